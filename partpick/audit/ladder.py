"""A ladder of relays, tuned again from its parts: every subset, every gap, every position."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from itertools import pairwise

from partpick.request import Request
from partpick.result import BandFigures, Candidate, PartLine

ROUNDING = 2e-6  # of the frequency: between two looks at the inductance, and at inductance in series
ALIKE = 0.35  # of what it is off: told are figures at the target, and capacitors act by the frequency itself
MOST_RELAYS = 14


def ladder_faults(candidate: Candidate, request: Request) -> Iterator[str]:
    """Yield what does not hold of the steps that a candidate is to tune in, in words."""
    asked = dict(dict(request.extra).get("steps", ()))
    if not asked:
        return
    low, high, coarsest = (float(str(asked[name])) for name in ("from", "to", "step"))
    targets = [band.target or math.nan for band in candidate.bands]
    slack = ROUNDING * high
    if targets[0] != low or targets[-1] != high:
        yield f"its positions run from {targets[0]} to {targets[-1]} Hz, asked for is {low} to {high} Hz"
    apart = [b - a for a, b in pairwise(targets)]
    if max(apart) > coarsest + 1e-9 * high or max(apart) - min(apart) > 1e-9 * high:
        yield f"its positions are {min(apart)} to {max(apart)} Hz apart, asked for are equal steps up to {coarsest} Hz"
    step = (high - low) / (len(targets) - 1)
    lines = {line.reference: line for line in candidate.parts if line.kind == "capacitor"}
    told = candidate.extra.get("ladder")
    if not isinstance(told, Mapping):
        yield "its relays are not told"
        return
    relays = [each["capacitor"] for each in told["relays"]]
    base = [name for name in lines if name not in relays]
    if not all(name in band.capacitors for name in base for band in candidate.bands):
        yield "a capacitor without a relay is not in circuit at every position"
    if len(relays) > MOST_RELAYS:
        yield f"{len(relays)} relays are more than can be held against each other"
        return
    rungs = _rungs(candidate, [lines[name] for name in base], [lines[name] for name in relays])
    yield from _gaps(sorted(rungs.values()), low, high, step, slack)
    for band in candidate.bands:
        yield from (f"{band.name}: {fault}" for fault in _position(band, relays, rungs, step, slack))
    yield from _told(candidate, step)


def _rungs(candidate: Candidate, base: list[PartLine], relays: list[PartLine]) -> dict[frozenset[str], float]:
    """Return where each set of closed relays resonates, with the inductance told for the position next to it. [Hz]"""
    found = {}
    for mask in range(2 ** len(relays)):
        closed = [line for place, line in enumerate(relays) if mask // 2**place % 2]
        found[frozenset(line.reference for line in closed)] = _resonance(candidate, [*base, *closed])
    return found


def _resonance(candidate: Candidate, parts: list[PartLine]) -> float:
    bands = candidate.bands
    first, last = bands[0], bands[-1]
    frequency = last.target or 0.0
    for _ in range(12):
        place = (frequency - (first.target or 0.0)) / ((last.target or 1.0) - (first.target or 0.0)) * (len(bands) - 1)
        band = bands[min(max(round(place), 0), len(bands) - 1)]
        total = band.stray + band.self_capacitance
        for line in parts:
            value = line.value or 0.0
            total += value / (1 - (2 * math.pi * frequency) ** 2 * (line.series_inductance or 0.0) * value)
        frequency = 1 / (2 * math.pi * math.sqrt(band.inductance * total))
    return frequency


def _gaps(rungs: list[float], low: float, high: float, step: float, slack: float) -> Iterator[str]:
    inside = [f for f in rungs if low - step / 2 - slack <= f <= high + step / 2 + slack]
    if not inside or inside[0] > low + step / 2 + slack or inside[-1] < high - step / 2 - slack:
        yield "no set of closed relays is within half a step of an end of the span"
    for below, above in pairwise(inside):
        if above - below > step + 2 * slack:
            yield f"nothing between {below:.9g} and {above:.9g} Hz, further apart than {step:.9g} Hz"


def _position(
    band: BandFigures, relays: list[str], rungs: Mapping[frozenset[str], float], step: float, slack: float
) -> Iterator[str]:
    target, reached = band.target or math.nan, band.resonance or math.nan
    own = rungs[frozenset(name for name in band.capacitors if name in relays)]
    if not abs(own - reached) <= slack + ALIKE * abs(own - target):
        yield f"its relays tune it to {own:.9g} Hz, told is {reached:.9g}"
    if not abs(own - target) <= step / 2 + slack:
        yield f"{abs(own - target):.9g} Hz off, half a step is {step / 2:.9g}"
    nearest = min(rungs.values(), key=lambda f: abs(f - target))
    if abs(nearest - target) < abs(own - target) - slack:
        yield f"other relays would tune it to {nearest:.9g} Hz, which is nearer"


def _told(candidate: Candidate, step: float) -> Iterator[str]:
    """What the JSON keys say must be what the bands say."""
    steps, ladder = candidate.extra.get("steps"), candidate.extra.get("ladder")
    if not isinstance(steps, list) or not isinstance(ladder, Mapping) or len(steps) != len(candidate.bands):
        yield "its steps are not told, or not all"
        return
    for each, band in zip(steps, candidate.bands, strict=True):
        if (each["frequency_hz"], each["closed"]) != (band.resonance, list(band.contacts)):
            yield f"{band.name}: its step is told otherwise than its band"
    if not math.isclose(ladder["step_hz"], step, rel_tol=1e-9):
        yield f"its step is told as {ladder['step_hz']} Hz, it is {step}"
