"""Sums of tolerances against closed forms."""

from __future__ import annotations

from math import comb, factorial

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.uncertainty import UNIFORM, correlated_uniform, quantiles, uniform_sum_distribution

SIZES = st.lists(st.floats(1e-6, 0.3), min_size=1, max_size=8)


def irwin_hall(count: int, x: float) -> float:
    """Distribution of the sum of uniform quantities from 0 to 1: Hall, Biometrika 19 (1927) 240-245."""
    return sum((-1) ** k * comb(count, k) * max(x - k, 0.0) ** count for k in range(count + 1)) / factorial(count)


@pytest.mark.parametrize("count", [1, 2, 3, 4, 6])
def test_equal_tolerances_add_as_irwin_and_hall_have_it(count: int) -> None:
    """The closed form of 1927 for equal tolerances."""
    deviation, share = uniform_sum_distribution(np.ones(count))
    expected = [irwin_hall(count, (x + count) / 2) for x in deviation]
    assert share == pytest.approx(expected, abs=1e-6)


@pytest.mark.parametrize("ratio", [0.001, 0.05, 0.3, 0.9])
def test_two_unequal_tolerances_add_to_a_trapezium(ratio: float) -> None:
    """JCGM 100:2008, 4.3.9: two uniform quantities make a symmetric trapezium."""
    a, b = 1.0, ratio
    deviation, share = uniform_sum_distribution([a, b])
    x = np.abs(deviation)
    slope = (np.maximum(a + b - x, 0.0)) ** 2 / (8 * a * b)  # upper tail on the sloping side
    upper = np.where(x >= a - b, slope, 0.5 - x / (2 * a))
    assert share == pytest.approx(np.where(deviation < 0, upper, 1 - upper), abs=1e-3)


@given(SIZES)
def test_the_distribution_rises_from_none_to_all_and_is_even(sizes: list[float]) -> None:
    """What every distribution of a symmetric sum does."""
    deviation, share = uniform_sum_distribution(sizes)
    assert share[0] == pytest.approx(0.0, abs=1e-9) and share[-1] == pytest.approx(1.0, abs=1e-9)
    assert (np.diff(share) >= -1e-12).all()
    assert share == pytest.approx(1.0 - share[::-1], abs=1e-12)
    assert deviation[-1] == pytest.approx(sum(sizes))


@given(SIZES)
def test_variances_add(sizes: list[float]) -> None:
    """JCGM 100:2008, 4.3.7 and 5.1.2: the spread of the distribution is the root of the sum of squares."""
    deviation, share = uniform_sum_distribution(sizes)
    middle = (deviation[1:] + deviation[:-1]) / 2
    variance = float((np.diff(share) * middle**2).sum())
    assert np.sqrt(variance) == pytest.approx(UNIFORM * np.linalg.norm(sizes), rel=0.01)


def test_no_tolerance_at_all_is_a_step() -> None:
    """Parts without spread are all alike."""
    deviation, share = uniform_sum_distribution([])
    assert (deviation == 0).all() and share[0] == 0 and share[-1] == 1


@pytest.mark.parametrize("wanted", [0.0, 0.3, 0.8, 1.0])
def test_a_batch_has_the_correlation_asked_for_and_stays_uniform(wanted: float) -> None:
    """Correlation of members, against the draws themselves; marginals by their variance and ends."""
    random = np.random.default_rng(5)
    x = correlated_uniform(random.standard_normal(200_000), random.standard_normal((2, 200_000)), wanted)
    assert np.corrcoef(x)[0, 1] == pytest.approx(wanted, abs=0.01)
    assert x.std(axis=1) == pytest.approx(np.full(2, 3**-0.5), rel=0.01)
    assert np.abs(x).max() <= 1.0


def test_quantiles_are_those_of_numpy() -> None:
    """Type 7 of Hyndman and Fan (1996), which numpy.quantile takes by default."""
    sample = np.random.default_rng(3).normal(size=1001)
    shares = [0.0, 0.05, 0.5, 0.951, 1.0]
    assert quantiles(sample, shares) == pytest.approx(np.quantile(sample, shares), rel=1e-12)
