"""Lower bounds on the order of every coil, and of every pair of coils, as single whole numbers.

A bound packs the leading steps of the order into 63 bits, none wider than its field,
so that no choice ever ranks before its bound.
"""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np

from partpick.search.choose import ORDERS, Choice
from partpick.search.columns import ColumnSource
from partpick.search.figures import coarse_error, fine_error, whole_excess
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem

IMPOSSIBLE = 1000  # fewest parts where a coil cannot serve a band
OUT_OF_REACH = 1 << 62  # its error or excess there, as a whole number

_BITS = {
    "pieces": 9,
    "error_class": 27,
    "fine_error": 36,
    "excess_class": 37,
    "fine_excess": 44,
    "coarse_excess": 27,  # in steps of 1e-6, so nothing may follow it
    "q_class": 3,
    "stray_class": 2,
    "reactance_class": 4,
    "price": 27,
    "forms": 5,
    "wires": 3,
    "volume": 10,
}
_TAIL = ("q_class", "stray_class", "reactance_class", "forms", "wires")
_FIXED = {
    "build": ("pieces", "error_class", *_TAIL, "volume"),
    "error": ("fine_error", "pieces", *_TAIL),
    "price": ("price", "pieces", "error_class"),
}
_SWEPT = {
    "build": ("pieces", "excess_class", *_TAIL),
    "error": ("fine_excess", "pieces", "q_class", "stray_class", "reactance_class"),
    "price": ("price", "pieces", "coarse_excess"),
}
_MIXED = {
    "build": ("pieces", "error_class", "coarse_excess"),
    "error": ("fine_error", "coarse_excess"),
    "price": ("price", "pieces", "error_class"),
}
_COARSE = 10**6  # of fine_excess
BELOW_PIECES = 54  # bits of a bound of `build` after its pieces, the same for all kinds


def packed_fields(problem: Problem, by: str) -> tuple[str, ...]:
    """Return the steps of the order that a packed bound holds; they fit into 63 bits."""
    kind = _SWEPT if problem.led_by_excess else _MIXED if problem.mixed else _FIXED
    return kind[by]


