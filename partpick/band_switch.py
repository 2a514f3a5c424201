"""The band switch of a design: its kind, which contact closes at which bands, and what idle coils do.

Names of contacts: S capacitors, ST a trimmer, SL the coil or its tap, SV the tuning element.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from partpick.circuit import Design
from partpick.quantities import format_quantity
from partpick.receiver import is_receiver
from partpick.request import Request
from partpick.result import BandFigures, CoilFigures

KINDS = {"separate": "single pole", "stacked": "progressive shorting", "shared": "relays or toggles"}
NEAR = 0.05  # of the frequency: an idle coil so near takes power; common practice, no source


@dataclass(frozen=True)
class Contact:
    """One contact: its name, the pole it belongs to, and the places of the bands at which it is closed."""

    name: str
    pole: str  # "capacitors", "trimmers", "coil", "tuning element"
    bands: tuple[int, ...]


def contacts_of(request: Request, design: Design) -> tuple[Contact, ...]:
    """Return every contact that a design needs; none where there is one band.

    What is in circuit at every band by the layout itself is wired: the capacitors of the highest band of a
    stack. In `shared` each capacitor of the set has its contact.
    """
    if len(request.bands) < 2:
        return ()
    if is_receiver(request):  # each circuit has its coil for itself; one band of two circuits has no switch
        both = [Contact(f"S{place + 1}", "circuits", (place,)) for place in range(len(request.bands))]
        return tuple(both) if len(both) > 2 else ()
    makers = {"separate": _separate, "stacked": _stacked, "shared": _shared}
    return (*makers[request.switching](request, design), *_coil_pole(request, design), *_element_pole(request, design))


def _separate(request: Request, design: Design) -> list[Contact]:
    found = []
    for place, (band, network) in enumerate(zip(request.bands, design.networks, strict=True)):
        if network.parts or band.trimmer is not None:
            found.append(Contact(f"S{place + 1}", "capacitors", (place,)))
    return found


def _stacked(request: Request, design: Design) -> list[Contact]:
    """A band's contact adds its capacitors and stays closed at all lower bands of the coil."""
    found = []
    for coil in dict.fromkeys(design.coils):
        own = [place for place, other in enumerate(design.coils) if other == coil]
        falling = sorted(own, key=lambda place: -request.bands[place].lowest)
        for step, place in enumerate(falling[1:], 1):
            found.append(Contact(f"S{place + 1}", "capacitors", tuple(sorted(falling[step:]))))
    return [*sorted(found, key=lambda contact: int(contact.name[1:])), *_trimmers(request)]


def _shared(request: Request, design: Design) -> list[Contact]:
    found = []
    wired = "steps" in dict(request.extra)  # there, what is in circuit at every position needs no relay
    for member in range(len(design.members)):
        bands = tuple(place for place, closed in enumerate(design.closed) if member in closed)
        if wired and len(bands) == len(request.bands):
            continue
        found.append(Contact(f"S{member + 1}", "capacitors", bands))
    return [*found, *_trimmers(request)]


def _trimmers(request: Request) -> list[Contact]:
    trimmed = [place for place, band in enumerate(request.bands) if band.trimmer is not None]
    return [Contact(f"ST{place + 1}", "trimmers", (place,)) for place in trimmed]


def _coil_pole(request: Request, design: Design) -> list[Contact]:
    if len(set(design.coils)) < 2 and not any(design.taps):
        return []
    return [Contact(f"SL{place + 1}", "coil", (place,)) for place in range(len(request.bands))]


def _element_pole(request: Request, design: Design) -> list[Contact]:
    swept = [place for place, band in enumerate(request.bands) if band.swept]
    through_padders = any(network.series is not None for network in design.networks)
    moves_coil = request.tuning is not None and request.tuning.moves_inductance
    if not swept or moves_coil or (len(swept) == len(request.bands) and not through_padders):
        return []
    return [Contact(f"SV{place + 1}", "tuning element", (place,)) for place in swept]


def closed_at(contacts: Sequence[Contact], place: int) -> tuple[str, ...]:
    """Return the names of the contacts that are closed at a band."""
    return tuple(contact.name for contact in contacts if place in contact.bands)


def switch_entry(
    request: Request,
    contacts: Sequence[Contact],
    bands: Sequence[BandFigures],
    coils: Sequence[CoilFigures],
) -> dict[str, object]:
    """Return the JSON key `switch` of a candidate; empty where there is one band.

    Its `idle_coils` tell between which frequencies each coil resonates by itself while others are in use:
    with its self-capacitance alone, and with all strays of its bands besides. [Hz]
    """
    if len(request.bands) < 2 or is_receiver(request):
        return {}
    idle = [_idle(coil, bands) for coil in coils] if len(coils) > 1 else []
    poles = list(dict.fromkeys(contact.pole for contact in contacts))
    entry: dict[str, object] = {
        "kind": KINDS[request.switching],
        "poles": poles,
        "contacts": len(contacts),
        "closes": [
            {"contact": contact.name, "pole": contact.pole, "bands": [bands[place].name for place in contact.bands]}
            for contact in contacts
        ],
        "idle_coils": idle,
    }
    return {"switch": {**entry, "advice": _advice(request, contacts, bands, idle)}}


def _idle(coil: CoilFigures, bands: Sequence[BandFigures]) -> dict[str, Any]:
    own = coil.self_capacitance
    strays = max((band.stray for band in bands if band.coil == coil.reference), default=0.0)
    low = high = None
    if own is not None and own + strays > 0:
        low = _resonance(coil.inductance, own + strays)
        high = _resonance(coil.inductance, own) if own > 0 else None
    told: dict[str, Any] = {"coil": coil.reference, "resonance_low_hz": low, "resonance_high_hz": high}
    near = [band.name for band in bands if band.coil != coil.reference and _is_near(band, low, high)]
    return {**told, "near": near}


def _resonance(inductance: float, capacitance: float) -> float:
    return 1.0 / (2.0 * math.pi * math.sqrt(inductance * capacitance))


def _is_near(band: BandFigures, low: float | None, high: float | None) -> bool:
    if low is None:
        return False
    ends = (band.target, band.target) if band.target is not None else (band.extra["low_hz"], band.extra["high_hz"])
    first, last = (float(str(end)) for end in ends)
    return last >= low * (1 - NEAR) and (high is None or first <= high * (1 + NEAR))


def _advice(
    request: Request, contacts: Sequence[Contact], bands: Sequence[BandFigures], idle: Sequence[dict[str, Any]]
) -> list[str]:
    said = []
    for entry in idle:
        near = entry["near"]
        if isinstance(near, list) and near:
            low, high = entry["resonance_low_hz"], entry["resonance_high_hz"]
            above = f"and {format_quantity(high, 'Hz', 3)}" if high is not None else "and far above"
            said.append(
                f"{entry['coil']} idle resonates by itself between {format_quantity(low, 'Hz', 3)} {above}, by what "
                f"strays stay on it, and takes power at {', '.join(near)}: short it there"
            )
    if idle and all(entry["near"] == [] and entry["resonance_low_hz"] is not None for entry in idle):
        said.append("no idle coil resonates near a band in use")
    if idle:
        said.append("short a coil that is not in use, or screen the coils from each other")
    if request.switching == "shared":
        for contact in contacts:
            if contact.pole == "capacitors" and len(contact.bands) == len(bands):
                said.append(f"{contact.name} is closed at every band: its capacitor may be wired in for good")
    return said
