"""The search against plain enumeration on tiny problems: every rank and every step of the order."""

from __future__ import annotations

import pytest
from tiny.brute_force import ranking
from tiny.random_problem import random_problem

from partpick.progress import Quiet
from partpick.search.bands import Found, search_bands
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


def found_in(problem: Problem) -> Found:
    found = search_bands(
        problem, ColumnSource(problem), wanted=100, all_windings=False, monitor=Quiet()
    )
    assert found.stopped_by is None
    return found


def pieces_and_error(choice: Choice) -> tuple[int, float]:
    pieces = len(choice.coils) + sum(int((columns.parts[0] >= 0).sum()) for columns in choice.columns)
    return pieces, max(abs(float(columns.error[0])) for columns in choice.columns)


def agree(seed: int, shape: dict[str, int]) -> int:
    problem = random_problem(seed, **shape)
    wanted, front = ranking(problem)
    found = found_in(problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [pieces_and_error(choice) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return len(wanted)


@pytest.mark.parametrize("name", SHAPES)
def test_every_rank_and_the_front_equal_plain_enumeration(name: str) -> None:
    """A plan that the search leaves out or misplaces would be a false "optimal"."""
    answered = sum(agree(seed, SHAPES[name]) > 0 for seed in range(100))
    assert answered > 10, "the sample must hold plans, not only refusals"


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
