"""Coaxial rings against Maxwell's formula as published, a field computation of others, and limits."""

from __future__ import annotations

import csv
from pathlib import Path

import magpylib
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.filaments import loop_inductance, mutual_inductance
from partpick.physics.skin import MU_0

PUBLISHED = Path(__file__).parent / "published"
lengths = st.floats(1e-4, 1.0)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def size(row: dict[str, str]) -> tuple[float, float, float]:
    return float(row["radius1_m"]), float(row["radius2_m"]), float(row["axial_distance_m"])


@pytest.mark.parametrize("row", rows("maxwell_mutual.csv"), ids=lambda r: r["axial_distance_m"])
def test_mutual_inductance_of_rings_is_the_published_one(row: dict[str, str]) -> None:
    """Maxwell's formula and DLMF 19.34.5, evaluated to all digits."""
    assert mutual_inductance(*size(row)) == pytest.approx(float(row["M_H"]), rel=float(row["rel_tol"]))


@pytest.mark.parametrize("row", rows("maxwell_mutual.csv")[1:], ids=lambda r: r["axial_distance_m"])
def test_mutual_inductance_is_the_flux_of_the_field(row: dict[str, str]) -> None:
    """The ring field of magpylib, integrated over the disc of the other ring, knows nothing of our formula."""
    radius, other, distance = size(row)
    nodes, weights = np.polynomial.legendre.leggauss(200)
    rho = (nodes + 1.0) / 2.0 * other
    points = np.stack([rho, 0.0 * rho, np.full_like(rho, distance)], axis=1)
    field = magpylib.current.Circle(current=1.0, diameter=2.0 * radius).getB(points)[:, 2]
    flux = np.sum(weights * other / 2.0 * 2.0 * np.pi * rho * field)
    assert mutual_inductance(radius, other, distance) == pytest.approx(flux, rel=1e-8)


@given(lengths, lengths, lengths)
def test_it_does_not_matter_which_ring_carries_the_current(a: float, b: float, z: float) -> None:
    """Reciprocity, and symmetry of the distance."""
    forward = mutual_inductance(a, b, z)
    assert mutual_inductance(b, a, -z) == pytest.approx(forward, rel=1e-12)
    assert forward >= 0.0


@given(lengths, lengths, lengths, st.floats(0.1, 10.0))
def test_larger_rings_have_more_inductance_in_proportion(a: float, b: float, z: float, k: float) -> None:
    """Magnetostatics has no length of its own."""
    assert mutual_inductance(k * a, k * b, k * z) == pytest.approx(k * mutual_inductance(a, b, z), rel=1e-9)


def test_far_rings_are_dipoles() -> None:
    """mu0 pi a^2 b^2/(2 z^3), to second order exact: where the closed form would have lost its digits."""
    a, b, z = 0.01, 0.004, np.array([1.0, 10.0, 1000.0])
    dipole = MU_0 * np.pi * a**2 * b**2 / (2.0 * (z**2 + a**2 + b**2) ** 1.5)
    assert mutual_inductance(a, b, z) == pytest.approx(dipole, rel=1e-6)
    assert mutual_inductance(a, b, z[2]) == pytest.approx(dipole[2], rel=1e-11)


def test_series_and_closed_form_join() -> None:
    """A step at the seam would rank two nearly equal coils wrongly."""
    seam = np.sqrt(4.0 / 0.04 - 4.0)  # m = 0.04 for two rings of radius 1
    before, after = mutual_inductance(1.0, 1.0, seam * (1.0 + np.array([-1e-12, 1e-12])))
    assert before == pytest.approx(after, rel=2e-11)


def test_rings_that_coincide_have_no_finite_mutual_inductance() -> None:
    """The log of nothing: infinite, and no warning that would stop a run."""
    assert mutual_inductance(0.01, 0.01, 0.0) == np.inf


def test_a_turn_of_round_wire_is_a_thin_ring_at_the_wire_s_mean_distance() -> None:
    """Self-inductance is the mutual one at the geometric mean distance r exp(-1/4) (Maxwell 1873)."""
    for ratio, tolerance in ((0.1, 1e-3), (0.01, 1e-5), (0.001, 1e-7)):
        alike = mutual_inductance(0.5, 0.5, ratio / 2.0 * np.exp(-0.25))
        assert loop_inductance(1.0, ratio) == pytest.approx(alike, rel=tolerance)
