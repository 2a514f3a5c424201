"""[coupling]: two tanks as picked, top-coupled by a small standard capacitor for a wanted bandwidth."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from partpick.circuit import acting_capacitance
from partpick.errors import RequestError
from partpick.parts import Capacitor
from partpick.physics.coupled_tanks import (
    Tank,
    coupling_capacitance,
    coupling_for_bandwidth,
    critical_coupling,
    pair_attenuation,
    pair_transfer,
)
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import BandFigures, Candidate
from partpick.search.networks import network_tables

MOST_PARTS = 3  # in a network that is picked again
POINTS = 20_001  # of a response
OFF = 1.25  # of the bandwidth, in ratio: from here it is told
HARMONICS = (2, 3)


def check_coupling(request: Request) -> None:
    """Refuse what a coupled pair is not planned with.

    Raises
    ------
    RequestError
        Ranges, another layout, series inductance, a load by divider, an oscillator or a receiver.
    """
    extra = dict(request.extra)
    if "coupling" not in extra:
        return
    swept = [band.name for band in request.bands if band.swept]
    divided = any(band.load is not None and band.load.connection == "divider" for band in request.bands)
    refused = (
        (bool(swept), f"a range ({', '.join(swept)})", "a band with at"),
        (request.switching != "separate", f'switching = "{request.switching}"', '"separate"'),
        (request.stray.inductance > 0, "stray.inductance", "0 nH"),
        (divided, 'load.connection = "divider"', '"across", "tap" or "link"'),
        ("oscillator" in extra, "[oscillator]", "a plan of its own"),
        ("receiver" in extra, "[receiver]", "a plan of its own"),
    )
    for asked, what, instead in refused:
        if asked:
            raise RequestError(f"[coupling] with {what} is not planned; {instead} would do")


def with_coupling(request: Request, capacitors: Sequence[Capacitor], candidate: Candidate) -> Candidate:
    """Return a candidate with how two of each of its tanks are coupled; itself where that is not asked for."""
    keys = dict(request.extra).get("coupling")
    if keys is None:
        return candidate
    wanted = dict(keys)["bandwidth"]
    bands, told = [], []
    for band, asked in zip(candidate.bands, request.bands, strict=True):
        entry = pair_of(band, asked, capacitors, wanted, min(request.limits.parts_per_band, MOST_PARTS))
        bands.append(replace(band, extra={**band.extra, "coupling": entry}))
        if entry["note"]:
            told.append(f"{band.name}: {entry['note']}")
    told.append("a coupled pair takes every coil and each tank's capacitors twice: the bill has one tank as picked")
    return replace(candidate, bands=tuple(bands), warnings=(*candidate.warnings, *told))


def pair_of(
    band: BandFigures, asked: Band, capacitors: Sequence[Capacitor], wanted: object, parts: int
) -> dict[str, Any]:
    """Return two equal tanks of one band and their response.

    Parameters
    ----------
    band : BandFigures
        The tank as picked, at one frequency.
    asked : Band
        The band as asked for.
    capacitors : sequence of Capacitor
        Those in play, for the coupling and for the network that is left of each tank.
    wanted : float or None
        Bandwidth; None: critical coupling. [Hz]
    parts : int
        Most capacitors in a tank. [-]
    """
    assert band.target is not None
    load = band.extra.get("load")
    q = load["loaded_q"] if isinstance(load, dict) else band.q
    nothing = {"capacitor_f": None, "factor": None, "bandwidth_hz": None, "note": None}
    if q is None or band.q is None:
        return {**nothing, "note": "the Q is unknown, so that nothing says how two tanks are to be coupled"}
    critical = float(critical_coupling(q, q))
    factor = critical
    if isinstance(wanted, float):
        factor = float(coupling_for_bandwidth(band.target, q, wanted))
    if not factor > 0:
        least = math.sqrt(math.sqrt(2.0) - 1.0) * band.target / q
        asked_for = format_quantity(wanted, "Hz", 3) if isinstance(wanted, float) else "?"
        return {
            **nothing,
            "note": f"two tanks with a Q of {q:.3g} have at least {format_quantity(least, 'Hz', 3)}, {asked_for} is "
            "wanted: tanks of higher Q would do",
        }
    total = 1.0 / ((2 * math.pi * band.target) ** 2 * band.inductance)
    needed = float(coupling_capacitance(factor, total, total))
    acting = {part.value: acting_capacitance(part, band.target) for part in capacitors if part.quantity != 0}
    coupling = min(acting, key=lambda value: (abs(math.log(acting[value] / needed)), value), default=None)
    fixed = band.stray + band.self_capacitance + (band.trimmer or 0.0)
    if coupling is None or total - acting[coupling] - fixed < 0:
        return {**nothing, "note": f"{format_quantity(needed, 'F', 3)} would couple them; no capacitor in play fits"}
    own = _network(acting, total - acting[coupling] - fixed, parts)
    across = math.fsum(acting[value] for value in own) + fixed
    reached = {
        "capacitor_f": coupling,
        "factor": acting[coupling] / (across + acting[coupling]),
        "critical_factor": critical,
        "needed_f": needed,
        "capacitors_f": own,
        "capacitance_f": across + acting[coupling],  # of each tank, the coupling counted
    }
    response = _response(band, asked, q, across, acting[coupling], wanted)
    return {**reached, **response, "note": _note(response, wanted, needed, acting[coupling])}


def _network(acting: dict[float, float], wanted: float, parts: int) -> list[float]:
    """Return the capacitors in parallel that come nearest to a capacitance, of equal ones the fewest. [F]"""
    values = sorted(acting, key=lambda value: (acting[value], value))
    at_work = np.array([acting[value] for value in values])
    best: tuple[float, list[float]] = (abs(wanted), [])
    for table in network_tables(at_work, parts, connect_any=False)[1:]:
        below, above = (float(side[0]) for side in table.neighbours(np.array([wanted])))
        for side in (below, above):
            if math.isfinite(side) and abs(side - wanted) < best[0] * (1 - 1e-9):
                row = table.inside(side * (1 - 1e-12), side * (1 + 1e-12))
                best = abs(side - wanted), [values[place] for place in row.species[0]]
    return best[1]


def _response(
    band: BandFigures, asked: Band, q: float, across: float, coupling: float, wanted: object
) -> dict[str, Any]:
    """Return peaks, dip, bandwidth and what is kept out of a pair driven at one tank and taken from the other."""
    assert band.target is not None and band.q is not None
    x = math.sqrt(band.inductance / (across + coupling))
    tank = Tank(band.inductance, across, x / band.q, max(1.0 / q - 1.0 / band.q, 0.0) / x)
    width = max(wanted if isinstance(wanted, float) else 0.0, band.target / q, 2.0 * coupling / across * band.target)
    span = min(4.0 * width / band.target, 0.9)
    grid = band.target * np.linspace(1.0 - span, 1.0 + span, POINTS)
    size = np.abs(pair_transfer(grid, tank, tank, coupling))
    most = float(size.max())
    level = most / math.sqrt(2.0)
    inside = np.flatnonzero(size >= level)
    low = _crossing(grid, size, level, int(inside[0]), -1)
    high = _crossing(grid, size, level, int(inside[-1]), 1)
    peaks = 1 + np.flatnonzero((size[1:-1] > size[:-2]) & (size[1:-1] >= size[2:]))
    dip = float(size[peaks[0] : peaks[-1] + 1].min()) if len(peaks) else most

    target = band.target

    def down(frequency: float) -> float | None:
        return float(pair_attenuation(frequency, target, tank, tank, coupling)) if frequency > 0 else None

    offset = None if asked.load is None else asked.load.offset
    sides = None if offset is None else {"below": down(target - offset), "above": down(target + offset)}
    return {
        "bandwidth_hz": high - low,
        "low_hz": low,
        "high_hz": high,
        "peaks_hz": [float(grid[peak]) for peak in peaks],
        "ripple_db": 20.0 * math.log10(most / dip),
        "rejection_db": sides,
        "harmonics_db": {str(order): down(order * target) for order in HARMONICS},
    }


def _crossing(grid: Any, size: Any, level: float, at: int, way: int) -> float:
    """Return where a response crosses a level next to a place, on a straight line between two points. [Hz]"""
    other = min(max(at + way, 0), len(grid) - 1)
    if other == at or size[other] >= level:
        return float(grid[at])
    share = (size[at] - level) / (size[at] - size[other])
    return float(grid[at] + share * (grid[other] - grid[at]))


def _note(response: dict[str, Any], wanted: object, needed: float, taken: float) -> str | None:
    if not isinstance(wanted, float) or 1 / OFF <= response["bandwidth_hz"] / wanted <= OFF:
        return None
    reached, asked_for = (format_quantity(width, "Hz", 3) for width in (response["bandwidth_hz"], wanted))
    return (
        f"two tanks coupled by {format_quantity(taken, 'F', 3)} have {reached}, {asked_for} is wanted: "
        f"{format_quantity(needed, 'F', 2)} would do"
    )
