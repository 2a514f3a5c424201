"""Whether a band can be brought on frequency whatever its parts are within tolerance.

A fixed band: on its target, by its trimmer and its coil's own adjustment. A swept band: one setting with which
the tuning element reaches both ends of the range as asked for, without margin.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.search.networks import network_values
from partpick.search.problem import Bools, Floats, Ints, Problem

_ROUNDING = 1e-12
_ALL_GONE = 1.0 - 1e-9  # a part is never less than nothing
_error_function = np.vectorize(math.erf, otypes=[float])


@dataclass(frozen=True, eq=False)
class _Circuit:
    """Networks of one coil and band, (m,), that can be figured with their parts off nominal."""

    problem: Problem
    coil: int
    band: int
    chosen: Ints  # (m, k) parts across the coil
    shape: NDArray[np.int8]
    values: Floats  # (m, k) F, as they act at the upper end
    values_low: Floats  # at the lower end
    padder: Ints | None = None  # (m,) in series with the tuning element
    padder_values: tuple[Floats, Floats] | None = None  # F, as they act at the lower and the upper end

    def across(self, off: Floats, *, low_end: bool) -> Floats:
        """Return what the capacitors across the coil act as, each off by `off` (m, k) of its value. [F]"""
        p = self.problem
        values = self.values_low if low_end else self.values
        network = network_values(_off_nominal(values, p.written[self.chosen], off), self.shape)
        return p.behind_leads(network, self.band, low_end=low_end) if p.lead_inductance > 0 else network

    def tuned(self, off: float, padder_off: Floats | float, *, low_end: bool) -> Floats | float:
        """Return the tuning element behind its padder, both off nominal; 0 in a fixed band. [F]"""
        p = self.problem
        own = float((p.tuning_high if low_end else p.tuning_low)[self.band]) * (1.0 + off)
        if self.padder is None or self.padder_values is None:
            return own
        acting = self.padder_values[0 if low_end else 1]
        padder = _off_nominal(acting, p.written[self.padder], padder_off)
        return np.asarray(own * padder / (own + padder))


def alignable(problem: Problem, coil: int, band: int, values: Floats, chosen: Ints, shape: NDArray[np.int8]) -> Bools:
    """Return which networks of one coil and fixed band can be brought on frequency, (m,).

    Parameters
    ----------
    problem : Problem
        Tolerances, trimmers and what share of the builds is asked for.
    coil, band : int
        Which coil and band. [-]
    values : (m, k) array
        Capacitance of each part as it acts at the band. [F]
    chosen : (m, k) array of int
        The parts. [-]
    shape : (m,) array of int
        Shape of each network. [-]

    Notes
    -----
    All corners: the capacitance wanted is most with the least inductance and the fixed capacitance grows with
    every part, so two corners bound all. A share: the trimmer setting that is needed is taken as normal, with
    the variance of independent uniform tolerances (JCGM 100:2008, 4.3.7 and 5.1.2). What a coil's own adjustment
    does is in `Problem.coil_ends`.
    """
    circuit = _Circuit(problem, coil, band, chosen, shape, values, values)
    if problem.alignable >= 1.0:
        return _at_all_corners(circuit)
    return _for_a_share(circuit)


def swept_alignable(
    problem: Problem,
    coil: int,
    band: int,
    values: tuple[Floats, Floats],
    chosen: Ints,
    shape: NDArray[np.int8],
    padder: Ints | None,
    padder_values: tuple[Floats, Floats] | None,
) -> Bools:
    """Return which networks of one coil cover a swept band in the builds asked for, (m,).

    Parameters
    ----------
    problem, coil, band, chosen, shape :
        As in `alignable`; `chosen` are the parts across the coil.
    values : two (m, k) arrays
        Capacitance of each part as it acts at the lower and at the upper end. [F]
    padder : (m,) array of int, optional
        The parts in series with the tuning element. [-]
    padder_values : two (m,) arrays, optional
        As they act at the lower and at the upper end. [F]

    Notes
    -----
    With y the inductance over nominal and t the trimmer: y (C_low + t) >= D and y (C_high + t) <= U. Such a t
    exists where y is between max(D/(C_low + t_max), (D - U)/(C_low - C_high)) and U/(C_high + t_min). Each of
    these conditions is at its worst at a corner: the swing C_low - C_high rises with the padder and first rises,
    then falls with the element, so both of its ends are tried. A share: one less the chances, by the normal law,
    that each condition fails, which may count a unit twice and is a careful figure.
    """
    circuit = _Circuit(problem, coil, band, chosen, shape, values[1], values[0], padder, padder_values)
    if problem.alignable >= 1.0:
        return _covers_at_all_corners(circuit)
    return _covers_for_a_share(circuit)


def _off_nominal(acting: Floats, written: Floats, off: Floats | float) -> Floats:
    """Return how capacitors act when they are off their value: their series inductance stays as it is. [F]"""
    off = np.maximum(off, -_ALL_GONE)
    with np.errstate(divide="ignore", invalid="ignore"):
        inverse = 1.0 / acting - off / (1.0 + off) / written
        # at or beyond its own resonance: no capacitor any more
        return np.asarray(np.where(inverse > 0, 1.0 / inverse, np.inf))


# ---------------------------------------------------------------- fixed bands


def _at_all_corners(circuit: _Circuit) -> Bools:
    p, coil, band = circuit.problem, circuit.coil, circuit.band
    tolerance = p.part_tolerance[circuit.chosen]
    wanted, strays = p.wanted[coil, band], p.self_capacitance[coil] + p.stray[band]
    least = circuit.across(-tolerance, low_end=False) + strays * (1 - p.stray_tolerance)
    most = circuit.across(tolerance, low_end=False) + strays * (1 + p.stray_tolerance)
    down, up = (float(end[coil]) for end in p.coil_ends)
    slack = _ROUNDING * wanted
    result: Bools = wanted / up - most >= p.trimmer_low[band] - slack
    result &= wanted / down - least <= p.trimmer_high[band] + slack
    return result


def _for_a_share(circuit: _Circuit) -> Bools:
    """Too much and too little are never wrong at once, so the share is one less both chances."""
    p, coil, band = circuit.problem, circuit.coil, circuit.band
    wanted = p.wanted[coil, band]
    nothing = np.zeros(circuit.chosen.shape)
    fixed = circuit.across(nothing, low_end=False) + p.self_capacitance[coil] + p.stray[band]
    square = _stray_square(p, coil, band)
    for part, tolerance in _each_part(circuit):
        up = circuit.across(part * tolerance, low_end=False)
        square = square + ((up - circuit.across(-part * tolerance, low_end=False)) / 2.0) ** 2
    share = np.zeros(len(fixed))
    for stretch, spread in _inductances(p, coil):
        ends = (p.trimmer_low[band], p.trimmer_high[band])
        missing = [
            _chance_below(sign * (wanted / factor - fixed - end), square + (wanted / factor * spread) ** 2, wanted)
            for factor, end, sign in zip(stretch, ends, (1.0, -1.0), strict=True)
        ]
        share = np.maximum(share, 1.0 - missing[0] - missing[1])
    return np.asarray(share >= p.alignable - _ROUNDING)


def _stray_square(problem: Problem, coil: int, band: int) -> Floats:
    """Return the square of what the strays may be off, wiring and winding independent. [F2]"""
    own, wiring = problem.self_capacitance[coil], problem.stray[band]
    return np.asarray((own * problem.stray_tolerance) ** 2 + (wiring * problem.stray_tolerance) ** 2)


def _each_part(circuit: _Circuit) -> list[tuple[Floats, Floats]]:
    """Return for each part of the networks where it stands, (m, k) of 0 and 1, and the tolerances."""
    tolerance = circuit.problem.part_tolerance[circuit.chosen]
    return [(np.eye(tolerance.shape[1])[place], tolerance) for place in range(tolerance.shape[1])]


def _inductances(problem: Problem, coil: int) -> list[tuple[tuple[float, float], float]]:
    """Return the ways to use one coil, as in `Problem.coil_ways`."""
    return [
        ((float(down[coil]), float(up[coil])), float(spread[coil])) for (down, up), spread in problem.coil_ways
    ]


def _chance_below(margin: Floats, square: Floats, wanted: float) -> Floats:
    """Return the chance that a margin is below 0; `square`: of the sizes of uniform deviations, added. [-]"""
    deviation = np.maximum(np.sqrt(square / 3.0), _ROUNDING * wanted)
    return np.asarray(0.5 * (1.0 - _error_function(margin / deviation / math.sqrt(2.0))))


# ---------------------------------------------------------------- swept bands


def _ends_of_range(problem: Problem, coil: int, band: int) -> tuple[float, float]:
    """Return what is wanted in circuit at the lower and the upper end as asked for. [F]"""
    lower = 1.0 / ((2 * np.pi * problem.low_end[band]) ** 2 * problem.inductance_low[coil, band])
    return float(lower), float(problem.wanted[coil, band])


def _covers_at_all_corners(circuit: _Circuit) -> Bools:
    p, coil, band = circuit.problem, circuit.coil, circuit.band
    wide, narrow = _ends_of_range(p, coil, band)
    tolerance = p.part_tolerance[circuit.chosen]
    padder = 0.0 if circuit.padder is None else p.part_tolerance[circuit.padder]
    strays = p.self_capacitance[coil] + p.stray[band]
    least, most = strays * (1 - p.stray_tolerance), strays * (1 + p.stray_tolerance)
    down, up = (float(end[coil]) for end in p.coil_ends)
    slack = _ROUNDING * wide
    low = circuit.across(-tolerance, low_end=True) + least
    low = low + circuit.tuned(-p.tuning_tolerance, -padder, low_end=True)
    high = circuit.across(tolerance, low_end=False) + most
    high = high + circuit.tuned(p.tuning_tolerance, padder, low_end=False)
    covers: Bools = down * (low + p.trimmer_high[band]) >= wide - slack
    covers &= up * (high + p.trimmer_low[band]) <= narrow + slack
    for side, element, of_padder in itertools.product((-1.0, 1.0), repeat=3):
        parts = [
            circuit.across(side * tolerance, low_end=end)
            + circuit.tuned(element * p.tuning_tolerance, of_padder * padder, low_end=end)
            for end in (True, False)
        ]
        covers &= down * (parts[0] - parts[1]) >= wide - narrow - slack
        if p.coil_alone:
            for fixed in (least, most):
                lowest = fixed + p.trimmer_low[band]
                # so that the range of the inductance which is asked for is not empty
                covers &= narrow * (parts[0] + lowest) >= wide * (parts[1] + lowest) - slack * narrow
    return covers


def _covers_for_a_share(circuit: _Circuit) -> Bools:
    p, coil, band = circuit.problem, circuit.coil, circuit.band
    wide, narrow = _ends_of_range(p, coil, band)
    middle, moves = _moves(circuit)
    low, high = middle
    trimmer = p.trimmer_low[band], p.trimmer_high[band]
    share = np.zeros(len(circuit.chosen))
    for (up, down), spread in _inductances(p, coil):  # `up`: the coil turned down for the upper end
        conditions = (
            (narrow / up, 0.0, -1.0, -trimmer[0]),
            (-wide / down, 1.0, 0.0, trimmer[1]),
            (-(wide - narrow) / down, 1.0, -1.0, 0.0),
        )
        failing = np.zeros(len(share))
        for wanted, of_low, of_high, rest in conditions:
            square = np.add.reduce([(of_low * a + of_high * b) ** 2 for a, b in moves]) + (wanted * spread) ** 2
            failing += _chance_below(wanted + of_low * low + of_high * high + rest, square, wide)
        if (up, down) != (1.0, 1.0):  # else it follows from the others
            square = np.add.reduce([(a - wide / narrow * b) ** 2 for a, b in moves])
            margin = low + trimmer[0] - wide / narrow * (high + trimmer[0])
            failing += _chance_below(margin, square, wide)
        share = np.maximum(share, 1.0 - failing)
    return np.asarray(share >= p.alignable - _ROUNDING)


def _moves(circuit: _Circuit) -> tuple[tuple[Floats, Floats], list[tuple[Floats, Floats]]]:
    """Return what is in circuit at both ends without trimmer, and how far each source moves it. [F]"""
    p, coil, band = circuit.problem, circuit.coil, circuit.band
    nothing = np.zeros(circuit.chosen.shape)
    strays = p.self_capacitance[coil] + p.stray[band]
    of_padder = 0.0 if circuit.padder is None else p.part_tolerance[circuit.padder]

    def ends(off: Floats, element: float, padder: Floats | float) -> list[Floats]:
        return [
            np.asarray(circuit.across(off, low_end=end) + circuit.tuned(element, padder, low_end=end))
            for end in (True, False)
        ]

    def halved(up: list[Floats], down: list[Floats]) -> tuple[Floats, Floats]:
        return (up[0] - down[0]) / 2.0, (up[1] - down[1]) / 2.0

    moves = [
        halved(ends(part * tolerance, 0.0, 0.0), ends(-part * tolerance, 0.0, 0.0))
        for part, tolerance in _each_part(circuit)
    ]
    size = p.tuning_tolerance
    moves.append(halved(ends(nothing, size, 0.0), ends(nothing, -size, 0.0)))
    moves.append(halved(ends(nothing, 0.0, of_padder), ends(nothing, 0.0, -of_padder)))
    for stray in (p.self_capacitance[coil], p.stray[band]):
        own = np.full(len(nothing), stray * p.stray_tolerance)
        moves.append((own, own))
    low, high = ends(nothing, 0.0, 0.0)
    return (low + strays, high + strays), moves
