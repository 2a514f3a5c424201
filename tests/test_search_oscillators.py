"""Oscillators in the search against plain enumeration: every rank, every step of the order, and the front."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from tiny.brute_force import ranking
from tiny.brute_force_oscillator import oscillator_columns
from tiny.compare import equals_enumeration
from tiny.random_oscillator import random_oscillator, source_of, taps_of

from partpick.progress import Quiet
from partpick.search.bands import search_bands
from partpick.search.problem import Problem

CIRCUITS = ("colpitts", "clapp", "hartley")
SHAPES = {
    "one band": {"bands": 1},
    "two bands": {"bands": 2},
    "two coils": {"bands": 2, "inductors": 2},
    "one swept band": {"bands": 1, "swept": 1},
    "a swept band and a fixed one": {"bands": 2, "swept": 1},
}


def enumerated(problem: Problem, seed: int) -> tuple[list, list]:
    """Return ranks and front by plain enumeration, each column made once."""
    assert problem.oscillator is not None
    of_coil: dict[int, list[dict]] = {}
    if not problem.oscillator.divided:
        taps, _ = taps_of(problem, seed)
        for row, coil in enumerate(taps.coil.tolist()):
            names = {"turns": "turns", "share": "output_turns", "output": "output_share"}
            names |= {"control": "control_share", "mutual": "mutual_share"}
            of_coil.setdefault(coil, []).append({k: getattr(taps, v)[row].item() for k, v in names.items()})
    made: dict[tuple[int, int], list[dict]] = {}

    def columns(given: Problem, coil: int, band: int) -> list[dict]:
        if (coil, band) not in made:
            made[coil, band] = oscillator_columns(given, coil, band, of_coil.get(coil, []))
        return made[coil, band]

    return ranking(problem, columns)


def agree(seed: int, circuit: str, shape: dict[str, int]) -> int:
    problem = random_oscillator(seed, circuit, **shape)
    wanted, front = enumerated(problem, seed)
    source = source_of(problem, seed)
    equals_enumeration(problem, source, wanted, front, seed)
    return len(wanted)


@pytest.mark.parametrize("circuit", CIRCUITS)
def test_oscillators_equal_plain_enumeration(circuit: str) -> None:
    """A divider that is left out, or one that does not start, would be a false "optimal"."""
    answered = sum(agree(seed, circuit, shape) > 0 for shape in SHAPES.values() for seed in range(5))
    assert answered >= 5, "the sample must hold plans, not only refusals"


def test_no_excess_of_an_oscillator_is_below_its_bound() -> None:
    """A bound above a choice would let the search stop before that choice."""
    compared = 0
    for seed in range(24):
        problem = random_oscillator(seed, CIRCUITS[seed % 3], bands=1, swept=1)
        source = source_of(problem, seed)
        for parts in range(problem.most_parts + 1):
            bound = source.least_excesses(parts)
            for coil in range(problem.coils):
                excess = source.columns(coil, 0, parts).excess
                assert np.all(excess >= bound[coil, 0] - 1e-9)
                compared += len(excess)
    assert compared > 50


def test_the_transconductance_decides_in_the_sample() -> None:
    """Instances where everything starts, or nothing does, would prove little about start-up."""
    changed = 0
    for seed in range(12):
        problem = random_oscillator(seed, "colpitts", bands=1)
        assert problem.oscillator is not None
        free = replace(problem, oscillator=replace(problem.oscillator, allowed=1e3))
        keys = []
        for each in (problem, free):
            found = search_bands(each, source_of(each, seed), wanted=9, all_windings=False, monitor=Quiet())
            keys.append([choice.key for choice in found.choices])
        changed += keys[0] != keys[1]
    assert changed >= 3


@pytest.mark.slow
@pytest.mark.parametrize("circuit", CIRCUITS)
@pytest.mark.parametrize("name", SHAPES)
def test_oscillators_equal_plain_enumeration_at_length(name: str, circuit: str) -> None:
    """The same over more instances than the default suite has time for."""
    answered = sum(agree(seed, circuit, SHAPES[name]) > 0 for seed in range(1000, 1120))
    assert answered > 10
