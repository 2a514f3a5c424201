"""Random oscillators of a few coils and a few capacitors, the transconductance on purpose close to what is needed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.search.columns import ColumnSource
from partpick.search.oscillating import CommonTaps, DividedSource, HartleySource
from partpick.search.problem import Oscillator, Problem
from tiny.random_problem import random_problem, random_swept_problem

OWN = {"colpitts": 2, "clapp": 3, "hartley": 0}


def random_oscillator(seed: int, circuit: str, *, bands: int, swept: int = 0, inductors: int = 1) -> Problem:
    """Return a problem with an oscillator that depends on the seed alone; each coil is made for a design drawn."""
    shape = {"bands": bands, "inductors": inductors, "coupled": seed % 5 == 0}
    plain = random_swept_problem(seed, swept=swept, **shape) if swept else random_problem(seed, **shape)
    rng = np.random.default_rng(seed + 2 * 10**6)
    pick = lambda *choices: choices[int(rng.integers(0, len(choices)))]  # noqa: E731
    device = pick((0.0, 0.0), (1.5e-12, 0.0), (2e-12, 5e-12))
    least = min(2 if circuit == "clapp" and plain.swept[b] else OWN[circuit] for b in range(bands))
    most = max(2 if circuit == "clapp" and plain.swept[b] else OWN[circuit] for b in range(bands))
    most = max(1, most + int(rng.integers(0, 2)) * (bands == 1 or circuit != "clapp"))
    wanted, low_end, needed = np.empty_like(plain.wanted), plain.low_end.copy(), []
    inductance_low = np.empty_like(wanted)
    fixed, room = plain.fixed_capacitance(), most - OWN[circuit]
    for coil, band in np.ndindex(wanted.shape):
        halves = rng.choice(plain.species[band], 2) + np.array(device)
        inner = 1 / sum(1 / c for c in halves)
        shared = 1.0  # of the tank's voltage over the divider's, squared
        across = fixed[coil, band] + (rng.choice(plain.species[band]) if room > 0 and rng.random() < 0.5 else 0.0)
        ends = [0.0, 0.0]
        if plain.swept[band]:
            ends = [float(plain.tuning_high[band]), float(plain.tuning_low[band])]
        if circuit == "colpitts":
            across += inner
        if circuit == "clapp" and plain.swept[band]:
            shared = (1 + inner / ends[1]) ** 2
            ends = [1 / (1 / t + 1 / inner) for t in ends]
        if circuit == "clapp" and not plain.swept[band]:
            third = rng.choice(plain.species[band])
            shared = (1 + inner / third) ** 2
            across += 1 / (1 / inner + 1 / third)
        if plain.swept[band]:
            margin = plain.margin
            wanted[coil, band] = (ends[1] + across) * (1 + margin) ** 2 * rng.uniform(1.0, 1.05)
            ratio = np.sqrt((ends[0] + across) / (ends[1] + across) * rng.uniform(0.8, 0.97))
            low_end[band] = plain.frequency[band] * min(0.97, (1 + margin) / (1 - margin) / ratio)
        else:
            wanted[coil, band] = across * rng.uniform(0.99, 1.01) if rng.random() < 0.7 else across
        omega = 2 * np.pi * plain.frequency[band]
        inductance_low[coil, band] = rng.uniform(1.0, 1.004) / (omega**2 * wanted[coil, band])
        needed.append(omega * (across + ends[0]) / 100 * shared * sum(halves) ** 2 / (halves[0] * halves[1]))
    worse = rng.uniform(1.0, 1.4, wanted.shape)
    problem = replace(
        plain,
        wanted=wanted,
        low_end=low_end,
        inductance_low=inductance_low if swept else np.empty(0),
        connect_any=False,
        lead_inductance=0.0,
        most_parts=most,
        least_parts=max(least, 1) if bands == 1 else least,
        in_play=plain.in_play | (rng.random(wanted.shape) < 0.8),
        tuning_share=float("inf"),  # what an oscillator puts on its element is not known: no limit goes with it
        error_limit=np.where(plain.trimmer_high > 0, np.inf, 0.02),
        share=pick(float("inf"), float("inf"), 0.4),
        excess_limit=pick(float("inf"), float("inf"), 2.0),
    )
    oscillator = Oscillator(
        circuit=circuit,
        allowed=float(np.median(needed) * rng.choice([0.7, 1.0, 1.5, 3.0, 30.0])),
        device=device,
        coil_loss=problem.coil_loss * worse,
        coil_loss_low=problem.coil_loss_low * worse,
        load=np.full(bands, pick(0.0, 0.0, 1e-5)),
        least_loss=np.full(bands, pick(0.0, 0.0, 0.0, 1 / 80)),
    )
    return replace(problem, oscillator=oscillator)


def taps_of(problem: Problem, seed: int) -> tuple[CommonTaps, np.ndarray]:
    """Return a few taps of every coil, and how many each has."""
    rng = np.random.default_rng(seed + 3 * 10**6)
    counts = rng.integers(0, 4, problem.coils)
    coil = np.repeat(np.arange(problem.coils), counts)
    turns = np.concatenate([np.arange(1, n + 1) for n in counts] or [np.empty(0)]).astype(np.int64)
    share = turns / (counts[coil] + 1.0)
    output, control = share**1.6, (1 - share) ** 1.6
    mutual = (1 - output - control) / 2
    assert problem.oscillator is not None
    device = problem.oscillator.device
    across = (output + mutual) ** 2 * device[0] + (control + mutual) ** 2 * device[1]
    self_capacitance = problem.self_capacitance[coil] + across
    nothing = np.zeros((len(coil), problem.bands))
    taps = CommonTaps(
        coil,
        turns,
        coil,
        self_capacitance,
        nothing,
        nothing,
        problem.in_play[coil],
        share,
        output,
        control,
        mutual,
    )
    return taps, counts


def source_of(problem: Problem, seed: int) -> ColumnSource:
    """Return what the search takes its columns from."""
    assert problem.oscillator is not None
    if problem.oscillator.divided:
        return DividedSource(problem)
    taps, counts = taps_of(problem, seed)

    def of_coils(chosen: np.ndarray) -> CommonTaps:
        rows = np.concatenate([np.flatnonzero(taps.coil == j) for j in chosen] or [np.empty(0)]).astype(np.int64)
        return CommonTaps(*(getattr(taps, name)[rows] for name in CommonTaps.__dataclass_fields__))

    return HartleySource(problem, of_coils, counts)
