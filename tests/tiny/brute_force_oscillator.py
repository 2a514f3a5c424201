"""Plain enumeration of tiny oscillators: every divider or tap, start-up by the eigenvalues of the state equations.

Shares no code with the search, only its input arrays.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter

import numpy as np

from partpick.search.problem import Problem
from tiny.brute_force import ROUNDING, q_class_of

SHAPE = {("colpitts", False): 4, ("colpitts", True): 4, ("clapp", False): 5, ("clapp", True): 6}
# of the transconductance allowed: far above what is needed the modes no longer swing, but on the way they grew
SHARES = (1.0, 0.5, 0.2, 0.1, 0.05, 0.02, 0.01)
STEPS = 5  # settings of the tuning element, from end to end in equal ratios


def series(*c):
    """Return capacitances in series; endless ones are wires."""
    return 1 / sum(1 / x for x in c)


def grows(storage, flow):
    """Whether some oscillation of C dx/dt + G x = 0 does not die out."""
    modes = np.linalg.eigvals(-np.linalg.solve(np.array(storage, float), np.array(flow, float)))
    swinging = modes[np.abs(modes.imag) > 1e5]
    return len(swinging) > 0 and swinging.real.max() > 0


def three_point_grows(inductance, resistance, c0, c1, c2, beside, gm):
    """Return the verdict on a Colpitts circuit, or with `c0` a Clapp circuit; `beside` is across the coil."""
    if c0 is None:
        storage = [[c1 + beside, -beside, 0], [-beside, c2 + beside, 0], [0, 0, inductance]]
        return grows(storage, [[0, gm, 1], [0, 0, -1], [-1, 1, resistance]])
    storage = [
        [c1 + c0, 0, -c0, 0],
        [0, c2 + beside, -beside, 0],
        [-c0, -beside, c0 + beside, 0],
        [0, 0, 0, inductance],
    ]
    return grows(storage, [[0, gm, 0, 0], [0, 0, 0, -1], [0, 0, 0, 1], [0, 1, -1, resistance]])


def hartley_grows(inductance, resistance, tap, capacitance, device, gm):
    """Return the verdict on a coil with its common terminal at a tap."""
    l1, l2, m = (inductance * tap[name] for name in ("output", "control", "mutual"))
    r1, r2 = resistance * tap["share"], resistance * (1 - tap["share"])
    c, (c1, c2) = capacitance, device
    storage = [[c + c1, -c, 0, 0], [-c, c + c2, 0, 0], [0, 0, l1, m], [0, 0, m, l2]]
    if c1 == c2 == 0:  # both nodes swing against each other alone: a trace of capacitance to common keeps it solvable
        storage[0][0] += 1e-9 * c
        storage[1][1] += 1e-9 * c
    return grows(storage, [[0, gm, 1, 0], [0, 0, 0, -1], [-1, 0, r1, 0], [0, 1, 0, r2]])


def oscillator_columns(problem: Problem, coil: int, band: int, taps):
    """Return every admissible choice of a coil at a band with its figures; `taps` of a Hartley circuit."""
    oscillator, swept = problem.oscillator, bool(problem.swept[band])
    if not problem.in_play[coil, band]:
        return []
    of_part = {part: s for s, options in enumerate(problem.options) for part in options}
    usable = sorted(of_part, key=lambda p: int(problem.part_rank[p]))
    own = {"colpitts": 2, "clapp": 2 if swept else 3, "hartley": 0}[oscillator.circuit]
    with_padder = swept and oscillator.circuit != "clapp"
    found = []
    for count in range(max(own, problem.least_parts), problem.most_parts + 1):
        for padder in [None, *usable] if with_padder else [None]:
            rest = count - own - (padder is not None)
            if rest < 0:
                continue
            for head in itertools.product(usable, repeat=own):
                for tail in itertools.combinations_with_replacement(usable, rest):
                    for tap in taps if oscillator.circuit == "hartley" else [None]:
                        column = one(problem, coil, band, of_part, head, tail, padder, tap)
                        if column is not None:
                            found.append(column)
    return found


def one(problem, coil, band, of_part, head, tail, padder, tap):
    """Return the figures of one choice, None where a limit rules it out or it does not start."""
    p, o, swept = problem, problem.oscillator, bool(problem.swept[band])
    parts = (*head, *tail, *(() if padder is None else (padder,)))
    if any(count > p.part_stock[x] for x, count in Counter(parts).items()):
        return None
    own = p.self_capacitance[coil]
    if tap is not None:
        own = own + (tap["output"] + tap["mutual"]) ** 2 * o.device[0]
        own = own + (tap["control"] + tap["mutual"]) ** 2 * o.device[1]
    strays, middle = own + p.stray[band], (p.trimmer_low[band] + p.trimmer_high[band]) / 2
    inductance_high = 1 / ((2 * math.pi * p.frequency[band]) ** 2 * p.wanted[coil, band])
    high = end_of(p, band, of_part, head, tail, padder, p.species, p.tuning_low[band] if swept else None)
    total = high["across"] + high["tuned"] + strays + middle
    ends = [(high, total, inductance_high, p.coil_loss, p.part_loss)]
    error = excess = 0.0
    if swept:
        low = end_of(p, band, of_part, head, tail, padder, p.species_low, p.tuning_high[band])
        total_low = low["across"] + low["tuned"] + strays + middle
        inductance_low = p.inductance_low[coil, band]
        ends.insert(0, (low, total_low, inductance_low, p.coil_loss_low, p.part_loss_low))
        asked_low, asked_high = p.low_end[band], p.frequency[band]
        tuned = [1 / (2 * math.pi * math.sqrt(x[2] * x[1])) for x in ends]
        if tuned[0] > asked_low * (1 - p.margin) * (1 + ROUNDING):
            return None
        if tuned[1] < asked_high * (1 + p.margin) * (1 - ROUNDING):
            return None
        excess = max(asked_low - tuned[0], tuned[1] - asked_high) / (asked_high - asked_low)
        if excess > p.excess_limit * (1 + ROUNDING):
            return None
    else:
        error = math.sqrt(p.wanted[coil, band] / total) - 1
        if abs(error) > p.error_limit[band] * (1 + ROUNDING):
            return None
        if p.trimmer_high[band] > 0:
            set_to, slack = p.wanted[coil, band] - high["across"] - strays, ROUNDING * p.wanted[coil, band]
            if not p.trimmer_low[band] - slack <= set_to <= p.trimmer_high[band] + slack:
                return None
    if parts and strays / total > p.share * (1 + ROUNDING):
        return None
    further = []
    for end, whole, _, _, part_loss in ends:
        loss = middle / whole * p.trimmer_loss[band]
        loss += end["element_weight"] / whole * (p.tuning_loss[band] if swept else 0.0)
        loss += sum(w / whole * part_loss[band][x] for x, w in zip(parts, end["weights"], strict=True))
        further.append(loss)
    nominal = [x[3][coil, band] + f for x, f in zip(ends, further, strict=True)]
    loss = math.nan if any(math.isnan(n) for n in nominal) else max(nominal)
    if p.q_limit[band] > 0 and not 1 / loss >= p.q_limit[band]:
        return None
    if math.isfinite(p.drift_limit) and not steady(p, coil, band, parts, high, strays, middle, swept):
        return None
    if not all_start(p, coil, band, tap, ends, further, strays + middle, swept):
        return None
    share = strays / total
    return {
        "parts": parts,
        "shape": SHAPE.get((o.circuit, swept), 0),
        "series": padder,
        "coil": coil,
        "tap": 0 if tap is None else tap["turns"],
        "error": error,
        "excess": excess,
        "q_class": q_class_of(p, band, loss),
        "stray_class": 0 if share <= 0.1 else 1 if share <= 0.2 else 2,
        "reactance_class": int(p.reactance_class[coil, band]),
        "commonness": sum(int(p.commonness[of_part[x]]) for x in parts),
        "price": sum(int(p.part_price[x]) for x in parts),
    }


def end_of(p, band, of_part, head, tail, padder, species, element):
    """Return what is in circuit at one end: across the coil, tuned, each part's c dC/dc by a numerical derivative."""
    parts = (*head, *tail, *(() if padder is None else (padder,)))
    c = [float(species[band][of_part[x]]) for x in parts]
    gains = [acts / float(p.part_value[x]) for x, acts in zip(parts, c, strict=True)]  # of inductance in series
    circuit, device = p.oscillator.circuit, p.oscillator.device

    def acting(values, t):
        own, rest = values[: len(head)], values[len(head) : len(head) + len(tail)]
        across, tuned = sum(rest), 0.0 if t is None else t
        halves = [x + d for x, d in zip(own[-2:], device, strict=False)]
        if circuit == "colpitts":
            across += series(*halves)
        if circuit == "clapp" and t is None:
            across += series(own[0], *halves)
        if circuit == "clapp" and t is not None:
            tuned = series(t, *halves)
        if padder is not None:
            tuned = series(tuned, values[-1])
        return across, tuned, halves

    def slope(place):
        step, sides = 1e-6, []
        for sign in (1, -1):
            moved = list(c)
            moved[place] *= 1 + sign * step
            sides.append(sum(acting(moved, element)[:2]))
        return (sides[0] - sides[1]) / (2 * step)

    across, tuned, halves = acting(c, element)
    by_element = 0.0
    if element is not None:
        sides = [acting(c, element * (1 + sign * 1e-6))[1] for sign in (1, -1)]
        by_element = (sides[0] - sides[1]) / 2e-6
    return {
        "across": across,
        "tuned": tuned,
        "halves": halves,
        "series": c[0] if circuit == "clapp" and element is None else None,
        "values": c,
        "element": element,
        "padder": None if padder is None else c[-1],
        "weights": [slope(place) * gain for place, gain in enumerate(gains)],
        "element_weight": by_element,
    }


