"""The limit `alignable` inside the search: against every corner, against HiGHS, and against drawn builds."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from scipy.optimize import LinearConstraint, milp
from tiny.brute_force import band_columns, ranking
from tiny.brute_force_alignment import aligned_columns
from tiny.brute_force_alignment import with_tolerances as varying
from tiny.random_problem import random_problem, random_swept_problem

from partpick.catalogue import load_catalogue
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.alignment import alignable, swept_alignable
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


WAYS = {  # bands, of them swept, coils at most, share of bands with a trimmer
    "one band": (1, 0, 1, 0.6),
    "two bands": (2, 0, 1, 0.8),
    "a coil each": (2, 0, 2, 0.5),
    "three bands, two coils": (3, 0, 2, 0.8),
    "one swept band": (1, 1, 1, 0.6),
    "two swept bands": (2, 2, 2, 0.6),
    "swept and fixed": (2, 1, 2, 0.7),
}


def equal_to_a_trial_of_every_corner(way: str, seeds: range) -> int:
    """Compare the search with plain enumeration; return how many of the problems had an answer."""
    bands, swept, inductors, trimmed = WAYS[way]
    answered = 0
    for seed in seeds:
        shape = {"bands": bands, "inductors": inductors, "coupled": seed % 3 == 0}
        plain = random_swept_problem(seed, swept=swept, **shape) if swept else random_problem(seed, **shape)
        problem = varying(plain, seed, trimmed=trimmed)
        if bands > 2:
            problem = replace(problem, most_parts=1)
        found = search_bands(problem, ColumnSource(problem), wanted=50, all_windings=False, monitor=Quiet())
        wanted, front = ranking(problem, aligned_columns)
        assert [choice.key for choice in found.choices] == wanted, f"{way}, seed {seed}"
        assert [choice.key for choice in found.choices] == sorted(choice.key for choice in found.choices)
        shown = [sum(int(c.pieces[0]) for c in choice.columns) + len(choice.coils) for choice in found.front]
        assert shown == [pieces for pieces, _ in front], f"{way}, seed {seed}"
        answered += bool(wanted)
    return answered


@pytest.mark.parametrize("way", WAYS)
def test_coils_that_adjust_and_swept_bands_equal_a_trial_of_every_corner(way: str) -> None:
    """With coil and trimmer together, alone or shared, fixed or swept."""
    assert equal_to_a_trial_of_every_corner(way, range(16)) > 1


@pytest.mark.slow
@pytest.mark.parametrize("way", WAYS)
def test_many_plans_equal_a_trial_of_every_corner(way: str) -> None:
    """The same at length."""
    assert equal_to_a_trial_of_every_corner(way, range(100, 400)) > 30


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


DRAWS = 200_000


def one_circuit(*, swept: bool, adjust: float, alone: bool, trimmer: tuple[float, float]) -> Problem:
    """Return one coil and one band that wants 70 pF at its target, two parts and a padder of 330 pF."""
    plain = with_tolerances(3, 0.5, bands=1)
    low_end = plain.frequency * 0.8
    return replace(
        plain,
        share=np.inf,
        lead_inductance=0.0,
        wanted=np.full((1, 1), 70e-12),
        self_capacitance=np.full(1, 1e-12),
        coil_spread=np.full(1, 0.04),
        coil_adjust=np.full(1, adjust),
        coil_alone=alone,
        part_value=(Fraction(22, 10**12), Fraction(33, 10**12), Fraction(330, 10**12)),
        part_tolerance=np.full(3, 0.05),
        trimmer_low=np.array([trimmer[0]]),
        trimmer_high=np.array([trimmer[1]]),
        swept=np.array([swept]),
        low_end=low_end,
        inductance_low=np.full((1, 1), 1.0 / ((2 * math.pi * plain.frequency[0]) ** 2 * 70e-12)),
        tuning_low=np.array([12e-12]),
        tuning_high=np.array([66e-12]),
        tuning_tolerance=0.03,
    )


def drawn_share(problem: Problem, values: list[float], padder: float | None) -> float:
    """Return the share of uniformly drawn builds that some setting brings right."""
    drawn = np.random.default_rng(5).uniform(-1, 1, (len(values) + 5, DRAWS))
    deviation, adjust = 0.04 * drawn[0], problem.coil_adjust[0]
    fixed = 3e-12 * (1 + 0.3 * drawn[1]) + 1e-12 * (1 + 0.3 * drawn[2])
    fixed = fixed + sum(v * (1 + 0.05 * x) for v, x in zip(values, drawn[5:], strict=True))
    least, most = (1 + deviation) * (1 - adjust), (1 + deviation) * (1 + adjust)
    if not problem.coil_alone:
        least = most = np.clip(1.0, least, most)
    shortest, longest = problem.trimmer_low[0], problem.trimmer_high[0]
    if not problem.swept[0]:
        down, up = 70e-12 / (fixed + longest), 70e-12 / (fixed + shortest)
    else:
        ends = [t * (1 + 0.03 * drawn[3]) for t in (66e-12, 12e-12)]
        if padder is not None:
            ends = [t * padder * (1 + 0.05 * drawn[4]) / (t + padder * (1 + 0.05 * drawn[4])) for t in ends]
        low, high = ends[0] + fixed, ends[1] + fixed
        wide = 70e-12 / 0.8**2
        down, up = np.maximum(wide / (low + longest), (wide - 70e-12) / (low - high)), 70e-12 / (high + shortest)
    return float(np.mean(np.maximum(down, least) <= np.minimum(up, most)))


@pytest.mark.parametrize("adjust", [0.0, 0.015, 0.06])
@pytest.mark.parametrize("alone", [True, False])
@pytest.mark.parametrize("trimmer", [(6e-12, 13e-12), (11e-12, 11e-12)])
def test_the_share_agrees_with_drawn_builds(adjust: float, alone: bool, trimmer: tuple[float, float]) -> None:
    """The closed form for a share of builds against uniform draws of every part, within sampling and shape."""
    problem = one_circuit(swept=False, adjust=adjust, alone=alone, trimmer=trimmer)
    share = drawn_share(problem, [22e-12, 33e-12], None)
    values = np.array([[22e-12, 33e-12]])
    for asked, expected in ((share - 0.04, True), (share + 0.04, False)):
        if 0.0 < asked < 1.0:
            given = replace(problem, alignable=asked)
            answer = alignable(given, 0, 0, values, np.array([[0, 1]]), np.zeros(1, dtype=np.int8))
            assert bool(answer[0]) is expected, (share, asked)
    moves = adjust > 0 and alone
    assert share > 0.2 or (trimmer[0] == trimmer[1] and not moves)  # one setting for all is right by chance only


@pytest.mark.parametrize("padder", [None, 330e-12])
@pytest.mark.parametrize(("adjust", "alone"), [(0.0, True), (0.06, True), (0.06, False), (0.015, False)])
@pytest.mark.parametrize("trimmer", [(3e-12, 9e-12), (2e-12, 20e-12)])
def test_the_share_of_a_swept_band_agrees_with_drawn_builds(
    padder: float | None, adjust: float, alone: bool, trimmer: tuple[float, float]
) -> None:
    """What it promises is there within the normal law's 4 %, and it is not far below."""
    problem = one_circuit(swept=True, adjust=adjust, alone=alone, trimmer=trimmer)
    share = drawn_share(problem, [33e-12], padder)
    values, chosen, shape = np.array([[33e-12]]), np.array([[1]]), np.zeros(1, dtype=np.int8)
    behind = None if padder is None else np.array([2])
    acting = None if padder is None else (np.array([padder]), np.array([padder]))

    def promised(asked: float) -> bool:
        given = replace(problem, alignable=asked)
        return bool(swept_alignable(given, 0, 0, (values, values), chosen, shape, behind, acting)[0])

    if share + 0.04 < 1.0:
        assert not promised(share + 0.04), share
    if share > 0.2:
        assert promised(share - 0.15), share


