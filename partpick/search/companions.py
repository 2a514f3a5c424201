"""Which padder, coil and network keep a circuit at its distance from another on the same gang.

The other circuit says what the section is at four frequencies. At each the circuit may be off by so much and
no more, so that what is in circuit, L C, lies in a window. Behind a padder P the section x acts as
x P / (x + P), and L C is a straight line against that: three windows out of four leave an interval of
padders in closed form, two leave an interval of coils, and padder and coil together one of the network.
All of them are necessary, none throws away what would do; the error itself is computed from what is left.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from partpick.search.networks import Stream, Table
from partpick.search.problem import Floats, Ints, Problem
from partpick.search.sections import CHECKS, Made, Maker, behind_padder

_ROUNDING = 1e-9
_STEADINESS = (1e-12, 1e-5, 1e-4, 1e-3, 1.0)  # padders by how much their capacitance moves over the range
_AT_ONCE = 200_000  # triples of section curve, padder and coil


@dataclass(frozen=True, eq=False)
class Hits:
    """Companions that may do, (h,) each."""

    curve: Ints  # row of the section curves
    made: Made

    def take(self, chosen: Ints) -> Hits:
        """Return some of the hits."""
        return Hits(self.curve[chosen], self.made.take(chosen))


@dataclass(frozen=True, eq=False)
class _Windows:
    """What a largest error leaves, for every coil still possible."""

    coil: Ints  # (c,) by rising inductance
    inductance: Floats  # (c,) H, at the low end
    least: Floats  # (c, 4) F, in circuit at each check
    most: Floats
    line_least: Floats  # (4,) s^2, inductance at the low end times what is in circuit, over all coils
    line_most: Floats
    beyond: float  # by how much the error reaches beyond the range, as a fraction of it
    moving: float  # by how much a network acts less at the low end


class Companions:
    """Looks for the companions of section curves in one swept band."""

    def __init__(
        self, problem: Problem, tables: list[Table | Stream], valid: Ints, band: int, target: Floats
    ) -> None:
        """Keep what does not depend on the curves.

        Parameters
        ----------
        problem : Problem
            The arrays of the request.
        tables : list
            Networks of the band, by number of parts.
        valid : (v,) array of int
            Species that act as capacitors there. [-]
        band : int
            The companion's. [-]
        target : (n,) array
            Where it ought to be at each point of the other circuit's band, rising. [Hz]
        """
        self.problem, self.tables, self.valid, self.band = problem, tables, valid, band
        self.target = target
        self.low, self.high = float(problem.low_end[band]), float(problem.frequency[band])
        self.coils = np.flatnonzero(problem.in_play[:, band])
        self.fixed = problem.fixed_capacitance()[:, band]
        self.maker = Maker(problem, valid, band)
        self.padder_low, self.padder_high = self.maker.padder_low, self.maker.padder_high
        self.steadiness = np.append(1.0 - self.padder_low[:-1] / self.padder_high[:-1], 0.0)

    def windows(self, largest: float) -> _Windows:
        """Return the windows for a largest error, in hertz."""
        p, band = self.problem, self.band
        target = self.target[list(CHECKS)]
        low, high = p.inductance_low[self.coils, band], p.inductance_high[self.coils, band]

        def in_circuit(frequency: Floats) -> Floats:
            inductance = low[:, None] + (high - low)[:, None] * (frequency - self.low) / (self.high - self.low)
            return np.asarray(1.0 / ((2 * np.pi * frequency) ** 2 * inductance))

        least, most = in_circuit(target + largest), in_circuit(target - largest)
        swing = float(p.tuning_high[band] - p.tuning_low[band])
        kept = np.flatnonzero(least[:, 0] - most[:, -1] <= swing * (1 + _ROUNDING))
        kept = kept[np.argsort(low[kept], kind="stable")]
        least, most, low = least[kept], most[kept], low[kept]
        beyond = 2 * largest / (self.high - self.low)
        moving = self._moving(float(most.max(initial=0.0)))
        line_least = (least * low[:, None]).min(axis=0, initial=np.inf)
        line_most = (most * low[:, None]).max(axis=0, initial=-np.inf)
        return _Windows(self.coils[kept], low, least, most, line_least, line_most, beyond, moving)

    def _moving(self, largest: float) -> float:
        """Return by how much a network of at most `largest` farad acts less at the low end. [-]"""
        p, band = self.problem, self.band
        high = p.species[band][self.valid]
        inside = high <= largest
        ratio = float((p.species_low[band][self.valid] / high)[inside].min(initial=1.0))
        leads = (2 * np.pi * self.high) ** 2 * p.lead_inductance * largest
        return float(min(1.0 - min(ratio, 1.0) * max(1.0 - leads, 0.0), 0.5))

    def hits(self, section: Floats, parts: int, behind: bool, windows: _Windows) -> Iterator[Hits]:
        """Yield the companions of `parts` capacitors that the windows leave.

        Parameters
        ----------
        section : (m, 4) array
            Of each curve, at the checks, falling. [F]
        parts : int
            How many capacitors, a padder counted in. [-]
        behind : bool
            Whether there is a padder. [-]
        windows : _Windows
            From `windows`.
        """
        across = parts - 1 if behind else parts
        if across < 0 or across >= len(self.tables) or len(windows.coil) == 0:
            return
        for curve, place in self._padders(section, behind, windows):
            for start in range(0, len(curve), _AT_ONCE):
                some = slice(start, start + _AT_ONCE)
                yield from self._with_coils(section, curve[some], place[some], across, parts, windows)

    # ------------------------------------------------------------ padders

    def _padders(self, section: Floats, behind: bool, windows: _Windows) -> Iterator[tuple[Ints, Ints]]:
        """Yield pairs of curve and padder, by how steady the padders are."""
        none = len(self.valid)
        if not behind:
            least, most = self._interval(section, windows, 0.0)
            curve = np.flatnonzero((most == np.inf) & (least < np.inf))
            yield curve, np.full(len(curve), none)
            return
        for below, upto in zip((-1.0, *_STEADINESS[:-1]), _STEADINESS, strict=True):
            group = np.flatnonzero((self.steadiness[:none] > below) & (self.steadiness[:none] <= upto))
            if len(group) == 0:
                continue
            group = group[np.argsort(self.padder_high[group], kind="stable")]
            least, most = self._interval(section, windows, float(self.steadiness[group].max()))
            values = self.padder_high[group]
            first = np.searchsorted(values, least * (1 - _ROUNDING), side="left")
            last = np.searchsorted(values, most * (1 + _ROUNDING), side="right")
            curve, offset = _ranges(first, last)
            yield curve, group[offset]

    def _lines(self, windows: _Windows, steadiness: float) -> tuple[Floats, Floats]:
        """Return the windows of L C with a padder and a network as they act at the high end."""
        moving = max(windows.moving, steadiness)
        least = windows.line_least * (1 - moving * windows.beyond - _ROUNDING)
        most = windows.line_most / max(1 - moving * (1 + windows.beyond) - _ROUNDING, 1e-3)
        return least, most

    def _interval(self, section: Floats, windows: _Windows, steadiness: float) -> tuple[Floats, Floats]:
        """Return the interval of the padder that every three of the checks leave to each curve, (m,) each. [F]"""
        least, most = self._lines(windows, steadiness)
        padder_least, padder_most = np.zeros(len(section)), np.full(len(section), np.inf)
        for a, b, c in combinations(range(len(CHECKS)), 3):
            lowest = (least[b] - most[c]) / (most[a] - most[c])
            highest = (most[b] - least[c]) / (least[a] - least[c])
            x_a, x_b, x_c = section[:, a], section[:, b], section[:, c]
            ratio = (x_b - x_c) / (x_a - x_c)  # the middle's place between the outer two, without a padder
            with np.errstate(divide="ignore", invalid="ignore"):
                from_highest = (ratio * x_a - highest * x_b) / (highest - ratio)
                from_lowest = (ratio * x_a - lowest * x_b) / (lowest - ratio)
            padder_least = np.maximum(padder_least, np.where(highest > ratio, from_highest, np.inf))
            padder_most = np.minimum(padder_most, np.where(lowest > ratio, from_lowest, np.inf))
        return padder_least, padder_most

    # ------------------------------------------------------------ coils and networks

    def _with_coils(
        self, section: Floats, curve: Ints, place: Ints, across: int, parts: int, windows: _Windows
    ) -> Iterator[Hits]:
        acting = behind_padder(section[curve], self.padder_high[place][:, None])
        least, most = self._lines(windows, float(self.steadiness[place].max(initial=0.0)))
        inductance_least, inductance_most = np.zeros(len(curve)), np.full(len(curve), np.inf)
        for a, c in combinations(range(len(CHECKS)), 2):
            swing = acting[:, a] - acting[:, c]
            inductance_least = np.maximum(inductance_least, (least[a] - most[c]) / swing)
            inductance_most = np.minimum(inductance_most, (most[a] - least[c]) / swing)
        first = np.searchsorted(windows.inductance, inductance_least * (1 - _ROUNDING), side="left")
        last = np.searchsorted(windows.inductance, inductance_most * (1 + _ROUNDING), side="right")
        count = np.maximum(last - first, 0)
        ends = np.cumsum(count)
        start = 0
        while start < len(curve):
            begun = int(ends[start] - count[start])
            stop = max(start + 1, int(np.searchsorted(ends, begun + _AT_ONCE, side="right")))
            pair, coil = _ranges(first[start:stop], last[start:stop])
            if len(pair):
                yield self._with_networks(section, curve, place, pair + start, coil, across, parts, windows)
            start = stop

    def _with_networks(
        self,
        section: Floats,
        curve: Ints,
        place: Ints,
        pair: Ints,
        row: Ints,
        across: int,
        parts: int,
        windows: _Windows,
    ) -> Hits:
        """Return what the exact windows of each padder and coil leave of the networks."""
        p, band = self.problem, self.band
        curve, place, coil = curve[pair], place[pair], windows.coil[row]
        along = (self.target[list(CHECKS)] - self.low) / (self.high - self.low)
        low, high = 1.0 / self.padder_low[place], 1.0 / self.padder_high[place]
        acting = section[curve] / (1.0 + section[curve] * (low[:, None] + (high - low)[:, None] * along))
        slack = _ROUNDING + self.steadiness[place] * windows.beyond
        lower = (windows.least[row] * (1 - slack)[:, None] - acting).max(axis=1) - self.fixed[coil]
        upper = (windows.most[row] * (1 + slack)[:, None] - acting).min(axis=1) - self.fixed[coil]
        upper = np.where(upper > 0, upper / (1 - windows.moving * (1 + windows.beyond)), upper)
        lower = np.where(lower > 0, lower * (1 - windows.moving * windows.beyond), lower)
        if parts:
            strays = (p.self_capacitance[coil] + p.stray[band]) / p.share
            end = behind_padder(np.full(len(coil), p.tuning_low[band]), self.padder_high[place])
            lower = np.maximum(lower, (strays - end) * (1 - _ROUNDING) - self.fixed[coil])
        leads = (2 * np.pi * self.high) ** 2 * p.lead_inductance
        lower, upper = (side / (1 + leads * np.maximum(side, 0.0)) for side in (lower, upper))
        grain = _ROUNDING * windows.most[row, 0]
        lower, upper = lower - grain, upper + grain
        some = np.flatnonzero((lower <= upper) & (upper >= 0))
        rows, which = self.tables[across].inside_each(lower[some], upper[some])
        kept = some[which]
        return Hits(curve[kept], self.maker.made(coil[kept], place[kept], rows))


def _ranges(first: Ints, last: Ints) -> tuple[Ints, Ints]:
    """Return row and place of every place in the half-open ranges, end to end."""
    count = np.maximum(last - first, 0)
    row = np.repeat(np.arange(len(first)), count)
    start = first - (np.cumsum(count) - count)
    return row, np.arange(len(row)) + start[row]
