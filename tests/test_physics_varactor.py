"""Varactors: published law, inverse, derivatives by difference, charge under rf, ngspice."""

from __future__ import annotations

import csv
import os
import re
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.resonance import resonance_frequency
from partpick.physics.varactor import (
    bias_for,
    bias_sensitivity,
    capacitance_under_rf,
    junction_capacitance,
    junction_for_network,
    junction_rf_peak,
    junction_tempco,
    least_bias,
    network_capacitance,
    network_tempco,
)

PUBLISHED = Path(__file__).parent / "published"
DIODE = (30e-12, 0.7, 0.45)  # zero bias [F], potential [V], grading
biases = st.floats(0.0, 30.0)
gradings = st.floats(0.3, 1.2)
# Absent, the simulator is skipped on a workbench; where CI is set its absence is a failure.
needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None and "CI" not in os.environ, reason="ngspice is not installed"
)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("varactor.csv"), ids=lambda r: f"{r['gamma']}-{r['V_reverse']}")
def test_junction_law(row: dict[str, str]) -> None:
    """Capacitance and its slope, to the digits printed."""
    zero_bias, potential, grading, bias = (float(row[k]) for k in ("Cj0_F", "phi_V", "gamma", "V_reverse"))
    value = junction_capacitance(bias, zero_bias, potential, grading)
    assert value == pytest.approx(float(row["C_F"]), rel=float(row["rel_tol"]))
    slope = bias_sensitivity(bias, potential, grading)
    assert slope == pytest.approx(float(row["dlnC_dV_per_V"]), abs=5e-7)
    assert -slope / 2 == pytest.approx(float(row["dlnf_dV_if_sole_C_per_V"]), abs=5.1e-7)


@given(biases, gradings)
def test_bias_inverts_the_law(bias: float, grading: float) -> None:
    """The dial in volts must bring back the capacitance."""
    value = junction_capacitance(bias, 60e-12, 0.7, grading)
    assert bias_for(value, 60e-12, 0.7, grading) == pytest.approx(bias, rel=1e-9, abs=1e-12)


def test_conducting_junction_has_no_capacitance() -> None:
    """Below zero bias, and above the capacitance at zero bias."""
    assert np.isnan(junction_capacitance(-0.1, *DIODE))
    assert np.isnan(bias_for(31e-12, *DIODE))


@given(st.floats(1e-12, 1e-9), st.integers(1, 6), st.booleans(), st.floats(1e-11, 1e-8))
def test_network_inverts(junction: float, count: int, back_to_back: bool, series: float) -> None:
    """From the junction to the whole and back."""
    whole = network_capacitance(junction, count, back_to_back, series)
    assert whole < series
    assert junction_for_network(whole, count, back_to_back, series) == pytest.approx(junction, rel=1e-6)


def test_pairs_halve_and_branches_add() -> None:
    """Two in opposition are in series; a series capacitor below the wanted value cannot do it."""
    assert network_capacitance(20e-12, 1, True) == pytest.approx(10e-12)
    assert network_capacitance(20e-12, 3, False) == pytest.approx(60e-12)
    assert network_capacitance(20e-12, 1, False, 20e-12) == pytest.approx(10e-12)
    assert np.isnan(junction_for_network(20e-12, series=19e-12))


@given(biases, gradings)
def test_tempco_is_the_change_of_the_law_with_its_potential(bias: float, grading: float) -> None:
    """C0 (phi/(phi' + V))^g with phi' = phi - 2 mV/K: by difference over one kelvin."""
    value = [0.7**grading / (0.7 - 2e-3 * t + bias) ** grading for t in (-0.5, 0.5)]
    by_difference = np.log(value[1] / value[0])
    assert junction_tempco(bias, 0.7, grading) == pytest.approx(by_difference, rel=1e-5)


