"""A varactor under drive: conduction at the least bias is told, with the bias that would do."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

import partpick
from partpick.conduction import conduction_warnings
from partpick.planfile import request_from_tables
from partpick.result import Candidate, Result

JUNCTION = {"kind": "varactor", "zero_bias": "500 pF", "grading": 0.5, "from": "3 V", "to": "12 V"}


def result_of(drive: dict[str, str], **keys: Any) -> Result:
    tables = {
        "band": [{"name": "a", "from": "5 MHz", "to": "5.5 MHz"}],
        "tuning": {**JUNCTION, **keys},
        "coil": {"measured": "3.3 µH", "self_capacitance": "2 pF"},
        "limits": {"parts_per_band": 1},
        "stray": {"share": "none"},
        "drive": drive,
    }
    return partpick.solve(request_from_tables(tables, "bands"), partpick.load_catalogue(), top=1)


def driven(volts: str, **keys: Any) -> Candidate:
    return result_of({"voltage": volts}, **keys).candidates[0]


def told(candidate: Candidate) -> str:
    return " ".join(text for text in candidate.warnings if "varactor" in text and "Q of" not in text)


@pytest.mark.parametrize(
    ("volts", "said"),
    [("1.9 V", ""), ("2.5 V", "close to conduction")],
)
def test_the_least_bias_stays_above_the_peak_and_a_reserve(volts: str, said: str) -> None:
    """One volt of reserve: common practice, no source. The whole tank voltage is on a junction by itself."""
    candidate = driven(volts)
    assert candidate.bands[0].extra["series_padder_f"] is None
    assert (said in told(candidate)) if said else told(candidate) == ""


def test_the_bias_that_would_do_is_told() -> None:
    """Peak and reserve: 2.5 V + 1 V."""
    assert "tuning.from at 3.5 V" in told(driven("2.5 V"))


def test_a_drive_into_conduction_is_refused_with_the_peak() -> None:
    """Where the plan states the voltage across the tank, no such design is offered; the peak is told."""
    result = result_of({"voltage": "3.5 V"})
    assert not result.candidates and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "drive" and result.ruled_out_by.needed == pytest.approx(3.5)
    for said in ("driven into conduction", "3.5 V peak", "least bias of 3 V", "two back to back"):
        assert said in result.ruled_out_by.text
    more = {"zero_bias": "540 pF", "from": "3.6 V", "to": "14.2 V"}  # the same capacitances at more bias
    assert result_of({"voltage": "3.5 V"}, **more).candidates


def test_a_peak_that_is_known_only_with_the_tank_is_told() -> None:
    """A drive by power or current: the voltage follows from the Q of each design, so it is a warning there."""
    (band,) = driven("2.5 V").bands
    ends = [{"voltage_load_off_peak_v": 3.5}] * 2
    stressed = replace(band, extra={**band.extra, "stress": {"ends": ends}})
    tuning = request_from_tables({"band": [{"at": 5e6}], "tuning": JUNCTION}, "pair").tuning
    (said,) = conduction_warnings(tuning, [stressed])
    assert "into conduction" in said and "tuning.from at 4.5 V" in said


def test_two_in_opposition_bear_half_each() -> None:
    """Capacitive voltage division between equals."""
    assert told(driven("3.5 V", connection="back to back", count=2)) == ""
    assert not result_of({"voltage": "6.5 V"}, connection="back to back", count=2).candidates
