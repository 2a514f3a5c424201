"""Start-up of oscillators: published roots and transients, state-space eigenvalues, known limits."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
import scipy.linalg
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.oscillator import clapp, colpitts, divider_threshold, growth_rate, hartley, threshold

PUBLISHED = Path(__file__).parent / "published"
coils = st.floats(1e-7, 1e-4)
qs = st.floats(5.0, 400.0)
dividers = st.floats(1e-11, 3e-9)
small = st.floats(0.0, 2e-11)
conductances = st.sampled_from([0.0, 1e-6, 5e-5])


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("oscillator_colpitts.csv"), ids=lambda r: r["L_H"])
def test_colpitts_thresholds(row: dict[str, str]) -> None:
    """Exact root; growth above it by polynomial (6 figures) and by ngspice (1 %)."""
    coil, resistance, c1, c2 = (float(row[k]) for k in ("L_H", "r_series_ohm", "C1_drain_F", "C2_gate_F"))
    circuit = colpitts(coil, resistance, c1, c2, 0.0, float(row["go_S"]), float(row["gi_S"]))
    found, tolerance = threshold(circuit), float(row["rel_tol"])
    assert found.transconductance == pytest.approx(float(row["gm_min_exact_S"]), rel=tolerance)
    assert found.frequency == pytest.approx(float(row["f_at_threshold_Hz"]), rel=tolerance)
    rate = growth_rate(circuit, 1.2 * found.transconductance)
    assert rate == pytest.approx(float(row["growth_rate_at_1.2gm_poly_1/s"]), rel=1e-5)
    assert rate == pytest.approx(float(row["growth_rate_ngspice_1/s"]), rel=0.01)


@pytest.mark.parametrize("row", rows("oscillator_hartley.csv"), ids=lambda r: r["L1_drain_H"])
def test_hartley_thresholds(row: dict[str, str]) -> None:
    """Exact root to the figures printed; the power balance close to it."""
    names = ("L1_drain_H", "L2_gate_H", "M_aiding_H", "r1_ohm", "r2_ohm", "C_F")
    found = threshold(hartley(*(float(row[k]) for k in names)))
    assert found.transconductance == pytest.approx(float(row["gm_min_exact_S"]), rel=float(row["rel_tol"]))
    assert found.frequency == pytest.approx(float(row["f_at_threshold_Hz"]), rel=float(row["rel_tol"]))
    assert found.transconductance == pytest.approx(float(row["gm_min_approx_S"]), rel=2e-4)


@given(coils, qs, dividers, dividers)
def test_colpitts_without_other_loss_is_the_closed_form(coil: float, q: float, c1: float, c2: float) -> None:
    """Routh's criterion gives exactly g = r (C1 + C2)/L at w^2 = (C1 + C2)/(L C1 C2)."""
    omega = np.sqrt((c1 + c2) / (coil * c1 * c2))
    found = threshold(colpitts(coil, omega * coil / q, c1, c2))
    assert found.transconductance == pytest.approx(omega / q * (c1 + c2), rel=1e-9)
    assert found.frequency == pytest.approx(omega / (2 * np.pi), rel=1e-9)


@given(coils, qs, dividers, dividers, dividers)
def test_clapp_without_other_loss_is_the_closed_form(coil: float, q: float, c0: float, c1: float, c2: float) -> None:
    """Exactly g = r w^2 C1 C2 where the coil resonates with the three capacitors in series (Clapp 1948)."""
    omega = np.sqrt((1 / c0 + 1 / c1 + 1 / c2) / coil)
    resistance = omega * coil / q
    found = threshold(clapp(coil, resistance, c0, c1, c2))
    assert found.transconductance == pytest.approx(resistance * omega**2 * c1 * c2, rel=1e-7)
    assert found.frequency == pytest.approx(omega / (2 * np.pi), rel=1e-7)


def state_space(capacitance: np.ndarray, conductance: np.ndarray) -> float:
    """Fastest growth of a circuit whose nodes obey C dx/dt + G x = 0, by generalised eigenvalues."""
    modes = scipy.linalg.eigvals(-conductance, capacitance)
    swinging = modes[np.isfinite(modes) & (np.abs(modes.imag) > 1e3)]
    return float(np.max(swinging.real, initial=-np.inf))


