"""Capacitors in parallel across a coil that one tuning element sweeps, alone or behind a series padder.

What `circuits.py` is for fixed bands: the interval that the parallel capacitors must lie in, and the
figures of many circuits at a time. The series padder stands apart; it is in series with the element.
"""

from __future__ import annotations

import numpy as np

from partpick.search.circuits import AnyInts, Circuits, acting_parts, species_of_parts
from partpick.search.drive import borne
from partpick.search.figures import Columns, coarse_error, fine_error, quality_class, stray_class, whole_excess
from partpick.search.networks import PARALLEL
from partpick.search.problem import Bools, Floats, Ints, Problem

_ROUNDING = 1e-12


class SweptCircuits:
    """Intervals and figures of the swept bands of one problem."""

    def __init__(self, problem: Problem, circuits: Circuits) -> None:
        self.problem = problem
        self.circuits = circuits
        self._acting = [acting_parts(problem), _acting_low(problem)]  # high end, low end
        self._finite = np.isfinite(self._acting[0]) & np.isfinite(self._acting[1])
        self._gain = [problem.part_gain(), problem.part_gain(low_end=True)]
        self._fixed = problem.fixed_capacitance()
        self._need, self._most = problem.least_at_low_end, problem.most_at_high_end
        self._strays = problem.self_capacitance[:, None] + problem.stray[None, :]
        self._inductance = problem.inductance_high

    def padders(self, band: int, parts: Ints) -> Ints:
        """Return those of some parts that may be a series padder at a band. [-]"""
        return parts[self._finite[band][parts]]

    def windows(
        self, band: int, place: Ints, padder: Ints, lead: Floats
    ) -> tuple[Floats, Floats, Floats]:
        """Return intervals of the parallel capacitance at the high end that hold all that covers the band.

        Parameters
        ----------
        band : int
            A swept band. [-]
        place, padder : (m,) arrays
            Row of the problem, and the part in series with the element, -1 for none. [-]
        lead : (m,) array
            Largest excess of interest, inf: the limit's. [fraction of the band as asked for]

        Returns
        -------
        low, high : (m,) arrays
            With at least one capacitor, the padder counted. [F]
        bare_low : (m,) array
            The lower end for a band without any capacitor. [F]
        """
        p = self.problem
        at_high, at_low = self._element(band, padder)
        need, most, fixed = self._need[place, band], self._most[place, band], self._fixed[place, band]
        low, high, margin = float(p.low_end[band]), float(p.frequency[band]), p.margin
        span = (high - low) * np.minimum(lead, p.excess_limit) * (1 + 1e-9)
        finite = np.isfinite(span)
        step = np.where(finite, span, 0.0)
        within = np.where(finite, most * (high * (1 + margin) / (high + step)) ** 2, 0.0)
        strays = np.where(np.isfinite(p.share), self._strays[place, band] / p.share, 0.0)
        grain = 3 * _ROUNDING * (need + most)
        bare_low = np.maximum(need - at_low, within - at_high) - fixed - grain
        least = np.maximum(bare_low, strays - at_high - fixed - grain)
        upper = most - at_high - fixed + grain
        if p.lead_inductance == 0 and p.species_low is p.species:  # acts alike at both ends
            below = np.maximum(low - step, 1.0)
            most_low = np.where(finite & (low > step), need * (low * (1 - margin) / below) ** 2, np.inf)
            upper = np.minimum(upper, most_low - at_low - fixed + grain)
        in_play = p.in_play[place, band]
        upper = np.where(in_play, upper, -np.inf)
        leads = (2 * np.pi * high) ** 2 * p.lead_inductance
        least, upper, bare_low = (side / (1 + leads * np.maximum(side, 0.0)) for side in (least, upper, bare_low))
        return least, upper, bare_low

    def _element(self, band: int, padder: Ints) -> tuple[Floats, Floats]:
        """Return the element behind its padder at the high end and at the low end. [F]"""
        p = self.problem
        ends = []
        for own, acting in zip((p.tuning_low[band], p.tuning_high[band]), self._acting, strict=True):
            series = np.where(padder >= 0, acting[band][padder], np.inf)
            with np.errstate(invalid="ignore"):
                behind = own * series / (own + series)
            ends.append(np.where(padder >= 0, behind, own))
        return ends[0], ends[1]

    def columns(self, place: Ints, band: int, parts: AnyInts, padder: Ints) -> tuple[Columns, Bools]:
        """Return the figures of each circuit, and whether it is inside every limit of the band.

        Parameters
        ----------
        place : (m,) array
            Row of the problem. [-]
        band : int
            A swept band. [-]
        parts : (m, k) array
            Parts across the coil, -1 where there are fewer than k. [-]
        padder : (m,) array
            The part in series with the element, -1: none. [-]
        """
        p = self.problem
        usable = (np.append(self._finite[band], True)[parts]).all(axis=1)
        high = self._end(place, band, parts, padder, low_end=False)
        low = self._end(place, band, parts, padder, low_end=True)
        excess = np.maximum(p.low_end[band] - low.frequency, high.frequency - p.frequency[band])
        excess = excess / (p.frequency[band] - p.low_end[band])
        strays = self._strays[place, band]
        pieces = (parts >= 0).sum(axis=1) + (padder >= 0)
        loss = np.maximum(low.loss, high.loss)  # the worse end, unknown if either is
        keep = usable & p.in_play[place, band]
        keep &= low.total >= self._need[place, band] * (1 - _ROUNDING)
        keep &= high.total <= self._most[place, band] * (1 + _ROUNDING)
        keep &= excess <= p.excess_limit * (1 + _ROUNDING)
        keep &= (pieces == 0) | (strays <= high.total * p.share * (1 + _ROUNDING))
        if p.q_limit[band] > 0:
            keep &= loss * p.q_limit[band] <= 1 + _ROUNDING
        if np.isfinite(p.drift_limit):
            keep &= high.drift <= p.drift_limit * (1 + _ROUNDING)
        keep &= low.bears & high.bears
        whole, none = np.zeros(len(place), dtype=np.int64), np.zeros(len(place))
        behind = padder >= 0
        everything = np.concatenate([parts.astype(np.int64), padder[:, None]], axis=1) if behind.any() else parts
        columns = Columns(
            coil=place,
            parts=everything.astype(np.int64),
            series=padder,
            tap=whole,
            shape=np.full(len(place), PARALLEL, np.int8),
            network=high.network,
            error=none,
            excess=excess,
            pieces=pieces,
            error_class=coarse_error(none, p.floor),
            fine_error=fine_error(none),
            q_class=quality_class(loss, p.q_enough[band]),
            stray_class=stray_class(strays / high.total),
            reactance_class=p.reactance_class[place, band],
            commonness=self.circuits.commonness(everything),
            error_rank=whole,
            price=self.circuits.price(everything),
            excess_class=whole_excess(excess, 1e-9),
            fine_excess=whole_excess(excess, 1e-12),
        )
        return columns, keep

    def _end(self, place: Ints, band: int, parts: AnyInts, padder: Ints, *, low_end: bool) -> _End:
        p = self.problem
        acting = np.append(np.where(self._finite[band], self._acting[int(low_end)][band], 0.0), 0.0)
        value = acting[parts]
        nominal = value.sum(axis=1)
        network = p.behind_leads(nominal, band, low_end=low_end)
        tuned = self._element(band, padder)[int(low_end)]
        tuned = np.where(np.isfinite(tuned), tuned, 0.0)
        own = (p.tuning_high if low_end else p.tuning_low)[band]
        total = np.maximum(network + tuned + self._fixed[place, band], 1e-30)
        gain = np.append(self._gain[int(low_end)][band], 1.0)
        alone = np.maximum(nominal, 1e-30)  # behind leads what is in circuit grows faster than its parts
        weight = value / alone[:, None] * gain[parts] * (network / alone * network / total)[:, None]
        series = acting[padder]
        behind = tuned / np.where(series > 0, series, 1.0) * tuned / total * gain[padder]
        of_padder = np.where(padder >= 0, behind, 0.0)
        of_element = tuned / own * tuned / total if own > 0 else np.zeros(len(place))
        middle = (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        part_loss = np.append((p.part_loss_low if low_end else p.part_loss)[band], 0.0)
        loss = (p.coil_loss_low if low_end else p.coil_loss)[place, band]
        loss = loss + (weight * part_loss[parts]).sum(axis=1) + of_padder * part_loss[padder]
        loss = loss + of_element * p.tuning_loss[band] + middle / total * p.trimmer_loss[band]
        inductance = (p.inductance_low if low_end else self._inductance)[place, band]
        drift = np.zeros(len(place))
        if np.isfinite(p.drift_limit):
            tempco, spread = np.append(p.part_tempco, 0.0), np.append(p.part_tempco_spread, 0.0)
            nominal_drift = (weight * tempco[parts]).sum(axis=1) + of_padder * tempco[padder]
            nominal_drift = nominal_drift + of_element * p.tuning_tempco[band] + p.coil_tempco[place, band]
            others = self._strays[place, band] * p.stray_tempco + middle * p.trimmer_tempco[band]
            own_spread = (weight * spread[parts]).sum(axis=1) + of_padder * spread[padder]
            drift = 0.5 * np.abs(nominal_drift + others / total) + 0.5 * (p.coil_tempco_spread[place] + own_spread)
        bears = np.ones(len(place), dtype=np.bool_)
        if p.drive is not None:
            omega = 2 * np.pi * float((p.low_end if low_end else p.frequency)[band])
            # the element is set so that the tank resonates at the end of the band, short of its own end
            on_padder = (1.0 / (omega**2 * inductance) - (total - tuned)) / np.where(series > 0, series, 1.0)
            on_padder = np.where(padder >= 0, on_padder, 0.0)
            share = np.where(parts >= 0, (network / alone)[:, None], 0.0)
            every = np.concatenate([parts, padder[:, None]], axis=1)
            most = p.drive.on_parts(
                omega, acting[every], np.concatenate([share, on_padder[:, None]], axis=1), every
            )
            element = p.drive.element_voltage / (p.drive.crest * (1.0 - on_padder))
            limits = (most, element, p.drive.on_coil(omega * inductance, place), p.drive.on_trimmer(band))
            bears = borne(p.drive.carrier(omega * inductance, loss), *limits)
        return _End(network, total, 1.0 / (2 * np.pi * np.sqrt(inductance * total)), loss, drift, bears)


class _End:
    """What is in circuit at one end of the band, (m,) each."""

    def __init__(
        self, network: Floats, total: Floats, frequency: Floats, loss: Floats, drift: Floats, bears: Bools
    ) -> None:
        self.network, self.total, self.frequency, self.loss, self.drift = network, total, frequency, loss, drift
        self.bears = bears


def _acting_low(problem: Problem) -> Floats:
    """Return how each part acts at the low end of each band, (B, P); inf where it is of no use. [F]"""
    of_part = species_of_parts(problem)
    acting = np.full((problem.bands, len(of_part)), np.inf)
    known = of_part >= 0
    acting[:, known] = problem.species_low[:, of_part[known]]
    return acting
