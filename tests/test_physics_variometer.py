"""Variometer: published angles, two exact methods against one another, magpylib, limits."""

from __future__ import annotations

import csv
from pathlib import Path

import magpylib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.filaments import mutual_inductance
from partpick.physics.solenoid import solenoid_family
from partpick.physics.variometer import (
    Rings,
    clearance,
    coil_rings,
    parallel_inductance,
    series_inductance,
    tilted_mutual_by_line_integral,
    tilted_mutual_inductance,
)

PUBLISHED = Path(__file__).parent / "published"
angles = st.floats(0.0, 180.0)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def coils(row: dict[str, str]) -> tuple[Rings, Rings]:
    gap = float(row["centre_gap_m"])
    return tuple(coil_rings(int(row[f"N{k}"]), float(row[f"D{k}_m"]), float(row[f"pitch{k}_m"]), gap) for k in (1, 2))  # type: ignore[return-value]


@pytest.mark.parametrize("row", rows("variometer.csv"), ids=lambda r: f"{r['case']}-{r['theta_deg']}")
def test_mutual_inductance_against_angle(row: dict[str, str]) -> None:
    """Both methods, as a share of M at 0 degrees (it passes through 0 at 90), and the series connection."""
    stator, rotor = coils(row)
    angle, expected, tolerance = float(row["theta_deg"]), float(row["M_H"]), float(row["rel_tol"])
    greatest = 1e-5 if row["case"] == "A" else 2e-6  # M at 0 degrees, rounded down
    mutual = tilted_mutual_inductance(stator, rotor, angle)
    assert mutual == pytest.approx(expected, abs=tolerance * greatest)
    assert tilted_mutual_by_line_integral(stator, rotor, angle, 180) == pytest.approx(mutual, abs=1e-10 * greatest)
    own = [float(row["L1_H"]), float(row["L2_H"])]
    assert series_inductance(*own, mutual) == pytest.approx(float(row["L_series_H"]), rel=1e-6)
    if row["centre_gap_m"] == "0":  # the family has no gap in its middle
        for k in (1, 2):
            size = (float(row[f"{name}{k}_m"]) for name in ("D", "wire", "pitch"))
            assert solenoid_family(int(row[f"N{k}"]), *size)[-1] == pytest.approx(own[k - 1], rel=1e-4)


@pytest.mark.parametrize("angle", [0.0, 40.0, 70.0, 130.0])
def test_flux_by_magpylib(angle: float) -> None:
    """An independent program for the field, its flux through the tilted turns by Gauss quadrature."""
    stator, rotor = coil_rings(4, 0.06, 0.002, 0.003), coil_rings(3, 0.045, 0.0015)
    loops = magpylib.Collection(
        [magpylib.current.Circle(diameter=2 * r, current=1.0, position=(0, 0, h)) for r, h in zip(*stator, strict=True)]
    )
    nodes, weights = np.polynomial.legendre.leggauss(24)
    phase = np.arange(48) * 2 * np.pi / 48
    tilt = np.deg2rad(angle)
    flux = 0.0
    for radius, height in zip(*rotor, strict=True):
        rho = radius * (nodes + 1) / 2
        x, y = np.outer(rho, np.cos(phase)), np.outer(rho, np.sin(phase))
        points = np.stack([x, y * np.cos(tilt) - height * np.sin(tilt), y * np.sin(tilt) + height * np.cos(tilt)], -1)
        field = loops.getB(points.reshape(-1, 3)).reshape(points.shape)
        through = field[..., 2] * np.cos(tilt) - field[..., 1] * np.sin(tilt)
        flux += float(np.sum(through.mean(axis=1) * 2 * np.pi * rho * weights * radius / 2))
    assert tilted_mutual_inductance(stator, rotor, angle) == pytest.approx(flux, rel=1e-6)


