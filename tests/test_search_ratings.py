"""Ratings as limits inside the search, against plain enumeration on tiny problems."""

from __future__ import annotations

import itertools
from collections.abc import Iterable
from dataclasses import replace

import numpy as np
import pytest
from test_search_against_enumeration import SHAPES, SWEPT_SHAPES, found_in, pieces_of
from test_search_layouts import PIECES, PLANS
from test_search_layouts import found_in as found_in_layout
from tiny import brute_force, brute_force_layouts
from tiny.random_layout import random_layout, random_swept_layout
from tiny.random_problem import driven, random_problem, random_swept_problem

from partpick.search.bands import leading_figure
from partpick.search.columns import ColumnSource
from partpick.search.figures import Columns
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED
from partpick.search.problem import Problem
from partpick.search.ratings import can_bear, voltage_shares

SEVERAL = {**SHAPES, **SWEPT_SHAPES}
LAYOUTS = [(layout, bands) for layout in PLANS for bands in (2, 3)]


def made(seed: int, shape: dict[str, int]) -> Problem:
    plain = random_swept_problem(seed, **shape) if "swept" in shape else random_problem(seed, **shape)
    return driven(plain, seed)


def agree(problem: Problem, seed: int) -> tuple[bool, bool] | None:
    """Compare every rank and the front; return whether there are plans, and whether a rating changed them.

    None where there would be no plan without ratings either.
    """
    free = found_in(replace(problem, drive=None))
    if not free.choices:
        return None
    wanted, front = brute_force.ranking(problem)
    found = found_in(problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(pieces_of(choice), leading_figure(problem, choice)) for choice in found.front]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return bool(wanted), [choice.key for choice in free.choices] != wanted


def agree_layout(layout: str, seed: int, bands: int) -> tuple[bool, bool] | None:
    coupled = seed % 3 == 0
    if layout == "stacked" and seed % 2:
        plain = random_swept_layout(seed, bands=bands, swept=1 + seed % bands, coupled=coupled)
    else:
        plain = random_layout(seed, bands=bands, shared=layout == "shared", coupled=coupled)
    problem = driven(plain, seed)
    free = found_in_layout(layout, replace(problem, drive=None))
    if not free.choices:
        return None
    wanted, front = brute_force_layouts.ranking(problem, PLANS[layout])
    found = found_in_layout(layout, problem)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [(pieces, leading_figure(problem, choice)) for choice in found.front for pieces in (choice.key[PIECES],)]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=1e-12)
    return bool(wanted), [choice.key for choice in free.choices] != wanted


def enough(every: Iterable[tuple[bool, bool] | None], count: int) -> None:
    """Look at problems until so many have plans without ratings; some must keep plans, and some ratings must bind."""
    seen = list(itertools.islice((one for one in every if one is not None), count))
    assert len(seen) == count
    assert sum(plans for plans, _ in seen) > count // 20, "the sample must hold plans"
    assert any(bound for _, bound in seen), "a rating must rule something out"


@pytest.mark.parametrize("name", [name for name in SEVERAL if "three" not in name])
def test_every_rank_under_ratings_equals_plain_enumeration(name: str) -> None:
    """A plan over a rating would be offered, or one inside left out: both would be false."""
    enough((agree(made(seed, SEVERAL[name]), seed) for seed in itertools.count()), 6)


@pytest.mark.parametrize(("layout", "bands"), LAYOUTS)
def test_stacks_and_sets_under_ratings_equal_plain_enumeration(layout: str, bands: int) -> None:
    """What one band adds must bear every band at which it is in circuit."""
    enough((agree_layout(layout, seed, bands) for seed in itertools.count()), 12)


@pytest.mark.slow
@pytest.mark.parametrize("name", SEVERAL)
def test_every_rank_under_ratings_equals_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    enough((agree(made(seed, SEVERAL[name]), seed) for seed in itertools.count(1000)), 150)


@pytest.mark.slow
@pytest.mark.parametrize(("layout", "bands"), LAYOUTS)
def test_stacks_and_sets_under_ratings_equal_plain_enumeration_at_length(layout: str, bands: int) -> None:
    """The same over more instances than the default suite has time for."""
    enough((agree_layout(layout, seed, bands) for seed in itertools.count(1000)), 150)


def test_every_column_under_ratings_equals_plain_enumeration() -> None:
    """The best plans alone would not show a network that is lost further down, or kept though it is over."""
    seen = 0
    for seed in range(180):
        problem = made(seed, {"bands": 2, "swept": 1} if seed % 3 == 0 else {"bands": 2})
        source = ColumnSource(problem)
        levels = range(problem.least_parts, problem.most_parts + 1)
        for coil in range(problem.coils):
            for band in range(problem.bands):
                wanted = {(c["parts"], c["shape"], c["series"]) for c in brute_force.band_columns(problem, coil, band)}
                found = Columns.join([source.columns(coil, band, parts) for parts in levels])
                got = {
                    (tuple(int(p) for p in found.parts[i] if p >= 0), int(found.shape[i]), found.series_padder(i))
                    for i in range(len(found))
                }
                assert got <= wanted, f"seed {seed}"
                seen += len(got)
    assert seen > 300


def test_no_coil_that_can_bear_the_drive_is_left_out() -> None:
    """The bound leaves out only coils for which no network of so many parts is inside."""
    refused = 0
    for seed in range(150):
        problem = made(seed, {"bands": 2})
        for parts in range(problem.least_parts, problem.most_parts + 1):
            able = can_bear(problem, parts)
            for coil in range(problem.coils):
                for band in range(problem.bands):
                    refused += not able[coil, band]
                    if not able[coil, band]:
                        columns = brute_force.band_columns(problem, coil, band)
                        assert all(len(c["parts"]) != parts for c in columns), f"seed {seed}"
    assert refused > 50


def test_an_unknown_loss_of_the_tuning_element_says_nothing_of_a_fixed_band() -> None:
    """It is not in circuit there; a bound that counted it would leave out plans that bear the drive."""
    agree(made(1695, SEVERAL["a mixed plan under shared limits"]), 1695)


def test_the_voltage_on_each_part_of_a_network() -> None:
    """By hand: 20 pF in series with 60 pF takes three quarters; 20 pF with 30 pF || 30 pF too."""
    acting = np.array([[20.0, 60.0, 60.0], [20.0, 40.0, 40.0], [10.0, 20.0, 60.0], [20.0, 30.0, 30.0]])
    shares = voltage_shares(acting, np.array([PARALLEL, SERIES, SHUNTED, CHAINED], np.int8))
    assert shares == pytest.approx(np.array([[1, 1, 1], [0.5, 0.25, 0.25], [1, 0.75, 0.25], [0.75, 0.25, 0.25]]))
