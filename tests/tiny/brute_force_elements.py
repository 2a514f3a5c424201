"""Plain enumeration of one swept band from a plan's own parts: every element of a plan, one coil at a time.

Ends of the element by the formula of its kind, coils as wound; shares no code with the search or with what
prepares its arrays.
"""

from __future__ import annotations

import itertools
import math

import numpy as np

from partpick.physics.moving_contact import section_inductance
from partpick.physics.sliding_core import core_inductance_rise
from partpick.physics.variometer import coil_rings, tilted_mutual_by_line_integral

ROUNDING = 1e-9
LEAST_COIL = 24e-9  # H, three times a centimetre of lead


def capacitive_ends(keys):
    """Return what the element holds where it tunes lowest and highest."""
    if keys["kind"] == "variable capacitor":
        ends = [keys["high"], keys["low"]]
        return [end * (keys["parallel"] or keys["sections"]) for end in ends]
    ends = []
    for bias in (keys["from"], keys["to"]):
        junction = keys["zero_bias"] / (1 + bias / keys["potential"]) ** keys["grading"] * keys["count"]
        whole = junction / 2 if keys["connection"] == "back to back" else junction
        ends.append(whole if keys["series"] is None else 1 / (1 / whole + 1 / keys["series"]))
    return ends


def moved_ends(keys, coil):
    """Return (inductance, self-capacitance) at both ends of an element on one coil; None where they do not go."""
    if keys["kind"] == "sliding core":
        return core(keys, coil)
    if keys["kind"] == "moving contact":
        return contact(keys, coil)
    return rotor(keys, coil)


def core(keys, coil):
    if keys["diameter"] > 0.9 * coil["outside"]:
        return None
    size = coil["turns"], coil["mean"], coil["turns"] * coil["pitch"]
    pushed = min(keys["travel"], (size[2] + keys["length"]) / 2)
    ends = []
    for inserted, own in ((pushed, coil["low"]), (0.0, coil["high"])):
        offset = inserted - (size[2] + keys["length"]) / 2
        rise = core_inductance_rise(*size, keys["diameter"], keys["length"], keys["permeability"], offset)
        ends.append((own + float(rise), coil["own"]))
    return ends


def contact(keys, coil):
    least = keys["least_turns"] if keys["continuous"] else math.ceil(keys["least_turns"])
    if coil["turns"] < least + 1:
        return None
    shorted = keys["unused"] == "shorted"
    used = float(section_inductance(coil["make_high"], least))
    slow = [float(section_inductance(coil["make_dc"], n)) for n in (least, coil["turns"] - least, coil["turns"])]
    mutual = (slow[2] - slow[0] - slow[1]) / 2
    if shorted:
        used -= mutual**2 / slow[1]
        whole = [coil["own_of"](math.floor(least)), coil["own_of"](math.ceil(least))]
        own = float(np.interp(least % 1, [0, 1], whole))
    else:
        own = coil["own"] * (1 + mutual / slow[0]) ** 2
    return [(coil["low"], coil["own"]), (used, own)]


def rotor(keys, coil):
    reach = (0.9 * coil["outside"] - coil["overall"]) / 2 - 0.5e-3
    if reach <= keys["rotor"] / 2:
        return None
    most = 1 + int(2 * math.sqrt(reach**2 - (keys["rotor"] / 2) ** 2) / coil["pitch"] * (1 + 1e-9))
    turns = keys["turns"] or min(coil["turns"], most)
    if turns > most:
        return None
    rings = coil_rings(coil["turns"], coil["mean"], coil["pitch"]), coil_rings(turns, keys["rotor"], coil["pitch"])
    mutual = [float(tilted_mutual_by_line_integral(*rings, keys[key], 90)) for key in ("from", "to")]
    ends = []
    for m, own, (second, second_own) in zip(
        mutual, (coil["low"], coil["high"]), coil["rotor_of"](turns, keys["rotor"]), strict=True
    ):
        if keys["connection"] == "parallel":
            if mutual[0] > min(coil["make_dc"][-1], coil["rotor_dc"](turns, keys["rotor"])):
                return None
            ends.append(((own * second - m * m) / (own + second - 2 * m), coil["own"] + second_own))
        else:
            whole = own + second + 2 * m
            share = (own + m) / whole
            ends.append((whole, coil["own"] * share**2 + second_own * (1 - share) ** 2))
    return ends


def least_by_pieces(request, keys, coils, values):
    """Return the least excess of each number of pieces that covers the one band of a request.

    `coils` are dicts of a coil as wound; `values` the capacitors, all alike but for their value.
    """
    (band,) = request.bands
    margin, stray = request.limits.margin, band.stray
    moved = keys["kind"] not in ("variable capacitor", "varactor")
    ends = [0.0, 0.0] if moved else capacitive_ends(keys)
    least: dict[int, float] = {}
    for coil in coils:
        pair = moved_ends(keys, coil) if moved else [(coil["low"], coil["own"]), (coil["high"], coil["own"])]
        if pair is None or min(pair[0][0], pair[1][0]) < LEAST_COIL:
            continue
        for padder in [None] if moved else [None, *values]:
            tuned = ends if padder is None else [1 / (1 / t + 1 / padder) for t in ends]
            taken = 0 if padder is None else 1
            fewest = max(0, (1 if request.command == "pair" else 0) - taken)
            for count in range(fewest, request.limits.parts_per_band - taken + 1):
                for across in itertools.combinations_with_replacement(values, count):
                    networks = [sum(across)]
                    if request.capacitors.connect == "any" and count > 1:
                        networks.append(1 / sum(1 / c for c in across))
                    for network in networks:
                        totals = [t + network + stray + own for t, (_, own) in zip(tuned, pair, strict=True)]
                        low, high = (
                            1 / (2 * math.pi * math.sqrt(inductance * total))
                            for total, (inductance, _) in zip(totals, pair, strict=True)
                        )
                        if low > band.low * (1 - margin) * (1 + ROUNDING):
                            continue
                        if high < band.high * (1 + margin) * (1 - ROUNDING):
                            continue
                        share = (stray + pair[1][1]) / totals[1]
                        if count + taken and request.stray.share and share > request.stray.share * (1 + ROUNDING):
                            continue
                        excess = max(band.low - low, high - band.high) / (band.high - band.low)
                        pieces = 1 + count + taken
                        least[pieces] = min(least.get(pieces, math.inf), excess)
    return least
