"""The search against plain enumeration on tiny problems: every rank and every step of the order."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from tiny.brute_force import band_columns, ranking
from tiny.random_problem import random_moved_problem, random_problem, random_swept_problem

from partpick.progress import Quiet
from partpick.search.bands import Found, leading_figure, search_bands
from partpick.search.bounds import BELOW_PIECES, pack, packed_fields
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.figures import Columns
from partpick.search.problem import PLENTY, Problem

SHAPES = {
    "one band": {"bands": 1},
    "one coil for two bands": {"bands": 2},
    "shared limits": {"bands": 2, "coupled": True},
    "two coils": {"bands": 2, "inductors": 2},
    "two coils under shared limits": {"bands": 2, "inductors": 2, "coupled": True},
    "two coils for three bands": {"bands": 3, "inductors": 2},
    "three coils for three bands": {"bands": 3, "inductors": 3},
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

MOVED_SHAPES = {
    "one band on a moving inductance": {"bands": 1, "moved": 1},
    "two bands on one": {"bands": 2, "moved": 2},
    "one on it and a fixed one": {"bands": 2, "moved": 1},
    "under shared limits": {"bands": 2, "moved": 2, "coupled": True},
    "two coils": {"bands": 2, "moved": 2, "inductors": 2},
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
    kinds = {"swept": random_swept_problem, "moved": random_moved_problem}
    problem = next((make for kind, make in kinds.items() if kind in shape), random_problem)(seed, **shape)
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


@pytest.mark.parametrize("name", SWEPT_SHAPES)
def test_swept_and_mixed_plans_equal_plain_enumeration(name: str) -> None:
    """Padders, coverage and excess are enumerated with loops that know no interval and no crossing."""
    answered = sum(agree(seed, SWEPT_SHAPES[name]) > 0 for seed in range(40))
    assert answered > 4, "the sample must hold plans, not only refusals"


@pytest.mark.parametrize("name", MOVED_SHAPES)
def test_bands_of_a_moving_inductance_equal_plain_enumeration(name: str) -> None:
    """Sliding core, moving contact and variometer: L and the self-capacitance differ at the two ends."""
    answered = sum(agree(seed, MOVED_SHAPES[name]) > 0 for seed in range(40))
    assert answered > 4, "the sample must hold plans, not only refusals"


@pytest.mark.slow
@pytest.mark.parametrize("name", MOVED_SHAPES)
def test_bands_of_a_moving_inductance_equal_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1300):
        agree(seed, MOVED_SHAPES[name])


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


def swept_problems(count: int) -> Iterator[Problem]:
    for seed in range(count):
        yield random_swept_problem(seed, bands=2, swept=2, coupled=seed % 2 == 0)


def test_every_column_of_a_swept_band_equals_plain_enumeration() -> None:
    """The best plans alone would not show a covering choice that is lost further down."""
    seen = 0
    for problem in swept_problems(100):
        source = ColumnSource(problem)
        species = {part: s for s, options in enumerate(problem.options) for part in options}
        species[None] = None
        for coil in range(problem.coils):
            for band in range(problem.bands):
                wanted = {}
                for c in band_columns(problem, coil, band):
                    across = c["parts"] if c["series"] is None else c["parts"][:-1]
                    spelled = tuple(species[p] for p in across), c["shape"], species[c["series"]]
                    wanted[spelled] = c["excess"]
                levels = range(problem.least_parts, problem.most_parts + 1)
                found = Columns.join([source.columns(coil, band, parts) for parts in levels])
                got = {}
                for row in range(len(found)):
                    across = tuple(species[p] for p in found.network_parts(row))
                    spelled = across, int(found.shape[row]), species[found.series_padder(row)]
                    got[spelled] = float(found.excess[row])
                assert got == pytest.approx(wanted, abs=1e-9)
                seen += len(got)
    assert seen > 400


def test_no_excess_is_below_its_bound() -> None:
    """A bound above a choice would let the search stop before that choice."""
    compared = 0
    for problem in swept_problems(80):
        problem = replace(problem, inductors=2)  # else a coil that fails at one band is left out at all
        source = ColumnSource(problem)
        for parts in range(problem.most_parts + 1):
            bound = source.least_excesses(parts)
            for coil in range(problem.coils):
                for band in range(problem.bands):
                    excess = source.columns(coil, band, parts).excess
                    assert np.all(excess >= bound[coil, band] - 1e-9)
                    compared += len(excess)
    assert compared > 500


def test_without_series_inductance_the_bound_of_the_excess_is_reached() -> None:
    """A bound that is merely low would make the search slow without anybody seeing why."""
    reached = 0
    for seed in range(80):
        problem = random_swept_problem(seed, bands=1, swept=1)
        problem = replace(
            problem,
            species_low=problem.species,
            lead_inductance=0.0,
            q_limit=problem.q_limit * 0,
            drift_limit=float("inf"),
            part_stock=problem.part_stock * 0 + PLENTY,
            tuning_share=float("inf"),
        )
        source = ColumnSource(problem)
        levels = range(problem.least_parts, problem.most_parts + 1)
        bound = source.least_excesses(problem.most_parts)
        for coil in np.flatnonzero(np.isfinite(bound[:, 0])):
            columns = Columns.join([source.columns(int(coil), 0, parts) for parts in levels])
            assert columns.excess.min() == pytest.approx(bound[coil, 0], rel=1e-9)
            reached += 1
    assert reached > 40


def test_a_wider_margin_never_lowers_the_first_excess() -> None:
    """Every plan that covers more covers less too."""
    compared = 0
    for problem in swept_problems(60):
        problem = replace(problem, by="error")
        wider = replace(problem, margin=problem.margin + 0.005)
        before, after = found_in(problem).choices, found_in(wider).choices
        if after:
            assert before and before[0].key[1] <= after[0].key[1]
            compared += 1
    assert compared > 5


def test_packed_bounds_fit_into_63_bits() -> None:
    """A step that runs over would turn the first plan into the last."""
    for kind in ({"bands": 2}, {"bands": 2, "swept": 2}, {"bands": 2, "swept": 1}):
        problem = random_swept_problem(1, **kind) if "swept" in kind else random_problem(1, **kind)
        for by in ("build", "error", "price"):
            fields = packed_fields(problem, by)
            most = pack({name: np.array([2**62]) for name in fields}, fields)
            assert 0 < int(most[0]) < 2**63
            if by == "build":
                widths = pack({name: np.array([int(name == "pieces")]) for name in fields}, fields)
                assert int(widths[0]) == 1 << BELOW_PIECES


def test_a_larger_stock_never_makes_the_first_plan_worse() -> None:
    """Lifting the stock can only add plans."""
    fixed = [random_problem(seed, bands=2, coupled=True) for seed in range(60)]
    for problem in [*fixed, *swept_problems(60)]:
        richer = replace(problem, part_stock=problem.part_stock * 0 + PLENTY)
        before, after = found_in(problem).choices, found_in(richer).choices
        if before:
            assert after and after[0].key <= before[0].key
