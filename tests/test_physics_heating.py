"""Heat and flux estimates against hand computations."""

from __future__ import annotations

import math

import pytest

from partpick.physics.heating import (
    bulk_surface,
    peak_flux_density,
    surface_rise,
    usual_flux_density,
    winding_surface,
)


def test_a_winding_cools_by_its_outside() -> None:
    """By hand: 25 mm by 40 mm, pi 25 (40 + 12.5) = 4123 mm2; 1 W makes 24 K at 10 W/(m2 K)."""
    surface = winding_surface(25e-3, 40e-3)
    assert surface == pytest.approx(4123.3e-6, rel=1e-4)
    assert surface_rise(1.0, surface) == pytest.approx(24.25, rel=1e-3)


def test_a_body_of_known_volume_is_taken_as_a_cube() -> None:
    """A centimetre cube has 6 cm2; a ring of 17 x 9.5 x 5 mm has 1.2 times what a cube of its outside would say."""
    assert bulk_surface(1e-6) == pytest.approx(6e-4)
    outside = math.pi / 4 * 17**2 * 5  # mm3, as the coils have it
    ring = math.pi * (17 + 9.5) * 5 + math.pi / 2 * (17**2 - 9.5**2)
    assert ring == pytest.approx(1.13 * 6 * outside ** (2 / 3), rel=0.02)


def test_flux_density_follows_from_the_law_of_induction() -> None:
    """100 V peak, 7 MHz, 20 turns on 20 mm2: 5.68 mT by hand."""
    assert peak_flux_density(100.0, 7e6, 20, 20e-6) == pytest.approx(5.684e-3, rel=1e-3)


@pytest.mark.parametrize(("hertz", "tesla"), [(1e5, 50e-3), (1e6, 15e-3), (7e6, 5.7e-3), (14e6, 4.2e-3), (28e6, 3e-3)])
def test_the_usual_flux_density(hertz: float, tesla: float) -> None:
    """What operators go by, within 10 %; common practice, from memory."""
    assert usual_flux_density(hertz) == pytest.approx(tesla, rel=0.1)
