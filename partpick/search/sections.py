"""Tuned circuits on one gang: what the section must be at a frequency, and where a section tunes a circuit.

Inductance, network and padder are known at both ends of a circuit's range. Between and beyond them they lie
on straight lines against frequency, the padder in its reciprocal, so that none (infinite) is a padder too.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.search.figures import Columns
from partpick.search.networks import Rows
from partpick.search.problem import Floats, Ints, Problem

POINTS = 121  # frequencies at which a tracking error is looked at, denser towards the ends
CHECKS = (0, 40, 80, 120)  # those at the extremes of a third Chebyshev polynomial: the error's usual ones
_ROUNDS = 60  # of the resonance with what depends on frequency: each gains one to three digits
_CLOSE = 1e-14  # of the frequency


def band_points(low: float, high: float) -> Floats:
    """Return the frequencies of a band at which tracking is looked at, rising, both ends included. [Hz]"""
    turned = np.cos(np.pi * np.arange(POINTS) / (POINTS - 1))
    points = (low + high) / 2 - (high - low) / 2 * turned
    points[[0, -1]] = low, high
    return np.asarray(points)


@dataclass(frozen=True, eq=False)
class Circuits:
    """Circuits of one band, (m,) each."""

    low: float  # Hz, where the figures of the low end hold
    high: float
    inductance_low: Floats  # H
    inductance_high: Floats
    fixed: Floats  # F, strays, self-capacitance and trimmer
    across_low: Floats  # F, the network across the coil as it acts
    across_high: Floats
    padder_low: Floats  # F, inf: none
    padder_high: Floats

    def take(self, chosen: Ints) -> Circuits:
        """Return some of the circuits."""
        names = [name for name in self.__dataclass_fields__ if name not in ("low", "high")]
        return Circuits(self.low, self.high, **{name: getattr(self, name)[chosen] for name in names})

    def section(self, frequency: Floats) -> Floats:
        """Return the section that tunes each circuit to each frequency (n,), (m, n). [F]"""
        inductance, others, elastance = self._at(np.asarray(frequency)[None, :])
        behind = 1.0 / ((2 * np.pi * frequency) ** 2 * inductance) - others
        return np.asarray(behind / (1.0 - behind * elastance))

    def tuned(self, section: Floats, near: Floats) -> Floats:
        """Return the resonance of each circuit at its own sections (m, n), begun from near it, (m, n). [Hz]"""
        frequency = np.broadcast_to(near, section.shape)
        for _ in range(_ROUNDS):
            inductance, others, elastance = self._at(frequency)
            total = others + section / (1.0 + section * elastance)
            last, frequency = frequency, 1.0 / (2 * np.pi * np.sqrt(inductance * total))
            if np.abs(frequency / last - 1.0).max(initial=0.0) < _CLOSE:
                break
        return np.asarray(frequency)

    def _at(self, frequency: Floats) -> tuple[Floats, Floats, Floats]:
        """Return inductance [H], fixed capacitance with the network [F], reciprocal of the padder [1/F]."""
        along = (frequency - self.low) / (self.high - self.low)

        def line(low: Floats, high: Floats) -> Floats:
            return np.asarray(low[:, None] + (high - low)[:, None] * along)

        inductance = line(self.inductance_low, self.inductance_high)
        others = self.fixed[:, None] + line(self.across_low, self.across_high)
        return inductance, others, line(1.0 / self.padder_low, 1.0 / self.padder_high)


@dataclass(frozen=True, eq=False)
class Made:
    """Circuits of one band by what they are made of, (m,) each; grades are left open."""

    coil: Ints
    place: Ints  # of the padder among the valid species; their number: none
    rows: Rows  # networks across the coil, species among the valid ones
    circuits: Circuits

    def __len__(self) -> int:
        return len(self.coil)

    def take(self, chosen: Ints) -> Made:
        """Return some of the circuits."""
        return Made(self.coil[chosen], self.place[chosen], self.rows.take(chosen), self.circuits.take(chosen))


class Maker:
    """Makes the circuits of one swept band."""

    def __init__(self, problem: Problem, valid: Ints, band: int) -> None:
        self.problem, self.band = problem, band
        self.value_low = problem.species_low[band][valid]
        self.padder_low = np.append(self.value_low, np.inf)
        self.padder_high = np.append(problem.species[band][valid], np.inf)
        self.fixed = problem.fixed_capacitance()[:, band]

    def made(self, coil: Ints, place: Ints, rows: Rows) -> Made:
        """Return circuits of coils, padders and networks."""
        p, band = self.problem, self.band
        low = self.value_low[rows.species].sum(axis=1) if rows.species.shape[1] else np.zeros(len(coil))
        circuits = Circuits(
            low=float(p.low_end[band]),
            high=float(p.frequency[band]),
            inductance_low=p.inductance_low[coil, band],
            inductance_high=p.inductance_high[coil, band],
            fixed=self.fixed[coil],
            across_low=p.behind_leads(low, band, low_end=True),
            across_high=p.behind_leads(rows.value, band),
            padder_low=self.padder_low[place],
            padder_high=self.padder_high[place],
        )
        return Made(coil, place, rows, circuits)


def behind_padder(section: Floats, padder: Floats) -> Floats:
    """Return a section in series with a padder. [F]"""
    return np.asarray(section / (1.0 + section / padder))


def circuits_of(problem: Problem, band: int, columns: Columns, species_of_part: Ints) -> Circuits:
    """Return columns of a swept band as circuits.

    Parameters
    ----------
    problem : Problem
        The arrays of the request.
    band : int
        Which band. [-]
    columns : Columns
        Parallel networks, with or without a padder.
    species_of_part : (P,) array of int
        Which species each part is. [-]
    """
    coil = columns.coil
    used = (columns.parts >= 0) & (np.cumsum(columns.parts >= 0, axis=1) <= _across_count(columns)[:, None])
    species = np.where(used, species_of_part[columns.parts], 0)
    low = np.where(used, problem.species_low[band][species], 0.0).sum(axis=1)
    padder = np.where(columns.series >= 0, species_of_part[columns.series], 0)
    behind = columns.series >= 0
    return Circuits(
        low=float(problem.low_end[band]),
        high=float(problem.frequency[band]),
        inductance_low=problem.inductance_low[coil, band],
        inductance_high=problem.inductance_high[coil, band],
        fixed=problem.fixed_capacitance()[coil, band],
        across_low=problem.behind_leads(low, band, low_end=True),
        across_high=columns.network,
        padder_low=np.where(behind, problem.species_low[band][padder], np.inf),
        padder_high=np.where(behind, problem.species[band][padder], np.inf),
    )


def _across_count(columns: Columns) -> Ints:
    """Return how many of each column's parts are across the coil. [-]"""
    return np.asarray((columns.parts >= 0).sum(axis=1) - (columns.series >= 0))


def species_of_parts(problem: Problem) -> Ints:
    """Return which species each part is, (P,). [-]"""
    species = np.zeros(max(1, len(problem.part_value)), dtype=np.int64)
    for place, parts in enumerate(problem.options):
        species[list(parts)] = place
    return species
