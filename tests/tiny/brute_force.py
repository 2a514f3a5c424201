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


def networks(problem: Problem, band: int, fewest: int, most: int):
    """Yield (parts, shape, capacitance) of every network of a band, each spelled once."""
    values = problem.species[band]
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    parts = sorted(of_part, key=lambda p: int(problem.part_rank[p]))
    c = {part: values[of_part[part]] for part in parts}
    usable = [part for part in parts if math.isfinite(c[part])]
    for k in range(fewest, most + 1):
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


def value(shape, v):
    """Return the capacitance of a network of known parts."""
    if shape == 0:
        return sum(v)
    if shape == 1:
        return 1 / sum(1 / x for x in v)
    if shape == 2:
        return v[0] + v[1] * v[2] / (v[1] + v[2])
    return v[0] * (v[1] + v[2]) / sum(v)


def acting(problem: Problem, network, frequency):
    """Return a network behind the leads' inductance."""
    return network / (1 - (2 * math.pi * frequency) ** 2 * problem.lead_inductance * network)


def with_inductance(problem: Problem, part, acts, own):
    """Return how a part would act with another value, its series inductance and the frequency as they are."""
    squared = 1 / float(problem.part_value[part]) - 1 / acts  # w^2 Ls
    return 1 / (1 / own - squared)


def weights(problem: Problem, parts, shape, c, frequency):
    """Return d ln(network) / d ln(a part's own value), all inductance in series counted, by a numerical derivative."""
    own = [float(problem.part_value[p]) for p in parts]

    def network(values):
        acts = [with_inductance(problem, p, a, v) for p, a, v in zip(parts, c, values, strict=True)]
        return acting(problem, value(shape, acts), frequency)

    out = []
    for i in range(len(parts)):
        step = 1e-6
        up, down = list(own), list(own)
        up[i] *= 1 + step
        down[i] *= 1 - step
        rise = math.log(network(up)) - math.log(network(down))
        out.append(rise / (math.log1p(step) - math.log1p(-step)))
    return out


def shares_of_voltage(shape, c):
    """Return the voltage on each part with 1 V across the network: from the charge that each carries."""
    if shape == 0:
        return [1.0] * len(c)
    if shape == 1:
        charge = 1.0 / sum(1 / x for x in c)
        return [charge / x for x in c]
    if shape == 2:
        charge = c[1] * c[2] / (c[1] + c[2])
        return [1.0, charge / c[1], charge / c[2]]
    charge = value(3, c)
    return [charge / c[0], charge / (c[1] + c[2]), charge / (c[1] + c[2])]


def bears(problem: Problem, coil, band, frequency, inductance, loss, on_parts, on_element=0.0):
    """Return whether all parts keep to their ratings; `on_parts`: (part, acting, its share of the tank's voltage)."""
    drive = problem.drive
    if drive is None:
        return True
    omega = 2 * math.pi * frequency
    if drive.kind == "voltage":
        volts = drive.amount
    elif drive.kind == "power":  # what is stored is P/(w d), all of it in the capacitance at the peak
        volts = math.sqrt(2 * drive.amount / (omega * loss) * omega**2 * inductance)
    else:
        volts = drive.amount * omega * inductance / loss
    if not math.isfinite(volts):  # not known: only where nothing is rated
        of_parts = [x[p] for p, *_ in on_parts for x in (drive.part_voltage, drive.part_current)]
        rated = [*of_parts, drive.coil_current[coil], drive.trimmer_voltage[band]]
        return all(math.isinf(x) for x in [*rated, *([drive.element_voltage] if on_element else [])])
    low = 1 - ROUNDING
    if volts / (omega * inductance) * drive.effective * low > drive.coil_current[coil]:
        return False
    if volts * drive.crest * low > drive.trimmer_voltage[band]:
        return False
    if volts * on_element * drive.crest * low > drive.element_voltage:
        return False
    for part, c, share in on_parts:
        amperes = volts * share * omega * c  # peak, of the carrier
        if amperes * drive.effective * low > drive.part_current[part]:
            return False
        plates = amperes / (omega * drive.part_capacitance[part])
        if plates * drive.crest * low > drive.part_voltage[part]:
            return False
    return True


