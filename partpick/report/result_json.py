"""The result as JSON, keys as the contract has them: SI numbers, null for unknown.

The same result gives the same bytes: no clock, host or path, keys always in one order.
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from numbers import Integral, Real

import partpick
from partpick.errors import InternalError
from partpick.report.request_json import request_as_json
from partpick.result import BandFigures, Candidate, CoilFigures, Front, PartLine, Proof, Result, RuledOut

RESULT_FORMAT = 1
WINDINGS_FORMAT = 1
PPM = 1e6

Entry = dict[str, object]


def result_json(result: Result) -> str:
    """Return the result file, indented, with a final newline.

    Raises
    ------
    InternalError
        A figure is infinite, or is of a type that JSON does not know.
    """
    return json.dumps(_plain(result_entry(result), "result"), indent=2, ensure_ascii=False) + "\n"


def result_entry(result: Result) -> Entry:
    """Return the result as nested dicts and lists, in the contract's keys."""
    miss = result.nearest_miss
    return {
        "partpick_result": RESULT_FORMAT,
        "version": partpick.__version__,
        "request": {**request_as_json(result.request), "floor": result.floor},
        "proof": _proof(result.proof),
        "nearest_miss": None if miss is None else _candidate(miss),
        "ruled_out_by": _ruled_out(result.ruled_out_by),
        "warnings": list(result.warnings),
        "front": [_for_all(candidate, result.request.units) for candidate in result.front],
        **({"fronts": [_front(result, front) for front in result.fronts]} if result.fronts else {}),
        "candidates": [_for_all(candidate, result.request.units) for candidate in result.candidates],
    }


def windings_json(coils: Sequence[CoilFigures]) -> str:
    """Return the file of `partpick windings`, one winding a line (there may be tens of thousands)."""
    rows = [json.dumps(_plain(_coil(coil), "windings"), ensure_ascii=False) for coil in coils]
    body = "[\n    " + ",\n    ".join(rows) + "\n  ]" if rows else "[]"
    return f'{{\n  "partpick_windings": {WINDINGS_FORMAT},\n  "windings": {body}\n}}\n'


def _proof(proof: Proof) -> Entry:
    return {
        "status": proof.status,
        "searched": proof.searched,
        "stages": [{"objective": s.objective, "value": s.value, "bound": s.bound} for s in proof.stages],
        "stopped_by": proof.stopped_by,
    }


def _ruled_out(ruled_out: RuledOut | None) -> Entry | None:
    if ruled_out is None:
        return None
    others = [_ruled_out(other) for other in ruled_out.others]
    return {
        "limit": ruled_out.limit, "needed": ruled_out.needed, "text": ruled_out.text, "others": others,
        "unsettled": list(ruled_out.unsettled),
    }


def _front(result: Result, front: Front) -> Entry:
    candidates = [_for_all(candidate, result.request.units) for candidate in front.candidates]
    return {"criteria": list(front.criteria), "complete": front.complete, "candidates": candidates}


def _for_all(candidate: Candidate, units: int) -> Entry:
    """Return a candidate, with what all units take together where there are several."""
    entry = _candidate(candidate)
    if units > 1:
        price = None if candidate.price is None else units * candidate.price
        entry["all_units"] = {"units": units, "pieces": units * candidate.piece_count, "price": price}
    return entry


def _candidate(candidate: Candidate) -> Entry:
    return {
        "rank": candidate.rank,
        "on_front": candidate.on_front,
        "worst_error_ppm": _ppm(candidate.worst_error),
        "worst_excess": candidate.worst_excess,
        "part_count": candidate.part_count,
        "inductor_count": candidate.inductor_count,
        "piece_count": candidate.piece_count,
        "value_count": candidate.value_count,
        "price": candidate.price,
        "alternatives": candidate.alternatives,
        "bands": [_band(band) for band in candidate.bands],
        "coils": [_coil(coil) for coil in candidate.coils],
        "parts": [_part(part) for part in candidate.parts],
        "warnings": list(candidate.warnings),
        **candidate.extra,
    }


def _band(band: BandFigures) -> Entry:
    """A fixed band has target, resonance and error; a swept one brings its own keys in `extra`."""
    fixed = band.target is not None
    on_target: Entry = {
        "target_hz": band.target,
        "resonance_hz": band.resonance,
        "error_ppm": _ppm(band.error),
    }
    # the contract has no capacitance of a swept band: it has two, one at each end
    capacitances: Entry = {
        "capacitance_f": band.capacitance if fixed else None,
        "network_f": band.network if fixed else None,
        "stray_f": band.stray if fixed else None,
        "self_capacitance_f": band.self_capacitance if fixed else None,
        "trimmer_f": band.trimmer if fixed else None,
    }
    return {
        "name": band.name,
        **(on_target if fixed else {}),
        "inductance_h": band.inductance,
        **capacitances,
        "coil": band.coil,
        "tap_turns": band.tap_turns,
        "contacts": list(band.contacts),
        "capacitors": list(band.capacitors),
        "connection": band.connection,
        "reactance_ohm": band.reactance,
        "q": band.q,
        "bandwidth_hz": band.bandwidth,
        "drift_per_k": band.drift,
        "drift_spread_per_k": band.drift_spread,
        "hertz_per_farad": band.hertz_per_farad,
        **band.extra,
    }


def _coil(coil: CoilFigures) -> Entry:
    return {
        "reference": coil.reference,
        "form": coil.form,
        "label": coil.label,
        "turns": coil.turns,
        "former": coil.former,
        "wire": coil.wire,
        "winding_length_m": coil.winding_length,
        "wire_length_m": coil.wire_length,
        "pitch_m": coil.pitch,
        "mean_diameter_m": coil.mean_diameter,
        "inductance_h": coil.inductance,
        "inductance_dc_h": coil.inductance_dc,
        "self_capacitance_f": coil.self_capacitance,
        **coil.extra,
    }


def _part(part: PartLine) -> Entry:
    return {
        "reference": part.reference,
        "kind": part.kind,
        "value_h" if part.unit == "H" else "value_f": part.value,
        "label": part.label,
        "description": part.description,
        "grade": part.grade,
        "tolerance": part.tolerance,
        "tempco_per_k": part.tempco,
        "bands": list(part.bands),
        "unit_price": part.unit_price,
        "source": part.source,
    }


def _ppm(fraction: float | None) -> float | None:
    return None if fraction is None else fraction * PPM


def _plain(value: object, where: str) -> object:
    """Return a value in types that JSON has; nan becomes null, infinity is a bug of ours."""
    if value is None or isinstance(value, (str, bool)):
        return value
    if isinstance(value, Integral):  # numpy's too
        return int(value)
    if isinstance(value, Real):
        number = float(value)
        if math.isinf(number):
            raise InternalError(f"internal error: {where} is infinite; nothing is written")
        return None if math.isnan(number) else number
    if isinstance(value, Mapping):
        return {str(key): _plain(item, f"{where}.{key}") for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item, f"{where}[{place}]") for place, item in enumerate(value)]
    raise InternalError(f"internal error: {where} is a {type(value).__name__}; nothing is written")
