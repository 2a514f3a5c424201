"""A varactor under drive: conduction at the least bias is told, with the bias that would do."""

from __future__ import annotations

from typing import Any

import pytest

import partpick
from partpick.planfile import request_from_tables
from partpick.result import Candidate

JUNCTION = {"kind": "varactor", "zero_bias": "500 pF", "grading": 0.5, "from": "3 V", "to": "12 V"}


def driven(volts: str, **keys: Any) -> Candidate:
    tables = {
        "band": [{"name": "a", "from": "5 MHz", "to": "5.5 MHz"}],
        "tuning": {**JUNCTION, **keys},
        "coil": {"measured": "3.3 µH", "self_capacitance": "2 pF"},
        "limits": {"parts_per_band": 1},
        "stray": {"share": "none"},
        "drive": {"voltage": volts},
    }
    return partpick.solve(request_from_tables(tables, "bands"), partpick.load_catalogue(), top=1).candidates[0]


def told(candidate: Candidate) -> str:
    return " ".join(text for text in candidate.warnings if "varactor" in text)


@pytest.mark.parametrize(
    ("volts", "said"),
    [("1.9 V", ""), ("2.5 V", "close to conduction"), ("3.5 V", "into conduction")],
)
def test_the_least_bias_stays_above_the_peak_and_a_reserve(volts: str, said: str) -> None:
    """One volt of reserve: common practice, no source. The whole tank voltage is on a junction by itself."""
    candidate = driven(volts)
    assert candidate.bands[0].extra["series_padder_f"] is None
    assert (said in told(candidate)) if said else told(candidate) == ""


def test_the_bias_that_would_do_is_told() -> None:
    """Peak and reserve: 3.5 V + 1 V."""
    assert "tuning.from at 4.5 V" in told(driven("3.5 V"))


def test_two_in_opposition_bear_half_each() -> None:
    """Capacitive voltage division between equals."""
    assert told(driven("3.5 V", connection="back to back", count=2)) == ""
    assert "into conduction" in told(driven("6.5 V", connection="back to back", count=2))