def band_columns(problem: Problem, coil: int, band: int):
    """Return every admissible network of a coil at a band with its figures."""
    found = []
    if not problem.in_play[coil, band]:
        return found
    if problem.swept[band]:
        return swept_columns(problem, coil, band)
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    middle = (problem.trimmer_low[band] + problem.trimmer_high[band]) / 2
    strays = problem.self_capacitance[coil] + problem.stray[band]
    wanted = problem.wanted[coil, band]
    for parts, shape, raw in networks(problem, band, problem.least_parts, problem.most_parts):
        net = acting(problem, raw, problem.frequency[band])
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
        w = weights(problem, parts, shape, c, problem.frequency[band])
        loss = problem.coil_loss[coil, band] + middle / total * problem.trimmer_loss[band]
        loss += sum(x * net / total * problem.part_loss[band][p] for x, p in zip(w, parts, strict=True))
        if problem.q_limit[band] > 0 and not 1 / loss >= problem.q_limit[band]:
            continue
        rise = net / raw if parts else 1.0
        on_parts = [(p, x, s * rise) for p, x, s in zip(parts, c, shares_of_voltage(shape, c), strict=True)]
        frequency = problem.frequency[band]
        inductance = 1 / ((2 * math.pi * frequency) ** 2 * wanted)
        if not bears(problem, coil, band, frequency, inductance, loss, on_parts):
            continue
        if math.isfinite(problem.drift_limit):
            set_to = min(max(wanted - net - strays, problem.trimmer_low[band]), problem.trimmer_high[band])
            whole = net + strays + set_to
            tempco = sum(x * net / whole * problem.part_tempco[p] for x, p in zip(w, parts, strict=True))
            tempco += (strays * problem.stray_tempco + set_to * problem.trimmer_tempco[band]) / whole
            spread = problem.coil_tempco_spread[coil] + sum(
                x * net / whole * problem.part_tempco_spread[p] for x, p in zip(w, parts, strict=True)
            )
            spread += set_to / whole * problem.trimmer_tempco_spread[band]
            size = abs(problem.coil_tempco[coil, band] + tempco) / 2 + spread / 2
            if not size <= problem.drift_limit:
                continue
        share = strays / total
        found.append(
            {
                "parts": parts,
                "shape": shape,
                "series": None,
                "coil": coil,
                "error": error,
                "total": total,
                "excess": 0.0,
                "q_class": q_class_of(problem, band, loss),
                "stray_class": 0 if share <= 0.1 else 1 if share <= 0.2 else 2,
                "reactance_class": int(problem.reactance_class[coil, band]),
                "commonness": sum(int(problem.commonness[of_part[p]]) for p in parts),
                "price": sum(int(problem.part_price[p]) for p in parts),
            }
        )
    return found


def q_class_of(problem: Problem, band: int, loss):
    """Return the steps of 25 % below enough Q; 5 where it is unknown."""
    if not math.isfinite(loss):
        return 5
    return max(0, math.ceil((1 - 1 / loss / problem.q_enough[band]) / 0.25 - 1e-9))


def swept_columns(problem: Problem, coil: int, band: int):
    """Return every series padder, or none, with every network that covers a swept band."""
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    padders = [None, *(p for p in of_part if math.isfinite(problem.species[band][of_part[p]]))]
    if problem.tuning_high[band] == 0:  # the coil is tuned: there is nothing to be in series with
        padders = [None]
    found = []
    for padder in padders:
        taken = 0 if padder is None else 1
        if problem.most_parts - taken < 0:
            continue
        for across, shape, _ in networks(
            problem, band, max(0, problem.least_parts - taken), problem.most_parts - taken
        ):
            column = swept_column(problem, coil, band, of_part, padder, across, shape)
            if column is not None:
                found.append(column)
    return found


