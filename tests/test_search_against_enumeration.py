"""The search against plain enumeration on tiny problems: every rank and every step of the order."""

from __future__ import annotations

import pytest
from tiny.brute_force import ranking
from tiny.random_problem import random_problem, random_swept_problem

from partpick.progress import Quiet
from partpick.search.bands import Found, leading_figure, search_bands
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem

SHAPES = {
    "one band": {"bands": 1},
    "one coil for two bands": {"bands": 2},
    "shared limits": {"bands": 2, "coupled": True},
    "two coils": {"bands": 2, "inductors": 2},
    "two coils under shared limits": {"bands": 2, "inductors": 2, "coupled": True},
    "two coils for three bands": {"bands": 3, "inductors": 2},
}

SWEPT_SHAPES = {
    "one swept band": {"bands": 1, "swept": 1},
    "two swept bands": {"bands": 2, "swept": 2},
    "a swept band and a fixed one": {"bands": 2, "swept": 1},
    "swept bands under shared limits": {"bands": 2, "swept": 2, "coupled": True},
    "a mixed plan under shared limits": {"bands": 2, "swept": 1, "coupled": True},
    "two coils for two swept bands": {"bands": 2, "swept": 2, "inductors": 2},
    "two coils for a mixed plan": {"bands": 2, "swept": 1, "inductors": 2},
}


def found_in(problem: Problem) -> Found:
    found = search_bands(
        problem, ColumnSource(problem), wanted=100, all_windings=False, monitor=Quiet()
    )
    assert found.stopped_by is None
    return found


def pieces_of(choice: Choice) -> int:
    return len(choice.coils) + sum(int((columns.parts[0] >= 0).sum()) for columns in choice.columns)


def agree(seed: int, shape: dict[str, int]) -> int:
    problem = random_swept_problem(seed, **shape) if "swept" in shape else random_problem(seed, **shape)
    wanted, front = ranking(problem)
    found = found_in(problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(pieces_of(choice), leading_figure(problem, choice)) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return len(wanted)


@pytest.mark.parametrize("name", SHAPES)
def test_every_rank_and_the_front_equal_plain_enumeration(name: str) -> None:
    """A plan that the search leaves out or misplaces would be a false "optimal"."""
    answered = sum(agree(seed, SHAPES[name]) > 0 for seed in range(100))
    assert answered > 10, "the sample must hold plans, not only refusals"


@pytest.mark.slow
@pytest.mark.parametrize("name", SWEPT_SHAPES)
def test_swept_and_mixed_plans_equal_plain_enumeration(name: str) -> None:
    """Padders, coverage and excess are enumerated with loops that know no interval and no crossing."""
    answered = sum(agree(seed, SWEPT_SHAPES[name]) > 0 for seed in range(40))
    assert answered > 10, "the sample must hold plans, not only refusals"


@pytest.mark.slow
@pytest.mark.parametrize("name", SWEPT_SHAPES)
def test_swept_and_mixed_plans_equal_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1300):
        agree(seed, SWEPT_SHAPES[name])


@pytest.mark.slow
@pytest.mark.parametrize("name", SHAPES)
def test_every_rank_and_the_front_equal_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1600):
        agree(seed, SHAPES[name])


def test_a_larger_stock_never_makes_the_first_plan_worse() -> None:
    """Lifting the stock can only add plans."""
    from dataclasses import replace

    from partpick.search.problem import PLENTY

    for seed in range(60):
        problem = random_problem(seed, bands=2, coupled=True)
        richer = replace(problem, part_stock=problem.part_stock * 0 + PLENTY)
        before, after = found_in(problem).choices, found_in(richer).choices
        if before:
            assert after and after[0].key <= before[0].key
