"""The tuning element of a plan as the search sees it: two ends, a loss and a tempco.

An element that moves inductance has no capacitance: what it does is in the figures of the coils (`moved/`).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from partpick.physics.varactor import (
    junction_capacitance,
    junction_rf_peak,
    junction_tempco,
    network_capacitance,
    network_tempco,
)
from partpick.physics.variable_capacitor import sections_in_parallel
from partpick.request import Tuning

VARIABLE_Q = 1000.0  # an air-spaced variable capacitor; common practice, no source
VARACTOR_Q = 150.0  # common practice, no source
CORE_Q = 150.0  # of a sliding core's material where the plan states none; common practice, no source
# of what the element sets, where the plan states no tolerance; common practice, no source
TOLERANCE = {
    "variable capacitor": 0.05,
    "varactor": 0.10,
    "sliding core": 0.10,
    "moving contact": 0.01,
    "variometer": 0.02,
}
TOLERANCE_OF = {
    "variable capacitor": "the capacitance",
    "varactor": "the capacitance",
    "sliding core": "the inductance that the core adds",
    "moving contact": "the inductance in use",
    "variometer": "the mutual inductance",
}
SETTING_UNITS = {
    "variable capacitor": "degree",
    "varactor": "V",
    "sliding core": "mm",
    "moving contact": "turn",
    "variometer": "degree",
}


@dataclass(frozen=True, kw_only=True)
class ElementEnds:
    """What an element of capacitance spans; nothing for one that moves inductance."""

    low: float  # F
    high: float  # F
    q: float
    tempco: float | None  # 1/K, at the end that tunes highest
    words: str


def element_ends(tuning: Tuning) -> ElementEnds:
    """Return the ends of a tuning element."""
    if tuning.kind == "variable capacitor":
        return _variable_capacitor(tuning)
    if tuning.kind == "varactor":
        return _varactor(tuning)
    assert tuning.moves_inductance, tuning.kind
    return ElementEnds(low=0.0, high=0.0, q=float("inf"), tempco=None, words=tuning.kind)


def element_notes(tuning: Tuning) -> tuple[str, ...]:
    """Return what must be said of an element that moves inductance, whatever coil it goes with."""
    notes = {
        "sliding core": (
            "sliding core: permeability and loss are taken as the same at every frequency; the former's bore as "
            "0.9 of its diameter (common practice)",
        ),
        "moving contact": (
            "moving contact: bare the wire along the track of the contact, or take bare wire",
            *(("moving contact: the loss of the open unused turns is not counted",) if _rest_open(tuning) else ()),
        ),
        "variometer": ("variometer: the former's bore is taken as 0.9 of its diameter (common practice)",),
    }
    own_q = tuning.kind == "sliding core" and tuning.get("q") is None
    taken = (f"sliding core: tuning.q is not stated, {CORE_Q:.0f} taken (common practice)",) if own_q else ()
    return (*notes.get(tuning.kind, ()), *taken)


def most_share(tuning: Tuning, drive: Mapping[str, object]) -> float:
    """Return the most of the tank's voltage that a varactor may bear at its least bias; infinite where any will do.

    More drives it into conduction. Only a drive that states the voltage across the tank says so before there is a
    tank; any other is looked at afterwards (`conduction.py`). [-]
    """
    held, depth = drive.get("voltage"), drive.get("modulation")
    if tuning.kind != "varactor" or not isinstance(held, float):
        return float("inf")
    peak = held * (1.0 + (depth if isinstance(depth, float) else 0.0))
    zero_bias, potential, grading = (_number(tuning, key) for key in ("zero_bias", "potential", "grading"))
    opposed = tuning.get("connection") == "back to back"
    junction = junction_capacitance(_number(tuning, "from"), zero_bias, potential, grading)
    whole = network_capacitance(junction, _stated(tuning, "count") or 1.0, opposed)
    series = _stated(tuning, "series") or float("inf")
    return _number(tuning, "from") / float(junction_rf_peak(peak, whole, series, opposed))


def _rest_open(tuning: Tuning) -> bool:
    return tuning.get("unused") == "open"


def element_tolerance(tuning: Tuning) -> float:
    """Return the tolerance of what an element sets, the kind's default where the plan states none. [fraction]"""
    stated = tuning.get("tolerance")
    return float(stated) if isinstance(stated, (int, float)) else TOLERANCE[tuning.kind]


def _number(tuning: Tuning, key: str) -> float:
    value = tuning.get(key)
    assert isinstance(value, (int, float))
    return float(value)


def _stated(tuning: Tuning, key: str) -> float | None:
    value = tuning.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _variable_capacitor(tuning: Tuning) -> ElementEnds:
    sections = _stated(tuning, "parallel") or _stated(tuning, "sections") or 1.0
    low, high = (float(sections_in_parallel(_number(tuning, key), sections)) for key in ("low", "high"))
    words = f"variable capacitor, {sections:.0f} sections in parallel" if sections > 1 else "variable capacitor"
    if gang := _stated(tuning, "gang"):  # of a receiver: a section for each circuit
        words = f"variable capacitor of {gang:.0f} equal sections"
    return ElementEnds(low=low, high=high, q=VARIABLE_Q, tempco=_stated(tuning, "tempco"), words=words)


def _varactor(tuning: Tuning) -> ElementEnds:
    zero_bias, potential, grading = (_number(tuning, key) for key in ("zero_bias", "potential", "grading"))
    bias_low, bias_high = _number(tuning, "from"), _number(tuning, "to")
    count = _stated(tuning, "count") or 1.0
    back_to_back = tuning.get("connection") == "back to back"
    series = _stated(tuning, "series") or float("inf")

    def whole(bias: float, behind: float) -> float:
        junction = junction_capacitance(bias, zero_bias, potential, grading)
        return float(network_capacitance(junction, count, back_to_back, behind))

    tempco = _stated(tuning, "tempco")
    if tempco is None:
        junctions = whole(bias_high, float("inf"))
        tempco = float(network_tempco(junction_tempco(bias_high, potential, grading), junctions, series))
    low, high = whole(bias_high, series), whole(bias_low, series)
    gang = _stated(tuning, "gang")  # of a receiver: one for each circuit
    words = f"{gang:.0f} equal varactors on one voltage" if gang else "varactor"
    return ElementEnds(low=low, high=high, q=VARACTOR_Q, tempco=tempco, words=words)