def swept_column(problem: Problem, coil: int, band: int, of_part, padder, across, shape):
    """Return the figures of one choice for a swept band, None where a limit rules it out."""
    asked_low, asked_high, margin = problem.low_end[band], problem.frequency[band], problem.margin
    middle = (problem.trimmer_low[band] + problem.trimmer_high[band]) / 2
    further = problem.moved_own_low, problem.moved_own_high
    own = [problem.self_capacitance[coil] + (each[coil, band] if each.size else 0.0) for each in further]
    strays_at = [each + problem.stray[band] for each in own]
    parts = across if padder is None else (*across, padder)
    if any(count > problem.part_stock[p] for p, count in Counter(parts).items()):
        return None
    inductance_high = 1 / ((2 * math.pi * asked_high) ** 2 * problem.wanted[coil, band])
    ends = (
        (problem.tuning_high, problem.species_low, problem.inductance_low[coil, band], asked_low, strays_at[0]),
        (problem.tuning_low, problem.species, inductance_high, asked_high, strays_at[1]),
    )
    losses = (
        (problem.coil_loss_low, problem.part_loss_low),
        (problem.coil_loss, problem.part_loss),
    )
    tuned_to, loss = [], 0.0
    for (element, species, inductance, frequency, strays), (coil_loss, part_loss) in zip(ends, losses, strict=True):
        c = [species[band][of_part[p]] for p in across]
        raw = value(shape, c) if c else 0.0
        net = acting(problem, raw, frequency)
        tuned = t = element[band]
        share = {}
        if padder is not None:
            s = species[band][of_part[padder]]
            tuned = 1 / (1 / t + 1 / s)
        if not tuned_to and (tuned / t if t else 1.0) > problem.tuning_share * (1 + ROUNDING):
            return None  # the first end is the low one
        total = tuned + net + strays + middle
        tuned_to.append(1 / (2 * math.pi * math.sqrt(inductance * total)))
        slopes = weights(problem, across, shape, c, frequency)
        share = [(p, w * net / total) for p, w in zip(across, slopes, strict=True)]
        if padder is not None:
            share.append((padder, tuned / float(problem.part_value[padder]) * tuned / total))
        of_element = tuned / t * tuned / total if t else 0.0
        own = coil_loss[coil, band] + middle / total * problem.trimmer_loss[band]
        own += of_element * problem.tuning_loss[band] + sum(x * part_loss[band][p] for p, x in share)
        loss = math.nan if math.isnan(own) or math.isnan(loss) else max(loss, own)
        shares = shares_of_voltage(shape, c)
        on_parts = [(p, x, v * net / raw) for p, x, v in zip(across, c, shares, strict=True)]
        on_element = 1.0
        if padder is not None:  # the element where the tank resonates at the end of the band
            tuned = 1 / ((2 * math.pi * frequency) ** 2 * inductance) - net - strays - middle
            set_to = 1 / (1 / tuned - 1 / s)
            on_parts.append((padder, s, set_to / (set_to + s)))
            on_element = s / (set_to + s)
        if not bears(problem, coil, band, frequency, inductance, own, on_parts, on_element):
            return None
    if tuned_to[0] > asked_low * (1 - margin) * (1 + ROUNDING):
        return None
    if tuned_to[1] < asked_high * (1 + margin) * (1 - ROUNDING):
        return None
    excess = max(asked_low - tuned_to[0], tuned_to[1] - asked_high) / (asked_high - asked_low)
    if excess > problem.excess_limit * (1 + ROUNDING):
        return None
    stray_share = strays / total  # at the high end, which came last
    if parts and stray_share > problem.share * (1 + ROUNDING):
        return None
    if problem.q_limit[band] > 0 and not 1 / loss >= problem.q_limit[band]:
        return None
    if math.isfinite(problem.drift_limit):
        tempco = sum(x * problem.part_tempco[p] for p, x in share) + of_element * problem.tuning_tempco[band]
        tempco += (strays * problem.stray_tempco + middle * problem.trimmer_tempco[band]) / total
        spread = problem.coil_tempco_spread[coil] + sum(x * problem.part_tempco_spread[p] for p, x in share)
        spread += middle / total * problem.trimmer_tempco_spread[band]
        if not abs(problem.coil_tempco[coil, band] + tempco) / 2 + spread / 2 <= problem.drift_limit:
            return None
    return {
        "parts": parts,
        "shape": shape,
        "series": padder,
        "coil": coil,
        "error": 0.0,
        "total": total,
        "excess": excess,
        "q_class": q_class_of(problem, band, loss),
        "stray_class": 0 if stray_share <= 0.1 else 1 if stray_share <= 0.2 else 2,
        "reactance_class": int(problem.reactance_class[coil, band]),
        "commonness": sum(int(problem.commonness[of_part[p]]) for p in parts),
        "price": sum(int(problem.part_price[p]) for p in parts),
    }


