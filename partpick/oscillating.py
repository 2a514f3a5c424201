"""Oscillators as the search wants them: what the device gives, losses at their worst, and the taps of coils."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from partpick.candidates import Coils, Floats, Ints
from partpick.errors import InternalError, RequestError
from partpick.request import Load, Request
from partpick.search.columns import ColumnSource
from partpick.search.oscillating import CommonTaps, DividedSource, HartleySource
from partpick.search.problem import Oscillator, Problem
from partpick.search.startup import able_to_start

MOST_PARTS = 4  # a band, divider counted in


def oscillator_keys(request: Request) -> dict[str, Any] | None:
    """Return the keys of the table [oscillator], None where there is none."""
    keys = dict(request.extra).get("oscillator")
    return None if keys is None else dict(keys)


def check_oscillator(request: Request) -> None:
    """Refuse what an oscillator is not planned with.

    Raises
    ------
    RequestError
        Another layout, taps, series networks, series inductance, a coil of unknown Q, or too many parts a band.
    """
    keys = oscillator_keys(request)
    if keys is None:
        return
    circuit, parts = keys["circuit"], request.limits.parts_per_band
    tuning = request.tuning
    least = least_parts(circuit, swept=False)
    layout = request.switching
    refused = (
        (layout != "separate", f'switching = "{layout}"', 'every band has its own divider: "separate"'),
        (request.coil.taps, "coil.taps = true", "bands share the whole coil: false"),
        (request.capacitors.connect == "any", 'capacitors.connect = "any"', 'the circuit says how they go: "parallel"'),
        (request.stray.inductance > 0, "stray.inductance", "leads in series with a divider are not modelled: 0 nH"),
        (
            any(band.trimmer is not None and band.trimmer.to_choose for band in request.bands),
            "a trimmer to be chosen",
            "state its low and high",
        ),
        ("drive" in dict(request.extra), "[drive]", "what an oscillator drives itself to is not known; leave it out"),
        ("receiver" in dict(request.extra), "[receiver]", "plan the two apart"),
        (request.limits.alignable is not None, "limits.alignable", 'take "none", or leave [oscillator] out'),
        (
            request.coil.measured is not None,
            "coil.measured",
            "its Q is not known, so that nothing says whether it starts; name the winding instead",
        ),
        (
            tuning is not None and tuning.kind not in ("variable capacitor", "varactor"),
            f'tuning.kind = "{tuning.kind if tuning else ""}"',
            "an oscillator is tuned by a variable capacitor or a varactor",
        ),
        (circuit != "hartley" and parts > MOST_PARTS, f"limits.parts_per_band {parts}", f"at most {MOST_PARTS}"),
        (
            parts < least and not all(band.swept for band in request.bands),
            f"limits.parts_per_band {parts}",
            f"a {circuit} circuit has {least} capacitors in its divider: at least {least}",
        ),
        (circuit != "hartley" and parts < 2, f"limits.parts_per_band {parts}", "a divider has 2: at least 2"),
    )
    for asked, what, instead in refused:
        if asked:
            raise RequestError(f"[oscillator] with {what} is not planned; {instead}")


def least_parts(circuit: str, *, swept: bool) -> int:
    """Return how many capacitors the divider of a circuit has; the tuning element of a swept Clapp is none. [-]"""
    return {"colpitts": 2, "clapp": 2 if swept else 3, "hartley": 0}[circuit]


def with_oscillator(request: Request, coils: Coils, problem: Problem) -> Problem:
    """Return the problem with its oscillator, coils that cannot start left out; itself where none is asked for."""
    keys = oscillator_keys(request)
    if keys is None:
        return problem
    # of a bought coil's spread of Q something is always known; nan stands for a Q that is itself unknown
    left = 1.0 - np.nan_to_num(coils.q_spread[:, 0])
    oscillator = Oscillator(
        circuit=keys["circuit"],
        allowed=keys["transconductance"] / keys["margin"],
        device=(keys["output_capacitance"], keys["input_capacitance"]),
        coil_loss=1.0 / (coils.q * left[:, None]),
        coil_loss_low=1.0 / (coils.q_low * left[:, None]),
        load=np.array([load_conductance(band.load) for band in request.bands]),
        least_loss=np.array([1.0 / q if (q := wanted_q(band.load, band.lowest)) else 0.0 for band in request.bands]),
    )
    able = problem.in_play & able_to_start(problem, oscillator)
    if not oscillator.divided:
        able &= (_tap_counts(coils) > 0)[:, None]
    return replace(problem, oscillator=oscillator, in_play=able, least_parts=_least(request, problem, keys))


def _least(request: Request, problem: Problem, keys: dict[str, Any]) -> int:
    """Return the fewest parts of any band. [-]"""
    fewest = min(least_parts(keys["circuit"], swept=band.swept) for band in request.bands)
    return max(problem.least_parts, fewest)


def load_conductance(load: Load | None) -> float:
    """Return what a load puts across the tank; one by tap, link or divider shows in the loaded Q alone. [S]"""
    if load is None or load.resistance is None or load.connection != "across":
        return 0.0
    return 1.0 / load.resistance


def wanted_q(load: Load | None, frequency: float) -> float | None:
    """Return the loaded Q that is asked for, of a bandwidth that at a frequency. [-]"""
    if load is None:
        return None
    return load.loaded_q if load.bandwidth is None else frequency / load.bandwidth


def oscillator_source(coils: Coils, problem: Problem) -> ColumnSource:
    """Return the columns of a problem with an oscillator."""
    assert problem.oscillator is not None
    if problem.oscillator.divided:
        return DividedSource(problem)
    counts = _tap_counts(coils)
    device = problem.oscillator.device

    def taps(chosen: Ints) -> CommonTaps:
        coil = np.repeat(chosen, counts[chosen])
        first = np.repeat(np.cumsum(counts[chosen]) - counts[chosen], counts[chosen])
        turns = 1 + np.arange(len(coil)) - first
        output, control, mutual = tap_shares(coils, coil, turns)
        across = (output + mutual) ** 2 * device[0] + (control + mutual) ** 2 * device[1]
        return CommonTaps(
            coil,
            turns,
            coil,
            coils.self_capacitance[coil] + across,
            np.zeros((len(coil), problem.bands)),
            np.zeros((len(coil), problem.bands)),
            problem.in_play[coil],
            turns / coils.turns[coil],
            output,
            control,
            mutual,
        )

    return HartleySource(problem, taps, counts)


def tap_shares(coils: Coils, coil: Ints | int, turns: Ints | int) -> tuple[Floats, Floats, Floats]:
    """Return the inductance on both sides of a tap and between them, as shares of the whole coil's. [-]

    Parameters
    ----------
    coils : Coils
        Every coil; those of a former and wire follow each other by turns from 1.
    coil : int or (v,) array of int
        The whole coil. [-]
    turns : int or (v,) array of int
        Between the output end and the tap. [-]
    """
    dc, every = coils.inductance_dc, coils.turns[coil]
    rows = ((coil - (every - turns), turns), (coil - turns, every - turns))
    if any(np.any(coils.turns[row] != wanted) for row, wanted in rows):
        raise InternalError("internal error: the coils of a former are not all there; please report this plan")
    output, control = dc[coil - (every - turns)] / dc[coil], dc[coil - turns] / dc[coil]
    return output, control, (1.0 - output - control) / 2.0


def _tap_counts(coils: Coils) -> Ints:
    """Return how many whole turns of each coil could be its common terminal, (J,); 0 where it cannot be tapped."""
    start, counts = 0, np.zeros(len(coils), dtype=np.int64)
    for block in coils.blocks:
        rows = slice(start, start + len(block))
        start += len(block)
        if block.tappable:
            counts[rows] = np.maximum(block.turns - 1, 0)
    return counts