def test_a_worst_case_without_a_trimmer_is_refused_with_the_reason() -> None:
    """Contradictory demands: nothing can be aligned without something to align it with."""
    tables = {
        "limits": {"alignable": "worst case"},
        "coil": {"forms": ["ring core"]},  # rings do not adjust
        "capacitors": {"series": "E6"},
        "band": [{"name": "beacon", "at": "3.58 MHz"}],
    }
    result = solve(request_from_tables(tables, "bands"), load_catalogue(None), top=1)
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "alignable"
    assert "trimmer" in result.ruled_out_by.text and "beacon" in result.ruled_out_by.text


def test_one_slug_does_not_align_two_bands() -> None:
    """Each band may want the coil elsewhere; with a coil each it does."""
    bands = [{"name": "beacon", "at": "3.58 MHz"}, {"name": "weather", "at": "7.1 MHz"}]
    tables = {"limits": {"alignable": "worst case"}, "coil": {"forms": ["bought"]}, "band": bands}
    result = solve(request_from_tables(tables, "bands"), load_catalogue(None), top=1)
    assert result.proof.status == "infeasible" and result.ruled_out_by is not None
    said = [ruled.limit for ruled in (result.ruled_out_by, *result.ruled_out_by.others)]
    assert {"alignable", "inductors"} <= set(said)


