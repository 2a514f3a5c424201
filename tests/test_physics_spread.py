"""Spread of coils: model error and tolerances together."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.sheet import sheet_inductance
from partpick.physics.skin import MU_0
from partpick.physics.solenoid import solenoid_family
from partpick.physics.spread import ring_spread, solenoid_model_spread, solenoid_spread

PUBLISHED = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def helix_inductance(n: int, d: float, w: float, p: float) -> float:
    """Neumann's integral over a helix, azimuthal part; within half a turn at the wire's mean distance."""
    radius, mean = d / 2, w / 2 * np.exp(-0.25)
    nodes, weights = np.polynomial.legendre.leggauss(24)
    whole = 2 * np.pi * n
    stretch = mean / np.hypot(radius, p / (2 * np.pi))
    near = stretch * np.sinh(np.linspace(0.0, np.arcsinh(np.pi / stretch), 40))
    edges = np.concatenate([near, np.linspace(np.pi, whole, 48 * n)[1:]])
    half = np.diff(edges)[:, None] / 2
    s = (edges[1:] + edges[:-1])[:, None] / 2 + half * nodes
    soft = np.where(s < np.pi, mean, 0.0)
    apart = np.sqrt(2 * radius**2 * (1 - np.cos(s)) + (p * s / (2 * np.pi)) ** 2 + soft**2)
    return float(MU_0 / (2 * np.pi) * radius**2 * np.sum(half * weights * (whole - s) * np.cos(s) / apart))


@pytest.mark.parametrize("row", rows("solenoid_round_wire.csv")[:4], ids=lambda r: r["N"])
def test_the_helix_of_these_tests_is_the_published_one(row: dict[str, str]) -> None:
    """The yardstick itself."""
    n, d, w, p = int(row["N"]), float(row["d_mean_m"]), float(row["wire_d_m"]), float(row["pitch_m"])
    assert helix_inductance(n, d, w, p) == pytest.approx(float(row["L_helix_azimuthal_H"]), rel=1e-6)


@pytest.mark.parametrize("n", [3, 5, 10, 20])
@pytest.mark.parametrize("width", [3.0, 5.0, 8.0, 12.0, 30.0])
@pytest.mark.parametrize("spacing", [1.05, 2.0, 3.0])
def test_rings_stay_inside_their_stated_error(n: int, width: float, spacing: float) -> None:
    """Against a true helix, thick wire and thin."""
    wire = 1e-3
    d, p = width * wire, spacing * wire
    excess = solenoid_family(n, d, wire, p)[-1] / helix_inductance(n, d, wire, p) - 1.0
    assert 0.0 <= excess <= solenoid_model_spread(n, p / d)


@pytest.mark.parametrize("row", rows("high_frequency_inductance.csv"), ids=lambda r: r["N"])
def test_a_proximity_factor_off_by_a_tenth_stays_inside_the_stated_error(row: dict[str, str]) -> None:
    """Boundary elements say what is lost at radio frequency; ours with a factor 10 % high or low."""
    n, ratio, proportion, factor = (float(row[key]) for key in ("N", "d_over_s", "l_over_D", "Phi_BEM"))
    d = 0.02
    p = proportion * d / n
    low = solenoid_family(int(n), d, ratio * p, p)[-1]
    for off in (0.9, 1.1):
        shift = MU_0 * n * d * (1 / 8 + (off * factor - 1) / 4) / low
        truth = float(row["L_hf_ext_over_L_dc_BEM"])
        assert abs((1 - shift) / truth - 1) <= solenoid_model_spread(n, p / d, shift)


@given(st.floats(0.1, 10.0), st.floats(0.0, 0.05), st.floats(0.0, 0.05), st.floats(0.0, 0.02))
def test_spread_lies_between_the_largest_and_the_sum(x: float, by_d: float, by_l: float, model: float) -> None:
    """Changes of the sheet's own inductance, taken alone, bound the propagated figure."""
    base = sheet_inductance(1.0, 1.0, x)
    alone = [
        abs(sheet_inductance(1.0, 1.0 + by_d, x) / base - 1.0),
        abs(sheet_inductance(1.0, 1.0, x * (1.0 + by_l)) / base - 1.0),
        model,
    ]
    spread = solenoid_spread(x, by_d, by_l, model)
    assert max(alone) * 0.94 - 1e-12 <= spread <= sum(alone) * 1.06 + 1e-12


def test_a_ring_without_leak_spreads_by_its_material() -> None:
    """Ferrite: nothing but AL."""
    assert ring_spread(0.2, 850.0, 0.0) == pytest.approx(0.2)


def test_the_spread_of_a_leaking_ring_reaches_to_what_it_may_measure() -> None:
    """AL N^2 is printed; the leak with its uncertainty, half for air and all above, comes on top of it."""
    assert ring_spread(0.0, 6.0, 0.1) == pytest.approx(0.2)
    assert ring_spread(0.0, 1.0, 0.4) == pytest.approx(0.6)
