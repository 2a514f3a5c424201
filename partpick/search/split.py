"""Swept bands of a Clapp oscillator: the tuning element in series with the divider, all else across the coil."""

from __future__ import annotations

import numpy as np

from partpick.search.coverage import LeastExcess
from partpick.search.divided import SPLIT, Device, divider_values, with_device
from partpick.search.dividers import divider_rows
from partpick.search.figures import Columns
from partpick.search.grades import Grades
from partpick.search.networks import Rows, Stream, Table
from partpick.search.problem import Floats, Ints, Problem
from partpick.search.swept import Species, SweptColumns, _End

_GRAIN = 1e-9  # intervals are a little wide; every column is tested afterwards
_STEP = 1e-12  # of the excess: one in the whole numbers that are compared
_CLOSE_LOOK = 1  # parts beside the divider up to which the least excess is found, not merely bounded by 0


class SplitColumns(SweptColumns):
    """Every divider behind the element with every network that covers."""

    def __init__(
        self,
        problem: Problem,
        tables: list[list[Table | Stream]],
        valid: list[Ints],
        grades: Grades,
        gain: tuple[Floats, Floats],
    ) -> None:
        super().__init__(problem, tables, valid, grades, gain)
        self.dividers = {b: _dividers(problem, b, valid[b]) for b in np.flatnonzero(problem.swept).tolist()}

    def columns(self, coil: int, band: int, parts: int, excess: float | None = None) -> Columns:
        """Return every column of `parts` parts, the divider's two counted in, inside all limits of one band."""
        p = self.problem
        if not p.in_play[coil, band] or parts < 2 or parts - 2 >= len(self.tables[band]):
            return Columns.empty(p.most_parts)
        beside = self._beside(coil, band, parts, excess)
        lower, upper = self._divider_intervals(coil, band, beside.value, parts, excess)
        halves, which = self.dividers[band].inside_each(lower, upper)
        beside = beside.take(which)
        valid = self.valid[band]
        species = np.concatenate([valid[halves.species], valid[beside.species]], axis=1).astype(np.int16)
        rows = Rows(beside.value, species, np.full(len(which), SPLIT, np.int8))
        origin, chosen = self.grades.expand(rows)
        columns, keep = self._figures(coil, band, rows.take(origin), chosen, origin, False)
        columns = columns.take(keep)
        return columns if excess is None else columns.take(columns.excess <= excess)

    def _beside(self, coil: int, band: int, parts: int, excess: float | None) -> Rows:
        """Return the networks across the coil that leave room for element and divider."""
        p = self.problem
        most = (self.most[coil, band] - self.fixed[coil, band]) * (1 + _GRAIN)
        least_high, _ = self._totals(coil, band, parts, excess)
        least = least_high - self.fixed[coil, band] - p.tuning_low[band]
        return self.tables[band][parts - 2].inside(float(least - _GRAIN * abs(least)), float(most))

    def _divider_intervals(
        self, coil: int, band: int, beside: Floats, parts: int, excess: float | None
    ) -> tuple[Floats, Floats]:
        """Return the interval of the divider for each network beside it, as both act at the high end. [F]"""
        p, held = self.problem, beside + self.fixed[coil, band]
        need, most = self.need[coil, band], self.most[coil, band]
        least_high, most_low = self._totals(coil, band, parts, excess)
        lower = np.maximum(
            _behind(p.tuning_high[band], need - held),
            _behind(p.tuning_low[band], least_high - held),
        )
        upper = _behind(p.tuning_low[band], most - held)
        if p.species_low is p.species:
            upper = np.minimum(upper, _behind(p.tuning_high[band], most_low - held))
        return lower * (1 - _GRAIN), upper * (1 + _GRAIN)

    def _tuned(self, band: int, rows: Rows, padder: Ints) -> tuple[Floats, Floats]:
        p = self.problem
        low, high = self._padders_of(band, rows, padder)
        return (
            p.tuning_high[band] * low / (p.tuning_high[band] + low),
            p.tuning_low[band] * high / (p.tuning_low[band] + high),
        )

    def _padders_of(self, band: int, rows: Rows, padder: Ints) -> tuple[Floats, Floats]:
        p = self.problem
        low, high = (divider_values(s[band][rows.species], SPLIT, p.device) for s in (p.species_low, p.species))
        return low, high

    def _weights(
        self,
        band: int,
        rows: Rows,
        across: Species,
        chosen: Ints,
        behind: bool,
        end: _End,
        *,
        at_low_end: bool,
    ) -> tuple[Floats, Floats]:
        p = self.problem
        weights, tuned = super()._weights(band, rows, across, chosen, behind, end, at_low_end=at_low_end)
        gain = (self.gain_low if at_low_end else self.gain)[band][chosen[:, :2]]
        values = (p.species_low if at_low_end else p.species)[band][rows.species]
        element = (p.tuning_high if at_low_end else p.tuning_low)[band]
        divider = divider_values(values, SPLIT, p.device)
        own, grown = values[:, :2], with_device(values, SPLIT, p.device)[:, :2]
        share = (tuned * (1.0 - end.tuned / element) * divider)[:, None]
        weights[:, :2] = share * own / grown**2 * gain
        return weights, tuned * end.tuned / element


