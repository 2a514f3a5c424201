"""Results made by hand, with consistent figures and no search behind them, for tests of what shows them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from partpick.request import Band, Limits, Request
from partpick.result import BandFigures, Candidate, CoilFigures, PartLine, Proof, Result, RuledOut, Stage

INDUCTANCE = 4.05e-6
STRAY, SELF_CAPACITANCE = 5e-12, 1.2e-12


def capacitor(reference: str, value: float = 100e-12, label: str = "100 pF", **changes: Any) -> PartLine:
    """Return one capacitor of grade C0G."""
    fields: dict[str, Any] = {
        "reference": reference,
        "kind": "capacitor",
        "value": value,
        "unit": "F",
        "label": label,
        "description": f"{label} C0G",
        "grade": "C0G",
        "tolerance": 0.05,
        "tempco": 0.0,
        "bands": ("beacon",),
        "unit_price": 0.1,
        "source": "invented row",
    }
    return PartLine(**{**fields, **changes})


def coil_part(reference: str = "L1", **changes: Any) -> PartLine:
    """Return one coil: a former that costs 0.80 and 1.24 m of wire at 0.05 a metre, 0.862 together."""
    fields: dict[str, Any] = {
        "reference": reference,
        "kind": "coil",
        "value": INDUCTANCE,
        "unit": "H",
        "label": "4.05 \u00b5H",
        "description": "14 turns of 0.5 mm on 20 mm former",
        "grade": None,
        "tolerance": 0.02,
        "tempco": 5e-5,
        "bands": ("beacon",),
        "unit_price": 0.862,
        "source": "invented row",
        "wire": "enamelled 0.5 mm",
        "wire_length": 1.24,
        "wire_price_per_m": 0.05,
    }
    return PartLine(**{**fields, **changes})


def coil(reference: str = "L1", **changes: Any) -> CoilFigures:
    """Return the figures of that coil."""
    fields: dict[str, Any] = {
        "reference": reference,
        "form": "solenoid",
        "label": "14 turns of 0.5 mm on 20 mm former",
        "turns": 14,
        "former": "20 mm former",
        "wire": "enamelled 0.5 mm",
        "winding_length": 7.8e-3,
        "wire_length": 1.24,
        "inductance": INDUCTANCE,
        "inductance_dc": 4.06e-6,
        "self_capacitance": SELF_CAPACITANCE,
    }
    return CoilFigures(**{**fields, **changes})


def band(name: str, target: float, network: float, references: Sequence[str], **changes: Any) -> BandFigures:
    """Return a band whose resonance follows from its inductance and its capacitance in circuit."""
    total = network + STRAY + SELF_CAPACITANCE
    resonance = 1 / (2 * math.pi * math.sqrt(INDUCTANCE * total))
    fields: dict[str, Any] = {
        "name": name,
        "target": target,
        "resonance": resonance,
        "error": (resonance - target) / target,
        "inductance": INDUCTANCE,
        "capacitance": total,
        "network": network,
        "stray": STRAY,
        "self_capacitance": SELF_CAPACITANCE,
        "trimmer": None,
        "coil": "L1",
        "tap_turns": None,
        "contacts": (),
        "capacitors": tuple(references),
        "connection": " | ".join(references),
        "reactance": 2 * math.pi * target * INDUCTANCE,
        "q": 187.0,
        "bandwidth": None,
        "drift": 1.2e-5,
        "drift_spread": 4e-5,
        "hertz_per_farad": -resonance / (2 * total),
    }
    return BandFigures(**{**fields, **changes})


def swept_band(name: str = "weather") -> BandFigures:
    """Return a band that a tuning element sweeps."""
    return replace(
        band(name, 7.1e6, 0.0, ["C1"]),
        target=None,
        resonance=None,
        error=None,
        capacitance=None,
        network=None,
        hertz_per_farad=None,
        drift=None,
        connection="(T + C1)",
        extra={
            "low_hz": 7.0e6,
            "high_hz": 7.3e6,
            "tuned_low_hz": 6.7e6,
            "tuned_high_hz": 7.6e6,
            "excess": 1.0,
            "series_padder_f": 100e-12,
            "parallel_padder_f": 0.0,
            "tuning_low_f": 12e-12,
            "tuning_high_f": 150e-12,
        },
    )


def candidate(rank: int | None = 1, **changes: Any) -> Candidate:
    """Return a candidate of one band at 7.1 MHz: 100 pF and 18 pF across the coil."""
    own = band("beacon", 7.1e6, 118e-12, ["C1", "C2"])
    assert own.error is not None
    fields: dict[str, Any] = {
        "rank": rank,
        "on_front": True,
        "worst_error": abs(own.error),
        "worst_excess": None,
        "part_count": 2,
        "inductor_count": 1,
        "piece_count": 3,
        "value_count": 2,
        "price": 1.062,
        "alternatives": 4,
        "bands": (own,),
        "coils": (coil(),),
        "parts": (capacitor("C1"), capacitor("C2", 18e-12, "18 pF"), coil_part()),
        "warnings": (),
    }
    return Candidate(**{**fields, **changes})


def two_bands(rank: int | None = 1) -> Candidate:
    """Return a candidate of two bands on one coil, with an equal capacitor in each."""
    bands = (
        band("beacon", 7.1e6, 118e-12, ["C1", "C2"]),
        band("weather", 5.0e6, 244e-12, ["C3", "C4", "C5"], connection="C3 | (C4 + C5)", contacts=("S2",)),
    )
    parts = (
        capacitor("C1"),
        capacitor("C2", 18e-12, "18 pF"),
        capacitor("C3", bands=("weather",)),
        capacitor("C4", 270e-12, "270 pF", bands=("weather",)),
        capacitor("C5", 270e-12, "270 pF", bands=("weather",)),
        coil_part(bands=("beacon", "weather")),
    )
    worst = max(abs(each.error) for each in bands if each.error is not None)
    return candidate(
        rank,
        bands=bands,
        parts=parts,
        part_count=5,
        piece_count=6,
        value_count=3,
        worst_error=worst,
        price=1.362,
    )


def request(*names: str, **changes: Any) -> Request:
    """Return a request of `pair` for one name or none, of `bands` for more."""
    names = names or ("tank",)
    bands = tuple(Band(name=name, at=7.1e6 - 2.1e6 * place) for place, name in enumerate(names))
    fields = {"command": "pair" if len(bands) == 1 else "bands", "bands": bands, "limits": Limits()}
    return Request(**{**fields, **changes})


def result(*candidates: Candidate, **changes: Any) -> Result:
    """Return a result proven optimal that holds the candidates."""
    fields: dict[str, Any] = {
        "request": request(),
        "floor": 0.0021,
        "proof": Proof(
            status="optimal",
            searched="all 412 windings, 1 and 2 capacitors in parallel, for nominal values",
            stages=(Stage(objective="pieces", value=3, bound=3),),
        ),
        "candidates": candidates,
        "front": candidates[:1],
    }
    return Result(**{**fields, **changes})


def nothing(**changes: Any) -> Result:
    """Return the answer that nothing fits, with its nearest miss."""
    fields: dict[str, Any] = {
        "proof": Proof(status="infeasible", searched="all 412 windings"),
        "nearest_miss": candidate(None, on_front=False),
        "ruled_out_by": RuledOut(
            limit="error",
            needed=0.0083,
            text="error rules out every choice; the least that these parts reach is 0.83 %",
        ),
        "front": (),
    }
    return result(**{**fields, **changes})
