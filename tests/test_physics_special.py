"""Our elliptic integrals and Bessel quotients against scipy's."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import ellipe, ellipkm1, jve

from partpick.physics.special import bessel_quotients, distinct_values, elliptic_integrals


def test_elliptic_integrals_equal_those_of_scipy() -> None:
    """Over everything that rings and sheets can ask for, m near 1 included."""
    complement = np.concatenate([np.logspace(-300, -16, 50), np.logspace(-16, 0, 400), np.linspace(0.1, 1, 200)])
    first, second = elliptic_integrals(complement)
    assert first == pytest.approx(ellipkm1(complement), rel=2e-15 * 4)
    assert second == pytest.approx(ellipe(1 - complement), rel=1e-13)
    moderate = complement > 1e-8
    assert second[moderate] == pytest.approx(ellipe(1 - complement[moderate]), rel=1e-14)


def test_elliptic_integrals_at_the_ends() -> None:
    """K(0) = E(0) = pi/2; K(1) is infinite, E(1) = 1; beyond there is nothing."""
    assert elliptic_integrals(1.0) == pytest.approx((np.pi / 2, np.pi / 2), rel=1e-15)
    assert elliptic_integrals(0.0) == (np.inf, 1.0)
    assert all(np.isnan(elliptic_integrals(-0.1)))
    assert np.isnan(elliptic_integrals([np.nan, 0.5])[0][0])


@pytest.mark.parametrize("most", [0.5, 5.0, 60.0, 1000.0])
def test_bessel_quotients_equal_those_of_scipy(most: float) -> None:
    """Along the ray (1 - j) x of round wires, whatever else is asked for in the same call."""
    x = np.geomspace(1e-6, most, 200)
    z = (1 - 1j) * x
    first, second = bessel_quotients(z)
    np.testing.assert_allclose(first, jve(1, z) / jve(0, z), rtol=1e-13)
    np.testing.assert_allclose(second, jve(2, z) / jve(1, z), rtol=1e-13)


def test_bessel_quotients_at_zero_are_zero() -> None:
    """J1 and J2 fall with z and z squared."""
    assert bessel_quotients(0.0) == (0.0, 0.0)


@given(st.lists(st.sampled_from([0.1, 0.2, 3.0, float("inf"), 0.0]), max_size=30))
def test_distinct_values_put_together_are_the_values(values: list[float]) -> None:
    """Rising, each once, and every value in its place, whatever their order."""
    distinct, where = distinct_values(values)
    assert list(distinct) == sorted(set(values))
    assert list(distinct[where]) == values
