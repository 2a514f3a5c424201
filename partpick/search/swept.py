"""Columns of swept bands: every series padder, or none, with every parallel network that covers.

An element that moves inductance has no capacitance, so that nothing can stand in series with it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from partpick.search.alignment import swept_alignable
from partpick.search.coverage import SeriesPadders, series_padders
from partpick.search.figures import (
    Columns,
    coarse_error,
    fine_error,
    network_weights,
    padded,
    quality_class,
    stray_class,
    whole_excess,
)
from partpick.search.grades import Grades
from partpick.search.networks import Rows, Stream, Table, network_values
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.ratings import inside_ratings_at_end, voltage_shares
from partpick.search.startup import starts_when_swept

Species = NDArray[np.int16]
_GRAIN = 1e-12  # a design exactly on a limit is inside it


class _End:
    """What is in circuit at one end of the band, (m,) each, by the element's setting there."""

    def __init__(self, tuned: Floats, network: Floats, fixed: float, inductance: float) -> None:
        self.tuned = tuned  # F, the element behind its padder
        self.network = network
        self.total = tuned + network + fixed
        self.frequency = 1.0 / (2 * np.pi * np.sqrt(inductance * self.total))

    def take(self, chosen: Ints) -> _End:
        """Return some of the rows."""
        other = _End.__new__(_End)
        for name, values in vars(self).items():
            setattr(other, name, values[chosen])
        return other


