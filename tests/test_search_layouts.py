"""Stacked and shared plans against plain enumeration on tiny problems: every rank and step of the order."""

from __future__ import annotations

from collections import Counter
from dataclasses import fields, replace

import numpy as np
import pytest
from tiny.brute_force_layouts import ranking, shared_plans, stacked_plans
from tiny.random_layout import random_layout

from partpick.progress import Quiet
from partpick.search.bands import Found
from partpick.search.choose import ORDERS
from partpick.search.problem import NEVER, PLENTY, Problem
from partpick.search.set_figures import SharedChoice
from partpick.search.shared import search_shared
from partpick.search.stacked import StackedChoice, search_stacked

PLANS = {"stacked": stacked_plans, "shared": shared_plans}
SEARCHES = {"stacked": search_stacked, "shared": search_shared}
CASES = [(layout, bands, coupled) for layout in PLANS for bands in (1, 2, 3, 4) for coupled in (False, True)]
BY_COIL_AND_BAND = {
    *("wanted", "in_play", "coil_loss", "reactance_class", "coil_tempco"),
    *("inductance_low", "coil_loss_low"),
}
BY_BAND = {
    *("frequency", "error_limit", "q_limit", "q_enough", "stray", "species", "part_loss"),
    *("trimmer_low", "trimmer_high", "trimmer_loss", "trimmer_tempco"),
    *("swept", "low_end", "tuning_low", "tuning_high", "tuning_loss", "tuning_tempco", "species_low", "part_loss_low"),
}
PIECES = ORDERS["error"].index("pieces")  # the front is ordered by error


def found_in(layout: str, problem: Problem) -> Found:
    found = SEARCHES[layout](problem, wanted=100, all_windings=False, monitor=Quiet())
    assert found.stopped_by is None
    return found


def worst(choice) -> float:
    return max(abs(float(columns.error[0])) for columns in choice.columns)


def agree(layout: str, seed: int, *, bands: int, coupled: bool) -> int:
    problem = random_layout(seed, bands=bands, shared=layout == "shared", coupled=coupled)
    wanted, front = ranking(problem, PLANS[layout])
    found = found_in(layout, problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(choice.key[PIECES], worst(choice)) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return len(wanted)


@pytest.mark.parametrize(("layout", "bands", "coupled"), CASES)
def test_every_rank_and_the_front_equal_plain_enumeration(layout: str, bands: int, coupled: bool) -> None:
    """A plan that the search leaves out or misplaces would be a false "optimal"."""
    seeds = range(30 if bands < 4 else 18)
    answered = sum(agree(layout, seed, bands=bands, coupled=coupled) > 0 for seed in seeds)
    assert answered > 1, "the sample must hold plans, not only refusals"


def test_what_a_sum_comes_to_at_another_band_is_reckoned_with() -> None:
    """Series inductance: a pair that is too small at one band by its figures at another is large enough."""
    assert agree("shared", 1260, bands=3, coupled=True) > 0


@pytest.mark.slow
@pytest.mark.parametrize(("layout", "bands", "coupled"), CASES)
def test_every_rank_and_the_front_equal_plain_enumeration_at_length(
    layout: str, bands: int, coupled: bool
) -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1600):
        agree(layout, seed, bands=bands, coupled=coupled)


@pytest.mark.parametrize("layout", PLANS)
def test_a_larger_stock_never_makes_the_first_plan_worse(layout: str) -> None:
    """Lifting the stock can only add plans."""
    compared = 0
    for seed in range(40):
        problem = random_layout(seed, bands=2, shared=layout == "shared", coupled=True)
        before = found_in(layout, problem).choices
        after = found_in(layout, replace(problem, part_stock=problem.part_stock * 0 + PLENTY)).choices
        if before:
            assert after and after[0].key <= before[0].key
            compared += 1
    assert compared > 5


@pytest.mark.parametrize("layout", PLANS)
def test_the_order_of_bands_changes_nothing(layout: str) -> None:
    """Bands stand in the plan in any order; a stack goes by target."""
    for seed in range(12):
        problem = random_layout(seed, bands=3, shared=layout == "shared")
        turned = {
            field.name: value[..., ::-1] if field.name in BY_COIL_AND_BAND else value[::-1]
            for field in fields(problem)
            if isinstance(value := getattr(problem, field.name), np.ndarray)
            and (field.name in BY_COIL_AND_BAND or field.name in BY_BAND)
        }
        before, after = found_in(layout, problem), found_in(layout, replace(problem, **turned))
        assert [choice.key for choice in before.choices] == [choice.key for choice in after.choices]


def test_a_stack_lists_what_is_added_and_what_is_in_circuit() -> None:
    """The highest band may add nothing; each lower one adds at least one to what is there."""
    bare = 0
    for seed in range(40):
        problem = random_layout(seed, bands=3, shared=False)
        for choice in found_in("stacked", problem).choices:
            assert isinstance(choice, StackedChoice)
            in_circuit: Counter[int] = Counter()
            for place, band in enumerate(np.argsort(-problem.frequency)):
                assert place == 0 or choice.added[band]
                in_circuit.update(choice.added[band])
                parts = choice.columns[band].parts[0]
                assert Counter(parts[parts >= 0].tolist()) == in_circuit
            bare += not choice.added[int(np.argmax(problem.frequency))]
    assert bare > 0, "no sample with a highest band that adds none"


def test_a_shared_set_lists_its_members_and_the_slots_that_each_band_closes() -> None:
    """Twins in a set are two slots: each is counted once, and a band may close one of them."""
    twins = 0
    for seed in range(50):
        problem = random_layout(seed, bands=2, shared=True)
        for choice in found_in("shared", problem).choices:
            assert isinstance(choice, SharedChoice)
            assert choice.key[ORDERS[problem.by].index("pieces")] == len(choice.members) + 1
            for band, closed in enumerate(choice.closed):
                parts = choice.columns[band].parts[0]
                assert sorted(choice.members[slot] for slot in closed) == sorted(parts[parts >= 0].tolist())
            twins += len(set(choice.members)) < len(choice.members)
    assert twins > 0, "no sample with equal members"


@pytest.mark.parametrize("layout", PLANS)
def test_a_time_limit_is_never_reported_as_nothing_fits(layout: str) -> None:
    """An empty answer without `stopped_by` says that no plan exists."""
    problem = random_layout(3, bands=3, shared=layout == "shared")
    found = SEARCHES[layout](problem, wanted=1, all_windings=False, monitor=Quiet(time_limit=0.0))
    assert found.stopped_by == "time limit" and not found.settled


def test_a_shared_set_without_a_size_is_refused() -> None:
    """The contract asks for `parts`: it is the most that the set may hold."""
    problem = replace(random_layout(3, bands=2, shared=True), parts_limit=NEVER)
    with pytest.raises(ValueError, match="limit on parts"):
        search_shared(problem, wanted=1, all_windings=False, monitor=Quiet())


@pytest.mark.parametrize("layout", PLANS)
def test_series_networks_are_refused(layout: str) -> None:
    """Both layouts are planned with capacitors in parallel only."""
    problem = replace(random_layout(3, bands=2, shared=layout == "shared"), connect_any=True)
    with pytest.raises(ValueError, match="parallel"):
        SEARCHES[layout](problem, wanted=1, all_windings=False, monitor=Quiet())
