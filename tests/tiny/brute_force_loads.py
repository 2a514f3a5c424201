"""Plain enumeration of tiny tanks with a load on a capacitive divider, the load's effect by complex admittances.

Shares no code with the search, only its input arrays.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter

from partpick.search.problem import Problem
from tiny.brute_force import ROUNDING, band_columns, q_class_of

LOADED = 7  # shape of a divider with its load, as the order of content has it


def loaded_columns(problem: Problem, coil: int, band: int):
    """Return every admissible choice of a coil at a band with its figures."""
    p = problem
    if p.matching is None or not p.matching.conductance[band] > 0:
        return band_columns(p, coil, band)
    if not p.in_play[coil, band]:
        return []
    of_part = {part: s for s, options in enumerate(p.options) for part in options}
    usable = sorted(of_part, key=lambda x: int(p.part_rank[x]))
    found = []
    for count in range(2, p.most_parts + 1):
        for head in itertools.product(usable, repeat=2):
            for tail in itertools.combinations_with_replacement(usable, count - 2):
                column = one(p, coil, band, of_part, (*head, *tail))
                if column is not None:
                    found.append(column)
    return found


def one(p, coil, band, of_part, parts):
    """Return the figures of one choice, None where a limit rules it out."""
    if any(count > p.part_stock[x] for x, count in Counter(parts).items()):
        return None
    c = [float(p.species[band][of_part[x]]) for x in parts]
    omega, load = 2 * math.pi * p.frequency[band], p.matching.conductance[band]
    branch = 1 / (1 / (1j * omega * c[0]) + 1 / (1j * omega * c[1] + load))
    net = branch.imag / omega + sum(c[2:])
    strays, middle = p.self_capacitance[coil] + p.stray[band], (p.trimmer_low[band] + p.trimmer_high[band]) / 2
    total, wanted = net + strays + middle, p.wanted[coil, band]
    error = math.sqrt(wanted / total) - 1
    if abs(error) > p.error_limit[band] * (1 + ROUNDING) or strays / total > p.share * (1 + ROUNDING):
        return None
    if p.trimmer_high[band] > 0:
        slack = ROUNDING * wanted
        if not p.trimmer_low[band] - slack <= wanted - net - strays <= p.trimmer_high[band] + slack:
            return None
    # energy of each part without the load, over that of all
    halves = [c[0] * (c[1] / (c[0] + c[1])) ** 2, c[1] * (c[0] / (c[0] + c[1])) ** 2]
    gains = [acts / float(p.part_value[x]) for x, acts in zip(parts, c, strict=True)]
    weights = [w * gain for w, gain in zip([*halves, *c[2:]], gains, strict=True)]
    loss = p.coil_loss[coil, band] + middle / total * p.trimmer_loss[band]
    loss += sum(w / total * p.part_loss[band][x] for w, x in zip(weights, parts, strict=True))
    if p.q_limit[band] > 0 and not 1 / loss >= p.q_limit[band]:
        return None
    inductance = 1 / (omega**2 * wanted)
    if math.isnan(loss) and not p.matching.unknown_passes:
        return None
    loaded = 1 / ((0.0 if math.isnan(loss) else loss) + math.sqrt(inductance / total) * branch.real)
    if not p.matching.least_q[band] * (1 - ROUNDING) <= loaded <= p.matching.most_q[band] * (1 + ROUNDING):
        return None
    if math.isfinite(p.drift_limit):
        set_to = min(max(wanted - net - strays, p.trimmer_low[band]), p.trimmer_high[band])
        whole = net + strays + set_to
        tempco = sum(w / whole * p.part_tempco[x] for w, x in zip(weights, parts, strict=True))
        tempco += (strays * p.stray_tempco + set_to * p.trimmer_tempco[band]) / whole
        spread = p.coil_tempco_spread[coil] + set_to / whole * p.trimmer_tempco_spread[band]
        spread += sum(w / whole * p.part_tempco_spread[x] for w, x in zip(weights, parts, strict=True))
        if not abs(p.coil_tempco[coil, band] + tempco) / 2 + spread / 2 <= p.drift_limit:
            return None
    share = strays / total
    return {
        "parts": parts,
        "shape": LOADED,
        "series": None,
        "coil": coil,
        "tap": 0,
        "error": error,
        "excess": 0.0,
        "q_class": q_class_of(p, band, loss),
        "stray_class": 0 if share <= 0.1 else 1 if share <= 0.2 else 2,
        "reactance_class": int(p.reactance_class[coil, band]),
        "commonness": sum(int(p.commonness[of_part[x]]) for x in parts),
        "price": sum(int(p.part_price[x]) for x in parts),
    }
