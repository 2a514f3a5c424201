"""Plain enumeration of tiny stacked and shared plans: shares no code with the search, only its input arrays.

Every set of coils, every way to share out the bands, every section, every multiset of parts, every subset
in circuit at every band, one after the other.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter
from fractions import Fraction

from partpick.search.problem import NEVER, Problem
from tiny.brute_force import bears, swept_column, weights
from tiny.random_sections import places_of

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
    frequency = problem.frequency[band]
    inductance = 1 / ((2 * math.pi * frequency) ** 2 * wanted)
    rise = net / sum(c) if c else 1.0
    on_parts = [(p, x, rise) for p, x in zip(parts, c, strict=True)]
    if not bears(problem, coil, band, frequency, inductance, loss, on_parts):
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


def swept_circuit(problem: Problem, coil: int, band: int, parts: tuple[int, ...], padder: int | None):
    """Return the figures of parts across a coil that a tuning element sweeps, None outside a limit."""
    if not problem.in_play[coil, band]:
        return None
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    every = parts if padder is None else (*parts, padder)
    if not all(math.isfinite(problem.species[band][of_part[p]]) for p in every):
        return None
    column = swept_column(problem, coil, band, of_part, padder, parts, 0)
    return None if column is None else {**column, "parts": parts}


def on_a_place(problem: Problem, sections, coil: int, band: int, parts: tuple[int, ...], padder: int | None = None):
    """Yield the figures of parts across the whole coil and across each of its sections."""
    for where, row, tap in places_of(problem, sections, coil):
        if problem.swept[band]:
            column = swept_circuit(where, row, band, parts, padder)
        else:
            column = circuit(where, row, band, parts)
        if column is not None:
            yield {"excess": 0.0, **column, "padder": padder, "coil": coil, "tap": tap}


def described(problem: Problem, parts, column):
    """Return what orders equal circuits: values, connection, grades, coil, tap; the series padder comes last."""
    padder = column["padder"]
    every = [*parts, *([] if padder is None else [padder])]
    ranks = [int(problem.part_rank[p]) for p in sorted(parts, key=lambda p: int(problem.part_rank[p]))]
    in_series = -1
    if padder is not None:
        in_series = int(problem.part_rank[padder])
        ranks.append(in_series)
    values = tuple(sorted((problem.part_value[p] for p in every), key=Fraction))
    return values, (0, in_series), tuple(ranks), int(problem.coil_rank[column["coil"]]), column["tap"]


def plan_key(problem: Problem, coils, pieces, columns, content, by: str):
    """Return the order of a plan of these physical pieces, or None where a shared limit rules it out."""
    used = Counter(pieces)
    if any(count > problem.part_stock[p] for p, count in used.items()):
        return None
    if used.total() > problem.parts_limit:
        return None
    if len({problem.part_value[p] for p in used}) > problem.values_limit:
        return None
    price = min(sum(int(problem.part_price[p]) for p in pieces) + sum(int(problem.coil_price[j]) for j in coils), NEVER)
    if problem.price_limit < NEVER and price > problem.price_limit:
        return None
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    worst = max(abs(column["error"]) for column in columns)
    excess = max(column["excess"] for column in columns)
    rest = (
        round(max(worst, problem.floor) * 1e9),
        round(excess * 1e9),
        max(column["q_class"] for column in columns),
        max(column["stray_class"] for column in columns),
        max(column["reactance_class"] for column in columns),
        tuple(int(sum(problem.effort[j][i] for j in coils)) for i in range(3)),
        sum(int(problem.commonness[of_part[p]]) for p in pieces),
        round(worst * 1e9),
    )
    count = len(pieces) + len(coils)
    if by == "build":
        return (count, *rest, price, content)
    if by == "error":
        return (round(max(worst, 1e-9) * 1e12), round(excess * 1e12), count, *rest, price, content)
    return (price, count, *rest, content)


def coils_and_assignments(problem: Problem):
    """Yield every set of coils in stock with every way to give each band one of them, each coil used."""
    for size in range(1, min(problem.inductors, problem.bands) + 1):
        for coils in itertools.combinations(range(problem.coils), size):
            supports = Counter(int(problem.support[j]) for j in coils)
            if any(n > problem.support_stock[s] for s, n in supports.items()):
                continue
            for assignment in itertools.product(coils, repeat=problem.bands):
                if set(assignment) == set(coils):
                    yield coils, assignment


def lead(problem: Problem, columns) -> float:
    """Return what leads by error: the worst error, or the worst excess where every band is swept."""
    name = "excess" if all(problem.swept) else "error"
    return max(abs(column[name]) for column in columns)


def stacked_plans(problem: Problem, by: str, sections=None):
    """Yield (supports, key, pieces, worst error or excess) of every admissible plan of stacks."""
    parts = sorted((p for o in problem.options for p in o), key=lambda p: int(problem.part_rank[p]))
    target = [problem.low_end[b] if problem.swept[b] else problem.frequency[b] for b in range(problem.bands)]
    falling = sorted(range(problem.bands), key=lambda b: (-target[b], -problem.frequency[b], b))
    known: dict[tuple, list] = {}

    def figures(coil, band, inside, padder):
        key = coil, band, tuple(sorted(inside)), padder
        if key not in known:
            known[key] = list(on_a_place(problem, sections, coil, band, tuple(inside), padder))
        return known[key]

    def stacks(coil: int, bands, inside, added, columns):
        if not bands:
            yield added, columns
            return
        for padder in [None, *(parts if problem.swept[bands[0]] else [])]:
            taken = 0 if padder is None else 1
            least = 0 if not added or taken else 1
            for k in range(least, problem.most_parts - taken + 1):
                for own in itertools.combinations_with_replacement(parts, k):
                    for column in figures(coil, bands[0], [*inside, *own], padder):
                        new = {**column, "band": bands[0]}
                        yield from stacks(coil, bands[1:], [*inside, *own], [*added, own], [*columns, new])

    alone: dict[tuple, list] = {}
    for coils, assignment in coils_and_assignments(problem):
        ways = []
        for coil in coils:
            own = tuple(b for b in falling if assignment[b] == coil)
            if (coil, own) not in alone:
                alone[coil, own] = list(stacks(coil, own, [], [], []))
            ways.append(alone[coil, own])
        for combined in itertools.product(*ways):
            owns = [own for added, _ in combined for own in added]
            columns = [column for _, some in combined for column in some]
            padders = [column["padder"] for column in columns if column["padder"] is not None]
            pieces = [p for own in owns for p in own] + padders
            placed = {column["band"]: (own, column) for own, column in zip(owns, columns, strict=True)}
            rising = sorted(range(problem.bands), key=lambda b: problem.frequency[b])
            content = (
                tuple(sorted(int(problem.coil_rank[j]) for j in coils)),
                tuple(described(problem, *placed[b]) for b in rising),
            )
            key = plan_key(problem, coils, pieces, columns, content, by)
            if key is not None:
                supports = tuple(sorted(int(problem.support[j]) for j in coils))
                yield supports, key, len(pieces) + len(coils), lead(problem, columns)


def shared_plans(problem: Problem, by: str, sections=None):
    """Yield (supports, key, pieces, worst error) of every admissible set in every way to switch it."""
    parts = sorted((p for o in problem.options for p in o), key=lambda p: int(problem.part_rank[p]))
    rising = sorted(range(problem.bands), key=lambda b: problem.frequency[b])
    known: dict[tuple, list] = {}
    for coils, assignment in coils_and_assignments(problem):
        for size in range(problem.parts_limit + 1):
            for members in itertools.combinations_with_replacement(parts, size):
                subsets = {s for k in range(size + 1) for s in itertools.combinations(members, k)}
                ways = []
                for band in rising:
                    coil = assignment[band]
                    for subset in subsets:
                        if (coil, band, subset) not in known:
                            known[coil, band, subset] = list(on_a_place(problem, sections, coil, band, subset))
                    ways.append([c for s in sorted(subsets) for c in known[coil, band, s]])
                for columns in itertools.product(*ways):
                    used = tuple(described(problem, column["parts"], column) for column in columns)
                    values = tuple(sorted((problem.part_value[p] for p in members), key=Fraction))
                    ranks = tuple(sorted(int(problem.part_rank[p]) for p in members))
                    coil_ranks = tuple(sorted(int(problem.coil_rank[j]) for j in coils))
                    key = plan_key(problem, coils, members, columns, (coil_ranks, values, ranks, used), by)
                    if key is not None:
                        supports = tuple(sorted(int(problem.support[j]) for j in coils))
                        yield supports, key, size + len(coils), lead(problem, columns)


def ranking(problem: Problem, plans, sections=None):
    """Return the best key of each set of supports, best first, and the front of error or excess against pieces."""
    best: dict[tuple[int, ...], tuple] = {}
    least: dict[int, float] = {}
    for supports, key, pieces, worst in plans(problem, problem.by, sections):
        if supports not in best or key < best[supports]:
            best[supports] = key
        least[pieces] = min(least.get(pieces, math.inf), worst)
    front, last = [], math.inf
    for pieces in sorted(least):
        if least[pieces] < last - 1e-9:
            last = least[pieces]
            front.append((pieces, last))
    return sorted(best.values()), front
