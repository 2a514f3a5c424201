"""Tests of the result as JSON: the contract's keys, SI, null for unknown, the same bytes each time."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from typing import Any

import handmade
import numpy as np
import pytest

from partpick.errors import InternalError
from partpick.report.result_json import result_json, windings_json

# The lists below are the contract's, key by key.
TOP_KEYS = {
    "partpick_result", "version", "request", "proof", "nearest_miss", "ruled_out_by", "front", "candidates",
}  # fmt: skip
CANDIDATE_KEYS = {
    "rank", "on_front", "worst_error_ppm", "worst_excess", "part_count", "inductor_count", "piece_count",
    "value_count", "price", "alternatives", "bands", "coils", "parts", "warnings",
}  # fmt: skip
BAND_KEYS = {
    "name", "target_hz", "resonance_hz", "error_ppm", "inductance_h", "capacitance_f", "network_f", "stray_f",
    "self_capacitance_f", "trimmer_f", "coil", "tap_turns", "contacts", "capacitors", "connection",
    "reactance_ohm", "q", "bandwidth_hz",
}  # fmt: skip
COIL_KEYS = {
    "reference", "form", "label", "turns", "former", "wire", "winding_length_m", "wire_length_m",
    "inductance_h", "inductance_dc_h", "self_capacitance_f",
}  # fmt: skip
SWEPT_KEYS = {
    "low_hz", "high_hz", "tuned_low_hz", "tuned_high_hz", "excess", "series_padder_f", "parallel_padder_f",
    "tuning_low_f", "tuning_high_f",
}  # fmt: skip


def _read(text: str) -> Any:
    """Return JSON read strictly: NaN and Infinity are refused."""

    def refuse(constant: str) -> None:
        raise AssertionError(f"{constant} is not JSON")

    return json.loads(text, parse_constant=refuse)


def test_every_key_of_the_contract_is_there() -> None:
    """Scripts are written against these keys; a missing one breaks them."""
    read = _read(result_json(handmade.result(handmade.candidate())))
    candidate = read["candidates"][0]
    assert read.keys() >= TOP_KEYS
    assert candidate.keys() >= CANDIDATE_KEYS
    assert candidate["bands"][0].keys() >= BAND_KEYS
    assert candidate["coils"][0].keys() >= COIL_KEYS
    assert candidate["parts"][0].keys() >= {
        "reference", "kind", "value_f", "label", "grade", "tolerance", "tempco_per_k", "bands",
    }  # fmt: skip
    assert read["partpick_result"] == 1
    assert read["proof"] == {
        "status": "optimal",
        "searched": "all 412 windings, 1 and 2 capacitors in parallel, for nominal values",
        "stages": [{"objective": "pieces", "value": 3, "bound": 3}],
        "stopped_by": None,
    }


def test_the_floor_stands_in_the_request() -> None:
    """The contract puts the floor beside the limits in force."""
    assert _read(result_json(handmade.result()))["request"]["floor"] == 0.0021


def test_errors_are_signed_ppm_of_the_target() -> None:
    """(resonance - target)/target in parts per million; the worst one by size, both from one band here."""
    read = _read(result_json(handmade.result(handmade.candidate())))["candidates"][0]
    band = read["bands"][0]
    by_hand = (band["resonance_hz"] - band["target_hz"]) / band["target_hz"] * 1e6
    assert band["error_ppm"] == pytest.approx(by_hand, rel=1e-12)
    assert band["error_ppm"] < 0
    assert read["worst_error_ppm"] == -band["error_ppm"]


def test_resonance_follows_from_inductance_and_capacitance_as_written() -> None:
    """A reader must be able to check 1/(2 pi sqrt(LC)) from the digits in the file."""
    band = _read(result_json(handmade.result(handmade.candidate())))["candidates"][0]["bands"][0]
    resonance = 1 / (2 * math.pi * math.sqrt(band["inductance_h"] * band["capacitance_f"]))
    assert band["resonance_hz"] == pytest.approx(resonance, rel=1e-15)


def test_a_swept_band_has_ends_in_place_of_target_and_capacitance() -> None:
    """The contract replaces three keys and nulls the capacitances of a swept band."""
    swept = handmade.candidate(bands=(handmade.swept_band(),), worst_error=None, worst_excess=1.0)
    read = _read(result_json(handmade.result(swept)))["candidates"][0]
    band = read["bands"][0]
    assert band.keys() >= SWEPT_KEYS
    assert not band.keys() & {"target_hz", "resonance_hz", "error_ppm"}
    assert band["capacitance_f"] is None and band["network_f"] is None
    assert read["worst_error_ppm"] is None and read["worst_excess"] == 1.0


def test_unknown_and_not_a_number_are_null() -> None:
    """NaN is no JSON; a reader of another language would stop at it."""
    band = replace(handmade.candidate().bands[0], q=math.nan, bandwidth=None)
    read = _read(result_json(handmade.result(handmade.candidate(bands=(band,), price=None))))["candidates"][0]
    assert read["bands"][0]["q"] is None
    assert read["bands"][0]["bandwidth_hz"] is None
    assert read["price"] is None


@pytest.mark.parametrize("figure", [math.inf, -math.inf])
def test_an_infinite_figure_is_never_written(figure: float) -> None:
    """Infinity means that a computation went wrong; it must not look like an answer."""
    band = replace(handmade.candidate().bands[0], q=figure)
    with pytest.raises(InternalError, match="q is infinite"):
        result_json(handmade.result(handmade.candidate(bands=(band,))))


def test_numbers_of_numpy_are_written_as_plain_numbers() -> None:
    """The search works on arrays; its scalars may reach the result."""
    candidate = handmade.candidate(part_count=np.int64(2), price=np.float64(1.5))
    read = _read(result_json(handmade.result(candidate)))["candidates"][0]
    assert (read["part_count"], read["price"]) == (2, 1.5)


def test_nothing_fits_has_its_miss_and_its_limit() -> None:
    """The exit code is 1 but the file is still an answer: what came nearest, what would do."""
    read = _read(result_json(handmade.nothing()))
    assert read["candidates"] == []
    assert read["nearest_miss"]["rank"] is None
    assert read["ruled_out_by"]["limit"] == "error"
    assert read["ruled_out_by"]["needed"] == 0.0083


def test_a_coil_has_its_value_in_henry_and_a_capacitor_in_farad() -> None:
    """A key says its unit, so one key cannot hold both."""
    parts = _read(result_json(handmade.result(handmade.candidate())))["candidates"][0]["parts"]
    assert parts[0]["value_f"] == 100e-12 and "value_h" not in parts[0]
    assert parts[2]["value_h"] == handmade.INDUCTANCE and "value_f" not in parts[2]


def test_the_same_result_gives_the_same_bytes() -> None:
    """Two equal results, made apart, must not differ by clock, path or order of keys."""
    first = result_json(handmade.result(handmade.candidate()))
    second = result_json(handmade.result(handmade.candidate()))
    assert first.encode() == second.encode()
    assert first.endswith("}\n")


def test_windings_have_the_keys_of_a_coil_and_the_figures_at_a_frequency() -> None:
    """`windings --at` adds Q and resistance beside the coil's keys."""
    coils = (handmade.coil("", extra={"q": 187.0, "series_resistance_ohm": 0.97}), handmade.coil(""))
    read = _read(windings_json(coils))
    assert read["partpick_windings"] == 1
    assert [entry.keys() >= COIL_KEYS for entry in read["windings"]] == [True, True]
    assert (read["windings"][0]["q"], read["windings"][0]["series_resistance_ohm"]) == (187.0, 0.97)


def test_no_winding_is_an_empty_list() -> None:
    """An empty stock is no reason for a file that cannot be read."""
    assert _read(windings_json(()))["windings"] == []