def three_point_matrices(
    coil: float, resistance: float, c0: float | None, c1: float, c2: float, c3: float, g1: float, g2: float, gm: float
) -> tuple[np.ndarray, np.ndarray]:
    """Unknowns: output, control, coil current from output to control, voltage of the series capacitor."""
    storage = np.array(
        [[c1 + c3, -c3, 0, 0], [-c3, c2 + c3, 0, 0], [0, 0, coil, 0], [0, 0, 0, c0 if c0 else 1.0]], dtype=float
    )
    series = 1.0 if c0 else 0.0
    flow = np.array(
        [[g1, gm, 1, 0], [0, g2, -1, 0], [-1, 1, resistance, series], [0, 0, -series, 0.0 if c0 else 1.0]], dtype=float
    )
    return storage, flow


@given(coils, qs, dividers, dividers, small, conductances, conductances)
def test_colpitts_with_everything_agrees_with_its_state_equations(
    coil: float, q: float, c1: float, c2: float, c3: float, g1: float, g2: float
) -> None:
    """Growth by the differential equations changes sign at the threshold, device and feedback included.

    Where there is no threshold, no transconductance does it.
    """
    omega = 1 / np.sqrt(coil * (c1 * c2 / (c1 + c2) + c3))
    resistance = omega * coil / q
    starts = threshold(colpitts(coil, resistance, c1, c2, c3, g1, g2)).transconductance
    gains = (0.99 * starts, 1.01 * starts) if np.isfinite(starts) else (1e-5, 1e-3, 0.1, 10.0)
    parts = (coil, resistance, None, c1, c2, c3, g1, g2)
    rates = [state_space(*three_point_matrices(*parts, gain)) for gain in gains]
    assert rates[0] < 0.0
    assert (rates[-1] > 0.0) == np.isfinite(starts)


@given(coils, qs, st.floats(2e-11, 2e-10), st.floats(1e-10, 3e-9), st.floats(1e-10, 3e-9), small, conductances)
def test_clapp_with_everything_agrees_with_its_state_equations(
    coil: float, q: float, c0: float, c1: float, c2: float, c3: float, g1: float
) -> None:
    """As for the Colpitts circuit, and the rate itself at 1.5 times the threshold."""
    resistance = coil / q / np.sqrt(coil * c0)
    circuit = clapp(coil, resistance, c0, c1, c2, c3, g1, 2e-6)
    found = threshold(circuit)
    matrices = (coil, resistance, c0, c1, c2, c3, g1, 2e-6)
    if np.isnan(found.transconductance):
        assert all(state_space(*three_point_matrices(*matrices, gain)) < 0.0 for gain in (1e-5, 1e-3, 0.1, 10.0))
        return
    below, above = (
        state_space(*three_point_matrices(*matrices, share * found.transconductance)) for share in (0.99, 1.01)
    )
    assert below < 0.0 < above
    gain = 1.5 * found.transconductance
    rate = growth_rate(circuit, gain)
    scale = 2 * np.pi * found.frequency
    assert rate == pytest.approx(state_space(*three_point_matrices(*matrices, gain)), rel=1e-6, abs=1e-9 * scale)


def test_hartley_with_everything_agrees_with_its_state_equations() -> None:
    """Two coupled coils, device capacitances and conductances: growth against the differential equations."""
    l1, l2, m, r1, r2, c, c1, c2, g1, g2 = 8e-6, 2e-6, 1.5e-6, 1.5, 0.4, 2e-10, 6e-12, 9e-12, 5e-5, 2e-5
    circuit = hartley(l1, l2, m, r1, r2, c, c1, c2, g1, g2)
    found = threshold(circuit)
    for share in (0.9, 1.0, 1.5):
        gm = share * float(found.transconductance)
        # unknowns: output, control, current output -> tap, current tap -> control
        storage = np.array([[c + c1, -c, 0, 0], [-c, c + c2, 0, 0], [0, 0, l1, m], [0, 0, m, l2]])
        flow = np.array([[g1, gm, 1, 0], [0, g2, 0, -1], [-1, 0, r1, 0], [0, 1, 0, r2]])
        rate = state_space(storage, flow)
        assert growth_rate(circuit, gm) == pytest.approx(rate, rel=1e-6, abs=1e-6 * 2 * np.pi * found.frequency)
        assert share == 1.0 or (rate > 0.0) == (share > 1.0)
    assert found.transconductance > threshold(hartley(l1, l2, m, r1, r2, c)).transconductance