@settings(max_examples=30)
@given(angles, st.integers(1, 12), st.integers(1, 12), st.floats(0.3, 0.9))
def test_zonal_series_equals_the_line_integral(angle: float, outer: int, inner: int, ratio: float) -> None:
    """Two derivations that share no step; also when the rotor all but fills the sphere."""
    stator = coil_rings(outer, 0.05, 0.001)
    half = 0.0125 * ratio
    rotor = coil_rings(inner, 0.05 * ratio * 0.9, 2 * half / inner)
    series = tilted_mutual_inductance(stator, rotor, angle)
    greatest = tilted_mutual_inductance(stator, rotor, 0.0)
    line = tilted_mutual_by_line_integral(stator, rotor, angle, 360)
    assert series == pytest.approx(line, abs=1e-9 * greatest)
    assert tilted_mutual_inductance(stator, rotor, 180.0 - angle) == pytest.approx(-series, abs=1e-10 * greatest)


def test_aligned_coils_are_sums_of_maxwell_rings() -> None:
    """At 0 degrees every pair of turns is coaxial; at 90 nothing is linked."""
    stator, rotor = coil_rings(7, 0.05, 0.001), coil_rings(5, 0.04, 0.0012, 0.002)
    pairs = mutual_inductance(stator.radius[:, None], rotor.radius, stator.height[:, None] - rotor.height)
    assert tilted_mutual_inductance(stator, rotor, 0.0) == pytest.approx(pairs.sum(), rel=1e-12)
    assert abs(tilted_mutual_inductance(stator, rotor, 90.0)) < 1e-12 * pairs.sum()


def test_small_rotor_in_the_middle_follows_the_cosine() -> None:
    """In an even field the plain cosine is right; a large rotor leaves it."""
    angle = np.array([20.0, 50.0, 75.0])
    stator = coil_rings(20, 0.06, 0.0015)
    small, large = coil_rings(2, 0.002, 0.0001), coil_rings(20, 0.045, 0.0012)
    shares = [
        tilted_mutual_inductance(stator, rotor, angle) / tilted_mutual_inductance(stator, rotor, 0.0)
        for rotor in (small, large)
    ]
    assert shares[0] == pytest.approx(np.cos(np.deg2rad(angle)), rel=1e-3)
    assert np.all(np.abs(shares[1] / np.cos(np.deg2rad(angle)) - 1.0) > 0.01)


def test_rotor_that_does_not_turn_through_is_seen() -> None:
    """Negative clearance; the series refuses, the line integral still answers while nothing touches."""
    stator, rotor = coil_rings(4, 0.05, 0.002, 0.004), coil_rings(20, 0.045, 0.0015)
    assert clearance(stator, rotor) < 0.0
    with pytest.raises(ValueError, match="sphere"):
        tilted_mutual_inductance(stator, rotor, 30.0)
    assert np.isfinite(tilted_mutual_by_line_integral(stator, rotor, 10.0))
    assert clearance(stator, coil_rings(4, 0.03, 0.001), 0.0008, 0.0008) == pytest.approx(
        np.hypot(0.025, 0.003) - 0.0004 - np.hypot(0.015, 0.0015) - 0.0004, rel=1e-12
    )


@given(st.floats(1e-7, 1e-4), st.floats(1e-7, 1e-4), st.floats(-0.9, 0.9))
def test_connections_keep_their_order(first: float, second: float, coupling: float) -> None:
    """Parallel is below either coil in series; two equal uncoupled coils give twice and half."""
    mutual = coupling * np.sqrt(first * second)
    assert 0.0 < parallel_inductance(first, second, mutual) < series_inductance(first, second, abs(mutual))
    assert series_inductance(first, first, 0.0) == 2 * first
    assert parallel_inductance(first, first, 0.0) == pytest.approx(first / 2, rel=1e-12)
    assert parallel_inductance(first, first, mutual_of := coupling * first) == pytest.approx(
        (first + mutual_of) / 2, rel=1e-9
    )
