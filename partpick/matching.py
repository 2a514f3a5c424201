"""Loads that the search must meet: which coils suit one across the tank, and dividers that bring one to it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.candidates import Coils, Ints
from partpick.errors import RequestError
from partpick.oscillating import oscillator_keys, wanted_q
from partpick.request import Band, Request
from partpick.search.matching import Matching
from partpick.search.problem import Bools, Problem

MOST_PARTS = 4  # a band with a divider, which is counted in


def load_to_meet(request: Request, band: Band) -> tuple[float, float] | None:
    """Return resistance [ohm] and loaded Q of a load that the search must meet at a band, None where there is none.

    That is one of known resistance at a fixed band, across the tank or by a divider, for which a loaded Q or a
    bandwidth is asked. An oscillator has its load in its start-up instead.
    """
    load = band.load
    if load is None or load.resistance is None or band.swept or oscillator_keys(request) is not None:
        return None
    wanted = wanted_q(load, band.highest)
    return None if wanted is None or load.connection not in ("across", "divider") else (load.resistance, wanted)


def q_limits(band: Band, wanted: float) -> tuple[float, float]:
    """Return the least and the most loaded Q that a band may have: 0 and infinity without a tolerance. [-]"""
    off = None if band.load is None else band.load.q_tolerance
    return (0.0, np.inf) if off is None else (wanted * (1 - off), wanted * (1 + off))


def has_divider(request: Request, band: Band) -> bool:
    """Whether the search picks a divider for the load of a band."""
    return band.load is not None and band.load.connection == "divider" and load_to_meet(request, band) is not None


def check_loads(request: Request) -> None:
    """Refuse what a load by a divider is not planned with.

    Raises
    ------
    RequestError
        Another layout, taps, series networks, series inductance, [drive], alignment, or too few or many parts.
    """
    divided = [band for band in request.bands if has_divider(request, band)]
    if not divided:
        return
    layout, parts = request.switching, request.limits.parts_per_band
    refused = (
        (layout != "separate", f'switching = "{layout}"', 'every band has its own divider: "separate"'),
        (request.coil.taps, "coil.taps = true", "bands share the whole coil: false"),
        (request.capacitors.connect == "any", 'capacitors.connect = "any"', 'write "parallel"'),
        (request.stray.inductance > 0, "stray.inductance", "leads in series with a divider are not modelled: 0 nH"),
        (any(b.trimmer is not None and b.trimmer.to_choose for b in divided), "a trimmer to be chosen", "state it"),
        ("drive" in dict(request.extra), "[drive]", 'take connection = "across" or "tap"'),
        ("receiver" in dict(request.extra), "[receiver]", "plan the tank by itself"),
        (request.limits.alignable is not None, "limits.alignable", 'take "none"'),
        (parts < 2, f"limits.parts_per_band {parts}", "a divider has 2: at least 2"),
        (parts > MOST_PARTS, f"limits.parts_per_band {parts}", f"at most {MOST_PARTS}"),
    )
    for asked, what, instead in refused:
        if asked:
            raise RequestError(f'load.connection = "divider" with {what} is not planned; {instead}')


def suits_load(request: Request, coils: Coils, row: Ints) -> Bools:
    """Return which coils leave the loaded Q that is wanted of a load across the tank, (r, B).

    Taken at the target with the coil's own loss alone; capacitors add little. An unknown Q does not pass, but of a
    measured coil, which never has one, counts as no loss.
    """
    suits = np.ones((len(row), len(request.bands)), dtype=np.bool_)
    for index, band in enumerate(request.bands):
        met = load_to_meet(request, band)
        if met is None or band.load is None or band.load.connection != "across":
            continue
        resistance, wanted = met
        reactance = 2 * np.pi * band.highest * coils.inductance[row, index]
        own = 1.0 / coils.q[row, index]
        own = np.nan_to_num(own) if request.coil.measured is not None else own
        loaded = 1.0 / (own + reactance / resistance)
        least, most = q_limits(band, wanted)
        if band.load.q_tolerance is None:
            continue
        suits[:, index] = (loaded >= least * (1 - 1e-12)) & (loaded <= most * (1 + 1e-12))
    return suits


def with_loads(request: Request, coils: Coils, problem: Problem) -> Problem:
    """Return the problem with the loads that it must meet; itself where there are none."""
    met = [load_to_meet(request, band) for band in request.bands]
    if not any(met):
        return problem
    able = problem.in_play & suits_load(request, coils, np.arange(len(coils)))
    divided = np.array([has_divider(request, band) for band in request.bands])
    if not divided.any():
        return replace(problem, in_play=able)
    limits = [q_limits(band, each[1]) if each else (0.0, np.inf) for band, each in zip(request.bands, met, strict=True)]
    least, most = (np.array([pair[end] for pair in limits]) for end in range(2))
    # with no loss but its own a coil leaves at most its Q
    able &= ~(problem.coil_loss * np.where(divided, least, 0.0)[None, :] > 1.0)
    conductance = np.array([1.0 / each[0] if each and own else 0.0 for each, own in zip(met, divided, strict=True)])
    fewest = max(problem.least_parts, 2 if divided.all() else 0)
    free = request.coil.measured is not None or bool(np.isinf(most[divided]).all())
    matching = Matching(conductance=conductance, least_q=least, most_q=most, unknown_passes=free)
    return replace(problem, in_play=able, matching=matching, least_parts=fewest)
