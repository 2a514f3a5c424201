"""Every signal circuit that may cover its band, for all coils at once; grades are left open."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from partpick.search.networks import Stream, Table
from partpick.search.problem import Bools, Floats, Ints, Problem
from partpick.search.sections import Made, Maker, behind_padder

_ROUNDING = 1e-9
_BLOCK = 100_000  # circuits at once
_UNCOUNTED = 1_000  # networks of an interval taken where nobody has counted them


class Signals:
    """Makes the circuits that cover one swept band, with at least the margin and at most the excess wanted."""

    def __init__(self, problem: Problem, tables: list[Table | Stream], valid: Ints, band: int) -> None:
        self.problem, self.tables, self.band = problem, tables, band
        self.padders = len(valid)
        self.maker = Maker(problem, valid, band)
        self.need, self.most = problem.least_at_low_end[:, band], problem.most_at_high_end[:, band]
        self.coils = np.flatnonzero(self._may_cover())

    def _may_cover(self) -> Bools:
        """Return which coils leave enough swing with nothing but strays in circuit, (J,)."""
        p, band = self.problem, self.band
        swing = p.tuning_high[band] - p.tuning_low[band]
        enough = self.need - self.most <= swing * (1 + _ROUNDING)
        return np.asarray(p.in_play[:, band] & enough & (self.maker.fixed <= self.most * (1 + _ROUNDING)))

    def blocks(self, parts: int) -> Iterator[Made]:
        """Yield the circuits of so many capacitors, a padder counted in."""
        for behind in (False, True):
            across = parts - 1 if behind else parts
            if not 0 <= across < len(self.tables):
                continue
            places = np.arange(self.padders) if behind else np.array([self.padders])
            for coils in np.array_split(self.coils, 1 + len(self.coils) * len(places) // _BLOCK):
                coil, place = np.repeat(coils, len(places)), np.tile(places, len(coils))
                yield from self._with_networks(coil, place, across, parts)

    def _with_networks(self, coil: Ints, place: Ints, across: int, parts: int) -> Iterator[Made]:
        lower, upper = self._interval(coil, place, parts)
        some = np.flatnonzero((lower <= upper) & (upper >= 0))
        coil, place, lower, upper = coil[some], place[some], lower[some], upper[some]
        table = self.tables[across]
        if isinstance(table, Table):
            count = np.searchsorted(table.value, upper, side="right") - np.searchsorted(table.value, lower)
        else:
            count = np.full(len(coil), _UNCOUNTED)
        ends = np.cumsum(count)
        start = 0
        while start < len(coil):
            begun = int(ends[start] - count[start])
            stop = max(start + 1, int(np.searchsorted(ends, begun + _BLOCK, side="right")))
            rows, which = table.inside_each(lower[start:stop], upper[start:stop])
            made = self.maker.made(coil[start:stop][which], place[start:stop][which], rows)
            inside = np.flatnonzero(self._covers(made))
            if len(inside):
                yield made.take(inside)
            start = stop

    def _interval(self, coil: Ints, place: Ints, parts: int) -> tuple[Floats, Floats]:
        """Return the interval of the network that covers, a little too wide. [F]"""
        p, band, fixed = self.problem, self.band, self.maker.fixed[coil]
        at_low = behind_padder(p.tuning_high[band], self.maker.padder_low[place])
        at_high = behind_padder(p.tuning_low[band], self.maker.padder_high[place])
        lower = self.need[coil] - at_low - fixed
        upper = self.most[coil] - at_high - fixed
        if parts:
            strays = (p.self_capacitance[coil] + p.stray[band]) / p.share
            lower = np.maximum(lower, strays - at_high - fixed)
        leads = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
        lower, upper = (side / (1 + leads * np.maximum(side, 0.0)) for side in (lower, upper))
        grain = _ROUNDING * self.need[coil]
        return lower - grain, upper + grain

    def _covers(self, made: Made) -> Bools:
        """Return which circuits cover the band within the limit on the excess, rounding allowed for."""
        p, band, circuits = self.problem, self.band, made.circuits
        at_low = behind_padder(p.tuning_high[band], circuits.padder_low) + circuits.fixed + circuits.across_low
        at_high = behind_padder(p.tuning_low[band], circuits.padder_high) + circuits.fixed + circuits.across_high
        inside = at_low >= self.need[made.coil] * (1 - _ROUNDING)
        inside &= at_high <= self.most[made.coil] * (1 + _ROUNDING)
        if np.isfinite(p.excess_limit):
            low = 1 / (2 * np.pi * np.sqrt(circuits.inductance_low * at_low))
            high = 1 / (2 * np.pi * np.sqrt(circuits.inductance_high * at_high))
            worse = np.maximum(p.low_end[band] - low, high - p.frequency[band])
            span = p.frequency[band] - p.low_end[band]
            inside &= worse <= p.excess_limit * span * (1 + _ROUNDING) + _ROUNDING * span
        return np.asarray(inside)
