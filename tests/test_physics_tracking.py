"""Tracking: published three-point solutions, the best circuit against a general minimiser, limits."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize, minimize_scalar

from partpick.physics.tracking import (
    PaddedCircuit,
    PlainCircuit,
    best_scale,
    best_tracking,
    padded_frequency,
    plain_circuit,
    section_capacitance,
    three_point_circuit,
    tracking_error,
    tracking_points,
)

PUBLISHED = Path(__file__).parent / "published"
SECTION = (12e-12, 365e-12)
BROADCAST = (540e3, 1600e3)
spans = st.tuples(st.floats(1e5, 5e6), st.floats(1.5, 3.2), st.floats(0.1, 3.0))  # low [Hz], ratio, IF/low


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def three_points(low: float, high: float, distance: float, across: float = 0.0) -> tuple[PlainCircuit, PaddedCircuit]:
    plain, points = plain_circuit(low, high, *SECTION), tracking_points(low, high)
    return plain, three_point_circuit(section_capacitance(plain, points), points + distance, across)


@pytest.mark.parametrize("row", rows("tracking.csv"), ids=lambda r: r["case"])
def test_three_point_solution(row: dict[str, str]) -> None:
    """Coils, padder, trimmer and the error curve of the published examples."""
    value = {key: float(text) for key, text in row.items() if key not in ("case", "source")}
    low, high, distance = (1e3 * value[k] for k in ("rf_low_kHz", "rf_high_kHz", "intermediate_kHz"))
    plain, padded = three_points(low, high, distance, value["across_pF"] * 1e-12)
    points = tracking_points(low, high) / 1e3
    tolerance = value["rel_tol"]
    figures = {
        "fixed_pF": plain.fixed * 1e12,
        "plain_uH": plain.inductance * 1e6,
        "padded_uH": padded.inductance * 1e6,
        "padder_pF": padded.padder * 1e12,
        "trimmer_pF": padded.trimmer * 1e12,
        **{f"point{k + 1}_kHz": points[k] for k in range(3)},
    }
    for name, figure in figures.items():
        assert figure == pytest.approx(value[name], rel=tolerance), name
    places = {"low": low, "high": high, **{f"inner{k}": 1e3 * value[f"inner{k}_kHz"] for k in (1, 2)}}
    for name, place in places.items():
        error = tracking_error(plain, padded, place, distance) / 1e3
        assert error == pytest.approx(value[f"error_{name}_kHz"], abs=6e-4), name
    curve = tracking_error(plain, padded, np.linspace(low, high, 2001), distance) / 1e3
    assert np.max(np.abs(curve)) == pytest.approx(value["worst_kHz"], abs=6e-4)


@given(spans, st.floats(0.0, 20e-12))
def test_three_points_are_met_exactly(span: tuple[float, float, float], across: float) -> None:
    """The closed form solves its three equations; the ends of the plain circuit are the range."""
    low, high, distance = span[0], span[0] * span[1], span[0] * span[2]
    plain, padded = three_points(low, high, distance, across)
    error = tracking_error(plain, padded, tracking_points(low, high), distance)
    assert np.max(np.abs(error)) < 1e-8 * high
    assert section_capacitance(plain, np.array([low, high])) == pytest.approx(SECTION[::-1], rel=1e-9)
    assert padded.padder > 0.0 and padded.inductance < plain.inductance


@pytest.mark.parametrize("across", [0.0, 10e-12])
@pytest.mark.parametrize("span", [(*BROADCAST, 455e3), (150e3, 285e3, 455e3), (6e6, 18e6, 1.6e6)])
def test_best_tracking_is_where_a_general_minimiser_ends(span: tuple[float, float, float], across: float) -> None:
    """Nelder and Mead on the worst error of the three logarithms find no less, and come within 0.1 %."""
    low, high, distance = span
    plain, padded = three_points(*span, across)
    best = best_tracking(plain, low, high, distance, across)
    grid = np.linspace(low, high, 2001)

    def worst(logs: np.ndarray) -> float:
        return float(np.max(np.abs(tracking_error(plain, PaddedCircuit(*np.exp(logs), across), grid, distance))))

    start = np.log([padded.inductance, padded.padder, padded.trimmer])
    for _ in range(3):
        found = minimize(worst, start, method="Nelder-Mead", options={"maxfev": 3000, "xatol": 1e-12, "fatol": 1e-6})
        start = found.x
    assert best.worst_error <= found.fun * (1 + 1e-6)
    assert best.worst_error == pytest.approx(found.fun, rel=1e-3)
    assert best.worst_error < worst(np.log([padded.inductance, padded.padder, padded.trimmer]))


@settings(max_examples=30)
@given(spans)
def test_best_error_swings_four_times_alike(span: tuple[float, float, float]) -> None:
    """The sign of a minimax solution (Chebyshev): four equal extremes of alternating sign."""
    low, high, distance = span[0], span[0] * span[1], span[0] * span[2]
    plain = plain_circuit(low, high, *SECTION)
    best = best_tracking(plain, low, high, distance)
    error = tracking_error(plain, best.circuit, np.linspace(low, high, 2001), distance)
    pieces = np.split(error, np.flatnonzero(np.diff(np.sign(error))) + 1)
    assert len(pieces) == 4
    assert [np.max(np.abs(piece)) for piece in pieces] == pytest.approx([best.worst_error] * 4, rel=1e-3)


def test_oscillator_below_puts_the_padder_into_the_signal_circuit() -> None:
    """The circuit with the smaller ratio takes it; asked the other way round there is no padder above zero."""
    intermediate, low, high = 455e3, 2e6, 4e6
    oscillator = plain_circuit(low - intermediate, high - intermediate, *SECTION)
    best = best_tracking(oscillator, low - intermediate, high - intermediate, intermediate)
    assert best.worst_error < 0.01 * intermediate
    signal, points = plain_circuit(low, high, *SECTION), tracking_points(low, high)
    wrong = three_point_circuit(section_capacitance(signal, points), points - intermediate)
    assert np.isnan(wrong.padder)
    assert np.isnan(best_tracking(signal, low, high, -intermediate).worst_error)


def test_no_distance_needs_no_padder() -> None:
    """Two circuits at almost one frequency: padder far above the section, trimmer as in the plain circuit."""
    plain, padded = three_points(*BROADCAST, 10.0)
    assert padded.padder > 1e-7
    assert padded.trimmer == pytest.approx(plain.fixed, rel=0.01)
    assert padded.inductance == pytest.approx(plain.inductance, rel=0.01)


def test_circuits_broadcast() -> None:
    """Many padders at once: the search asks for the whole table."""
    plain, padded = three_points(*BROADCAST, 455e3)
    padder = padded.padder * np.array([[0.95], [1.0], [1.05]])
    grid = np.linspace(*BROADCAST, 50)
    curves = tracking_error(plain, padded._replace(padder=padder), grid, 455e3)
    assert curves.shape == (3, 50)
    assert np.array_equal(curves[1], tracking_error(plain, padded, grid, 455e3))
    together = three_point_circuit(np.array([[300e-12, 100e-12, 20e-12]] * 2), np.array([[1e6, 1.5e6, 2e6]] * 2))
    assert together.padder.shape == (2,)


@pytest.mark.parametrize("padder", [330e-12, 390e-12, 470e-12])
def test_best_coil_for_given_padders(padder: float) -> None:
    """The factor against a bounded scalar minimiser; it is never worse than no change."""
    plain, padded = three_points(*BROADCAST, 455e3)
    grid = np.linspace(*BROADCAST, 301)
    target = grid + 455e3
    shape = padded_frequency(padded._replace(padder=np.asarray(padder)), section_capacitance(plain, grid))
    scale = best_scale(shape, target)
    found = minimize_scalar(
        lambda u: float(np.max(np.abs(u * shape - target))),
        bounds=(0.5, 2.0),
        method="bounded",
        options={"xatol": 1e-12},
    )
    worst = np.max(np.abs(scale * shape - target))
    assert worst == pytest.approx(found.fun, rel=1e-6)
    assert worst <= np.max(np.abs(shape - target))
    assert best_scale(np.stack([shape, shape]), target).shape == (2,)
