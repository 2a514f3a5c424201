"""Loaded Q, damping, selectivity and stress of a tank."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
import skrf
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import loading, resonance

PUBLISHED = Path(__file__).parent / "published"
positive = st.floats(1.0, 1e4)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("loading_two_port.csv"), ids=lambda r: r["tank"])
def test_loaded_q_and_insertion_loss_agree_with_scikit_rf(row: dict[str, str]) -> None:
    """Between equal resistances, which stand in parallel across the tank."""
    inductance, resistance, capacitance = (float(row[key]) for key in ("L_H", "r_ohm", "C_F"))
    x = resonance.reactance(inductance, capacitance)
    unloaded = x / resistance
    assert unloaded == pytest.approx(float(row["Q_unloaded"]), rel=1e-5)
    loaded = loading.loaded_q(unloaded, x, float(row["R_source_and_load_ohm"]) / 2.0)
    assert loaded == pytest.approx(float(row["Q_loaded_skrf"]), rel=float(row["rel_tol"]))
    loss = loading.insertion_loss(unloaded, loaded)
    assert loss == pytest.approx(float(row["insertion_loss_dB_skrf"]), abs=1e-3)


@pytest.mark.parametrize("row", rows("loading_two_port.csv"), ids=lambda r: r["tank"])
def test_rejection_agrees_with_a_two_port(row: dict[str, str]) -> None:
    """From half to twice the resonance within 0.1 dB of S21 in scikit-rf."""
    inductance, resistance, capacitance, port = (
        float(row[key]) for key in ("L_H", "r_ohm", "C_F", "R_source_and_load_ohm")
    )
    centre = float(resonance.resonance_frequency(inductance, capacitance))
    frequency = skrf.Frequency(0.5 * centre, 2.0 * centre, 151, unit="Hz")
    line = skrf.media.DefinedGammaZ0(frequency, z0=port)
    coil = line.resistor(resistance) ** line.inductor(inductance) ** line.short()
    through = line.shunt_capacitor(capacitance) ** line.shunt(coil)
    x = resonance.reactance(inductance, capacitance)
    unloaded = x / resistance
    loaded = loading.loaded_q(unloaded, x, port / 2.0)
    below = loading.insertion_loss(unloaded, loaded) + loading.rejection(frequency.f, centre, loaded)
    assert np.abs(-20.0 * np.log10(np.abs(through.s[:, 1, 0])) - below).max() < 0.1


@pytest.mark.parametrize("row", rows("loading_stress.csv"), ids=lambda r: r["f_Hz"])
def test_stress_of_a_driven_tank(row: dict[str, str]) -> None:
    """Energy definition of Q; the load taken off raises the voltage by the root of the Q ratio."""
    tolerance = float(row["rel_tol"])
    x = resonance.reactance(float(row["L_H"]), float(row["C_F"]))
    unloaded, loaded, power = (float(row[key]) for key in ("Q_unloaded", "Q_loaded", "P_into_tank_W"))
    voltage = loading.peak_voltage(power, x, loaded)
    current = loading.circulating_current(voltage, x)
    assert voltage == pytest.approx(float(row["V_peak_V"]), rel=tolerance)
    assert current == pytest.approx(float(row["I_circulating_peak_A"]), rel=tolerance)
    assert current / np.sqrt(2.0) == pytest.approx(float(row["I_circulating_rms_A"]), rel=tolerance)
    share = loading.efficiency(unloaded, loaded)
    assert share == pytest.approx(float(row["efficiency_1-QL/QU"]), rel=tolerance)
    assert power * (1.0 - share) == pytest.approx(float(row["P_lost_in_tank_W"]), rel=tolerance)
    # The power that the tank's own resistance would turn into heat at that voltage, by Ohm's law.
    assert voltage**2 / 2.0 / (x * unloaded) == pytest.approx(float(row["P_lost_in_tank_W"]), rel=tolerance)
    alone = loading.peak_voltage(power, x, unloaded)
    assert alone / voltage == pytest.approx(np.sqrt(unloaded / loaded))


@given(st.floats(2.0, 500.0), st.floats(1.0, 1e4), st.floats(1.01, 50.0))
def test_the_damping_resistor_gives_the_wanted_q(wanted: float, x: float, ratio: float) -> None:
    """Put back across the tank, it loads it to what was wanted."""
    unloaded = wanted * ratio
    resistor = loading.damping_resistance(unloaded, x, wanted)
    assert loading.loaded_q(unloaded, x, resistor) == pytest.approx(wanted, rel=1e-9)


def test_no_resistor_sharpens_a_tank() -> None:
    """Nothing needed is infinity, impossible is nan: never a negative resistor."""
    assert np.isinf(loading.damping_resistance(50.0, 100.0, 50.0))
    assert np.isnan(loading.damping_resistance(50.0, 100.0, 60.0))


@given(st.lists(st.tuples(st.floats(1e-12, 1e-8), positive), min_size=1, max_size=6))
def test_network_q_is_that_of_the_admittances(parts: list[tuple[float, float]]) -> None:
    """Against complex admittances at one frequency, capacitors with series loss 1/(w C Q)."""
    value, q = np.array(parts).T
    omega = 1e7
    loss = 1.0 / (omega * value * q)
    series = np.sum(loss + 1.0 / (1j * omega * value))
    assert loading.series_q(value, q) == pytest.approx(-series.imag / series.real, rel=1e-9)
    lossy = omega * value * (1j + 1.0 / q)  # parallel loss, the same Q
    parallel = np.sum(lossy)
    assert loading.parallel_q(value, q) == pytest.approx(parallel.imag / parallel.real, rel=1e-9)


def test_network_q_limits() -> None:
    """Equal parts keep their Q; one ideal or unknown part shows."""
    assert loading.parallel_q([1e-10, 3e-10], [500.0, 500.0]) == pytest.approx(500.0)
    assert loading.series_q([1e-10, 3e-10], [500.0, 500.0]) == pytest.approx(500.0)
    assert np.isinf(loading.parallel_q([1e-10, 3e-10], [np.inf, np.inf]))
    assert np.isnan(loading.series_q([1e-10, 3e-10], [500.0, np.nan]))
    # The lossy part weighs by its capacitance in parallel and by its elastance in series: by hand.
    assert loading.parallel_q([1.0, 3.0], [100.0, np.inf]) == pytest.approx(400.0)
    assert loading.series_q([1.0, 3.0], [100.0, np.inf]) == pytest.approx(400.0 / 3.0)


def test_rejection_is_three_decibels_at_the_edge_of_the_band() -> None:
    """The exact edges of a parallel-loss tank: f/f0 - f0/f = 1/Q."""
    q = 30.0
    edge = 1.0 / (2 * q) + np.sqrt(1.0 + 1.0 / (2 * q) ** 2)
    assert loading.rejection(edge * 7e6, 7e6, q) == pytest.approx(10.0 * np.log10(2.0))
    assert loading.rejection(7e6, 7e6, q) == 0.0


def test_without_own_loss_nothing_is_lost() -> None:
    """Q unloaded to infinity."""
    assert loading.insertion_loss(np.inf, 20.0) == 0.0
    assert loading.efficiency(np.inf, 20.0) == 1.0
    assert loading.loaded_q(np.inf, 100.0, 2000.0) == pytest.approx(20.0)
