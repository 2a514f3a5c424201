"""What a ladder of relays gives: its steps, the largest gap, and what tolerances do to it."""

from __future__ import annotations

import numpy as np

from partpick.result import Candidate
from partpick.search.problem import Floats


def ladder_keys(
    candidate: Candidate, base: int, rungs: Floats, step: float, span: tuple[float, float]
) -> dict[str, object]:
    """Return the JSON keys `steps` and `ladder` of a candidate.

    Parameters
    ----------
    candidate : Candidate
        Assessed at every position; its first `base` capacitors are always in circuit.
    base : int
        Number of those. [-]
    rungs : (2^m,) array
        Frequency of every subset of the others. [Hz]
    step : float
        The step asked for. [Hz]
    span : tuple of float
        Lower and upper end. [Hz]
    """
    low, high = span
    lines = [line for line in candidate.parts if line.kind == "capacitor"]
    relays = lines[base:]
    reach = np.sort(rungs[(rungs >= low - step / 2 * (1 + 1e-9)) & (rungs <= high + step / 2 * (1 + 1e-9))])
    steps = [
        {
            "position": place,
            "target_hz": band.target,
            "frequency_hz": band.resonance,
            "off_hz": None if band.resonance is None or band.target is None else band.resonance - band.target,
            "closed": list(band.contacts),
            "capacitors": list(band.capacitors),
        }
        for place, band in enumerate(candidate.bands)
    ]
    return {
        "steps": steps,
        "ladder": {
            "step_hz": step,
            "largest_gap_hz": float(np.diff(reach).max(initial=0.0)),
            "open_hz": float(rungs[0]),
            "all_closed_hz": float(rungs[-1]),
            "always_in_circuit": [line.reference for line in lines[:base]],
            "relays": [
                {
                    "contact": next((name for band in candidate.bands for name in band.contacts if name == own), None),
                    "capacitor": line.reference,
                    "value_f": line.value,
                }
                for line, own in ((line, f"S{base + place + 1}") for place, line in enumerate(relays))
            ],
            "drowned": drowned(candidate, base, step),
        },
    }


def drowned(candidate: Candidate, base: int, step: float) -> list[dict[str, object]]:
    """Return the relays at which tolerances add up to more than a step, smallest value first.

    Where a relay takes over from all smaller ones, the tolerances of all of them add up (worst case), and a
    tolerance moves f by half its share of the capacitance in circuit; taken at the highest position that closes
    the relay. From there on the ladder may fall back where it should rise, and smaller values make it no finer.
    """
    found: list[dict[str, object]] = []
    lines = [line for line in candidate.parts if line.kind == "capacitor"][base:]
    farads = 0.0
    for line in sorted(lines, key=lambda line: line.value or 0.0):
        farads += (line.tolerance or 0.0) * (line.value or 0.0)
        closed = [band for band in candidate.bands if line.reference in band.capacitors]
        band = max(closed, key=lambda band: band.resonance or 0.0, default=None)
        if band is None or not band.capacitance or not band.resonance:
            continue
        off = 0.5 * farads / band.capacitance * band.resonance
        if off > step:
            found.append({"capacitor": line.reference, "tolerance": line.tolerance, "moves_hz": off})
    return found
