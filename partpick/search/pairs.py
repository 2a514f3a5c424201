"""Pairs of coils that share the bands between them: bounds over all pairs without looking at each.

What a coil can do at each band is a short vector of fewest parts; few of the vectors are different,
so pairs of vectors are tested, and only coils behind the best pairs of vectors are joined.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from partpick.progress import Monitor
from partpick.search.bounds import BELOW_PIECES, IMPOSSIBLE, OUT_OF_REACH, Bounds, pack, packed_fields
from partpick.search.choose import Stopped
from partpick.search.problem import NEVER, Floats, Ints, Problem

_BATCH = 20_000
_BLOCK = 1 << 21  # pairs figured at a time


class PairBounds:
    """All pairs of coils of one problem."""

    def __init__(self, problem: Problem, bounds: Bounds, monitor: Monitor) -> None:
        self.problem = problem
        self.bounds = bounds
        self.monitor = monitor
        self.size = 2
        self.complete = True
        self.useful = np.flatnonzero(bounds.possible.any(axis=1))

    def in_order(self) -> Iterator[tuple[int, tuple[int, ...]]]:
        """Yield (packed bound, pair of coils) by rising bound; at first a bound of all pairs, without coils.

        So that no pair is looked at where single coils alone decide.
        """
        by = self.problem.by
        yield self._least(by), ()
        classes = self.bounds.classes(by)
        figures = {name: figure[self.useful] for name, figure in classes.items()}
        if by == "error":
            yield from self._by_worst(figures)
        else:
            yield from self._by_total(figures, by)

    def _least(self, by: str) -> int:
        """Return a bound of all pairs, from the fewest parts that any coil needs at each band."""
        if by != "build":
            return 0
        fewest = int(self.bounds.fewest.min(axis=0, initial=IMPOSSIBLE).sum())
        return min(self.size + fewest, (1 << (62 - BELOW_PIECES)) - 1) << BELOW_PIECES

    def _by_total(self, figures: dict[str, Ints], by: str) -> Iterator[tuple[int, tuple[int, ...]]]:
        """Waves by number of pieces where that leads the order; inside a wave batches by rising bound."""
        vectors, member = _distinct(figures["pieces"])
        totals = _pair_totals(vectors)
        feasible = totals < IMPOSSIBLE
        waves = [totals == total for total in np.unique(totals[feasible])] if by == "build" else [feasible]
        for partners in waves:
            after = -1
            while True:
                batch = self._batch(figures, member, partners, after, by)
                if batch is None:
                    break
                packed, pairs = batch
                yield from zip(packed.tolist(), map(tuple, pairs.tolist()), strict=True)
                after = int(packed[-1])

    def _batch(
        self, figures: dict[str, Ints], member: Ints, partners: NDArray[np.bool_], after: int, by: str
    ) -> tuple[Ints, Ints] | None:
        """Return the pairs whose bound comes next after `after`, at least `_BATCH` of them if there are."""
        best_packed, best_pairs = np.empty(0, np.int64), np.empty((0, 2), np.int64)
        ceiling = np.iinfo(np.int64).max
        for first, second in self._joined(member, partners):
            packed = self._packed(figures, first, second, by)
            keep = (packed > after) & (packed <= ceiling)
            best_packed = np.concatenate([best_packed, packed[keep]])
            pairs = np.stack([self.useful[first[keep]], self.useful[second[keep]]], axis=1)
            best_pairs = np.concatenate([best_pairs, pairs])
            if len(best_packed) > 4 * _BATCH:
                ceiling = int(np.partition(best_packed, _BATCH)[_BATCH])
                inside = best_packed <= ceiling
                best_packed, best_pairs = best_packed[inside], best_pairs[inside]
        if not len(best_packed):
            return None
        if len(best_packed) > _BATCH:
            ceiling = int(np.partition(best_packed, _BATCH)[_BATCH])
            inside = best_packed <= ceiling
            best_packed, best_pairs = best_packed[inside], best_pairs[inside]
        order = np.lexsort((best_pairs[:, 1], best_pairs[:, 0], best_packed))
        return best_packed[order], best_pairs[order]

    def _joined(self, member: Ints, partners: NDArray[np.bool_]) -> Iterator[tuple[Ints, Ints]]:
        """Yield blocks of pairs (first < second) of coils whose vectors are partners."""
        by_vector = np.argsort(member, kind="stable")
        sizes = np.bincount(member, minlength=len(partners))
        starts = np.cumsum(sizes) - sizes
        ready: list[tuple[Ints, Ints]] = []
        waiting = 0
        for vector in range(len(partners)):
            others = np.flatnonzero(partners[vector, : vector + 1])
            if not len(others):
                continue
            own = by_vector[starts[vector] : starts[vector] + sizes[vector]]
            theirs = np.concatenate([by_vector[starts[o] : starts[o] + sizes[o]] for o in others])
            for piece in np.array_split(own, 1 + len(own) * len(theirs) // _BLOCK):
                first, second = np.repeat(piece, len(theirs)), np.tile(theirs, len(piece))
                if others[-1] == vector:
                    once = (member[second] != vector) | (first < second)
                    first, second = first[once], second[once]
                ready.append((first, second))
                waiting += len(first)
                if waiting >= _BLOCK // 8:
                    yield _stacked(ready)
                    ready, waiting = [], 0
                    self._check()
        if ready:
            yield _stacked(ready)

    def _check(self) -> None:
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        self.monitor.report("pairs of coils")

    def _packed(self, figures: dict[str, Ints], first: Ints, second: Ints, by: str) -> Ints:
        """Return the packed bounds of pairs: at each band the coil that needs fewer parts, or the better figure."""
        problem = self.problem
        lead = figures["pieces"]
        sums = {"pieces": 2}
        totals: dict[str, Ints] = {}
        for band in range(problem.bands):
            one, two = lead[first, band], lead[second, band]
            for name, figure in figures.items():
                a, b = figure[first, band], figure[second, band]
                if by == "build" and name != "pieces":
                    best = np.where(one < two, a, np.where(two < one, b, np.minimum(a, b)))
                else:
                    best = np.minimum(a, b)
                if name in ("pieces", "price"):
                    totals[name] = totals.get(name, sums.get(name, 0)) + best
                else:
                    totals[name] = np.maximum(totals[name], best) if name in totals else best
        coils = self.useful
        if "price" in totals:
            own = problem.coil_price[coils[first]] + problem.coil_price[coils[second]]
            totals["price"] = np.minimum(totals["price"] + own, NEVER)
        effort = problem.effort[coils[first]] + problem.effort[coils[second]]
        totals |= dict(zip(("forms", "wires", "volume"), effort.T, strict=True))
        return pack(totals, packed_fields(problem, by))

    def _by_worst(self, figures: dict[str, Ints]) -> Iterator[tuple[int, tuple[int, ...]]]:
        """Waves by the worst error or excess: pairs that stay inside a growing threshold."""
        rank = figures[packed_fields(self.problem, "error")[0]]
        levels = np.unique(rank[rank < OUT_OF_REACH])
        done = -1
        step = 1
        place = _first_covering(rank, levels)
        while place < len(levels):
            level = int(levels[place])
            covers, member = _distinct((rank > level).astype(np.int64))
            partners = ~(covers[:, None, :].astype(bool) & covers[None, :, :].astype(bool)).any(axis=2)
            blocks = []
            for first, second in self._joined(member, partners):
                worst = np.minimum(rank[first], rank[second]).max(axis=1)
                new = worst > done
                packed = self._packed(figures, first[new], second[new], "error")
                blocks.append((packed, self.useful[first[new]], self.useful[second[new]]))
            if blocks:
                packed = np.concatenate([b[0] for b in blocks])
                one, two = np.concatenate([b[1] for b in blocks]), np.concatenate([b[2] for b in blocks])
                order = np.lexsort((two, one, packed))
                for i in order:
                    yield int(packed[i]), (int(one[i]), int(two[i]))
            done = level
            if place == len(levels) - 1:
                return
            place = min(place + step, len(levels) - 1)
            step *= 2

    def by_error(self, cap: int, below: float) -> Iterator[tuple[float, tuple[int, ...]]]:
        """Yield (least worst error or excess, pair), rising, for pairs that need at most `cap` capacitors."""
        errors = np.array(self.bounds.leading)[:, self.useful, :]
        levels = np.unique(errors[np.isfinite(errors)])
        levels = levels[levels < below]
        low, high = 0, len(levels)
        while low < high:
            middle = (low + high) // 2
            if self._reachable(errors, float(levels[middle]), cap) is not None:
                high = middle
            else:
                low = middle + 1
        seen: set[tuple[int, ...]] = set()
        for level in levels[low:]:
            reachable = self._reachable(errors, float(level), cap)
            assert reachable is not None
            for first, second in self._joined(*reachable):
                for one, two in zip(self.useful[first].tolist(), self.useful[second].tolist(), strict=True):
                    if (one, two) not in seen:
                        seen.add((one, two))
                        yield float(level), (one, two)

    def _reachable(self, errors: Floats, level: float, cap: int) -> tuple[Ints, NDArray[np.bool_]] | None:
        """Return which coils pair up within `cap` capacitors and an error of `level`; None if none do."""
        inside = errors <= level
        fewest = np.where(inside.any(axis=0), inside.argmax(axis=0), IMPOSSIBLE)
        vectors, member = _distinct(fewest.astype(np.int64))
        partners = _pair_totals(vectors) <= cap
        return (member, partners) if partners.any() else None


def _stacked(blocks: list[tuple[Ints, Ints]]) -> tuple[Ints, Ints]:
    return np.concatenate([b[0] for b in blocks]), np.concatenate([b[1] for b in blocks])


def _distinct(vectors: Ints) -> tuple[NDArray[np.uint16], Ints]:
    """Return the different rows, (V, B), and which of them each row is, (J,)."""
    small = np.ascontiguousarray(np.minimum(vectors, IMPOSSIBLE).astype(np.uint16))
    as_one = small.view(np.dtype((np.void, 2 * small.shape[1]))).ravel()
    _, first, member = np.unique(as_one, return_index=True, return_inverse=True)
    return small[first], member.astype(np.int64)


def _pair_totals(vectors: NDArray[np.uint16]) -> NDArray[np.uint16]:
    """Return the fewest parts of every pair of vectors in all, (V, V); IMPOSSIBLE or more where a band is unserved."""
    count = len(vectors)
    totals = np.zeros((count, count), dtype=np.uint16)
    for band in range(vectors.shape[1]):
        column = vectors[:, band].astype(np.uint16)
        totals += np.minimum(column[:, None], column[None, :])
    return totals


def _first_covering(rank: Ints, levels: Ints) -> int:
    """Return the place of the least level at which some pair of coils serves every band; len(levels): none."""
    low, high = 0, len(levels)
    while low < high:
        middle = (low + high) // 2
        covers, _ = _distinct((rank > levels[middle]).astype(np.int64))
        missing = (covers[:, None, :].astype(bool) & covers[None, :, :].astype(bool)).any(axis=2)
        if (~missing).any():
            high = middle
        else:
            low = middle + 1
    return low
