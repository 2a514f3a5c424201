"""What is taken for empty cells of a row, by grade of capacitor and kind of coil.

Every default taken is said in the part's notes, which reach the warnings of each result.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

TRIMMER_Q = 400.0  # film and ceramic trimmers
PRACTICE = "common practice"
CLASS_1 = "EIA-198 class 1"


@dataclass(frozen=True, kw_only=True)
class Grade:
    """Working figures of one grade of capacitor; `None` is "nobody can say"."""

    tolerance: float = 0.05  # fraction of the value
    least_tolerance: float = 0.0  # F; small values are sorted in steps of this, not in per cent
    tempco: float | None = None  # 1/K
    tempco_tolerance: float | None = None  # 1/K
    q: float | None = None
    q_below: float | None = None  # Hz
    tempco_source: str = PRACTICE


def _ceramic(tempco: float, tempco_tolerance: float, q: float, source: str = CLASS_1) -> Grade:
    return Grade(
        least_tolerance=0.25e-12,  # IEC 60384-8: below 10 pF tolerances are in pF; from memory
        tempco=tempco * 1e-6,
        tempco_tolerance=tempco_tolerance * 1e-6,
        q=q,
        tempco_source=source,
    )


# Temperature coefficients of class 1: EIA-198 and IEC 60384-8, from memory. Q and the films: common
# practice, no source, on the careful side.
_C0G = _ceramic(0, 30, 1000)
_N150, _N330, _N750 = _ceramic(-150, 30, 700), _ceramic(-330, 60, 700), _ceramic(-750, 120, 500)
GRADES: dict[str, Grade] = {
    "c0g": _C0G,
    "np0": _C0G,
    "c0g high voltage": _C0G,
    "n150": _N150,
    "p2g": _N150,
    "n330": _N330,
    "s2h": _N330,
    "n750": _N750,
    "u2j": _N750,
    "p100": _ceramic(100, 30, 700, PRACTICE),
    "mica": Grade(tempco=35e-6, tempco_tolerance=35e-6, q=1500),
    "polystyrene": Grade(tolerance=0.025, tempco=-120e-6, tempco_tolerance=60e-6, q=1500, q_below=5e6),
    "polypropylene": Grade(tempco=-200e-6, tempco_tolerance=100e-6, q=1000, q_below=1e6),
}
UNKNOWN_GRADE = Grade()

_CLASS_2 = re.compile(r"[XYZ][2-9][DEFLPRSTUV]|electrolytic|tantalum", re.IGNORECASE)  # letters: EIA-198, from memory


def is_class_2(grade: str) -> bool:
    """Return whether a grade is a class 2 ceramic, such as X7R, or an electrolytic: no capacitor for a tank."""
    return _CLASS_2.match(grade.strip()) is not None


INDUCTOR_TOLERANCE = 0.10  # common practice, no source
FORMER_TOLERANCE = 0.01  # of the diameter; common practice, no source
# 1/K with its spread, of a coil on each support: common practice, no source.
FORMER_TEMPCO = {"tube": (100e-6, 50e-6), "ribbed": (30e-6, 15e-6), "mandrel": (25e-6, 10e-6)}
# Loss tangent of each support, what is air in it counted as such: common practice, from memory. Dry plastic
# has 0.005 to 0.02, ceramic 0.0005 to 0.001; the ribs of a ribbed former touch the winding at a few places.
FORMER_LOSS_TANGENT = {"tube": 0.01, "ribbed": 0.001, "mandrel": 0.0}
LOW_PERMEABILITY = 30.0  # powder and plastic below, ferrite above


def core_tolerance(permeability: float | None, al: float | None) -> float:
    """Return the tolerance of AL, a fraction, where none is stated: common practice, no source."""
    ferrite = al is None and permeability is not None and permeability > LOW_PERMEABILITY
    return 0.20 if ferrite else 0.05
