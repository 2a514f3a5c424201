"""A lower bound of each coil's drift, so that coils which no network can steady are left out at once."""

from __future__ import annotations

import numpy as np

from partpick.search.problem import Bools, Floats, Problem

_SLOPES = np.linspace(-1.0, 1.0, 21)

Corner = tuple[Floats, Floats]  # temperature coefficient and its spread, (J, B) each


def steady_enough(problem: Problem, parts: int) -> Bools:
    """Return which coils might keep the drift limit with a number of parts of the best grades, (J, B).

    Parameters
    ----------
    problem : Problem
        Its drift limit is finite.
    parts : int
        Capacitors at each band. [-]

    Notes
    -----
    The temperature coefficient and spread of what is across the coil is a mix, weights adding up to 1, of
    those of its grades and strays: a point of their convex hull. |nominal| + spread is at least
    t * nominal + spread for every t from -1 to 1, and that is least at a corner of the hull. The largest
    of these bounds over some t is taken. One part has one grade, so its hulls are taken grade by grade.
    Inductance in series raises the weight of a part by up to the largest gain, so that each grade has a corner
    without it and one with all of it.
    Swept bands and bands with a trimmer are left to the search.
    """
    p = problem
    grades = np.unique(np.stack([p.part_tempco, p.part_tempco_spread], axis=1), axis=0)
    ends = _stray_shares(p)
    gains = weight_gains(p)
    of_grade = [
        [
            (share * p.stray_tempco + (1.0 - share) * gain * tempco, (1.0 - share) * gain * spread)
            for share in ends
            for gain in gains
        ]
        for tempco, spread in grades[np.isfinite(grades[:, 0])]
    ]
    strays_alone = [(np.full_like(p.wanted, p.stray_tempco), np.zeros_like(p.wanted))]
    if parts == 0:
        hulls = [strays_alone]
    elif parts == 1:
        hulls = of_grade
    else:
        hulls = [[corner for corners in of_grade for corner in corners]]
    bound = np.full(p.wanted.shape, np.inf)
    for corners in hulls:
        if corners:
            bound = np.minimum(bound, _least_size(p.coil_tempco, corners))
    limit = 2.0 * p.drift_limit * (1.0 + 1e-9)
    able: Bools = bound + p.coil_tempco_spread[:, None] <= limit
    return able | (p.swept | (p.trimmer_high > 0))[None, :]


def _least_size(coil_tempco: Floats, corners: list[Corner]) -> Floats:
    """Return a lower bound of |coil + mix| + spread over all mixes of the corners, (J, B). [1/K]"""
    bound = np.full(coil_tempco.shape, -np.inf)
    for slope in _SLOPES:
        lowest = np.min([slope * tempco + spread for tempco, spread in corners], axis=0)
        bound = np.maximum(bound, slope * coil_tempco + lowest)
    return bound


def weight_gains(p: Problem) -> list[Floats]:
    """Return the least and the largest factor by which inductance in series raises a part's weight, (J, B) each."""
    gain = p.part_gain()
    least, most = gain.min(axis=1, initial=1.0), gain.max(axis=1, initial=1.0)
    if least.min(initial=1.0) == most.max(initial=1.0) and p.lead_inductance == 0:
        return [np.ones(p.wanted.shape)]
    largest = p.wanted / np.square(1.0 - np.minimum(p.error_limit, 1.0 - 1e-9))[None, :]
    leads = 1.0 + ((2 * np.pi * p.frequency) ** 2 * p.lead_inductance)[None, :] * largest
    return [np.broadcast_to(least, p.wanted.shape), most[None, :] * leads]


def _stray_shares(p: Problem) -> tuple[Floats, Floats]:
    """Return the least and the largest share of strays in the capacitance with capacitors, (J, B). [-]"""
    strays = p.self_capacitance[:, None] + p.stray[None, :]
    error = p.error_limit[None, :]
    smallest = p.wanted / (1.0 + error) ** 2
    with np.errstate(divide="ignore"):
        largest = np.where(error < 1.0, p.wanted / np.square(1.0 - np.minimum(error, 1.0)), np.inf)
        least, most = strays / largest, strays / smallest
    return np.minimum(least, 1.0), np.minimum(most, min(p.share, 1.0))
