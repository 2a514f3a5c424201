"""Temperature coefficients of coils, networks and resonances."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import resonance, skin, temperature

PUBLISHED = Path(__file__).parent / "published"
capacitors = st.lists(st.tuples(st.floats(1e-12, 1e-8), st.floats(-1e-3, 1e-3)), min_size=1, max_size=6)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("temperature_coil.csv"), ids=lambda r: r["f_Hz"])
def test_a_free_copper_coil(row: dict[str, str]) -> None:
    """Expansion of copper and the deeper current of warm copper, at high frequency."""
    tempco = temperature.coil_tempco(copper_q=float(row["Q_copper"])) * 1e6
    assert tempco == pytest.approx(float(row["ppm_per_K_total_free_copper_coil"]), rel=float(row["rel_tol"]))
    part = tempco - temperature.COPPER_EXPANSION * 1e6
    assert part == pytest.approx(float(row["ppm_per_K_from_resistivity"]), rel=float(row["rel_tol"]))


def test_expansion_is_the_published_one() -> None:
    """IEC 60028 rounds to 17 ppm/K, handbooks give 16.5 to 16.6 (from memory)."""
    row = next(row for row in rows("loss_copper.csv") if row["quantity"] == "linear expansion")
    assert pytest.approx(float(row["value"]), rel=float(row["rel_tol"])) == temperature.COPPER_EXPANSION


@pytest.mark.parametrize("x", [0.3, 1.0, 3.0, 10.0, 40.0])
def test_the_copper_part_is_the_derivative_of_the_exact_skin_effect(x: float) -> None:
    """Warm the wire by 1 K in the exact formula: resistivity up, a/delta down, internal inductance up."""
    warm = skin.copper_resistivity(20.5) / skin.copper_resistivity(19.5)
    internal = [skin.internal_inductance_ratio(x * warm**power) for power in (0.25, -0.25)]
    change = internal[1] - internal[0]  # of mu0/(8 pi), per kelvin
    # Reactance of mu0/(8 pi) over R_dc is x^2/4; with Q = wL/R this is (1/L) dL/dT = change x^2/(4 H Q).
    q = 200.0
    expected = change * x**2 / 4.0 / (skin.skin_ratio(x) * q)
    part = temperature.coil_tempco(expansion=0.0, copper_q=q, a_over_delta=x)
    assert part == pytest.approx(expected, rel=1e-3)


def test_the_copper_part_is_whole_at_high_and_gone_at_low_frequency() -> None:
    """0.00393/(2 Q) holds from a/delta = 4 on within 16 %; at 0.5 nothing is left."""
    assert temperature.internal_share([4.0, 8.0, 1e4]) == pytest.approx([1.0, 1.0, 1.0], abs=0.16)
    assert temperature.internal_share(0.5) < 1e-3
    assert temperature.internal_share(np.inf) == 1.0
    below, above = temperature.internal_share([300.0 * (1 - 1e-9), 300.0 * (1 + 1e-9)])
    assert below == pytest.approx(above, rel=1e-5)
    assert np.isnan(temperature.internal_share(-1.0))


@pytest.mark.parametrize("row", rows("temperature_drift.csv"), ids=lambda r: r["case"])
def test_drift_examples(row: dict[str, str]) -> None:
    """Half the sum, against frequency."""
    drift = temperature.frequency_drift(float(row["alpha_L_ppm_per_K"]), float(row["alpha_C_ppm_per_K"]))
    assert drift == pytest.approx(float(row["df_over_f_ppm_per_K"]), abs=1e-9)


def test_a_little_of_a_falling_grade_cancels_a_rising_coil() -> None:
    """+40 ppm/K of coil with N750: 5.33 % of the capacitance (published drift example)."""
    row = next(row for row in rows("temperature_drift.csv") if "N750" in row["case"])
    share = temperature.compensating_share(float(row["alpha_L_ppm_per_K"]), 0.0, -750.0)
    assert share * 100.0 == pytest.approx(5.33, abs=0.005)
    whole = temperature.parallel_tempco([1.0 - share, share], [0.0, -750.0])
    assert whole == pytest.approx(float(row["alpha_C_ppm_per_K"]))
    assert np.isnan(temperature.compensating_share(40.0, 0.0, 100.0))


@given(capacitors, st.sampled_from(["parallel", "series"]))
def test_network_coefficients_are_the_derivative(parts: list[tuple[float, float]], how: str) -> None:
    """Each capacitor warmed by a hundredth of a kelvin, the network computed afresh."""
    value, tempco = np.array(parts).T
    step = 1e-2

    def network(capacitance: np.ndarray) -> float:
        return float(capacitance.sum() if how == "parallel" else 1.0 / (1.0 / capacitance).sum())

    change = (network(value * (1 + tempco * step)) - network(value * (1 - tempco * step))) / (2 * step)
    function = temperature.parallel_tempco if how == "parallel" else temperature.series_tempco
    assert function(value, tempco) == pytest.approx(change / network(value), rel=1e-5, abs=1e-10)


@given(capacitors)
def test_equal_coefficients_stay_in_any_network(parts: list[tuple[float, float]]) -> None:
    """A mean cannot leave the range of its members."""
    value = np.array([part[0] for part in parts])
    same = np.full_like(value, 30e-6)
    assert temperature.parallel_tempco(value, same) == pytest.approx(30e-6)
    assert temperature.series_tempco(value, same) == pytest.approx(30e-6)


def test_drift_is_what_a_warm_tank_does() -> None:
    """Ten kelvin either way on coil and capacitor, the frequency computed afresh."""
    cold, warm = (
        resonance.resonance_frequency(4e-6 * (1 + 40e-6 * rise), 100e-12 * (1 - 30e-6 * rise))
        for rise in (-10, 10)
    )
    drift = np.log(warm / cold) / 20
    assert drift == pytest.approx(temperature.frequency_drift(40e-6, -30e-6), rel=1e-5)


def test_spreads_add_by_size() -> None:
    """All parts at their ends the same way, whatever the signs they are given with: C0G's 30 makes 15."""
    assert temperature.drift_spread(0.0, 30e-6) == pytest.approx(15e-6)
    assert temperature.drift_spread(-20e-6, 30e-6) == pytest.approx(25e-6)
