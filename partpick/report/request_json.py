"""The request as the result file shows it: every limit and default in force, by the plan's own names."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import asdict

from partpick.request import CHOSEN_ALIGNS, Band, MeasuredDips, Request, Trimmer

_KEY = {"low": "from", "high": "to"}  # fields that have another name in the plan
_SELF_RESONANCE_BOUGHT = 2.0  # default for bought and multilayer coils


def request_as_json(request: Request) -> dict[str, object]:
    """Return the request nested by table, in SI, ready for a JSON writer.

    Parameters
    ----------
    request : Request
        The job.

    Returns
    -------
    tables : dict
        "command", "title", "units", "switching", "by", "all_windings", then one entry a table of the plan
        (null where it is not set), "bands", and those of the further tables that are set. No nan and no
        infinity; None for "none" and for unknown.
    """
    tuning = request.tuning
    limits = asdict(request.limits)
    for flag in ("error_stated", "inductors_stated", "alignable_off"):
        limits.pop(flag)
    tables: dict[str, object] = {
        "command": request.command,
        "title": request.title,
        "units": request.units,
        "switching": request.switching,
        "by": request.by,
        "all_windings": request.all_windings,
        "limits": limits,
        "coil": _coil(request),
        "capacitors": {_KEY.get(name, name): value for name, value in asdict(request.capacitors).items()},
        "stray": asdict(request.stray),
        "trimmer": _trimmer(request, request.trimmer),
        "tuning": None if tuning is None else {"kind": tuning.kind, **dict(tuning.keys)},
        "load": None if request.load is None else asdict(request.load),
        "bands": [_band(request, band) for band in request.bands],
        **{name: dict(values) for name, values in request.extra},
    }
    return {name: _plain(value) for name, value in tables.items()}


def _coil(request: Request) -> dict[str, object]:
    coil = asdict(request.coil)
    stated = coil.pop("self_resonance_stated")
    coil["least_wound_h"] = coil.pop("least_wound")
    coil["self_resonance_bought"] = coil["self_resonance"] if stated else _SELF_RESONANCE_BOUGHT
    measured = request.coil.measured
    if isinstance(measured, MeasuredDips):
        dips = zip(measured.at, measured.with_capacitance, strict=True)
        coil["measured"] = [{"at": at, "with": capacitance} for at, capacitance in dips]
    return coil


def _trimmer(request: Request, trimmer: Trimmer | None) -> dict[str, object] | None:
    """Return a trimmer as stated, or what one that is to be chosen must do."""
    if trimmer is None:
        return None
    if trimmer.to_choose:
        asked = None if request.limits.alignable_off else CHOSEN_ALIGNS
        return {"choose": True, "alignable": request.limits.alignable or asked}
    return {"low": trimmer.low, "high": trimmer.high, "tempco": trimmer.tempco, "q": trimmer.q}


def _band(request: Request, band: Band) -> dict[str, object]:
    """Return a band with the limits in force on it."""
    values: dict[str, object] = {_KEY.get(name, name): value for name, value in asdict(band).items()}
    values["trimmer"] = _trimmer(request, band.trimmer)
    off = band.trimmer is not None and not request.limits.error_stated
    values["error"] = None if off or band.swept else request.limits.error
    return values


def _plain(value: object) -> object:
    """Return the value as JSON has it: lists for tuples, None for what is not a finite number."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(name): _plain(each) for name, each in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(each) for each in value]
    return value