def test_tempco_fades_with_bias_and_with_a_series_capacitor() -> None:
    """450 ppm/K of an abrupt junction near 1.5 V; half of it where the padder holds half the reactance."""
    at = junction_tempco(np.array([1.5, 10.0]), 0.7, 0.5)
    assert at[0] == pytest.approx(0.5 * 2e-3 / 2.2) and at[1] < at[0] / 4
    assert network_tempco(at[0], 47e-12, 47e-12) == pytest.approx(at[0] / 2)
    assert network_tempco(at[0], 47e-12) == at[0]
    by_difference = np.log(
        network_capacitance(47e-12 * 1.0001, series=33e-12) / network_capacitance(47e-12, series=33e-12)
    )
    assert network_tempco(1e-4, 47e-12, 33e-12) == pytest.approx(by_difference, rel=1e-3)


def test_rf_divides_between_junctions_and_capacitor() -> None:
    """A pair takes half each, an equal series capacitor half of that; the bias stays above the peak."""
    assert junction_rf_peak(8.0, 10e-12, back_to_back=True) == 4.0
    assert junction_rf_peak(8.0, 10e-12, 10e-12, back_to_back=True) == 2.0
    assert junction_rf_peak(8.0, 10e-12, 30e-12) == pytest.approx(6.0)
    assert least_bias(4.0, 1.0) == 5.0


@given(st.floats(1.0, 20.0), st.floats(0.0, 0.2), gradings)
def test_small_rf_raises_the_capacitance_by_its_square(bias: float, depth: float, grading: float) -> None:
    """The series of the describing function, C (1 + g (g + 1)/8 (v/(phi + V))^2 ...)."""
    peak = depth * bias
    step = peak / (0.7 + bias)
    raised = capacitance_under_rf(bias, peak, 60e-12, 0.7, grading) / junction_capacitance(bias, 60e-12, 0.7, grading)
    assert raised == pytest.approx(1 + grading * (grading + 1) / 8 * step**2, abs=3 * step**4 + 1e-12)


def test_rf_capacitance_is_the_fundamental_of_the_charge() -> None:
    """The charge of an abrupt junction in closed form, its fundamental by Fourier sum over a cycle."""
    phase = np.arange(4096) * 2 * np.pi / 4096
    voltage = 5.0 + 4.5 * np.cos(phase)
    charge = 30e-12 * 0.7 / 0.5 * (1 + voltage / 0.7) ** 0.5
    fundamental = 2 * np.mean(charge * np.cos(phase)) / 4.5
    assert capacitance_under_rf(5.0, 4.5, 30e-12, 0.7, 0.5) == pytest.approx(fundamental, rel=1e-6)
    assert np.isnan(capacitance_under_rf(5.0, 5.1, 30e-12, 0.7, 0.5))


@needs_ngspice
@pytest.mark.parametrize("bias", [1.0, 4.0, 12.0])
def test_tank_with_a_pair_resonates_where_ngspice_says(bias: float, tmp_path: Path) -> None:
    """Two diodes of the simulator in opposition across a coil, against law and network."""
    coil = 4.7e-6
    whole = network_capacitance(junction_capacitance(bias, *DIODE), 2, True, 100e-12)
    expected = float(resonance_frequency(coil, whole + 5e-12))
    pairs = "\n".join(f"DA{k} 0 mid{k} V\nDB{k} hot mid{k} V\nRB{k} mid{k} bias 10Meg" for k in (1, 2))
    deck = f"""varactors
I1 0 top AC 1
L1 top 0 {coil}
RP top 0 1Meg
C1 top 0 5p
CS top hot 100p
RH hot 0 10Meg
VB bias 0 {bias}
{pairs}
.model V D(CJO={DIODE[0]} VJ={DIODE[1]} M={DIODE[2]} IS=1e-30 RS=0 FC=0.5)
.control
set numdgt=10
ac lin 4001 {0.99 * expected} {1.01 * expected}
meas ac peak MAX_AT vm(top)
quit
.endc
.end
"""
    (tmp_path / "deck.cir").write_text(deck)
    run = subprocess.run(
        ["ngspice", "-b", "deck.cir"], cwd=tmp_path, capture_output=True, text=True, check=False, timeout=60
    )
    found = re.search(r"peak\s*=\s*(\S+)", run.stdout)
    assert found, run.stdout + run.stderr
    assert float(found[1]) == pytest.approx(expected, rel=1e-4)
