"""Swept bands: which parallel capacitance covers a band, and the least excess that any can reach.

A capacitance T between two ends tunes the band, alone or behind a series padder; everything else, x,
is across the coil. The band is covered while x lies in an interval. Over it the overshoot at the low
end rises with x and that at the high end falls, so the least excess is next to where they cross.

An excess already reached bounds the capacitance in circuit at both ends, and so the swing: padders are
taken by rising swing, looked at closely only where some network lies inside those bounds, and left
where the swing alone is too large.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from partpick.search.networks import Stream, Table
from partpick.search.problem import Bools, Floats, Ints, Problem

_GRAIN = 2e-12  # rounding of the limits themselves
_STEPS = 40  # of Newton's method; four to six are usual


@dataclass(frozen=True, eq=False)
class SeriesPadders:
    """The tuning element behind each series padder of a band, by species among the valid ones."""

    at_low_end: Floats  # (s,) F, the element at its most
    at_high_end: Floats  # (s,) F, the element at its least


def series_padders(problem: Problem, band: int, valid: Ints) -> SeriesPadders:
    """Return the ends of the tuning element in series with each valid species. [F]"""
    most, least = problem.tuning_high[band], problem.tuning_low[band]
    low_end, high_end = problem.species_low[band][valid], problem.species[band][valid]
    return SeriesPadders(most * low_end / (most + low_end), least * high_end / (least + high_end))


@dataclass(frozen=True, eq=False)
class _Rows:
    """Pairs of coil and band still in play, flat, (r,) each."""

    coil: Ints
    band: Ints
    fixed: Floats  # F, strays, self-capacitance and trimmer
    need: Floats  # F, least in circuit at the low end
    most: Floats  # F, most in circuit at the high end
    strays: Floats  # F, least in circuit at the high end for the share limit, with a capacitor
    low: Floats  # Hz, as asked for
    high: Floats
    margin: float
    leads: Floats  # 1/F, (2 pi f)^2 times the leads' inductance
    slack: Floats  # by how much the excess may be below what the figures of the high end say

    def take(self, chosen: Ints | Bools) -> _Rows:
        """Return some of the rows."""
        names = [name for name in self.__dataclass_fields__ if name != "margin"]
        return _Rows(margin=self.margin, **{name: getattr(self, name)[chosen] for name in names})

    def excess(self, low_total: Floats, high_total: Floats) -> Floats:
        """Return the excess for what is in circuit at the ends, never above the true one. [-]"""
        at_low = self.low * (1.0 - (1.0 - self.margin) * np.sqrt(self.need / low_total))
        at_high = self.high * ((1.0 + self.margin) * np.sqrt(self.most / high_total) - 1.0)
        return np.asarray(np.maximum(at_low, at_high) / (self.high - self.low) - self.slack)

    def totals_inside(self, excess: Floats) -> tuple[Floats, Floats]:
        """Return most in circuit at the low end and least at the high end within an excess. [F]"""
        span = (excess + self.slack) * (self.high - self.low)
        lowest, highest = self.low - span, self.high + span
        reached = lowest > 0
        most = (self.low * (1.0 - self.margin) / np.where(reached, lowest, 1.0)) ** 2
        least = (self.high * (1.0 + self.margin) / highest) ** 2
        return np.where(reached, self.need * most, np.inf), np.asarray(self.most * least)

    def crossing(self, swing: Floats) -> Floats:
        """Return what is in circuit at the high end with least excess for a swing, any x allowed. [F]"""
        ends = self.low + self.high
        at_low = self.low * (1.0 - self.margin) * np.sqrt(self.need / self.most)
        at_high = self.high * (1.0 + self.margin)
        wide = swing / self.most
        total = np.ones_like(wide)  # in units of the most at the high end
        rows = np.flatnonzero(at_low / np.sqrt(1.0 + wide) + at_high < ends)
        if len(rows):
            total[rows] = _falling_root(at_low[rows], at_high[rows], wide[rows], ends[rows])
        return np.asarray(np.clip(total * self.most, np.minimum(self.need - swing, self.most), self.most))


def _falling_root(one: Floats, two: Floats, wide: Floats, ends: Floats) -> Floats:
    """Return u with one/sqrt(u + wide) + two/sqrt(u) = ends: convex and falling, Newton from below."""
    u = (two / ends) ** 2  # the other term dropped: below the root
    for _ in range(_STEPS):
        first, second = 1.0 / np.sqrt(u + wide), 1.0 / np.sqrt(u)
        value = one * first + two * second - ends
        step = 2.0 * value / (one * first**3 + two * second**3)
        u = u + step
        if np.abs(step).max() < 1e-13:
            break
    return u


class LeastExcess:
    """The least excess of every coil at every swept band with at most k parts, (J, B), made on demand.

    Where one coil must serve every band, coils that cannot are left out of the work.
    """

    def __init__(self, problem: Problem, tables: list[list[Table | Stream]], valid: list[Ints]) -> None:
        self.problem = problem
        self.tables = tables
        self.valid = valid
        self._levels: list[Floats] = []
        self._groups: list[tuple[int, _Rows]] | None = None

    def level(self, parts: int) -> Floats:
        """Return the least excess with at most `parts` parts, (J, B); inf: none covers; 0: fixed band. [-]"""
        p = self.problem
        while len(self._levels) <= parts:
            level = len(self._levels)
            if level:
                self._levels.append(self._levels[-1].copy())
            else:
                self._levels.append(np.where(p.swept[None, :], np.inf, np.zeros(p.wanted.shape)))
            if level >= p.least_parts and p.swept.any():
                self._fill(level)
        return self._levels[parts]

    def _fill(self, parts: int) -> None:
        if self._groups is None:
            self._groups = self._rows_of_groups()
        known = self._levels[parts]
        for band, rows in self._groups:
            if parts >= len(self.tables[band]):
                continue
            best = known[rows.coil, rows.band]
            self._improve(band, rows, parts, best)
            inside = best <= self.problem.excess_limit * (1 + 1e-12)
            known[rows.coil, rows.band] = np.where(inside, np.maximum(best, 0.0), np.inf)

    def _improve(self, band: int, rows: _Rows, parts: int, best: Floats) -> None:
        """Lower `best` to the least excess with exactly `parts` parts where that is less."""
        p, tables = self.problem, self.tables[band]
        alone = SeriesPadders(p.tuning_high[band : band + 1], p.tuning_low[band : band + 1])
        behind = series_padders(p, band, self.valid[band])
        if parts == 0:
            _without_network(replace(rows, strays=np.zeros_like(rows.strays)), alone, best)
            return
        _with_network(rows, alone, tables[parts], best)
        if parts == 1:
            _without_network(rows, behind, best)
        else:
            _with_network(rows, behind, tables[parts - 1], best)

    def _rows_of_groups(self) -> list[tuple[int, _Rows]]:
        """Return the first band and the rows of each group of bands with the same parts as they act."""
        p = self.problem
        inside = self._coverable()
        if p.inductors == 1:
            inside &= np.all(inside | ~p.swept[None, :], axis=1)[:, None]
        return [(bands[0], self._rows(bands, inside)) for bands in self._alike()]

    def _coverable(self) -> Bools:
        """Whether enough swing is left, alone or behind some padder, with nothing else in circuit."""
        p = self.problem
        inside = p.in_play & p.swept[None, :] & p.swings_enough()
        fixed, most, need = p.fixed_capacitance(), p.most_at_high_end, p.least_at_low_end
        for band in np.flatnonzero(p.swept):
            padders = series_padders(p, int(band), self.valid[band])
            alone = p.tuning_high[band] - p.tuning_low[band]
            swing = np.append(padders.at_low_end - padders.at_high_end, alone)
            at_high_end = np.append(padders.at_high_end, p.tuning_low[band])
            order = np.argsort(swing, kind="stable")
            later_least = np.append(np.minimum.accumulate(at_high_end[order][::-1])[::-1], np.inf)
            grain = _GRAIN * most[:, band]
            place = np.searchsorted(swing[order], need[:, band] - most[:, band] - grain)
            inside[:, band] &= later_least[place] + fixed[:, band] <= most[:, band] + grain
        return inside

    def _alike(self) -> list[list[int]]:
        """Return the swept bands in groups with the same capacitors as they act and the same element."""
        p = self.problem
        groups: dict[object, list[int]] = {}
        for band in np.flatnonzero(p.swept).tolist():
            ends = float(p.tuning_low[band]), float(p.tuning_high[band])
            key = (id(self.tables[band]), p.species_low[band].tobytes(), ends)
            groups.setdefault(key, []).append(band)
        return list(groups.values())

    def _rows(self, bands: list[int], inside: Bools) -> _Rows:
        p = self.problem
        coil, place = np.nonzero(inside[:, bands])
        band = np.array(bands)[place]
        fixed = p.fixed_capacitance()[coil, band]
        need, most = p.least_at_low_end[coil, band], p.most_at_high_end[coil, band]
        leads = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
        low, high = p.low_end[band], p.frequency[band]
        slack = low * self._acting_less(bands[0], leads, most - fixed) / (2 * need) / (high - low)
        strays = (p.self_capacitance[coil] + p.stray[band]) / p.share
        return _Rows(coil, band, fixed, need, most, strays, low, high, p.margin, leads, slack)

    def _acting_less(self, band: int, leads: Floats, network: Floats) -> Floats:
        """Return by how much a network acts less at the low end than at the high one, at most. [F]"""
        valid = self.valid[band]
        low_end, high_end = self.problem.species_low[band][valid], self.problem.species[band][valid]
        ratio = float((low_end / high_end).min()) if len(valid) else 1.0
        network = np.maximum(network, 0.0)
        return np.asarray(network * (1.0 - min(ratio, 1.0) / (1.0 + leads * network)))


def _with_network(rows: _Rows, padders: SeriesPadders, table: Table | Stream, best: Floats) -> None:
    """Lower `best` to the least excess with one of the padders and a network of a table."""
    swing = padders.at_low_end - padders.at_high_end
    order = np.argsort(swing, kind="stable")
    swing, low_ends, high_ends = swing[order], padders.at_low_end[order], padders.at_high_end[order]
    # each row walks up from the least swing that covers
    place = np.searchsorted(swing, rows.need - rows.most - _GRAIN * rows.most)
    most, least = rows.totals_inside(best)
    going = np.flatnonzero(place < len(order))
    while len(going):
        at = place[going]
        low_total, high_total = low_ends[at] + rows.fixed[going], high_ends[at] + rows.fixed[going]
        grain = _GRAIN * rows.need[going]
        floor = np.maximum(rows.strays[going], least[going])
        lower = np.maximum(rows.need[going] - low_total, floor - high_total) - grain
        upper = np.minimum(rows.most[going] - high_total, most[going] - low_total) + grain
        leads = rows.leads[going]
        lower, upper = _before_leads(lower, leads), _before_leads(upper, leads)
        hit = np.flatnonzero(table.any_inside(lower, upper))
        if len(hit):
            chosen = going[hit]
            some = rows.take(chosen)
            found = _nearest(some, low_total[hit], high_total[hit], table)
            best[chosen] = np.minimum(best[chosen], found)
            most[chosen], least[chosen] = some.totals_inside(best[chosen])
        place[going] += 1
        going = going[place[going] < len(order)]
        going = going[swing[place[going]] < most[going] - least[going]]


def _nearest(rows: _Rows, low_total: Floats, high_total: Floats, table: Table | Stream) -> Floats:
    """Return the least excess with a network of a table beside what is given, inf where none covers. [-]"""
    grain = _GRAIN * rows.need
    lower = np.maximum(rows.need - low_total, rows.strays - high_total) - grain
    upper = rows.most - high_total + grain
    wanted = rows.crossing(low_total - high_total) - high_total
    lower, upper, wanted = (_before_leads(side, rows.leads) for side in (lower, upper, wanted))
    found = np.full(len(wanted), np.inf)
    for side in table.neighbours(np.clip(wanted, lower, upper)):
        inside = (side >= lower) & (side <= upper)
        value = np.where(inside, side, 0.0)
        network = value / (1.0 - rows.leads * value)
        excess = rows.excess(low_total + network, high_total + network)
        found = np.where(inside, np.minimum(found, excess), found)
    return found


def _before_leads(acting: Floats, leads: Floats) -> Floats:
    """Return the network that acts as `acting` behind the leads' inductance. [F]"""
    return np.asarray(acting / (1.0 + leads * np.maximum(acting, 0.0)))


def _without_network(rows: _Rows, padders: SeriesPadders, best: Floats) -> None:
    """Lower `best` to the least excess with one of the padders and nothing else."""
    order = np.argsort(padders.at_low_end, kind="stable")
    low_ends, high_ends = padders.at_low_end[order], padders.at_high_end[order]
    place = np.searchsorted(low_ends, rows.need * (1 - _GRAIN) - rows.fixed)
    floor = rows.strays * (1 - _GRAIN)
    most, least = rows.totals_inside(best)
    going = np.flatnonzero(place < len(order))
    while len(going):
        at = place[going]
        low_total, high_total = low_ends[at] + rows.fixed[going], high_ends[at] + rows.fixed[going]
        # the overshoot at the low end only grows from here on
        left = low_total < most[going]
        hit = left & (high_total <= rows.most[going] * (1 + _GRAIN))
        hit &= (high_total >= least[going]) & (high_total >= floor[going])
        chosen = going[hit]
        if len(chosen):
            some = rows.take(chosen)
            best[chosen] = np.minimum(best[chosen], some.excess(low_total[hit], high_total[hit]))
            most[chosen], least[chosen] = some.totals_inside(best[chosen])
        going = going[left]
        place[going] += 1
        going = going[place[going] < len(order)]
