"""The tuning element of a plan as the search sees it: two ends, a loss and a tempco.

So far the capacitive kinds; an inductive one moves L and is another kind of search.
"""

from __future__ import annotations

from dataclasses import dataclass

from partpick.errors import RequestError
from partpick.physics.varactor import junction_capacitance, junction_tempco, network_capacitance, network_tempco
from partpick.physics.variable_capacitor import sections_in_parallel
from partpick.request import Tuning

VARIABLE_Q = 1000.0  # an air-spaced variable capacitor; common practice, no source
VARACTOR_Q = 150.0  # common practice, no source
# of the capacitance of an element whose plan states no tolerance; common practice, no source
TOLERANCE = {"variable capacitor": 0.05, "varactor": 0.10}
KINDS_PLANNED = ("variable capacitor", "varactor")


@dataclass(frozen=True, kw_only=True)
class ElementEnds:
    """What an element of capacitance spans."""

    low: float  # F
    high: float  # F
    q: float
    tempco: float | None  # 1/K, at the end that tunes highest
    words: str


def element_ends(tuning: Tuning) -> ElementEnds:
    """Return the ends of a tuning element.

    Raises
    ------
    RequestError
        The element is of a kind that moves an inductance, or its ends are the wrong way round.
    """
    if tuning.kind == "variable capacitor":
        return _variable_capacitor(tuning)
    if tuning.kind == "varactor":
        return _varactor(tuning)
    raise RequestError(
        f'tuning.kind: "{tuning.kind}" is read and understood, but this version plans only '
        + " and ".join(f'"{kind}"' for kind in KINDS_PLANNED)
    )


def element_tolerance(tuning: Tuning) -> float:
    """Return the tolerance of an element's capacitance, the kind's default where the plan states none. [fraction]"""
    stated = tuning.get("tolerance")
    return float(stated) if isinstance(stated, (int, float)) else TOLERANCE.get(tuning.kind, 0.05)


def _number(tuning: Tuning, key: str) -> float:
    value = tuning.get(key)
    assert isinstance(value, (int, float))
    return float(value)


def _stated(tuning: Tuning, key: str) -> float | None:
    value = tuning.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _variable_capacitor(tuning: Tuning) -> ElementEnds:
    sections = _stated(tuning, "sections") or 1.0
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