def steady(p, coil, band, parts, high, strays, middle, swept):
    """Whether drift with its spread is inside the limit, a fixed band's trimmer set on frequency."""
    set_to = middle
    if not swept:
        set_to = p.wanted[coil, band] - high["across"] - strays
        set_to = min(max(set_to, p.trimmer_low[band]), p.trimmer_high[band])
    whole = high["across"] + high["tuned"] + strays + set_to
    tempco = sum(w / whole * p.part_tempco[x] for x, w in zip(parts, high["weights"], strict=True))
    tempco += (strays * p.stray_tempco + set_to * p.trimmer_tempco[band]) / whole
    tempco += high["element_weight"] / whole * (p.tuning_tempco[band] if swept else 0.0)
    spread = p.coil_tempco_spread[coil]
    spread += sum(w / whole * p.part_tempco_spread[x] for x, w in zip(parts, high["weights"], strict=True))
    return abs(p.coil_tempco[coil, band] + tempco) / 2 + spread / 2 <= p.drift_limit


def all_start(p, coil, band, tap, ends, further, fixed, swept):
    """Whether the oscillation grows with the transconductance allowed, at every setting of the element."""
    o = p.oscillator
    mix = lambda low, high, x: low if low == high else low ** (1 - x) * high**x  # noqa: E731
    (low, _, l_low, _, _), (high, _, l_high, _, _) = ends[0], ends[-1]
    for step in range(STEPS) if swept else [0]:
        x = step / (STEPS - 1)
        halves = [
            mix(a - d, b - d, x) + d for a, b, d in zip(low["halves"], high["halves"], o.device, strict=False)
        ]
        inductance = mix(l_low, l_high, x)
        tuned, element = low["tuned"], None
        if swept:
            element = mix(low["element"], high["element"], x)
            tuned = element
            if low["padder"] is not None:
                tuned = series(element, mix(low["padder"], high["padder"], x))
            if o.circuit == "clapp":
                tuned = series(element, *halves)
        total = mix(low["across"], high["across"], x) + tuned + fixed
        worst = o.coil_loss_low[coil, band] if swept else o.coil_loss[coil, band]
        loss = mix(worst, o.coil_loss[coil, band], x) + (1 - x) * further[0] + x * further[-1]
        loss = max(loss + math.sqrt(inductance / total) * o.load[band], o.least_loss[band])
        if math.isnan(loss):
            return False
        resistance = math.sqrt(inductance / total) * loss
        if o.circuit == "hartley":
            across = (tap["output"] + tap["mutual"]) ** 2 * o.device[0]
            across += (tap["control"] + tap["mutual"]) ** 2 * o.device[1]
            tank = inductance, resistance, tap, total - across, o.device
            if not any(hartley_grows(*tank, o.allowed * share) for share in SHARES):
                return False
            continue
        c0 = None
        inner = series(*halves)
        if o.circuit == "clapp":
            c0 = element if swept else low["series"]
            inner = series(c0, *halves)
        tank = inductance, resistance, c0, *halves, max(total - inner, 0.0)
        if not any(three_point_grows(*tank, o.allowed * share) for share in SHARES):
            return False
    return True