class SplitExcess(LeastExcess):
    """The least excess of every coil with the element behind a divider, (J, B), made on demand."""

    def _fill(self, parts: int) -> None:
        p, known = self.problem, self._levels[parts]
        for band in np.flatnonzero(p.swept).tolist():
            coils = np.flatnonzero(p.in_play[:, band])
            if parts < 2 or parts - 2 >= len(self.tables[band]) or not len(coils):
                continue
            if parts - 2 > _CLOSE_LOOK:
                known[coils, band] = 0.0
                continue
            beside = np.unique(self.tables[band][parts - 2].inside(-np.inf, np.inf).value)
            best = np.full(len(coils), np.inf)
            for network in beside:
                np.minimum(best, self._least(coils, band, float(network)), out=best)
            best = best - self._slack(coils, band)
            best = np.where(best <= p.excess_limit * (1 + _GRAIN), np.maximum(best - _STEP, 0.0), np.inf)
            known[coils, band] = np.minimum(known[coils, band], best)

    def _slack(self, coils: Ints, band: int) -> Floats:
        """Return by how much the excess may be below what the capacitors of the high end say. [-]

        Divider and network act less at the low end, where their series inductance counts for less: there is less
        in circuit, the low end is tuned higher, and so much less beyond what is asked for.
        """
        p, valid = self.problem, self.valid[band]
        low, high = p.low_end[band], p.frequency[band]
        ratio = float((p.species_low[band][valid] / p.species[band][valid]).min())
        most = p.tuning_high[band] + p.most_at_high_end[coils, band]
        less = most * max(1.0 - ratio, 0.0)
        return np.asarray(low * less / (2.0 * p.least_at_low_end[coils, band]) / (high - low))

    def _least(self, coils: Ints, band: int, network: float) -> Floats:
        """Return a bound of the least excess with one network beside the best divider; inf: none covers. [-]

        With a larger divider the overshoot at the low end rises and that at the high end falls, so that the
        least is next to where they cross.
        """
        p = self.problem
        dividers = np.unique(_dividers(p, band, self.valid[band]).value)
        held = p.fixed_capacitance()[coils, band] + network
        need, most = p.least_at_low_end[coils, band], p.most_at_high_end[coils, band]
        strays = (p.self_capacitance[coils] + p.stray[band]) / p.share
        low, high = p.low_end[band], p.frequency[band]
        ends = p.tuning_high[band], p.tuning_low[band]

        def totals(place: Ints) -> list[Floats]:
            own = dividers[place]
            return [end * own / (end + own) + held for end in ends]

        def overshoot(place: Ints) -> tuple[Floats, Floats]:
            at_low, at_high = totals(place)
            return (
                low * (1.0 - (1.0 - p.margin) * np.sqrt(need / at_low)),
                high * ((1.0 + p.margin) * np.sqrt(most / at_high) - 1.0),
            )

        first, last = np.zeros(len(coils), np.int64), np.full(len(coils), len(dividers) - 1)
        while (first < last).any():
            middle = (first + last) // 2
            one, two = overshoot(middle)
            crossed = one >= two
            first, last = np.where(crossed, first, np.minimum(middle + 1, last)), np.where(crossed, middle, last)
        lowest = np.searchsorted(
            dividers,
            np.maximum(_behind(ends[0], need - held), _behind(ends[1], strays - held)) * (1 - _GRAIN),
        )
        highest = np.searchsorted(dividers, _behind(ends[1], most - held) * (1 + _GRAIN), side="right") - 1
        best = np.full(len(coils), np.inf)
        inside = lowest <= highest
        for place in (first, first - 1):
            at = np.clip(place, lowest, np.maximum(highest, lowest))
            at = np.clip(at, 0, len(dividers) - 1)
            worse = np.maximum(*overshoot(at)) / (high - low)
            best = np.where(inside, np.minimum(best, worse), best)
        return best


def _behind(element: float, wanted: Floats) -> Floats:
    """Return what in series with the element acts as wanted; inf beyond the element itself, at most 0 for 0. [F]"""
    usual = wanted < element
    rest = element * np.where(usual, wanted, 0.0) / np.where(usual, element - wanted, 1.0)
    return np.where(usual, rest, np.inf)


def _dividers(problem: Problem, band: int, valid: Ints) -> Table:
    """Return every divider of two valid species as they act at the high end."""
    device: Device = problem.device
    return Table(divider_rows(problem.species[band][valid], device))
