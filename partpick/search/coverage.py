"""Swept bands: which parallel capacitance covers a band, and the least excess that any can reach.

A capacitance T between two ends tunes the band, alone or behind a series padder; everything else, x,
is across the coil. The band is covered while x lies in an interval. Over it the overshoot at the low
end rises with x and that at the high end falls, so the least excess is next to where they cross.
How much of it a larger swing costs is known without looking at any part: the search stops there.
"""

from __future__ import annotations

from dataclasses import dataclass

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
        names = [name for name in self.__dataclass_fields__ if name != "margin"]
        return _Rows(margin=self.margin, **{name: getattr(self, name)[chosen] for name in names})

    def low_overshoot(self, total: Floats) -> Floats:
        """Return low - tuned_low for the capacitance in circuit at the low end. [Hz]"""
        return self.low * (1.0 - (1.0 - self.margin) * np.sqrt(self.need / total))

    def high_overshoot(self, total: Floats) -> Floats:
        """Return tuned_high - high for the capacitance in circuit at the high end. [Hz]"""
        return self.high * ((1.0 + self.margin) * np.sqrt(self.most / total) - 1.0)

    def excess(self, low_total: Floats, high_total: Floats) -> Floats:
        """Return the excess, never above the true one. [fraction of the band]"""
        worse = np.maximum(self.low_overshoot(low_total), self.high_overshoot(high_total))
        return worse / (self.high - self.low) - self.slack

    def crossing(self, swing: Floats) -> Floats:
        """Return the capacitance in circuit at the high end with least excess for a swing, any x allowed. [F]"""
        ends = self.low + self.high
        at_low = self.low * (1.0 - self.margin) * np.sqrt(self.need / self.most)
        at_high = self.high * (1.0 + self.margin)
        wide = swing / self.most
        total = np.ones_like(wide)  # in units of the most at the high end
        rows = np.flatnonzero(at_low / np.sqrt(1.0 + wide) + at_high < ends)
        if len(rows):
            ends, at_low, at_high, wide = ends[rows], at_low[rows], at_high[rows], wide[rows]
            total[rows] = _falling_root(at_low, at_high, wide, ends)
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
    """The least excess of every coil at every swept band with at most k parts, (J, B), made on demand."""

    def __init__(self, problem: Problem, tables: list[list[Table | Stream]], valid: list[Ints]) -> None:
        self.problem = problem
        self.tables = tables
        self.valid = valid
        self._levels: list[Floats] = []

    def level(self, parts: int) -> Floats:
        """Return the least excess with at most `parts` parts, (J, B); inf: none covers; 0: fixed band. [-]"""
        p = self.problem
        while len(self._levels) <= parts:
            self._levels.append(np.where(p.swept[None, :], np.inf, np.zeros(p.wanted.shape)))
            level = len(self._levels) - 1
            if level < p.least_parts:
                continue
            if level:
                self._levels[level] = self._levels[level - 1].copy()
            for bands in self._alike():
                self._fill(bands, level)
        return self._levels[parts]

    def _alike(self) -> list[list[int]]:
        """Return the swept bands in groups with the same capacitors as they act and the same element."""
        p = self.problem
        groups: dict[object, list[int]] = {}
        for band in np.flatnonzero(p.swept).tolist():
            ends = float(p.tuning_low[band]), float(p.tuning_high[band])
            key = (id(self.tables[band]), p.species_low[band].tobytes(), ends)
            groups.setdefault(key, []).append(band)
        return list(groups.values())

    def _fill(self, bands: list[int], parts: int) -> None:
        first = bands[0]
        tables = self.tables[first]
        if parts >= len(tables):
            return
        known = self._levels[parts]
        rows = self._rows(bands, parts)
        best = known[rows.coil, rows.band]
        alone = SeriesPadders(*(np.array([end[first]]) for end in (self.problem.tuning_high, self.problem.tuning_low)))
        none = np.zeros(len(best), dtype=np.int64)
        best = _with_network(rows, alone, none, tables[parts], best)
        padders = series_padders(self.problem, first, self.valid[first])
        if parts == 1:
            best = _with_padder_only(rows, padders, best)
        elif parts > 1:
            best = _with_padder(rows, padders, tables[parts - 1], best)
        best = np.where(best <= self.problem.excess_limit * (1 + 1e-12), np.maximum(best, 0.0), np.inf)
        known[rows.coil, rows.band] = best

    def _rows(self, bands: list[int], parts: int) -> _Rows:
        p = self.problem
        chosen = np.array(bands)
        fixed, most, need = (a[:, chosen] for a in (p.fixed_capacitance(), p.most_at_high_end, p.least_at_low_end))
        widest = p.tuning_high[bands[0]] - p.tuning_low[bands[0]]  # a series padder only takes from it
        inside = p.in_play[:, chosen] & (most > fixed) & (need - most <= widest + _GRAIN * most)
        coil, place = np.nonzero(inside)
        band = chosen[place]
        strays = (p.self_capacitance[coil] + p.stray[band]) / p.share if parts else np.zeros(len(coil))
        leads = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
        low, high = p.low_end[band], p.frequency[band]
        fixed, need, most = fixed[coil, place], need[coil, place], most[coil, place]
        gap = self._acting_less(bands[0], leads, most - fixed)
        slack = low * gap / (2 * need) / (high - low)
        return _Rows(coil, band, fixed, need, most, strays, low, high, p.margin, leads, slack)

    def _acting_less(self, band: int, leads: Floats, network: Floats) -> Floats:
        """Return by how much a network acts less at the low end than at the high one, at most. [F]"""
        valid = self.valid[band]
        low_end, high_end = self.problem.species_low[band][valid], self.problem.species[band][valid]
        ratio = float((low_end / high_end).min()) if len(valid) else 1.0
        return np.asarray(network * (1.0 - min(ratio, 1.0) / (1.0 + leads * network)))


