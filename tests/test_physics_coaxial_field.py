"""Fields of rings and sheets: magpylib, sums of rings, the axis, Maxwell's equations."""

from __future__ import annotations

import magpylib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.coaxial_field import ring_field, ring_potential, sheet_end
from partpick.physics.skin import MU_0

POINTS = ((0.002, 0.0), (0.004, 0.003), (0.0095, -0.001), (0.013, 0.02), (0.0099, 0.0051))
inside = st.floats(0.05, 0.95)


def of_sheet(radius: float, length: float, rho: float, z: float) -> np.ndarray:
    """Axial, radial field and potential of a sheet centred on the origin."""
    lower = np.array(sheet_end(radius, rho, z + length / 2))
    return lower - np.array(sheet_end(radius, rho, z - length / 2))


@pytest.mark.parametrize(("rho", "z"), POINTS)
def test_ring_agrees_with_magpylib(rho: float, z: float) -> None:
    """An independent program for the same loop."""
    loop = magpylib.current.Circle(diameter=0.02, current=1.0)
    radial, _, axial = loop.getH((rho, 0.0, z))
    ours = ring_field(0.01, rho, z)
    assert ours.axial == pytest.approx(axial, rel=1e-9)
    assert ours.radial == pytest.approx(radial, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(("rho", "z"), POINTS)
def test_sheet_agrees_with_a_magnet_of_its_shape(rho: float, z: float) -> None:
    """An evenly magnetised cylinder has the outer field, and the induction, of a current sheet."""
    magnet = magpylib.magnet.Cylinder(polarization=(0.0, 0.0, MU_0), dimension=(0.02, 0.03))
    radial, _, axial = np.asarray(magnet.getB((rho, 0.0, z))) / MU_0
    ours = of_sheet(0.01, 0.03, rho, z)
    assert ours[0] == pytest.approx(axial, rel=1e-7)
    assert ours[1] == pytest.approx(radial, rel=1e-7, abs=1e-9)


@pytest.mark.parametrize(("rho", "z"), POINTS[:3])
def test_potential_of_a_sheet_is_that_of_its_rings(rho: float, z: float) -> None:
    """The closed form against Gauss quadrature over rings."""
    nodes, weights = np.polynomial.legendre.leggauss(400)
    rings = ring_potential(0.01, rho, z - 0.015 * nodes) @ weights * 0.015
    assert of_sheet(0.01, 0.03, rho, z)[2] == pytest.approx(rings, rel=1e-8)


def test_field_on_the_axis_is_the_elementary_one() -> None:
    """a^2/(2 (a^2 + z^2)^1.5) on the axis of a ring; cosines of the ends for a sheet (Biot and Savart)."""
    a, z = 0.01, 0.004
    assert ring_field(a, 1e-7, z).axial == pytest.approx(a**2 / (2 * (a**2 + z**2) ** 1.5), rel=1e-8)
    ends = [h / np.hypot(h, a) for h in (z + 0.015, z - 0.015)]
    assert of_sheet(a, 0.03, 1e-7, z)[0] == pytest.approx((ends[0] - ends[1]) / 2, rel=1e-8)


@settings(max_examples=40)
@given(inside, st.floats(-2.0, 2.0))
def test_curl_of_the_potential_is_the_field(rho: float, z: float) -> None:
    """1/rho d(rho A)/drho is the axial field; sources apart, the three closed forms must agree."""
    h = 1e-4
    flux = [(rho + s * h) * sheet_end(1.0, rho + s * h, z).potential for s in (1, -1)]
    end = sheet_end(1.0, rho, z)
    assert end.axial == pytest.approx((flux[0] - flux[1]) / (2 * h * rho), rel=1e-4, abs=1e-5)
    slope = (sheet_end(1.0, rho, z + h).potential - sheet_end(1.0, rho, z - h).potential) / (2 * h)
    assert end.radial == pytest.approx(-slope, rel=1e-4, abs=1e-5)
