"""Whether a band's trimmer brings it on frequency whatever the parts are within tolerance."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from partpick.search.figures import network_weights
from partpick.search.networks import network_values
from partpick.search.problem import Bools, Floats, Ints, Problem

_ROUNDING = 1e-12
_error_function = np.vectorize(math.erf, otypes=[float])


def alignable(problem: Problem, coil: int, band: int, values: Floats, chosen: Ints, shape: NDArray[np.int8]) -> Bools:
    """Return which networks of one coil and band can be aligned, (m,).

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
    the variance of independent uniform tolerances (JCGM 100:2008, 4.3.7 and 5.1.2).
    """
    if problem.alignable >= 1.0:
        return _at_all_corners(problem, coil, band, values, chosen, shape)
    return _for_a_share(problem, coil, band, values, chosen, shape)


def _at_all_corners(
    problem: Problem, coil: int, band: int, values: Floats, chosen: Ints, shape: NDArray[np.int8]
) -> Bools:
    p, tolerance = problem, problem.part_tolerance[chosen]
    wanted, spread = p.wanted[coil, band], p.coil_spread[coil]
    strays = p.self_capacitance[coil] + p.stray[band]
    least = _behind(p, network_values(values * (1 - tolerance), shape), band) + strays * (1 - p.stray_tolerance)
    most = _behind(p, network_values(values * (1 + tolerance), shape), band) + strays * (1 + p.stray_tolerance)
    slack = _ROUNDING * wanted
    reaches_down = wanted / (1 + spread) - most >= p.trimmer_low[band] - slack
    reaches_up = wanted / (1 - spread) - least <= p.trimmer_high[band] + slack
    result: Bools = reaches_down & reaches_up
    return result


def _for_a_share(
    problem: Problem, coil: int, band: int, values: Floats, chosen: Ints, shape: NDArray[np.int8]
) -> Bools:
    p = problem
    wanted = p.wanted[coil, band]
    strays = p.self_capacitance[coil] + p.stray[band]
    network = network_values(values, shape)
    acting = _behind(p, network, band)
    setting = wanted - acting - strays
    weights = network_weights(values, shape, np.maximum(network, 1e-30)) * acting[:, None]
    square = (wanted * p.coil_spread[coil]) ** 2 + (strays * p.stray_tolerance) ** 2
    deviation = np.sqrt((square + ((weights * p.part_tolerance[chosen]) ** 2).sum(axis=1)) / 3.0)
    deviation = np.maximum(deviation, _ROUNDING * wanted)
    ends = (p.trimmer_low[band] - setting, p.trimmer_high[band] - setting)
    below, above = (_error_function(end / deviation / math.sqrt(2.0)) for end in ends)
    result: Bools = (above - below) / 2.0 >= p.alignable - _ROUNDING
    return result


def _behind(problem: Problem, network: Floats, band: int) -> Floats:
    return problem.behind_leads(network, band) if problem.lead_inductance > 0 else network
