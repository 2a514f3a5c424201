"""Plain enumeration of tiny stacked and shared plans: shares no code with the search, only its input arrays.

Every coil, every multiset of parts, every subset in circuit at every band, one after the other.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter
from fractions import Fraction

from partpick.search.problem import NEVER, Problem
from tiny.brute_force import weights

ROUNDING = 1e-11  # a design exactly on a limit is inside it


def circuit(problem: Problem, coil: int, band: int, parts: tuple[int, ...]):
    """Return the figures of some parts in parallel across a coil at a band, None outside a limit."""
    if not problem.in_play[coil, band]:
        return None
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    c = [float(problem.species[band][of_part[p]]) for p in parts]
    if not all(math.isfinite(x) for x in c):
        return None
    net = math.fsum(c)
    if problem.lead_inductance > 0:
        net = net / (1 - (2 * math.pi * problem.frequency[band]) ** 2 * problem.lead_inductance * net)
    low, high = problem.trimmer_low[band], problem.trimmer_high[band]
    middle = (low + high) / 2
    strays = problem.self_capacitance[coil] + problem.stray[band]
    wanted = problem.wanted[coil, band]
    total = net + strays + middle
    error = math.sqrt(wanted / total) - 1
    if not abs(error) <= problem.error_limit[band] * (1 + ROUNDING):
        return None
    if high > 0 and not low - ROUNDING * wanted <= wanted - net - strays <= high + ROUNDING * wanted:
        return None
    if parts and strays / total > problem.share * (1 + ROUNDING):
        return None
    slopes = weights(problem, parts, 0, c, problem.frequency[band])
    portion = [x * net / total for x in slopes]
    loss = problem.coil_loss[coil, band] + middle / total * problem.trimmer_loss[band]
    loss += sum(x * problem.part_loss[band][p] for x, p in zip(portion, parts, strict=True))
    if problem.q_limit[band] > 0 and not 1 / loss >= problem.q_limit[band] * (1 - ROUNDING):
        return None
    if math.isfinite(problem.drift_limit):
        set_to = min(max(wanted - net - strays, low), high)
        whole = net + strays + set_to
        portion = [x * net / whole for x in slopes]
        tempco = sum(x * problem.part_tempco[p] for x, p in zip(portion, parts, strict=True))
        tempco += (strays * problem.stray_tempco + set_to * problem.trimmer_tempco[band]) / whole
        spread = problem.coil_tempco_spread[coil]
        spread += sum(x * problem.part_tempco_spread[p] for x, p in zip(portion, parts, strict=True))
        size = abs(problem.coil_tempco[coil, band] + tempco) / 2 + spread / 2
        if not size <= problem.drift_limit * (1 + ROUNDING):
            return None
    q_class = 5
    if math.isfinite(loss):
        q_class = max(0, math.ceil((1 - 1 / loss / problem.q_enough[band]) / 0.25 - 1e-9))
    share = strays / total
    return {
        "parts": tuple(sorted(parts, key=lambda p: int(problem.part_rank[p]))),
        "error": error,
        "q_class": q_class,
        "stray_class": 0 if share <= 0.1 else 1 if share <= 0.2 else 2,
        "reactance_class": int(problem.reactance_class[coil, band]),
    }


def described(problem: Problem, coil: int, parts):
    """Return what orders equal circuits: values, connection in parallel without series padder, grades, coil."""
    ranks = sorted((int(problem.part_rank[p]), p) for p in parts)
    values = tuple(sorted((problem.part_value[p] for p in parts), key=Fraction))
    return values, (0, -1), tuple(rank for rank, _ in ranks), int(problem.coil_rank[coil]), 0


def plan_key(problem: Problem, coil: int, pieces, columns, content, by: str):
    """Return the order of a plan of these physical pieces, or None where a shared limit rules it out."""
    used = Counter(pieces)
    if any(count > problem.part_stock[p] for p, count in used.items()):
        return None
    if used.total() > problem.parts_limit:
        return None
    if len({problem.part_value[p] for p in used}) > problem.values_limit:
        return None
    price = min(sum(int(problem.part_price[p]) for p in pieces) + int(problem.coil_price[coil]), NEVER)
    if problem.price_limit < NEVER and price > problem.price_limit:
        return None
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    worst = max(abs(column["error"]) for column in columns)
    rest = (
        round(max(worst, problem.floor) * 1e9),
        0,  # no swept band, no excess
        max(column["q_class"] for column in columns),
        max(column["stray_class"] for column in columns),
        max(column["reactance_class"] for column in columns),
        tuple(int(e) for e in problem.effort[coil]),
        sum(int(problem.commonness[of_part[p]]) for p in pieces),
        round(worst * 1e9),
    )
    count = len(pieces) + 1
    if by == "build":
        return (count, *rest, price, content)
    if by == "error":
        return (round(max(worst, 1e-9) * 1e12), 0, count, *rest, price, content)
    return (price, count, *rest, content)


def stacked_plans(problem: Problem, by: str):
    """Yield (coil, key, pieces, worst error) of every admissible stack."""
    parts = sorted((p for o in problem.options for p in o), key=lambda p: int(problem.part_rank[p]))
    falling = sorted(range(problem.bands), key=lambda b: -problem.frequency[b])

    def stacks(coil: int, place: int, added, columns):
        if place == len(falling):
            yield added, columns
            return
        for k in range(0 if place == 0 else 1, problem.most_parts + 1):
            for own in itertools.combinations_with_replacement(parts, k):
                inside = [p for a in added for p in a] + list(own)
                column = circuit(problem, coil, falling[place], tuple(inside))
                if column is not None:
                    yield from stacks(coil, place + 1, [*added, own], [*columns, column])

    for coil in range(problem.coils):
        if problem.support_stock[problem.support[coil]] < 1:
            continue
        for added, columns in stacks(coil, 0, [], []):
            pieces = [p for own in added for p in own]
            by_frequency = tuple(described(problem, coil, own) for own in reversed(added))
            content = ((int(problem.coil_rank[coil]),), by_frequency)
            key = plan_key(problem, coil, pieces, columns, content, by)
            if key is not None:
                yield coil, key, len(pieces) + 1, max(abs(c["error"]) for c in columns)


def shared_plans(problem: Problem, by: str):
    """Yield (coil, key, pieces, worst error) of every admissible set in every way to switch it."""
    parts = sorted((p for o in problem.options for p in o), key=lambda p: int(problem.part_rank[p]))
    rising = sorted(range(problem.bands), key=lambda b: problem.frequency[b])
    for coil in range(problem.coils):
        if problem.support_stock[problem.support[coil]] < 1:
            continue
        known: dict[tuple[int, tuple[int, ...]], object] = {}
        for size in range(problem.parts_limit + 1):
            for members in itertools.combinations_with_replacement(parts, size):
                subsets = {s for k in range(size + 1) for s in itertools.combinations(members, k)}
                ways = []
                for band in rising:
                    for subset in subsets:
                        if (band, subset) not in known:
                            known[band, subset] = circuit(problem, coil, band, subset)
                    ways.append([c for s in sorted(subsets) if (c := known[band, s]) is not None])
                for columns in itertools.product(*ways):
                    used = tuple(described(problem, coil, column["parts"]) for column in columns)
                    values, _, ranks, rank, _ = described(problem, coil, members)
                    key = plan_key(problem, coil, members, columns, ((rank,), values, ranks, used), by)
                    if key is not None:
                        yield coil, key, size + 1, max(abs(c["error"]) for c in columns)


def ranking(problem: Problem, plans):
    """Return the best key of each support, best first, and the front of error against pieces."""
    best: dict[int, tuple] = {}
    least: dict[int, float] = {}
    for coil, key, pieces, worst in plans(problem, problem.by):
        support = int(problem.support[coil])
        if support not in best or key < best[support]:
            best[support] = key
        least[pieces] = min(least.get(pieces, math.inf), worst)
    front, last = [], math.inf
    for pieces in sorted(least):
        if least[pieces] < last - 1e-9:
            last = least[pieces]
            front.append((pieces, last))
    return sorted(best.values()), front