def test_lossless_circuit_needs_nothing_and_a_hopeless_one_never_starts() -> None:
    """Threshold 0 without loss; a large feedback capacitance with low Q leaves no threshold at all."""
    assert threshold(colpitts(1e-6, 0.0, 1e-9, 1e-9)).transconductance == pytest.approx(0.0, abs=1e-15)
    found = threshold(colpitts(1e-6, 100.0, 1e-11, 1e-11, 1e-9))
    assert np.isnan(found.transconductance) and np.isnan(found.frequency)
    assert growth_rate(colpitts(1e-6, 100.0, 1e-11, 1e-11, 1e-9), [0.0, 1e-3, 1.0]).max() < 0.0


def test_many_circuits_at_once_equal_one_by_one() -> None:
    """Arrays broadcast, absent parts among present ones."""
    c1, g1 = np.array([1e-10, 2e-10, 4e-10]), np.array([[0.0], [1e-5]])
    together = threshold(colpitts(1e-6, 0.5, c1, 3e-10, np.array([0.0, 5e-12, 0.0]), g1))
    assert together.transconductance.shape == (2, 3)
    alone = threshold(colpitts(1e-6, 0.5, 2e-10, 3e-10, 5e-12, 1e-5))
    assert together.transconductance[1, 1] == pytest.approx(alone.transconductance, rel=1e-12)
    assert together.frequency[1, 1] == pytest.approx(alone.frequency, rel=1e-12)


@given(coils, qs, dividers, dividers, small, st.floats(0.1, 10.0))
def test_impedance_scales_the_threshold(coil: float, q: float, c1: float, c2: float, c3: float, k: float) -> None:
    """L and r times k, capacitances over k: the same frequency, transconductance over k."""
    resistance = coil / q / np.sqrt(coil * (c1 * c2 / (c1 + c2) + c3))
    one = threshold(colpitts(coil, resistance, c1, c2, c3))
    other = threshold(colpitts(k * coil, k * resistance, c1 / k, c2 / k, c3 / k))
    if np.isnan(one.transconductance):
        assert np.isnan(other.transconductance)
        return
    assert other.transconductance * k == pytest.approx(one.transconductance, rel=1e-6)
    assert other.frequency == pytest.approx(one.frequency, rel=1e-9)


@given(coils, qs, dividers, dividers, small, st.sampled_from([np.inf, 2e-11, 1e-10, 1e-9]))
def test_the_closed_form_of_a_divider_is_the_threshold(
    coil: float, q: float, c1: float, c2: float, beside: float, c0: float
) -> None:
    """Both circuits, the coil with a capacitance across it, against the roots of the characteristic polynomial."""
    behind = 1 / (1 / c1 + 1 / c2 + 1 / c0)
    resistance = np.sqrt(coil / (behind + beside)) / q
    closed = divider_threshold(coil, resistance, c1, c2, beside, c0)
    if np.isinf(c0):
        circuit = colpitts(coil, resistance, c1, c2, beside)
    else:
        circuit = clapp(coil, resistance, c0, c1, c2, coil_capacitance=beside)
    found = threshold(circuit)
    if np.isnan(closed.transconductance):
        gains = (1e-5, 1e-3, 0.1, 10.0)
        assert np.isnan(found.transconductance) or max(growth_rate(circuit, gains)) < 1e-6 * float(circuit.scale)
        return
    assert found.transconductance == pytest.approx(closed.transconductance, rel=1e-7)
    assert found.frequency == pytest.approx(closed.frequency, rel=1e-8)


@given(coils, qs, st.floats(2e-11, 2e-10), dividers, dividers, small)
def test_clapp_with_a_capacitance_across_the_coil_agrees_with_its_state_equations(
    coil: float, q: float, c0: float, c1: float, c2: float, beside: float
) -> None:
    """Unknowns: output, control, the node between coil and series capacitor, coil current."""
    resistance = coil / q / np.sqrt(coil * (c0 + beside))
    found = divider_threshold(coil, resistance, c1, c2, beside, c0)
    if np.isnan(found.transconductance):
        return
    storage = np.array(
        [[c1 + c0, 0, -c0, 0], [0, c2 + beside, -beside, 0], [-c0, -beside, c0 + beside, 0], [0, 0, 0, coil]]
    )
    for share in (0.99, 1.01):
        gm = share * float(found.transconductance)
        flow = np.array([[0, gm, 0, 0], [0, 0, 0, -1], [0, 0, 0, 1], [0, 1, -1, resistance]])
        assert (state_space(storage, flow) > 0) == (share > 1)
