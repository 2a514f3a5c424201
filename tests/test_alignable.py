"""The limit `alignable` inside the search: against every corner, against HiGHS, and against drawn builds."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import LinearConstraint, milp
from tiny.brute_force import band_columns, ranking
from tiny.random_problem import random_problem

from partpick.catalogue import load_catalogue
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.alignment import alignable
from partpick.search.bands import search_bands
from partpick.search.columns import ColumnSource
from partpick.search.problem import NEVER, PLENTY, Problem
from partpick.solving import solve


def with_tolerances(seed: int, share: float, **shape: int) -> Problem:
    """Return a random problem whose bands all have a trimmer and whose parts have tolerances."""
    problem = random_problem(seed, **shape)
    rng = np.random.default_rng(seed + 10_000)
    bands = problem.bands
    return replace(
        problem,
        error_limit=np.full(bands, np.inf),
        trimmer_low=np.full(bands, 2e-12),
        trimmer_high=rng.choice([12e-12, 25e-12], bands),
        trimmer_loss=np.full(bands, 1 / 400),
        trimmer_tempco=np.full(bands, -200e-6),
        alignable=share,
        coil_spread=rng.choice([0.0, 0.01, 0.03], problem.coils),
        part_tolerance=rng.choice([0.0, 0.01, 0.05], len(problem.part_value)),
        stray_tolerance=0.3,
    )


def network_of(values: list[float], shape: int) -> float:
    if not values:
        return 0.0
    if shape == 0:
        return sum(values)
    if shape == 1:
        return 1 / sum(1 / v for v in values)
    a, b, c = values
    return a + b * c / (b + c) if shape == 2 else a * (b + c) / (a + b + c)


def every_corner_is_reached(problem: Problem, coil: int, band: int, column: dict) -> bool:
    """Try every combination of extremes, one after the other."""
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    parts = column["parts"]
    nominal = [problem.species[band][of_part[p]] for p in parts]
    strays = problem.self_capacitance[coil] + problem.stray[band]
    for signs in itertools.product((-1, 1), repeat=len(parts) + 2):
        *of_parts, of_coil, of_strays = signs
        values = [v * (1 + s * problem.part_tolerance[p]) for v, s, p in zip(nominal, of_parts, parts, strict=True)]
        wanted = problem.wanted[coil, band] / (1 + of_coil * problem.coil_spread[coil])
        setting = wanted - network_of(values, column["shape"]) - strays * (1 + of_strays * problem.stray_tolerance)
        slack = 1e-11 * wanted
        if not problem.trimmer_low[band] - slack <= setting <= problem.trimmer_high[band] + slack:
            return False
    return True


@pytest.mark.parametrize("shape", [{"bands": 1}, {"bands": 2}, {"bands": 2, "coupled": True}], ids=str)
def test_worst_case_plans_equal_a_trial_of_every_corner(shape: dict[str, int]) -> None:
    """Nothing on offer may fail at a corner, and nothing that passes all of them may be left out."""
    answered = 0
    for seed in range(110):
        problem = with_tolerances(seed, 1.0, **shape)
        found = search_bands(problem, ColumnSource(problem), wanted=50, all_windings=False, monitor=Quiet())

        def columns(p: Problem, coil: int, band: int) -> list[dict]:
            return [c for c in band_columns(p, coil, band) if every_corner_is_reached(p, coil, band, c)]

        wanted, _ = ranking(problem, columns)
        assert [choice.key for choice in found.choices] == wanted, f"seed {seed}"
        answered += bool(wanted)
    assert answered > 8


def test_fewest_pieces_equal_highs_on_the_linear_rows() -> None:
    """Parallel capacitors make the corners linear in the counts of parts; HiGHS settles them independently."""
    compared = 0
    for seed in range(160):
        problem = with_tolerances(seed, 1.0, bands=1)
        problem = replace(
            problem,
            connect_any=False,
            q_limit=np.zeros(1),
            drift_limit=np.inf,
            share=np.inf,
            price_limit=NEVER,
            by="build",
            part_stock=problem.part_stock * 0 + PLENTY,
        )
        found = search_bands(problem, ColumnSource(problem), wanted=1, all_windings=False, monitor=Quiet())
        best = min((_highs(problem, j) for j in range(problem.coils)), default=math.inf)
        got = found.choices[0].key[0] - 1 if found.choices else math.inf
        assert got == best, f"seed {seed}"
        compared += math.isfinite(best)
    assert compared > 15


def _highs(problem: Problem, coil: int) -> float:
    """Return the least count of parts that reaches both extreme corners, inf where none does."""
    if not problem.in_play[coil, 0] or problem.support_stock[problem.support[coil]] < 1:
        return math.inf
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    values = np.array([problem.species[0][of_part[p]] for p in range(len(problem.part_value))]) * 1e12
    delta, tau = problem.part_tolerance, problem.coil_spread[coil]
    wanted = problem.wanted[coil, 0] * 1e12
    strays = (problem.self_capacitance[coil] + problem.stray[0]) * 1e12
    least = wanted / (1 - tau) - problem.trimmer_high[0] * 1e12 - strays * 0.7
    most = wanted / (1 + tau) - problem.trimmer_low[0] * 1e12 - strays * 1.3
    nominal = wanted - strays
    rows = [
        LinearConstraint(values * (1 - delta), least - 1e-6, np.inf),
        LinearConstraint(values * (1 + delta), -np.inf, most + 1e-6),
        LinearConstraint(values, nominal - problem.trimmer_high[0] * 1e12 - 1e-6, nominal - 2 + 1e-6),
        LinearConstraint(np.ones(len(values)), problem.least_parts, problem.most_parts),
    ]
    answer = milp(np.ones(len(values)), constraints=rows, integrality=np.ones(len(values)))
    return round(answer.fun) if answer.success else math.inf


def test_the_share_agrees_with_drawn_builds() -> None:
    """The closed form for a share of builds against uniform draws of every part, within sampling and shape."""
    rng = np.random.default_rng(5)
    problem = replace(with_tolerances(3, 0.5, bands=1), share=np.inf)
    values = np.array([[22e-12, 33e-12]])
    problem = replace(
        problem,
        wanted=np.full((problem.coils, 1), 70e-12),
        coil_spread=np.full(problem.coils, 0.04),
        part_tolerance=np.full(len(problem.part_value), 0.05),
        trimmer_low=np.array([6e-12]),
        trimmer_high=np.array([13e-12]),
    )
    drawn = rng.uniform(-1, 1, (4, 400_000))
    wanted = 70e-12 / (1 + 0.04 * drawn[0])
    fixed = 22e-12 * (1 + 0.05 * drawn[1]) + 33e-12 * (1 + 0.05 * drawn[2]) + 4e-12 * (1 + 0.3 * drawn[3])
    share = float(np.mean((wanted - fixed >= 6e-12) & (wanted - fixed <= 13e-12)))
    chosen, shape = np.zeros((1, 2), dtype=np.int64), np.zeros(1, dtype=np.int8)
    for asked, expected in ((share - 0.02, True), (share + 0.02, False)):
        given = replace(problem, alignable=asked)
        assert bool(alignable(given, 0, 0, values, chosen, shape)[0]) is expected


def test_a_worst_case_without_a_trimmer_is_refused_with_the_reason() -> None:
    """Contradictory demands: nothing can be aligned without something to align it with."""
    tables = {"limits": {"alignable": "worst case"}, "band": [{"name": "beacon", "at": "3.58 MHz"}]}
    result = solve(request_from_tables(tables, "bands"), load_catalogue(None), top=1)
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "alignable" and "trimmer" in result.ruled_out_by.text
