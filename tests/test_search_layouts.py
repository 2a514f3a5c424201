"""Stacked and shared plans against plain enumeration on tiny problems: every rank and step of the order."""

from __future__ import annotations

import pytest
from tiny.brute_force_layouts import ranking, shared_plans, stacked_plans
from tiny.random_layout import random_layout

from partpick.progress import Quiet
from partpick.search.bands import Found
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem
from partpick.search.shared import search_shared
from partpick.search.stacked import search_stacked

PLANS = {"stacked": stacked_plans, "shared": shared_plans}


def found_in(layout: str, problem: Problem) -> Found:
    search = {"stacked": search_stacked, "shared": search_shared}[layout]
    source = ColumnSource(problem)
    found = search(problem, source, wanted=100, all_windings=False, monitor=Quiet())
    assert found.stopped_by is None
    return found


def agree(layout: str, seed: int, *, bands: int, coupled: bool) -> int:
    problem = random_layout(seed, bands=bands, shared=layout == "shared", coupled=coupled)
    wanted, front = ranking(problem, PLANS[layout])
    found = found_in(layout, problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(choice.key[PIECES], max(abs(float(c.error[0])) for c in choice.columns)) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return len(wanted)


PIECES = 2  # place of the pieces in the order by error


@pytest.mark.parametrize("coupled", [False, True])
@pytest.mark.parametrize("bands", [1, 2, 3])
@pytest.mark.parametrize("layout", ["stacked", "shared"])
def test_every_rank_and_the_front_equal_plain_enumeration(layout: str, bands: int, coupled: bool) -> None:
    """A plan that the search leaves out or misplaces would be a false "optimal"."""
    answered = sum(agree(layout, seed, bands=bands, coupled=coupled) > 0 for seed in range(40))
    assert answered > 8, "the sample must hold plans, not only refusals"