def contacts(problem: Problem, coils, columns):
    """Count what the switch closes: capacitors of each band, its coil or tap, its way to the tuning element."""
    if problem.bands == 1:
        return 0
    closing = 0
    several_coils_or_taps = len(coils) > 1 or any(c.get("tap", 0) for c in columns)
    element_is_switched = any(c["series"] is not None for c in columns) or len(set(problem.swept.tolist())) == 2
    for band, column in enumerate(columns):
        padders = [p for p in column["parts"]]
        if column["series"] is not None:
            padders.remove(column["series"])
        if padders or problem.trimmer_high[band] > 0:
            closing += 1
        if several_coils_or_taps:
            closing += 1
        if problem.swept[band] and element_is_switched:
            closing += 1
    return closing


def plan_key(problem: Problem, coils, columns, by):
    """Return the order of a plan as the contract states it, or None where a shared limit rules it out."""
    used = Counter(p for column in columns for p in column["parts"])
    if any(count > problem.part_stock[p] for p, count in used.items()):
        return None
    if used.total() > problem.parts_limit:
        return None
    if len({problem.part_value[p] for p in used}) > problem.values_limit:
        return None
    if contacts(problem, coils, columns) > problem.contacts_limit:
        return None
    price = sum(column["price"] for column in columns) + sum(int(problem.coil_price[j]) for j in coils)
    price = min(price, NEVER)
    if problem.price_limit < NEVER and price > problem.price_limit:
        return None
    worst = max(abs(column["error"]) for column in columns)
    excess = max(column["excess"] for column in columns)
    pieces = used.total() + len(coils)
    rest = (
        round(max(worst, problem.floor) * 1e9),
        round(excess * 1e9),
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
                (
                    columns[b]["shape"],
                    -1 if columns[b]["series"] is None else int(problem.part_rank[columns[b]["series"]]),
                ),
                tuple(int(problem.part_rank[p]) for p in columns[b]["parts"]),
                int(problem.coil_rank[columns[b]["coil"]]),
                columns[b].get("tap", 0),
                *((columns[b]["trimmer"],) if "trimmer" in columns[b] else ()),
            )
            for b in order
        ),
    )
    lead = excess if all(problem.swept) else worst
    if by == "build":
        return (pieces, *rest, price, content), lead
    if by == "error":
        fine = round(max(worst, 1e-9) * 1e12), round(excess * 1e12)
        return (*fine, pieces, *rest, price, content), lead
    return (price, pieces, *rest, content), lead


def all_plans(problem: Problem, columns_of=band_columns, allowed=lambda columns: True):
    """Yield (key, supports, pieces, worst error or excess) of every admissible plan."""
    count = problem.coils
    for size in range(1, min(problem.inductors, problem.bands) + 1):
        for coils in itertools.combinations(range(count), size):
            supports = Counter(int(problem.support[j]) for j in coils)
            if any(n > problem.support_stock[s] for s, n in supports.items()):
                continue
            for assignment in itertools.product(coils, repeat=problem.bands):
                if set(assignment) != set(coils):
                    continue
                choices = [columns_of(problem, j, b) for b, j in enumerate(assignment)]
                for columns in itertools.product(*choices):
                    if any(not c.get("shared", True) and assignment.count(c["coil"]) > 1 for c in columns):
                        continue  # right only on a coil that no other band has
                    if not allowed(columns):
                        continue
                    keyed = plan_key(problem, coils, columns, problem.by)
                    if keyed is not None:
                        key, worst = keyed
                        pieces = sum(len(c["parts"]) for c in columns) + size
                        yield key, tuple(sorted(supports.elements())), pieces, worst


def ranking(problem: Problem, columns_of=band_columns, allowed=lambda columns: True):
    """Return the best key of each set of supports, best first, and the front against pieces."""
    best: dict[tuple[int, ...], tuple] = {}
    least: dict[int, float] = {}
    for key, supports, pieces, worst in all_plans(problem, columns_of, allowed):
        if supports not in best or key < best[supports]:
            best[supports] = key
        least[pieces] = min(least.get(pieces, math.inf), worst)
    front, last = [], math.inf
    for pieces in sorted(least):
        if least[pieces] < last - 1e-9:
            last = least[pieces]
            front.append((pieces, last))
    return sorted(best.values()), front
