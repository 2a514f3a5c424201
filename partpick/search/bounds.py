"""Lower bounds on the order of every coil, and of every pair of coils, as single whole numbers.

A bound packs the leading steps of the order into 63 bits, none wider than its field,
so that no choice ever ranks before its bound.
"""

from __future__ import annotations

import numpy as np

from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource, coarse_error, fine_error, quality_class, stray_class
from partpick.search.problem import NEVER, Floats, Ints, Problem

IMPOSSIBLE = 1000  # fewest parts where a coil cannot serve a band

_BITS = {
    "pieces": 9,
    "error_class": 27,
    "fine_error": 36,
    "q_class": 3,
    "stray_class": 2,
    "reactance_class": 4,
    "price": 27,
    "forms": 5,
    "wires": 3,
    "volume": 10,
}
_TAIL = ("q_class", "stray_class", "reactance_class")
FIELDS = {
    "build": ("pieces", "error_class", *_TAIL, "forms", "wires", "volume"),
    "error": ("fine_error", "pieces", *_TAIL, "forms", "wires"),
    "price": ("price", "pieces", "error_class"),
}


class Bounds:
    """What each coil can reach at best at each band, (J, B), from its capacitance windows alone."""

    def __init__(self, problem: Problem, source: ColumnSource) -> None:
        self.problem = problem
        self.errors = [np.full(problem.wanted.shape, np.inf)] * problem.least_parts
        for parts in range(problem.least_parts, problem.most_parts + 1):
            self.errors.append(source.least_errors(parts))
        finite = np.array([np.isfinite(errors) for errors in self.errors])
        self.possible = finite.any(axis=0)
        self.fewest = np.where(self.possible, finite.argmax(axis=0), IMPOSSIBLE).astype(np.int64)
        stacked = np.array(self.errors)
        self.error_at_fewest = np.take_along_axis(
            stacked, np.minimum(self.fewest, len(stacked) - 1)[None], axis=0
        )[0]
        self.least_error = stacked.min(axis=0)
        self.q_class = quality_class(problem.coil_loss, problem.q_enough[None, :])
        self.stray_class = self._least_stray_class()

    def _least_stray_class(self) -> Ints:
        p = self.problem
        error = np.minimum(p.error_limit, 0.999)[None, :]
        most = p.wanted / (1 - error) ** 2
        strays = p.self_capacitance[:, None] + p.stray[None, :]
        return stray_class(strays / most)

    def classes(self, by: str) -> dict[str, Ints]:
        """Return the per-band figures that enter the bound, (J, B) each."""
        p = self.problem
        if by == "error":
            first = {"fine_error": _whole(fine_error, self.least_error), "pieces": self.fewest}
        elif by == "price":
            coarse = _whole(lambda error: coarse_error(error, p.floor), self.least_error)
            first = {"price": self._least_price(), "pieces": self.fewest, "error_class": coarse}
        else:
            coarse = _whole(lambda error: coarse_error(error, p.floor), self.error_at_fewest)
            first = {"pieces": self.fewest, "error_class": coarse}
        return {
            **first,
            "q_class": self.q_class,
            "stray_class": self.stray_class,
            "reactance_class": p.reactance_class,
        }

    def _least_price(self) -> Ints:
        p = self.problem
        known = p.part_price[p.part_price < NEVER]
        least = int(known.min()) if len(known) else NEVER
        return np.where(self.fewest == 0, 0, np.minimum(self.fewest * least, NEVER))

    def staircase(self, cap: int) -> Floats:
        """Return the least worst error of each coil alone with at most `cap` capacitors, (J,); inf: none. [-]"""
        best = np.minimum.accumulate(np.array(self.errors), axis=0)
        rows = np.flatnonzero(self.possible.all(axis=1))
        worst = np.full(self.problem.coils, np.inf)
        if not len(rows):
            return worst
        level = self.fewest[rows].copy()
        every = np.arange(len(rows))
        bands = np.arange(self.problem.bands)
        while True:
            now = best[level, rows[:, None], bands[None, :]]
            inside = level.sum(axis=1) <= cap
            worst[rows] = np.where(inside, np.minimum(worst[rows], now.max(axis=1)), worst[rows])
            band = now.argmax(axis=1)
            grow = inside & (level[every, band] < self.problem.most_parts)
            if not grow.any():
                return worst
            level[every[grow], band[grow]] += 1

    def alone(self, by: str) -> Ints:
        """Return the packed bound of each coil used for all bands, (J,); the largest number where it cannot."""
        p = self.problem
        figures = {}
        for name, per_band in self.classes(by).items():
            figures[name] = per_band.sum(axis=1) if name in ("pieces", "price") else per_band.max(axis=1)
        figures["pieces"] = figures["pieces"] + 1
        if "price" in figures:
            figures["price"] = np.minimum(figures["price"] + p.coil_price, NEVER)
        figures |= dict(zip(("forms", "wires", "volume"), p.effort.T, strict=True))
        packed = pack(figures, by)
        return np.where(self.possible.all(axis=1), packed, np.iinfo(np.int64).max)


def _whole(rule: object, error: Floats) -> Ints:
    assert callable(rule)
    finite = np.isfinite(error)
    return np.where(finite, rule(np.where(finite, error, 0.0)), NEVER).astype(np.int64)


def pack(figures: dict[str, Ints], by: str, *, after_full: int = 0) -> Ints:
    """Return the leading steps of the order in one whole number each.

    A figure too wide for its field fills it; what follows it then says nothing, so it is set to the
    least for a bound (`after_full` 0) and to the most for a choice that was made (1).
    """
    packed = np.zeros_like(next(iter(figures.values())))
    full = np.zeros(packed.shape, dtype=np.bool_)
    for name in FIELDS[by]:
        width = _BITS[name]
        most = (1 << width) - 1
        value = np.where(full, after_full * most, np.clip(figures[name], 0, most))
        full = full | (figures[name] >= most)
        packed = (packed << width) | value
    return packed


def packed_key(choice: Choice, by: str, order: tuple[str, ...]) -> int:
    """Return the same whole number for a choice that was made: comparable with any bound. [-]"""
    figures: dict[str, Ints] = {}
    for name, value in zip(order, choice.key, strict=False):
        if isinstance(value, tuple):
            figures |= {n: np.array([v]) for n, v in zip(("forms", "wires", "volume"), value, strict=True)}
        else:
            figures[name] = np.array([value])
    return int(pack(figures, by, after_full=1)[0])