class Bounds:
    """What each coil can reach at best at each band, (J, B), from its capacitance windows alone."""

    def __init__(self, problem: Problem, source: ColumnSource) -> None:
        self.problem = problem
        self.errors = [np.full(problem.wanted.shape, np.inf)] * problem.least_parts
        excesses = list(self.errors)
        for parts in range(problem.least_parts, problem.most_parts + 1):
            self.errors.append(source.least_errors(parts))
            excesses.append(source.least_excesses(parts))
        finite = np.array([np.isfinite(errors) for errors in self.errors])
        self.possible: Bools = np.asarray(finite.any(axis=0))
        self.fewest = np.where(self.possible, finite.argmax(axis=0), IMPOSSIBLE).astype(np.int64)
        self.error_at_fewest, self.least_error = self._at_fewest_and_least(self.errors)
        self.excess_at_fewest, self.least_excess = self._at_fewest_and_least(excesses)
        # what leads by error and on the front, by number of parts
        self.leading = excesses if problem.led_by_excess else self.errors
        self.least_leading = self.least_excess if problem.led_by_excess else self.least_error
        self.q_class, self.stray_class, self.reactance_class = source.least_classes()

    def _at_fewest_and_least(self, levels: list[Floats]) -> tuple[Floats, Floats]:
        stacked = np.array(levels)
        fewest = np.minimum(self.fewest, len(stacked) - 1)[None]
        at_fewest = np.take_along_axis(stacked, fewest, axis=0)[0]
        return at_fewest, np.where(self.possible, stacked.min(axis=0), np.inf)

    def classes(self, by: str) -> dict[str, Ints]:
        """Return the per-band figures that enter the bound, (J, B) each."""
        p = self.problem
        error, excess = self.least_error, self.least_excess
        if by == "build":
            error, excess = self.error_at_fewest, self.excess_at_fewest
        figures = {
            "pieces": self.fewest,
            "error_class": _whole(lambda some: coarse_error(some, p.floor), error),
            "fine_error": _whole(fine_error, error),
            "excess_class": _whole(lambda some: whole_excess(some, 1e-9), excess),
            "fine_excess": _whole(lambda some: whole_excess(some, 1e-12), excess),
            "coarse_excess": _whole(lambda some: whole_excess(some, 1e-12) // _COARSE, excess),
            "q_class": self.q_class,
            "stray_class": self.stray_class,
            "reactance_class": self.reactance_class,
            "price": self._least_price(),
        }
        fields = packed_fields(p, by)
        return {name: figure for name, figure in figures.items() if name in fields or name == "pieces"}

    def _least_price(self) -> Ints:
        p = self.problem
        known = p.part_price[p.part_price < NEVER]
        least = int(known.min()) if len(known) else NEVER
        return np.where(self.fewest == 0, 0, np.minimum(self.fewest * least, NEVER))

    @cached_property
    def _stairs(self) -> tuple[Ints, Floats]:
        """Return the coils that serve every band, and the least error of each with at most k parts."""
        rows = np.flatnonzero(self.possible.all(axis=1))
        return rows, np.minimum.accumulate(np.array([level[rows] for level in self.leading]), axis=0)

    def staircase(self, cap: int) -> Floats:
        """Return the least worst error of each coil alone with at most `cap` capacitors, (J,); inf: none.

        The excess where every band is swept. [-]
        """
        rows, best = self._stairs
        worst = np.full(self.problem.coils, np.inf)
        if not len(rows):
            return worst
        level = self.fewest[rows].copy()
        every = np.arange(len(rows))
        bands = np.arange(self.problem.bands)
        while True:
            now = best[level, every[:, None], bands[None, :]]
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
        packed = pack(figures, packed_fields(p, by))
        return np.where(self.possible.all(axis=1), packed, np.iinfo(np.int64).max)


def _whole(rule: object, error: Floats) -> Ints:
    assert callable(rule)
    finite = np.isfinite(error)
    return np.where(finite, rule(np.where(finite, error, 0.0)), OUT_OF_REACH).astype(np.int64)


def pack(figures: dict[str, Ints], fields: tuple[str, ...]) -> Ints:
    """Return the leading steps of the order in one whole number each, none above what it stands for.

    A figure too wide for its field fills it; what follows it then says nothing, so it is set to the least.
    """
    packed = np.zeros_like(next(iter(figures.values())))
    full = np.zeros(packed.shape, dtype=np.bool_)
    for name in fields:
        width = _BITS[name]
        most = (1 << width) - 1
        value = np.where(full, 0, np.clip(figures[name], 0, most))
        full = full | (figures[name] >= most)
        packed = (packed << width) | value
    return packed


def packed_key(choice: Choice, problem: Problem) -> int:
    """Return the same whole number for a choice that was made: comparable with any bound. [-]

    What follows a figure too wide for its field is set to the most. Plain numbers: it is asked for each choice.
    """
    figures: dict[str, int] = {}
    for name, value in zip(ORDERS[problem.by], choice.key, strict=False):
        if isinstance(value, tuple):
            effort: tuple[Any, ...] = value
            figures |= {part: int(v) for part, v in zip(("forms", "wires", "volume"), effort, strict=True)}
        elif isinstance(value, (int, np.integer)):
            figures[name] = int(value)
    figures["coarse_excess"] = max(int(columns.fine_excess[0]) for columns in choice.columns) // _COARSE
    packed, full = 0, False
    for name in packed_fields(problem, problem.by):
        most = (1 << _BITS[name]) - 1
        figure = figures[name]
        packed = packed << _BITS[name] | (most if full else min(max(figure, 0), most))
        full = full or figure >= most
    return packed