def _with_network(
    rows: _Rows, padders: SeriesPadders, padder: Ints, table: Table | Stream, best: Floats
) -> Floats:
    """Return the least excess with one given padder a row and any network of a table, or `best`."""
    low_end, high_end = padders.at_low_end[padder] + rows.fixed, padders.at_high_end[padder] + rows.fixed
    wanted = rows.crossing(low_end - high_end)
    promising = rows.excess(wanted + (low_end - high_end), wanted) < best
    lower = np.maximum(rows.need - low_end, rows.strays - high_end) - _GRAIN * rows.need
    upper = rows.most - high_end + _GRAIN * rows.most
    promising &= (lower <= upper) & (upper >= 0)
    where = np.flatnonzero(promising)
    if not len(where):
        return best
    some, low_end, high_end = rows.take(where), low_end[where], high_end[where]
    lower, upper = (_before_leads(side[where], some.leads) for side in (lower, upper))
    centre = np.clip(_before_leads(wanted[where] - high_end, some.leads), lower, upper)
    found = best[where]
    for side in table.neighbours(centre):
        inside = (side >= lower) & (side <= upper)
        value = np.where(inside, side, np.maximum(centre, 0.0))
        network = value / (1.0 - some.leads * value)
        excess = some.excess(low_end + network, high_end + network)
        found = np.where(inside, np.minimum(found, excess), found)
    best = best.copy()
    best[where] = found
    return best


def _before_leads(acting: Floats, leads: Floats) -> Floats:
    """Return the network that acts as `acting` behind the leads' inductance. [F]"""
    return np.asarray(acting / (1.0 + leads * np.maximum(acting, 0.0)))


def _with_padder(rows: _Rows, padders: SeriesPadders, table: Table | Stream, best: Floats) -> Floats:
    """Return the least excess with a series padder and a network of a table: padders by rising swing."""
    swing = padders.at_low_end - padders.at_high_end
    order = np.argsort(swing, kind="stable")
    swing = swing[order]
    later_least = np.minimum.accumulate(padders.at_high_end[order][::-1])[::-1]
    # the least swing that covers; every row walks up from its own
    place = np.searchsorted(swing, rows.need - rows.most - _GRAIN * rows.most)
    best = best.copy()
    going = np.arange(len(best))
    while True:
        going = going[place[going] < len(order)]
        some = rows.take(going)
        at = place[going]
        wanted = some.crossing(swing[at])
        bound = some.excess(wanted + swing[at], wanted)
        keep = (bound < best[going]) & (later_least[at] + some.fixed <= some.most * (1 + _GRAIN))
        going = going[keep]
        if not len(going):
            return best
        best[going] = _with_network(some.take(keep), padders, order[at[keep]], table, best[going])
        place[going] += 1


def _with_padder_only(rows: _Rows, padders: SeriesPadders, best: Floats) -> Floats:
    """Return the least excess with a series padder and nothing else, or `best`: padders by rising low end."""
    order = np.argsort(padders.at_low_end, kind="stable")
    low_ends, high_ends = padders.at_low_end[order], padders.at_high_end[order]
    place = np.searchsorted(low_ends, rows.need * (1 - _GRAIN) - rows.fixed)
    best = best.copy()
    going = np.arange(len(best))
    while True:
        going = going[place[going] < len(order)]
        some, at = rows.take(going), place[going]
        low_total, high_total = low_ends[at] + some.fixed, high_ends[at] + some.fixed
        keep = some.low_overshoot(low_total) / (some.high - some.low) - some.slack < best[going]
        going = going[keep]
        if not len(going):
            return best
        covers = (high_total <= some.most * (1 + _GRAIN)) & (high_total >= some.strays * (1 - _GRAIN))
        excess = np.where(covers, some.excess(low_total, high_total), np.inf)
        best[going] = np.minimum(best[going], excess[keep])
        place[going] += 1
