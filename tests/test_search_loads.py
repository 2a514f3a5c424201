"""Loads on capacitive dividers in the search against plain enumeration, and the divider's algebra."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from tiny.brute_force import ranking
from tiny.brute_force_loads import loaded_columns
from tiny.compare import equals_enumeration
from tiny.random_loads import random_loads

from partpick.physics.coupling import divider_load
from partpick.progress import Quiet
from partpick.search.bands import search_bands
from partpick.search.columns import ColumnSource
from partpick.search.divided import load_across, loaded_slopes, loaded_value

SHAPES = {
    "one band": {"bands": 1},
    "two bands": {"bands": 2},
    "two coils": {"bands": 2, "inductors": 2},
    "a divider and a plain band": {"bands": 2, "plain": 1},
}


def agree(seed: int, shape: dict[str, int]) -> int:
    problem = random_loads(seed, **shape)
    wanted, front = ranking(problem, loaded_columns)
    equals_enumeration(problem, ColumnSource(problem), wanted, front, seed)
    return len(wanted)


def test_dividers_equal_plain_enumeration() -> None:
    """A divider that is left out, or one that leaves another loaded Q, would be a false "optimal"."""
    answered = sum(agree(seed, shape) > 0 for shape in SHAPES.values() for seed in range(8))
    assert answered >= 8, "the sample must hold plans, not only refusals"


def test_the_loaded_q_decides_in_the_sample() -> None:
    """Instances that every divider suits, or none, would prove little."""
    changed = 0
    for seed in range(16):
        problem = random_loads(seed, bands=1)
        assert problem.matching is not None
        free = replace(problem, matching=replace(problem.matching, least_q=np.zeros(1), most_q=np.full(1, np.inf)))
        keys = []
        for each in (problem, free):
            found = search_bands(each, ColumnSource(each), wanted=9, all_windings=False, monitor=Quiet())
            keys.append([choice.key for choice in found.choices])
        changed += keys[0] != keys[1]
    assert changed >= 3


@pytest.mark.slow
@pytest.mark.parametrize("name", SHAPES)
def test_dividers_equal_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    answered = sum(agree(seed, SHAPES[name]) > 0 for seed in range(1000, 1150))
    assert answered > 10


def test_a_loaded_divider_acts_as_complex_admittances_say() -> None:
    """Value and share of the load against `divider_load`; slopes against differences."""
    rng = np.random.default_rng(1)
    upper, lower = rng.uniform(10e-12, 3e-9, (2, 50))
    frequency, resistance = 7.1e6, 10 ** rng.uniform(0.5, 4, 50)
    load = 1 / (2 * np.pi * frequency * resistance)
    seen = divider_load(frequency, upper, lower, resistance)
    assert loaded_value(upper, lower, load) == pytest.approx(seen.capacitance, rel=1e-12)
    assert resistance / load_across(upper, lower, load) == pytest.approx(seen.resistance, rel=1e-12)
    for one, two, beside in zip(upper, lower, load, strict=True):
        slopes = loaded_slopes(float(one), float(two), float(beside))
        step = 1e-5
        by_hand = [
            (loaded_value(one * (1 + step), two, beside) - loaded_value(one * (1 - step), two, beside)) / (2 * step),
            (loaded_value(one, two * (1 + step), beside) - loaded_value(one, two * (1 - step), beside)) / (2 * step),
        ]
        assert slopes == pytest.approx(by_hand, rel=1e-5, abs=1e-9 * one)
