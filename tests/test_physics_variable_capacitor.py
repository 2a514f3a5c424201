"""Variable capacitors: published ranges, the laws at their ends and between, round trips, the gap."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.resonance import resonance_frequency
from partpick.physics.variable_capacitor import (
    LAWS,
    capacitance_at,
    capacitance_range,
    gap_breakdown_voltage,
    parallel_for_ratio,
    rotation_for,
    sections_in_parallel,
    with_padders,
)

PUBLISHED = Path(__file__).parent / "published"
LOW, HIGH = 12e-12, 365e-12
lows = st.floats(1e-12, 50e-12)
ratios = st.floats(1.5, 50.0)
laws = st.sampled_from(LAWS)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("variable_capacitor_range.csv"), ids=lambda r: r["f_ratio"])
def test_padders_leave_the_published_range(row: dict[str, str]) -> None:
    """Series padder on the element alone, parallel padder across the coil."""
    low, high, parallel, coil = (float(row[k]) for k in ("Cmin_F", "Cmax_F", "C_parallel_total_F", "L_H"))
    series = float(row["C_series_padder_F(blank=none)"] or "inf")
    tolerance = float(row["rel_tol"])
    ends = capacitance_range(low, high, series, parallel)
    assert ends.least == pytest.approx(float(row["Ctot_min_F"]), rel=tolerance)
    assert ends.greatest == pytest.approx(float(row["Ctot_max_F"]), rel=tolerance)
    assert ends.frequency_ratio == pytest.approx(float(row["f_ratio"]), rel=tolerance)
    assert resonance_frequency(coil, ends.greatest) == pytest.approx(float(row["f_low_Hz"]), rel=tolerance)
    assert resonance_frequency(coil, ends.least) == pytest.approx(float(row["f_high_Hz"]), rel=tolerance)


@given(lows, ratios, ratios, laws, st.floats(0.0, 100e-12))
def test_rotation_inverts_the_law(low: float, first: float, second: float, law: str, fixed: float) -> None:
    """What the dial shows must bring back the capacitance."""
    high, wanted = low * max(first, second), low * min(first, second)
    angle = rotation_for(wanted, low, high, law, fixed)
    assert 0.0 <= angle <= 180.0
    assert capacitance_at(angle, low, high, law, fixed) == pytest.approx(wanted, rel=1e-9)


@given(lows, ratios, laws, st.floats(0.0, 100e-12))
def test_plates_rise_from_end_to_end(low: float, ratio: float, law: str, fixed: float) -> None:
    """Least at 0, greatest at 180 degrees, never back."""
    curve = capacitance_at(np.linspace(0.0, 180.0, 37), low, low * ratio, law, fixed)
    assert curve[0] == pytest.approx(low, rel=1e-9) and curve[-1] == pytest.approx(low * ratio, rel=1e-9)
    assert np.all(np.diff(curve) > 0.0)


def test_each_law_is_straight_in_its_own_quantity() -> None:
    """Capacitance, wavelength or frequency of the circuit goes in equal steps of rotation."""
    angle, stray, coil = np.linspace(0.0, 180.0, 19), 20e-12, 1e-4
    of_circuit = {law: capacitance_at(angle, LOW, HIGH, law, stray) + stray for law in LAWS}
    frequency = {law: resonance_frequency(coil, c) for law, c in of_circuit.items()}
    straight = (
        of_circuit["straight-line capacitance"],
        1.0 / frequency["straight-line wavelength"],
        frequency["straight-line frequency"],
    )
    for curve in straight:
        steps = np.diff(curve)
        assert steps == pytest.approx(np.full(18, steps[0]), rel=1e-9)


def test_outside_the_travel_is_no_capacitance() -> None:
    """Neither beyond the stops nor outside the range; an unknown law is an error."""
    assert np.isnan(capacitance_at([-1.0, 181.0], LOW, HIGH)).all()
    assert np.isnan(rotation_for([11e-12, 366e-12], LOW, HIGH)).all()
    with pytest.raises(KeyError):
        capacitance_at(90.0, LOW, HIGH, "straight-line patience")


def test_absent_padders_leave_the_element_alone() -> None:
    """An endless padder is a wire; sections in parallel add."""
    assert with_padders(LOW) == LOW
    assert with_padders(LOW, 12e-12) == pytest.approx(6e-12)
    assert sections_in_parallel(LOW, 3) == pytest.approx(36e-12)


@given(lows, ratios, st.floats(1.05, 3.0), st.floats(20e-12, 2e-9))
def test_parallel_padder_sets_the_ratio(low: float, spread: float, wanted: float, series: float) -> None:
    """Where it comes out positive, the ratio is the one asked for; negative means out of reach."""
    parallel = parallel_for_ratio(low, low * spread, wanted, series)
    reach = capacitance_range(low, low * spread, series).frequency_ratio
    assert (parallel >= 0.0) == (wanted <= reach * (1 + 1e-12))
    if parallel > 0.0:
        ends = capacitance_range(low, low * spread, series, parallel)
        assert ends.frequency_ratio == pytest.approx(wanted, rel=1e-9)


def test_air_breaks_down_near_three_kilovolts_a_millimetre() -> None:
    """About 4.5 kV peak over 1 mm and 30 kV over 10 mm of dry air at sea level (handbook figures, from memory)."""
    assert gap_breakdown_voltage(1e-3) == pytest.approx(4500.0, rel=0.05)
    assert gap_breakdown_voltage(1e-2) == pytest.approx(30e3, rel=0.05)
    assert gap_breakdown_voltage(1e-3, 0.8) < gap_breakdown_voltage(1e-3)
    assert np.isnan(gap_breakdown_voltage([1e-5, 0.2])).all()
