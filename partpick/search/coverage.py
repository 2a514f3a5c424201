"""Swept bands: which parallel capacitance covers a band, and the least excess that any can reach.

A capacitance T between two ends tunes the band, alone or behind a series padder, or the coil's inductance
moves between two ends and T is nothing; everything else, x, is across the coil. The band is covered while x
lies in an interval. Over it the overshoot at the low end rises with x and that at the high end falls, so the
least excess is next to where they cross (`overshoot.py`).

An excess already reached bounds the capacitance in circuit at both ends, and so the swing: padders are
taken by rising swing, looked at closely only where some network lies inside those bounds, and left
where the swing alone is too large.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from partpick.search.networks import Stream, Table
from partpick.search.overshoot import GRAIN, Overshoot, TwinTable, before_leads, bounded_excess, least_excess
from partpick.search.problem import Bools, Floats, Ints, Problem


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


class LeastExcess:
    """The least excess of every coil at every swept band with at most k parts, (J, B), made on demand.

    Where one coil must serve every band, coils that cannot are left out of the work.
    """

    def __init__(self, problem: Problem, tables: list[list[Table | Stream]], valid: list[Ints]) -> None:
        self.problem = problem
        self.tables = tables
        self.valid = valid
        self._levels: list[Floats] = []
        self._groups: list[tuple[int, Overshoot]] | None = None
        self._twins: dict[tuple[int, int], TwinTable | Stream] = {}

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

    def _improve(self, band: int, rows: Overshoot, parts: int, best: Floats) -> None:
        """Lower `best` to the least excess with exactly `parts` parts where that is less."""
        p, tables = self.problem, self.tables[band]
        bare = len(tables[0].inside(-np.inf, np.inf).value) > 0  # no capacitor across the coil will do
        alone = SeriesPadders(p.tuning_high[band : band + 1], p.tuning_low[band : band + 1])
        if parts == 0 and not bare:
            return
        if parts == 0:
            nothing = np.zeros_like(rows.strays)
            _without_network(replace(rows, strays=nothing, slack=nothing), alone, best)
            return
        _with_network(rows, alone, tables[parts], self._twin(band, parts), best)
        if p.moved[band]:
            return
        behind = series_padders(p, band, self.valid[band])
        if parts > 1:
            _with_network(rows, behind, tables[parts - 1], self._twin(band, parts - 1), best)
        elif bare:
            _without_network(replace(rows, slack=np.zeros_like(rows.slack)), behind, best)

    def _twin(self, band: int, parts: int) -> TwinTable | Stream:
        """Return the networks of a band with what they are at both of its ends, where they are in a table."""
        table = self.tables[band][parts]
        if (band, parts) not in self._twins:
            values = self.problem.species_low[band][self.valid[band]]
            self._twins[band, parts] = table if isinstance(table, Stream) else TwinTable(table, values)
        return self._twins[band, parts]

    def _rows_of_groups(self) -> list[tuple[int, Overshoot]]:
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
        fixed_swing = p.fixed_capacitance(low_end=True) - fixed
        for band in np.flatnonzero(p.swept):
            padders = series_padders(p, int(band), self.valid[band])
            alone = p.tuning_high[band] - p.tuning_low[band]
            swing = np.append(padders.at_low_end - padders.at_high_end, alone)
            at_high_end = np.append(padders.at_high_end, p.tuning_low[band])
            order = np.argsort(swing, kind="stable")
            later_least = np.append(np.minimum.accumulate(at_high_end[order][::-1])[::-1], np.inf)
            grain = GRAIN * most[:, band]
            place = np.searchsorted(swing[order], need[:, band] - most[:, band] - fixed_swing[:, band] - grain)
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

    def _rows(self, bands: list[int], inside: Bools) -> Overshoot:
        p = self.problem
        coil, place = np.nonzero(inside[:, bands])
        band = np.array(bands)[place]
        fixed = p.fixed_capacitance()[coil, band]
        fixed_low = p.fixed_capacitance(low_end=True)[coil, band]
        need, most = p.least_at_low_end[coil, band], p.most_at_high_end[coil, band]
        leads, leads_low = ((2 * np.pi * f[band]) ** 2 * p.lead_inductance for f in (p.frequency, p.low_end))
        low, high = p.low_end[band], p.frequency[band]
        slack = low * self._acting_less(bands[0], leads, most - fixed) / (2 * need) / (high - low)
        strays = p.strays()[coil, band] / p.share
        return Overshoot(coil, band, fixed, fixed_low, need, most, strays, low, high, p.margin, leads, leads_low, slack)

    def _acting_less(self, band: int, leads: Floats, network: Floats) -> Floats:
        """Return by how much a network acts less at the low end than at the high one, at most. [F]"""
        valid = self.valid[band]
        low_end, high_end = self.problem.species_low[band][valid], self.problem.species[band][valid]
        ratio = float((low_end / high_end).min()) if len(valid) else 1.0
        network = np.maximum(network, 0.0)
        return np.asarray(network * (1.0 - min(ratio, 1.0) / (1.0 + leads * network)))


def _with_network(
    rows: Overshoot, padders: SeriesPadders, table: Table | Stream, twin: TwinTable | Stream, best: Floats
) -> None:
    """Lower `best` to the least excess with one of the padders and a network of a table."""
    swing = padders.at_low_end - padders.at_high_end
    order = np.argsort(swing, kind="stable")
    swing, low_ends, high_ends = swing[order], padders.at_low_end[order], padders.at_high_end[order]
    # each row walks up from the least swing that covers
    place = np.searchsorted(swing, rows.need - rows.most - rows.fixed_swing - GRAIN * rows.most)
    most, least = rows.totals_inside(best)
    going = np.flatnonzero(place < len(order))
    while len(going):
        at = place[going]
        low_total, high_total = low_ends[at] + rows.fixed_low[going], high_ends[at] + rows.fixed[going]
        grain = GRAIN * rows.need[going]
        floor = np.maximum(rows.strays[going], least[going])
        lower = np.maximum(rows.need[going] - low_total, floor - high_total) - grain
        upper = np.minimum(rows.most[going] - high_total, most[going] - low_total) + grain
        leads = rows.leads[going]
        lower, upper = before_leads(lower, leads), before_leads(upper, leads)
        hit = np.flatnonzero(table.any_inside(lower, upper))
        if len(hit):
            chosen = going[hit]
            some = rows.take(chosen)
            given = low_total[hit], high_total[hit]
            if isinstance(twin, TwinTable):
                found = least_excess(some, *given, twin)
            else:
                found = bounded_excess(some, *given, twin)
            best[chosen] = np.minimum(best[chosen], found)
            most[chosen], least[chosen] = some.totals_inside(best[chosen])
        place[going] += 1
        going = going[place[going] < len(order)]
        going = going[swing[place[going]] < most[going] - least[going] - rows.fixed_swing[going]]


def _without_network(rows: Overshoot, padders: SeriesPadders, best: Floats) -> None:
    """Lower `best` to the least excess with one of the padders and nothing else."""
    order = np.argsort(padders.at_low_end, kind="stable")
    low_ends, high_ends = padders.at_low_end[order], padders.at_high_end[order]
    place = np.searchsorted(low_ends, rows.need * (1 - GRAIN) - rows.fixed_low)
    floor = rows.strays * (1 - GRAIN)
    most, least = rows.totals_inside(best)
    going = np.flatnonzero(place < len(order))
    while len(going):
        at = place[going]
        low_total, high_total = low_ends[at] + rows.fixed_low[going], high_ends[at] + rows.fixed[going]
        # the overshoot at the low end only grows from here on
        left = low_total < most[going]
        hit = left & (high_total <= rows.most[going] * (1 + GRAIN))
        hit &= (high_total >= least[going]) & (high_total >= floor[going])
        chosen = going[hit]
        if len(chosen):
            some = rows.take(chosen)
            best[chosen] = np.minimum(best[chosen], some.excess(low_total[hit], high_total[hit]))
            most[chosen], least[chosen] = some.totals_inside(best[chosen])
        going = going[left]
        place[going] += 1
        going = going[place[going] < len(order)]
