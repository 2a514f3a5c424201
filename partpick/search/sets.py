"""Three coils and more that share the bands: bounds over every set, while their number allows it.

Where there are too many sets the most promising coils alone are joined; the search then says that it was
not complete.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from math import comb

import numpy as np

from partpick.progress import Monitor
from partpick.search.bounds import Bounds, pack, packed_fields
from partpick.search.choose import Stopped
from partpick.search.problem import NEVER, Floats, Ints, Problem

MOST_SETS = 1_000_000
_BLOCK = 100_000  # sets figured at a time


class SetBounds:
    """All sets of `size` coils of one problem, or of its most promising coils."""

    def __init__(self, problem: Problem, bounds: Bounds, size: int, monitor: Monitor) -> None:
        self.problem = problem
        self.bounds = bounds
        self.size = size
        self.monitor = monitor
        useful = np.flatnonzero(bounds.possible.any(axis=1))
        count = len(useful)
        while comb(count, size) > MOST_SETS:
            count -= 1
        self.complete = count == len(useful)
        self.useful = useful if self.complete else self._promising(useful, count)

    def _promising(self, useful: Ints, count: int) -> Ints:
        """Return the best coils for each single band, in turn, until there are enough."""
        classes = self.bounds.classes(self.problem.by)
        fields = [name for name in packed_fields(self.problem, self.problem.by) if name in classes]
        effort = self.problem.effort[useful].sum(axis=1)
        orders = []
        for band in range(self.problem.bands):
            steps = [classes[name][useful, band] for name in fields]
            served = ~self.bounds.possible[useful, band]
            orders.append(useful[np.lexsort((effort, *reversed(steps), served))])
        chosen: dict[int, None] = {}
        for row in np.array(orders).T:
            for coil in row:
                chosen[int(coil)] = None
                if len(chosen) >= count:
                    return np.sort(np.array(list(chosen), dtype=np.int64))
        return np.sort(np.array(list(chosen), dtype=np.int64))

    def in_order(self) -> Iterator[tuple[int, tuple[int, ...]]]:
        """Yield (packed bound, set of coils) by rising bound; a set that leaves a band unserved is left out."""
        by = self.problem.by
        classes = self.bounds.classes(by)
        packed, sets = [], []
        for block in self._blocks():
            serves = np.all(self.bounds.possible[block].any(axis=1), axis=1)
            kept = block[serves]
            packed.append(self._packed(classes, kept, by))
            sets.append(kept)
        yield from _rising(packed, sets)

    def by_error(self, cap: int, below: float) -> Iterator[tuple[float, tuple[int, ...]]]:
        """Yield (least worst error or excess, set), rising, for sets that need at most `cap` capacitors."""
        errors = np.array(self.bounds.leading)
        found, sets = [], []
        for block in self._blocks():
            worst = _least_worst(errors[:, block, :].min(axis=2), cap)
            kept = worst < below
            found.append(worst[kept])
            sets.append(block[kept])
        yield from _rising(found, sets)

    def _blocks(self) -> Iterator[Ints]:
        """Yield the sets as rows of coils, (m, size)."""
        every = itertools.combinations(self.useful.tolist(), self.size)
        while rows := list(itertools.islice(every, _BLOCK)):
            reason = self.monitor.stopped()
            if reason is not None:
                raise Stopped(reason)
            self.monitor.report(f"sets of {self.size} coils")
            yield np.array(rows, dtype=np.int64)

    def _packed(self, classes: dict[str, Ints], sets: Ints, by: str) -> Ints:
        """Return the packed bound of each set: at each band the coil of fewest parts, or the better figure."""
        lead = classes["pieces"][sets]  # (m, size, B)
        fewest = lead.min(axis=1)
        totals = {"pieces": fewest.sum(axis=1) + self.size}
        for name, figure in classes.items():
            if name == "pieces":
                continue
            best = figure[sets]
            if by == "build":
                best = np.where(lead == fewest[:, None, :], best, NEVER)
            best = best.min(axis=1)
            totals[name] = best.sum(axis=1) if name == "price" else best.max(axis=1)
        if "price" in totals:
            totals["price"] = np.minimum(totals["price"] + self.problem.coil_price[sets].sum(axis=1), NEVER)
        effort = self.problem.effort[sets].sum(axis=1)
        totals |= dict(zip(("forms", "wires", "volume"), effort.T, strict=True))
        return pack(totals, packed_fields(self.problem, by))


def _rising(figures: list[Ints] | list[Floats], sets: list[Ints]) -> Iterator[tuple[int, tuple[int, ...]]]:
    if not figures:
        return
    figure, rows = np.concatenate(figures), np.concatenate(sets)
    for place in np.argsort(figure, kind="stable"):
        yield figure[place].item(), tuple(rows[place].tolist())


def _least_worst(errors: Floats, cap: int) -> Floats:
    """Return the least worst error with at most `cap` parts from (K + 1, m, B) errors of exactly k parts."""
    best = np.minimum.accumulate(errors, axis=0)
    finite = np.isfinite(best)
    level = np.where(finite.any(axis=0), finite.argmax(axis=0), 0)
    served = np.all(finite.any(axis=0), axis=1)
    rows, bands = np.arange(best.shape[1]), np.arange(best.shape[2])
    worst = np.full(best.shape[1], np.inf)
    while True:
        now = best[level, rows[:, None], bands[None, :]]
        inside = served & (level.sum(axis=1) <= cap)
        worst = np.where(inside, np.minimum(worst, now.max(axis=1)), worst)
        band = now.argmax(axis=1)
        grow = inside & (level[rows, band] < len(best) - 1)
        if not grow.any():
            return worst
        level[rows[grow], band[grow]] += 1
