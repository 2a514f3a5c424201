"""Plain enumeration of tiny problems: shares no code with the search, only its input arrays.

Every set of coils, every assignment of bands, every network of every grade, one after the other.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter
from fractions import Fraction

import numpy as np

from partpick.search.problem import NEVER, Problem

ROUNDING = 1e-11  # a design exactly on a limit is inside it


def networks(problem: Problem, band: int):
    """Yield (parts, shape, capacitance) of every network of a band, each spelled once."""
    values = problem.species[band]
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    parts = sorted(of_part, key=lambda p: int(problem.part_rank[p]))
    c = {part: values[of_part[part]] for part in parts}
    usable = [part for part in parts if math.isfinite(c[part])]
    for k in range(problem.least_parts, problem.most_parts + 1):
        for chosen in itertools.combinations_with_replacement(usable, k):
            # the shape lists a network's species in rising order of capacitance
            if k == 0:
                yield (), 0, 0.0
                continue
            yield chosen, 0, sum(c[p] for p in chosen)
            if problem.connect_any and k > 1:
                yield chosen, 1, 1 / sum(1 / c[p] for p in chosen)
        if problem.connect_any and k == 3:
            for a in usable:
                for b, d in itertools.combinations_with_replacement(usable, 2):
                    yield (a, b, d), 2, c[a] + c[b] * c[d] / (c[b] + c[d])
                    yield (a, b, d), 3, c[a] * (c[b] + c[d]) / (c[a] + c[b] + c[d])


def weights(parts, shape, c, net):
    """Return d ln(net) / d ln(part) by a numerical derivative: nothing shared with the search."""

    def value(v):
        if shape == 0:
            return sum(v)
        if shape == 1:
            return 1 / sum(1 / x for x in v)
        if shape == 2:
            return v[0] + v[1] * v[2] / (v[1] + v[2])
        return v[0] * (v[1] + v[2]) / sum(v)

    out = []
    for i in range(len(parts)):
        step = 1e-6
        up, down = list(c), list(c)
        up[i] *= 1 + step
        down[i] *= 1 - step
        out.append((math.log(value(up)) - math.log(value(down))) / (math.log1p(step) - math.log1p(-step)))
    return out


def band_columns(problem: Problem, coil: int, band: int):
    """Return every admissible network of a coil at a band with its figures."""
    found = []
    if not problem.in_play[coil, band]:
        return found
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    middle = (problem.trimmer_low[band] + problem.trimmer_high[band]) / 2
    strays = problem.self_capacitance[coil] + problem.stray[band]
    wanted = problem.wanted[coil, band]
    for parts, shape, net in networks(problem, band):
        total = net + strays + middle
        error = math.sqrt(wanted / total) - 1
        if abs(error) > problem.error_limit[band] * (1 + ROUNDING):
            continue
        if problem.trimmer_high[band] > 0:
            set_to = wanted - net - strays
            slack = ROUNDING * wanted
            if not problem.trimmer_low[band] - slack <= set_to <= problem.trimmer_high[band] + slack:
                continue
        if parts and strays / total > problem.share * (1 + ROUNDING):
            continue
        if any(count > problem.part_stock[p] for p, count in Counter(parts).items()):
            continue
        c = [problem.species[band][of_part[p]] for p in parts]
        w = weights(parts, shape, c, net)
        loss = problem.coil_loss[coil, band] + middle / total * problem.trimmer_loss[band]
        loss += sum(x * net / total * problem.part_loss[band][p] for x, p in zip(w, parts, strict=True))
        if problem.q_limit[band] > 0 and not 1 / loss >= problem.q_limit[band]:
            continue
        if math.isfinite(problem.drift_limit):
            set_to = min(max(wanted - net - strays, problem.trimmer_low[band]), problem.trimmer_high[band])
            whole = net + strays + set_to
            tempco = sum(x * net / whole * problem.part_tempco[p] for x, p in zip(w, parts, strict=True))
            tempco += (strays * problem.stray_tempco + set_to * problem.trimmer_tempco[band]) / whole
            spread = problem.coil_tempco_spread[coil] + sum(
                x * net / whole * problem.part_tempco_spread[p] for x, p in zip(w, parts, strict=True)
            )
            size = abs(problem.coil_tempco[coil, band] + tempco) / 2 + spread / 2
            if not size <= problem.drift_limit:
                continue
        q = 1 / loss if math.isfinite(loss) else None
        if q is None:
            q_class = 5
        else:
            q_class = max(0, math.ceil((1 - q / problem.q_enough[band]) / 0.25 - 1e-9))
        share = strays / total
        found.append(
            {
                "parts": parts,
                "shape": shape,
                "coil": coil,
                "error": error,
                "q_class": q_class,
                "stray_class": 0 if share <= 0.1 else 1 if share <= 0.2 else 2,
                "reactance_class": int(problem.reactance_class[coil, band]),
                "commonness": sum(int(problem.commonness[of_part[p]]) for p in parts),
                "price": sum(int(problem.part_price[p]) for p in parts),
            }
        )
    return found


def plan_key(problem: Problem, coils, columns, by):
    """Return the order of a plan as the contract states it, or None where a shared limit rules it out."""
    used = Counter(p for column in columns for p in column["parts"])
    if any(count > problem.part_stock[p] for p, count in used.items()):
        return None
    if used.total() > problem.parts_limit:
        return None
    if len({problem.part_value[p] for p in used}) > problem.values_limit:
        return None
    price = sum(column["price"] for column in columns) + sum(int(problem.coil_price[j]) for j in coils)
    price = min(price, NEVER)
    if problem.price_limit < NEVER and price > problem.price_limit:
        return None
    worst = max(abs(column["error"]) for column in columns)
    pieces = used.total() + len(coils)
    rest = (
        round(max(worst, problem.floor) * 1e9),
        max(column["q_class"] for column in columns),
        max(column["stray_class"] for column in columns),
        max(column["reactance_class"] for column in columns),
        tuple(int(sum(problem.effort[j][i] for j in coils)) for i in range(3)),
        sum(column["commonness"] for column in columns),
        round(worst * 1e9),
    )
    order = np.argsort(problem.frequency, kind="stable")
    content = (
        tuple(sorted(int(problem.coil_rank[j]) for j in coils)),
        tuple(
            (
                tuple(sorted((problem.part_value[p] for p in columns[b]["parts"]), key=Fraction)),
                columns[b]["shape"],
                tuple(int(problem.part_rank[p]) for p in columns[b]["parts"]),
                int(problem.coil_rank[columns[b]["coil"]]),
            )
            for b in order
        ),
    )
    if by == "build":
        return (pieces, *rest, price, content), worst
    if by == "error":
        return (round(max(worst, 1e-9) * 1e12), pieces, *rest, price, content), worst
    return (price, pieces, *rest, content), worst


def all_plans(problem: Problem):
    """Yield (key, supports, pieces, worst error) of every admissible plan."""
    count = problem.coils
    for size in range(1, min(problem.inductors, problem.bands) + 1):
        for coils in itertools.combinations(range(count), size):
            supports = Counter(int(problem.support[j]) for j in coils)
            if any(n > problem.support_stock[s] for s, n in supports.items()):
                continue
            for assignment in itertools.product(coils, repeat=problem.bands):
                if set(assignment) != set(coils):
                    continue
                choices = [band_columns(problem, j, b) for b, j in enumerate(assignment)]
                for columns in itertools.product(*choices):
                    keyed = plan_key(problem, coils, columns, problem.by)
                    if keyed is not None:
                        key, worst = keyed
                        pieces = sum(len(c["parts"]) for c in columns) + size
                        yield key, tuple(sorted(supports.elements())), pieces, worst


def ranking(problem: Problem):
    """Return the best key of each set of supports, best first, and the front of error against pieces."""
    best: dict[tuple[int, ...], tuple] = {}
    least: dict[int, float] = {}
    for key, supports, pieces, worst in all_plans(problem):
        if supports not in best or key < best[supports]:
            best[supports] = key
        least[pieces] = min(least.get(pieces, math.inf), worst)
    front, last = [], math.inf
    for pieces in sorted(least):
        if least[pieces] < last - 1e-9:
            last = least[pieces]
            front.append((pieces, last))
    return sorted(best.values()), front
