"""Each band from its connection in words and the values of its parts: network, total, frequency, error."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

from partpick.connection import Connection, Parallel, Part, parse_connection, references_of, without
from partpick.errors import InternalError
from partpick.request import Request
from partpick.result import BandFigures, Candidate, PartLine

AGREE = 1e-9  # of a figure: sums in another order
ELEMENT = "T"


def band_faults(candidate: Candidate, band: BandFigures, request: Request) -> Iterator[str]:
    """Yield what does not hold of one band's figures.

    Parameters
    ----------
    candidate : Candidate
        Whose parts the band uses.
    band : BandFigures
        The band.
    request : Request
        Its leads' inductance and the band as asked for.
    """
    try:
        tree = parse_connection(band.connection)
    except InternalError:
        yield f"{band.name}: the connection {band.connection!r} cannot be read"
        return
    named = [name for name in references_of(tree) if name != ELEMENT]
    if sorted(named) != sorted(band.capacitors):
        yield f"{band.name}: connected are {' '.join(named)}, named as in circuit {' '.join(band.capacitors)}"
        return
    unlisted = set(named) - {line.reference for line in candidate.parts}
    if unlisted:
        yield f"{band.name}: {' '.join(sorted(unlisted))} in circuit but not among the parts"
        return
    if band.target is not None:
        yield from _fixed(candidate, band, tree, request)
    else:
        yield from _swept(candidate, band, tree, request)


def _fixed(candidate: Candidate, band: BandFigures, tree: Connection | None, request: Request) -> Iterator[str]:
    assert band.target is not None
    values = {line.reference: line for line in candidate.parts}
    bare = _acting(tree, values, band.target, None, _device(band, request)) + _by_load(band, values, request)
    network = _behind(bare, request.stray.inductance, band.target)
    total = network + band.stray + band.self_capacitance + (band.trimmer or 0.0)
    resonance = _frequency(band.inductance, total)
    error = (resonance - band.target) / band.target
    yield from _compare(band.name, "network", band.network, network)
    yield from _compare(band.name, "capacitance", band.capacitance, total)
    yield from _compare(band.name, "resonance", band.resonance, resonance)
    if band.error is None or abs(band.error - error) > AGREE:
        yield f"{band.name}: error is {band.error}, its parts give {error:.9g}"
    yield from _compare(band.name, "reactance", band.reactance, 2 * math.pi * band.target * band.inductance)


def _swept(candidate: Candidate, band: BandFigures, tree: Connection | None, request: Request) -> Iterator[str]:
    figure = {key: value for key, value in band.extra.items() if isinstance(value, float)}
    low, high = figure["low_hz"], figure["high_hz"]
    ends = (
        ("low", low, "tuning_high_f", figure["inductance_low_h"]),
        ("high", high, "tuning_low_f", band.inductance),
    )
    tuned = {}
    for end, frequency, own, inductance in ends:
        total = _total_with_element(candidate, band, tree, request, frequency, figure.get(own))
        # a coil that is tuned may have another self-capacitance at each end
        total += figure.get(f"self_capacitance_{end}_f", band.self_capacitance)
        tuned[end] = _frequency(inductance, total)
        yield from _compare(band.name, f"tuned {end} end", figure.get(f"tuned_{end}_hz"), tuned[end])
    excess = max(low - tuned["low"], tuned["high"] - high) / (high - low)
    if abs(figure.get("excess", math.inf) - excess) > AGREE * max(1.0, abs(excess)):
        yield f"{band.name}: excess is {figure.get('excess')}, its parts give {excess:.9g}"
    if "follows" in band.extra:
        return  # an oscillator covers what tracking asks of it
    margin = request.limits.margin
    if tuned["low"] > low * (1 - margin) * (1 + AGREE) or tuned["high"] < high * (1 + margin) * (1 - AGREE):
        yield f"{band.name}: tunes {tuned['low']:.9g} to {tuned['high']:.9g} Hz, which leaves no margin of {margin:g}"


def _total_with_element(
    candidate: Candidate,
    band: BandFigures,
    tree: Connection | None,
    request: Request,
    frequency: float,
    element: float | None,
) -> float:
    """Return all but the self-capacitance that is in circuit with the tuning element at one end. [F]"""
    values = {line.reference: line for line in candidate.parts}
    across, tuned = tree, 0.0
    if tree is not None and ELEMENT in references_of(tree):
        own, across = without(tree, ELEMENT)
        tuned = _acting(own, values, frequency, element, _device(band, request))
    bare = _acting(across, values, frequency, None, _device(band, request))
    others = _behind(bare, request.stray.inductance, frequency)
    return others + tuned + band.stray + (band.trimmer or 0.0)


def _acting(
    tree: Connection | None,
    values: Mapping[str, PartLine],
    frequency: float,
    element: float | None,
    device: Mapping[str, float],
) -> float:
    """Return the capacitance that a connection shows at a frequency, series inductances and device included. [F]"""
    if tree is None:
        return 0.0
    if isinstance(tree, Part):
        if tree.reference == ELEMENT:
            return element or 0.0
        line = values[tree.reference]
        own = _behind(line.value or 0.0, line.series_inductance or 0.0, frequency)
        return own + device.get(tree.reference, 0.0)
    branches = [_acting(branch, values, frequency, element, device) for branch in tree.branches]
    if isinstance(tree, Parallel):
        return math.fsum(branches)
    return 1.0 / math.fsum(1.0 / branch for branch in branches)


def _device(band: BandFigures, request: Request) -> dict[str, float]:
    """Return what of an oscillator's device is across which capacitor. [F]"""
    told: object = band.extra.get("oscillator")
    stated: dict[str, Any] = dict(dict(request.extra).get("oscillator", ()))
    if not isinstance(told, Mapping) or told["output_capacitor"] is None:
        return {}
    return {
        told["output_capacitor"]: stated["output_capacitance"],
        told["control_capacitor"]: stated["input_capacitance"],
    }


def _by_load(band: BandFigures, values: Mapping[str, PartLine], request: Request) -> float:
    """Return what a load on a capacitive divider adds to its capacitance: the divider with it less that without. [F]"""
    told = band.extra.get("load")
    names = told.get("divider") if isinstance(told, Mapping) else None
    asked = next(each for each in request.bands if each.name == band.name)
    if not names or band.target is None or asked.load is None or asked.load.resistance is None:
        return 0.0
    s = 2j * math.pi * band.target
    upper, lower = (s * _acting(Part(name), values, band.target, None, {}) for name in names)
    loaded = 1.0 / (1.0 / upper + 1.0 / (lower + 1.0 / asked.load.resistance))
    return (loaded - 1.0 / (1.0 / upper + 1.0 / lower)).imag / s.imag


def _behind(capacitance: float, inductance: float, frequency: float) -> float:
    """Return what a capacitance shows behind an inductance: the reactances are added. [F]"""
    if capacitance == 0.0 or inductance == 0.0:
        return capacitance
    omega = 2 * math.pi * frequency
    return 1.0 / (omega * (1.0 / (omega * capacitance) - omega * inductance))


def _frequency(inductance: float, capacitance: float) -> float:
    return 1.0 / (2 * math.pi * math.sqrt(inductance * capacitance))


def _compare(band: str, what: str, told: float | None, found: float) -> Iterator[str]:
    if told is None or abs(told - found) > AGREE * max(abs(found), abs(told)):
        yield f"{band}: {what} is {told}, its parts give {found:.9g}"
