"""Whether a plan of a tiny problem can be aligned, tried corner by corner: shares no code with the search."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np

from partpick.search.problem import Problem
from tiny.brute_force import acting, band_columns, value

SLACK = 1e-11


def off_value(problem: Problem, acting_as: float, part: int, off: float) -> float:
    """Return how a capacitor acts that is off its value, its own inductance unchanged."""
    written = float(problem.part_value[part])
    bend = 1 / written - 1 / acting_as  # (2 pi f)^2 times the series inductance
    changed = written * (1 + off)
    return changed / (1 - bend * changed)


def builds(problem: Problem, coil: int, band: int, column: dict):
    """Yield (coil deviation, capacitance at the lower end, at the upper end) of every corner, trimmer aside."""
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    padder = column["series"]
    across = list(column["parts"][:-1] if padder is not None else column["parts"])
    pieces = across + ([] if padder is None else [padder])
    own, wiring = problem.self_capacitance[coil], problem.stray[band]
    for signs in itertools.product((-1, 1), repeat=len(pieces) + 4):
        *of_pieces, of_coil, of_own, of_wiring, of_element = signs
        ends = []
        for species, element, frequency in (
            (problem.species_low, problem.tuning_high, problem.low_end[band]),
            (problem.species, problem.tuning_low, problem.frequency[band]),
        ):
            values = [
                off_value(problem, species[band][of_part[p]], p, sign * problem.part_tolerance[p])
                for p, sign in zip(pieces, of_pieces, strict=True)
            ]
            network = value(column["shape"], values[: len(across)]) if across else 0.0
            total = acting(problem, network, frequency)
            total += own * (1 + of_own * problem.stray_tolerance) + wiring * (1 + of_wiring * problem.stray_tolerance)
            if problem.swept[band]:
                tuned = element[band] * (1 + of_element * problem.tuning_tolerance)
                total += tuned if padder is None else 1 / (1 / tuned + 1 / values[-1])
            ends.append(total)
        yield of_coil * problem.coil_spread[coil], ends[0], ends[1]


def settings_of_coil(problem: Problem, coil: int, deviation: float, alone: bool) -> tuple[float, float]:
    """Return between which inductances over nominal the coil of one build is set."""
    least = (1 + deviation) * (1 - problem.coil_adjust[coil])
    most = (1 + deviation) * (1 + problem.coil_adjust[coil])
    if alone:
        return least, most
    nearest = min(max(1.0, least), most)
    return nearest, nearest


def comes_right(problem: Problem, coil: int, band: int, build: tuple[float, float, float], alone: bool) -> bool:
    """Return whether some setting of coil and trimmer brings one build right."""
    deviation, low_total, high_total = build
    least, most = settings_of_coil(problem, coil, deviation, alone)
    trimmer = problem.trimmer_low[band], problem.trimmer_high[band]
    high = problem.wanted[coil, band]
    if not problem.swept[band]:
        down, up = high / (high_total + trimmer[1]), high / (high_total + trimmer[0])
    else:
        low = 1 / ((2 * math.pi * problem.low_end[band]) ** 2 * problem.inductance_low[coil, band])
        if low_total <= high_total:
            return False
        down = max(low / (low_total + trimmer[1]), (low - high) / (low_total - high_total))
        up = high / (high_total + trimmer[0])
    return max(down, least) <= min(up, most) * (1 + SLACK)


def aligned_columns(problem: Problem, coil: int, band: int) -> list[dict]:
    """Return the columns that come right at every corner, with whether they do so on a coil of several bands."""
    found = []
    for column in band_columns(problem, coil, band):
        corners = list(builds(problem, coil, band, column))
        right = {way: all(comes_right(problem, coil, band, build, way) for build in corners) for way in (True, False)}
        if right[True]:
            found.append({**column, "shared": right[False]})
    return found


def with_tolerances(problem: Problem, seed: int, *, trimmed: float = 1.0, adjusts: bool = True) -> Problem:
    """Return the problem with tolerances, trimmers and coils that adjust, drawn by the seed alone."""
    rng = np.random.default_rng(seed + 20_000)
    bands, coils = problem.bands, problem.coils
    has = rng.random(bands) < trimmed
    wide = float(rng.choice([0.2, 0.5, 1.0]))
    free = rng.random() < 0.7  # of limits that rule most out
    return replace(
        problem,
        error_limit=np.where(has, np.inf, 0.1),
        trimmer_low=np.where(has, 2e-12, 0.0),
        trimmer_high=np.where(has, rng.choice([14e-12, 30e-12, 60e-12], bands), 0.0),
        trimmer_loss=np.where(has, 1 / 400, 0.0),
        trimmer_tempco=np.where(has, -200e-6, 0.0),
        q_limit=problem.q_limit * (0.0 if free else 1.0),
        drift_limit=np.inf if free else problem.drift_limit,
        alignable=1.0,
        coil_spread=wide * rng.choice([0.0, 0.01, 0.05], coils),
        coil_adjust=rng.choice([0.0, 0.02, 0.15], coils) if adjusts else np.zeros(coils),
        part_tolerance=wide * rng.choice([0.0, 0.01, 0.05], len(problem.part_value)),
        stray_tolerance=0.3 * wide,
        tuning_tolerance=wide * float(rng.choice([0.0, 0.01, 0.05])),
    )