class SweptColumns:
    """Makes the columns of swept bands on demand."""

    def __init__(
        self,
        problem: Problem,
        tables: list[list[Table | Stream]],
        valid: list[Ints],
        grades: Grades,
        gain: tuple[Floats, Floats],
    ) -> None:
        self.problem = problem
        self.tables = tables
        self.valid = valid
        self.grades = grades
        self.gain, self.gain_low = gain
        self.fixed, self.fixed_low = problem.fixed_capacitance(), problem.fixed_capacitance(low_end=True)
        self.strays = problem.strays()
        self.most, self.need = problem.most_at_high_end, problem.least_at_low_end
        self.inductance_high = problem.inductance_high
        self.padders = {b: self._padders(b) for b in np.flatnonzero(problem.swept).tolist()}

    def _padders(self, band: int) -> SeriesPadders:
        """Return the element behind each valid species; last, alone."""
        p = self.problem
        padders = series_padders(p, band, self.valid[band])
        return SeriesPadders(
            np.append(padders.at_low_end, p.tuning_high[band]),
            np.append(padders.at_high_end, p.tuning_low[band]),
        )

    def columns(self, coil: int, band: int, parts: int, excess: float | None = None) -> Columns:
        """Return every column of `parts` parts, a series padder counted in, inside all limits of one band.

        Parameters
        ----------
        coil, band, parts : int
            Which coil and band, and how many capacitors. [-]
        excess : float or None
            Keep to at most this excess (fraction of the band as asked for); None: the limit's. [-]
        """
        p = self.problem
        empty = Columns.empty(p.most_parts)
        if not p.in_play[coil, band] or parts >= len(self.tables[band]):
            return empty
        lower, upper = self._intervals(coil, band, parts, excess)
        alone = len(self.valid[band])
        blocks = [self._block(coil, band, parts, np.array([alone]), lower, upper)]
        if parts and not p.moved[band]:
            fits = np.flatnonzero((lower <= upper)[:alone] & (upper >= 0)[:alone])
            blocks.append(self._block(coil, band, parts - 1, fits, lower, upper))
        columns = Columns.join(blocks)
        return columns if excess is None else columns.take(columns.excess <= excess)

    def _intervals(self, coil: int, band: int, parts: int, excess: float | None) -> tuple[Floats, Floats]:
        """Return the interval of the network for each padder, wide enough for rounding and inductance. [F]"""
        p, padders, fixed = self.problem, self.padders[band], self.fixed[coil, band]
        fixed_low = self.fixed_low[coil, band]
        high = p.frequency[band]
        need, most = self.need[coil, band], self.most[coil, band]
        least_high, most_low = self._totals(coil, band, parts, excess)
        alike = p.lead_inductance == 0 and p.species_low is p.species
        lower = np.maximum(need - padders.at_low_end - fixed_low, least_high - padders.at_high_end - fixed)
        upper = most - padders.at_high_end - fixed
        if alike:  # else the network acts less at the low end; `_figures` tells
            upper = np.minimum(upper, most_low - padders.at_low_end - fixed_low)
        grain = 3 * _GRAIN * (need + most)
        lower, upper = lower - grain, upper + grain
        leads = (2 * np.pi * high) ** 2 * p.lead_inductance
        lower, upper = (side / (1 + leads * np.maximum(side, 0.0)) for side in (lower, upper))
        return lower, upper

    def _totals(self, coil: int, band: int, parts: int, excess: float | None) -> tuple[float, float]:
        """Return the least in circuit at the high end, and the most at the low end, for share and excess. [F]"""
        p = self.problem
        low, high, margin = p.low_end[band], p.frequency[band], p.margin
        need, most = self.need[coil, band], self.most[coil, band]
        least_high, most_low = 0.0, np.inf
        if parts:
            least_high = self.strays[coil, band] / p.share
        limit = p.excess_limit if excess is None else min(excess, p.excess_limit)
        if np.isfinite(limit):
            span = (high - low) * limit
            least_high = max(least_high, most * (high * (1 + margin) / (high + span)) ** 2)
            if low > span:
                most_low = need * (low * (1 - margin) / (low - span)) ** 2
        return least_high, most_low

    def _block(self, coil: int, band: int, parts: int, padder: Ints, lower: Floats, upper: Floats) -> Columns:
        """Return the columns of given padders, each with every network of `parts` parts in its interval."""
        valid = self.valid[band]
        behind = len(padder) == 0 or padder[0] < len(valid)
        rows, which = self.tables[band][parts].inside_each(lower[padder], upper[padder])
        species = valid[rows.species]
        padder = padder[which]
        if behind:
            species = np.concatenate([species, valid[padder][:, None]], axis=1)
        rows = Rows(rows.value, species.astype(np.int16), rows.shape)
        origin, chosen = self.grades.expand(rows, last_apart=behind)
        columns, keep = self._figures(coil, band, rows.take(origin), chosen, padder[origin], behind)
        return columns.take(keep)

    def _figures(
        self, coil: int, band: int, rows: Rows, chosen: Ints, padder: Ints, behind: bool
    ) -> tuple[Columns, Bools]:
        p = self.problem
        across = rows.species[:, :-1] if behind else rows.species
        low_end, high_end = self._ends(coil, band, rows, across, padder)
        span = p.frequency[band] - p.low_end[band]
        worse = np.maximum(p.low_end[band] - low_end.frequency, high_end.frequency - p.frequency[band])
        excess = worse / span
        strays = self.strays[coil, band]
        keep = low_end.total >= self.need[coil, band] * (1 - _GRAIN)
        keep &= high_end.total <= self.most[coil, band] * (1 + _GRAIN)
        keep &= excess <= p.excess_limit * (1 + _GRAIN)
        share = low_end.tuned / p.tuning_high[band] if behind else 1.0
        keep &= share <= p.tuning_share * (1 + _GRAIN)
        if chosen.shape[1]:
            keep &= strays <= high_end.total * p.share * (1 + _GRAIN)
        at_low = self._weights(band, rows, across, chosen, behind, low_end, at_low_end=True)
        at_high = self._weights(band, rows, across, chosen, behind, high_end, at_low_end=False)
        losses = (
            self._loss(band, p.coil_loss_low[coil, band], p.part_loss_low, chosen, at_low, low_end),
            self._loss(band, p.coil_loss[coil, band], p.part_loss, chosen, at_high, high_end),
        )
        loss = np.maximum(*losses)  # the worse end, unknown if either is
        if p.drive is not None:
            for end, own, at_low_end in zip((low_end, high_end), losses, (True, False), strict=True):
                keep &= self._bears(coil, band, rows, chosen, behind, end, own, at_low_end=at_low_end)
        if p.q_limit[band] > 0:
            keep &= loss * p.q_limit[band] <= 1 + _GRAIN
        if np.isfinite(p.drift_limit):
            nominal, spread = self._drift(coil, band, chosen, at_high, high_end)
            keep &= np.abs(nominal) + spread <= p.drift_limit * (1 + _GRAIN)
        keep &= p.trimmer_span[band] <= p.trim_share[band] * high_end.total * (1 + _GRAIN)
        if p.alignable > 0 and p.aligned[band]:
            keep &= self._alignable(coil, band, rows, chosen, behind)
        if p.oscillator is not None:
            keep = self._starting(coil, band, rows, chosen, padder, (low_end, high_end), (at_low, at_high), keep)
        whole, none = np.zeros(len(chosen), dtype=np.int64), np.zeros(len(chosen))
        columns = Columns(
            coil=whole + coil,
            parts=padded(chosen, p.most_parts),
            series=chosen[:, -1] if behind else whole - 1,
            tap=whole,
            shape=rows.shape,
            network=high_end.network,
            error=none,
            excess=excess,
            pieces=whole + chosen.shape[1],
            error_class=coarse_error(none, p.floor),
            fine_error=fine_error(none),
            q_class=quality_class(loss, p.q_enough[band]),
            stray_class=stray_class(strays / high_end.total),
            reactance_class=whole + p.reactance_class[coil, band],
            commonness=p.commonness[rows.species].sum(axis=1),
            error_rank=whole,
            price=np.minimum(p.part_price[chosen].sum(axis=1), NEVER),
            excess_class=whole_excess(excess, 1e-9),
            fine_excess=whole_excess(excess, 1e-12),
        )
        return columns, keep

    def _alignable(self, coil: int, band: int, rows: Rows, chosen: Ints, behind: bool) -> Bools:
        p = self.problem
        acting = p.species_low[band][rows.species], p.species[band][rows.species]
        if not behind:
            return swept_alignable(p, coil, band, acting, chosen, rows.shape, None, None)
        across = acting[0][:, :-1], acting[1][:, :-1]
        padder = acting[0][:, -1], acting[1][:, -1]
        return swept_alignable(p, coil, band, across, chosen[:, :-1], rows.shape, chosen[:, -1], padder)

    def _bears(
        self, coil: int, band: int, rows: Rows, chosen: Ints, behind: bool, end: _End, loss: Floats, *, at_low_end: bool
    ) -> Bools:
        """Return which choices keep to the ratings of all parts at one end, (m,)."""
        p = self.problem
        acting = (p.species_low if at_low_end else p.species)[band][rows.species]
        across = acting[:, :-1] if behind else acting
        own = np.maximum(network_values(across, rows.shape), 1e-30)
        share = voltage_shares(across, rows.shape) * (end.network / own)[:, None]
        on_element = np.ones(len(chosen))
        if behind:  # the element is set so that the tank resonates at the end of the band, short of its own end
            tuned = p.wanted_at_end(coil, band, low_end=at_low_end) - (end.total - end.tuned)
            on_padder = tuned / acting[:, -1]
            share = np.concatenate([share, on_padder[:, None]], axis=1)
            on_element = 1.0 - on_padder
        return inside_ratings_at_end(
            p, coil, band, acting, share, chosen, on_element, loss, low_end=at_low_end
        )

    def _starting(
        self,
        coil: int,
        band: int,
        rows: Rows,
        chosen: Ints,
        padder: Ints,
        ends: tuple[_End, _End],
        weights: tuple[tuple[Floats, Floats], tuple[Floats, Floats]],
        keep: Bools,
    ) -> Bools:
        """Return which of the rows to keep start as an oscillator all over the band."""
        p = self.problem
        left = np.flatnonzero(keep)
        some = [(shares[left], element[left]) for shares, element in weights]
        low_end, high_end = (end.take(left) for end in ends)
        further = (
            self._loss(band, 0.0, p.part_loss_low, chosen[left], some[0], low_end),
            self._loss(band, 0.0, p.part_loss, chosen[left], some[1], high_end),
        )
        started = starts_when_swept(
            p,
            coil,
            band,
            rows.take(left),
            padders=self._padders_of(band, rows.take(left), padder[left]),
            networks=(low_end.network, high_end.network),
            further=further,
        )
        result = np.zeros(len(keep), dtype=np.bool_)
        result[left[started]] = True
        return result

    def _padders_of(self, band: int, rows: Rows, padder: Ints) -> tuple[Floats, Floats]:
        """Return what is in series with the element at the low and at the high end, inf: nothing. [F]"""
        p, valid = self.problem, self.valid[band]
        return tuple(np.append(species[band][valid], np.inf)[padder] for species in (p.species_low, p.species))  # type: ignore[return-value]

    def _ends(self, coil: int, band: int, rows: Rows, across: Species, padder: Ints) -> tuple[_End, _End]:
        """Return what is in circuit at the low end and at the high end."""
        p = self.problem
        fixed_low, fixed = float(self.fixed_low[coil, band]), float(self.fixed[coil, band])
        tuned_low, tuned_high = self._tuned(band, rows, padder)
        high = p.behind_leads(rows.value, band)
        own = rows.value
        if p.species_low is not p.species:
            own = network_values(p.species_low[band][across], rows.shape, p.device)
        low = p.behind_leads(own, band, low_end=True)
        return (
            _End(tuned_low, low, fixed_low, float(p.inductance_low[coil, band])),
            _End(tuned_high, high, fixed, float(self.inductance_high[coil, band])),
        )

    def _tuned(self, band: int, rows: Rows, padder: Ints) -> tuple[Floats, Floats]:
        """Return the element behind what is in series with it, at the low and at the high end. [F]"""
        padders = self.padders[band]
        return padders.at_low_end[padder], padders.at_high_end[padder]

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
        """Return d ln(capacitance in circuit) / d ln of each part, (m, k), and of the element, (m,). [-]"""
        p = self.problem
        values = (p.species_low if at_low_end else p.species)[band]
        element = (p.tuning_high if at_low_end else p.tuning_low)[band]
        own = np.maximum(network_values(values[across], rows.shape, p.device), 1e-30)
        gain = (self.gain_low if at_low_end else self.gain)[band][chosen]
        shares = network_weights(values[across], rows.shape, own, p.device)
        leads = end.network / own  # behind leads a network grows faster than its parts
        weights = shares * (leads * end.network / end.total)[:, None]
        tuned = end.tuned / end.total
        if not behind:
            return weights * gain, tuned
        of_element = end.tuned / element  # T in series with C: d ln / d ln T is C / (T + C)
        weights = np.concatenate([weights, (tuned * (1.0 - of_element))[:, None]], axis=1)
        return weights * gain, tuned * of_element

    def _loss(
        self,
        band: int,
        coil: float,
        part_loss: Floats,
        chosen: Ints,
        weights: tuple[Floats, Floats],
        end: _End,
    ) -> Floats:
        """Return 1/Q at one end from the coil's there and that of everything else in circuit. [-]"""
        p = self.problem
        middle = (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        parts = (weights[0] * part_loss[band][chosen]).sum(axis=1)
        trimmer = middle / end.total * p.trimmer_loss[band]
        return np.asarray(coil + parts + weights[1] * p.tuning_loss[band] + trimmer)

    def _drift(
        self, coil: int, band: int, chosen: Ints, weights: tuple[Floats, Floats], end: _End
    ) -> tuple[Floats, Floats]:
        """Return df/f per kelvin at the high end, nominal (signed) and spread (size), (m,) each. [1/K]"""
        p = self.problem
        strays = self.strays[coil, band]
        middle = (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        others = (strays * p.stray_tempco + middle * p.trimmer_tempco[band]) / end.total
        capacitance = (weights[0] * p.part_tempco[chosen]).sum(axis=1) + others
        capacitance += weights[1] * p.tuning_tempco[band]
        nominal = -0.5 * (p.coil_tempco[coil, band] + capacitance)
        spread = (weights[0] * p.part_tempco_spread[chosen]).sum(axis=1)
        spread = spread + middle / end.total * p.trimmer_tempco_spread[band]
        return nominal, np.asarray(0.5 * (p.coil_tempco_spread[coil] + spread))