PLANS = {
    "a slug alone": {"band": [{"name": "beacon", "at": "3.58 MHz"}]},
    "a slug for each band": {
        "band": [{"name": "beacon", "at": "3.58 MHz"}, {"name": "weather", "at": "7.1 MHz"}],
        "limits": {"inductors": 2},
        "coil": {"forms": ["bought"]},
    },
    "one slug and trimmers": {
        "band": [{"name": "beacon", "at": "3.58 MHz"}, {"name": "weather", "at": "7.1 MHz"}],
        "trimmer": {"low": "4 pF", "high": "50 pF"},
    },
    "taps and trimmers": {
        "band": [{"name": "beacon", "at": "3.58 MHz"}, {"name": "weather", "at": "7.1 MHz"}],
        "trimmer": {"low": "4 pF", "high": "50 pF"},
        "coil": {"taps": True, "forms": ["rod core"]},
    },
    "swept by a variable capacitor": {
        "band": [
            {"name": "coast", "from": "3.5 MHz", "to": "3.8 MHz"},
            {"name": "sea", "from": "4.4 MHz", "to": "4.65 MHz"},
        ],
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "180 pF", "tolerance": "2 %"},
        "trimmer": {"low": "4 pF", "high": "50 pF"},
        "coil": {"forms": ["multilayer", "bought"]},
    },
    "swept, trimmer and slug": {
        "band": [{"name": "coast", "from": "3.5 MHz", "to": "3.8 MHz"}],
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "180 pF"},
        "trimmer": {"low": "3 pF", "high": "25 pF"},
        "coil": {"forms": ["bought", "pot core"]},
    },
}


@pytest.mark.parametrize("name", PLANS)
@pytest.mark.parametrize("asked", ["worst case", "90 %"])
def test_plans_of_the_shipped_parts_keep_what_they_promise(name: str, asked: str) -> None:
    """The figures of the built units, which come from the parts alone, agree with the limit of the search."""
    plan = PLANS[name]
    tables = {**plan, "limits": {**plan.get("limits", {}), "alignable": asked}}
    result = solve(request_from_tables(tables, "bands"), load_catalogue(None), top=3)
    assert result.candidates
    for candidate in result.candidates:
        figures = candidate.extra["alignment"]
        assert isinstance(figures, dict)
        if asked == "worst case":
            assert figures["worst_case_aligned"], candidate.coils
        assert figures["share_over_full_travel"] > (0.999 if asked == "worst case" else 0.7)
