"""Plain enumeration of tiny receivers: every pair of coils with every network, the tracking error by bisection.

Shares no code with the search, only its input arrays and the plain enumeration of swept bands.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter
from dataclasses import replace

import numpy as np

from partpick.search.problem import NEVER, Problem
from tiny.brute_force import acting, swept_columns

POINTS = 121


def circuit(problem: Problem, band: int, column):
    """Return inductance, capacitance across the coil and reciprocal of the padder at both ends of a band."""
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    across = list(column["parts"])
    if column["series"] is not None:
        across.remove(column["series"])
    coil = column["coil"]
    fixed = problem.self_capacitance[coil] + problem.stray[band]
    fixed += (problem.trimmer_low[band] + problem.trimmer_high[band]) / 2
    high_inductance = 1 / ((2 * math.pi * problem.frequency[band]) ** 2 * problem.wanted[coil, band])
    ends = []
    for species, frequency, inductance in (
        (problem.species_low[band], problem.low_end[band], problem.inductance_low[coil, band]),
        (problem.species[band], problem.frequency[band], high_inductance),
    ):
        net = acting(problem, sum(species[of_part[p]] for p in across), frequency)
        padder = 0.0 if column["series"] is None else 1 / species[of_part[column["series"]]]
        ends.append((inductance, fixed + net, padder))
    return ends


def at(problem: Problem, band: int, ends, frequency):
    """Return the three on straight lines between the ends."""
    low, high = problem.low_end[band], problem.frequency[band]
    t = (frequency - low) / (high - low)
    return [a * (1 - t) + b * t for a, b in zip(*ends, strict=True)]


def points(low: float, high: float):
    """Return where tracking is looked at."""
    return np.array([(low + high) / 2 - (high - low) / 2 * math.cos(math.pi * k / (POINTS - 1)) for k in range(POINTS)])


def worst_errors(problem: Problem, band, own, companions):
    """Return the worst tracking error of one signal circuit with each oscillator. [Hz]"""
    f = points(problem.low_end[band.signal], problem.frequency[band.signal])
    inductance, across, elastance = at(problem, band.signal, circuit(problem, band.signal, own), f)
    behind = 1 / (4 * math.pi**2 * f**2 * inductance) - across
    section = 1 / (1 / behind - elastance)
    if not companions:
        return []
    # (2 ends, 3 figures, companions, 1)
    every = np.array([circuit(problem, band.oscillator, column) for column in companions]).transpose(1, 2, 0)[..., None]
    wanted = f[None, :] + band.offset
    low, high = wanted * 0.4, wanted * 2.5
    for _ in range(52):  # resonance is where w^2 L C, which rises, is one
        g = (low + high) / 2
        inductance, across, elastance = at(problem, band.oscillator, every, g)
        total = across + 1 / (1 / section[None, :] + elastance)
        above = 4 * math.pi**2 * g**2 * inductance * total > 1
        low, high = np.where(above, low, g), np.where(above, g, high)
    return np.abs(g - wanted).max(axis=1).tolist()


def pairs(problem: Problem, band):
    """Return every admissible pair of one band with its figures."""
    free = replace(problem, margin=-0.6, excess_limit=math.inf)
    signals = [c for j in range(problem.coils) if problem.in_play[j, band.signal]
               for c in swept_columns(problem, j, band.signal)]  # fmt: skip
    others = [c for j in range(problem.coils) if problem.in_play[j, band.oscillator]
              for c in swept_columns(free, j, band.oscillator)]  # fmt: skip
    found = []
    for own in signals:
        for other, error in zip(others, worst_errors(problem, band, own, others), strict=True):
            if error <= band.limit and own["coil"] != other["coil"]:
                found.append((error, own, other))
    return found


def inside(problem: Problem, columns, coils):
    """Whether stock and the limits of a whole plan allow it."""
    used = Counter(p for column in columns for p in column["parts"])
    supports = Counter(int(problem.support[j]) for j in coils)
    price = sum(column["price"] for column in columns) + sum(int(problem.coil_price[j]) for j in coils)
    return (
        all(count <= problem.part_stock[p] for p, count in used.items())
        and all(count <= problem.support_stock[s] for s, count in supports.items())
        and used.total() <= problem.parts_limit
        and len({problem.part_value[p] for p in used}) <= problem.values_limit
        and (problem.price_limit >= NEVER or price <= problem.price_limit)
    )


def content(problem: Problem, column):
    """Return the last step of the order for one circuit."""
    series = column["series"]
    return (
        tuple(sorted(problem.part_value[p] for p in column["parts"])),
        (column["shape"], -1 if series is None else int(problem.part_rank[series])),
        tuple(int(problem.part_rank[p]) for p in column["parts"]),
        int(problem.coil_rank[column["coil"]]),
        0,
    )


def figures(problem: Problem, band, error, own, other):
    """Return the steps of the order of one band."""
    coils, both = (own["coil"], other["coil"]), (own, other)
    pieces = len(own["parts"]) + len(other["parts"]) + 2
    price = sum(c["price"] for c in both) + sum(int(problem.coil_price[j]) for j in coils)
    classes = [max(c[name] for c in both) for name in ("q_class", "stray_class", "reactance_class")]
    effort = [int(sum(problem.effort[j][i] for j in coils)) for i in range(3)]
    common, fine = sum(c["commonness"] for c in both), round(error / band.limit * 1e9)
    if problem.by == "error":
        return (fine, pieces, *classes, *effort, common, min(price, NEVER))
    return (pieces, round(error / band.limit * 1e3), *classes, *effort, common, fine, min(price, NEVER))


def ranking(problem: Problem, bands):
    """Return the best key of each choice of supports, best first, and the front of the error's share of its limit."""
    best: dict[object, tuple] = {}
    least: dict[int, float] = {}
    for plan in itertools.product(*(pairs(problem, band) for band in bands)):
        columns = [column for _, own, other in plan for column in (own, other)]
        coils = [column["coil"] for column in columns]
        if len(set(coils)) < len(coils) or not inside(problem, columns, coils):
            continue
        steps = [figures(problem, band, *pair) for band, pair in zip(bands, plan, strict=True)]
        key = (*(sum(step) for step in zip(*steps, strict=True)),
               tuple((content(problem, own), content(problem, other)) for _, own, other in plan))  # fmt: skip
        group = tuple(int(problem.support[j]) for j in coils)
        if group not in best or key < best[group]:
            best[group] = key
        pieces = len(coils) + sum(len(column["parts"]) for column in columns)
        worst = max(error / band.limit for band, (error, _, _) in zip(bands, plan, strict=True))
        least[pieces] = min(least.get(pieces, math.inf), worst)
    front, last = [], math.inf
    for pieces in sorted(least):
        if least[pieces] < last - 1e-9:
            last = least[pieces]
            front.append((pieces, last))
    return sorted(best.values()), front
