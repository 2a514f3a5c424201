"""Coils of many layers: the closed form against the sum over turns, and the sum against its limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.filaments import loop_inductance, mutual_inductance
from partpick.physics.multilayer import (
    OUTSIDE_SPREAD,
    layered_inductance,
    multilayer_inductance,
    multilayer_sensitivities,
    multilayer_spread,
)
from partpick.physics.solenoid import solenoid_family

proportion = st.floats(0.1, 3.0)


def test_the_sum_is_the_plain_double_sum() -> None:
    """Counting pairs by distance stands for every pair of turns."""
    layers, turns, bore, pitch, rise, wire = 3, 7, 0.01, 6e-4, 7e-4, 5e-4
    radius = np.repeat(bore / 2 + rise * (np.arange(layers) + 0.5), turns)
    place = np.tile(np.arange(turns) * pitch, layers)
    first, second = np.triu_indices(layers * turns, 1)
    pairs = mutual_inductance(radius[first], radius[second], place[second] - place[first])
    plain = 2 * pairs.sum() + loop_inductance(2 * radius, wire).sum()
    assert layered_inductance(layers, turns, bore, pitch, rise, wire) == pytest.approx(plain, rel=1e-12)


def test_one_layer_is_a_solenoid() -> None:
    """The mean diameter is the former's plus the rise."""
    single = solenoid_family(25, 0.0105, 4e-4, 5e-4)[-1]
    assert layered_inductance(1, 25, 0.01, 5e-4, 5e-4, 4e-4) == pytest.approx(single, rel=1e-12)


@given(proportion, proportion)
def test_closed_form_keeps_its_stated_error(length: float, depth: float) -> None:
    """Sections of at least a hundred turns, each term in range: 4 % or 7 %, against the sum."""
    radius = 0.01
    wire = min(length, depth, 1.3) * radius / 10
    turns, layers = round(length * radius / wire), round(min(depth, 1.3) * radius / wire)
    if turns > 100 or layers > 60:  # keep the sum short
        return
    size = (2 * radius, turns * wire, layers * wire)
    spread = multilayer_spread(*size)
    if np.isnan(spread):
        return
    summed = layered_inductance(layers, turns, 2 * radius - layers * wire, wire, wire, wire)
    assert multilayer_inductance(turns * layers, *size) == pytest.approx(summed, rel=float(spread))


def test_closed_form_is_good_to_one_per_cent_where_its_terms_are_equal() -> None:
    """The claim of its author (Wheeler 1928, from memory): 6 a = 9 l = 10 c."""
    a = 0.015
    n_l, n_c = 20, 18
    wire = 6 * a / 9 / n_l
    size = (2 * a, n_l * wire, n_c * wire)
    summed = layered_inductance(n_c, n_l, 2 * a - n_c * wire, wire, wire, wire)
    assert multilayer_inductance(n_l * n_c, *size) == pytest.approx(summed, rel=0.01)
    assert multilayer_spread(*size) == 0.04


def test_outside_its_range_no_error_is_claimed() -> None:
    """A thin long coil is a solenoid's business, a pancake too."""
    assert np.isnan(multilayer_spread(0.02, [0.06, 0.001], [0.001, 0.009])).all()


@given(st.integers(1, 5), st.integers(1, 12), st.floats(0.1, 10.0))
def test_larger_coils_have_more_inductance_in_proportion(layers: int, turns: int, k: float) -> None:
    """Magnetostatics has no length of its own."""
    sizes = np.array([0.01, 5e-4, 5e-4, 4e-4])
    small, large = (layered_inductance(layers, turns, *(s * sizes)) for s in (1.0, k))
    assert large == pytest.approx(k * small, rel=1e-9)
    more = layered_inductance(layers + 1, turns, 0.01, 5e-4, 5e-4, 4e-4)
    assert more > small


def test_sensitivities_are_the_derivatives() -> None:
    """Central differences of the closed form; together 1, as an inductance is a length."""
    size = np.array([0.012, 0.006, 0.004])
    by = multilayer_sensitivities(*size)
    for place, slope in enumerate(by):
        step = np.where(np.arange(3) == place, 1e-5, 0.0)
        up, down = (multilayer_inductance(100, *(size * (1 + sign * step))) for sign in (1, -1))
        assert slope == pytest.approx((up / down - 1) / 2e-5, rel=1e-4)
    assert sum(by) == pytest.approx(1.0)


@pytest.mark.parametrize(("layers", "turns"), [(2, 60), (2, 25), (20, 2), (30, 3), (3, 45)])
def test_outside_the_range_the_closed_form_is_within_its_wide_spread(layers: int, turns: int) -> None:
    """Long thin coils and flat discs of 0.3 mm wire on 10 mm, summed turn by turn."""
    pitch = 0.3e-3
    size = (10e-3 + layers * pitch, turns * pitch, layers * pitch)
    assert np.isnan(multilayer_spread(*size))
    summed = layered_inductance(layers, turns, 10e-3, pitch, pitch, 0.27e-3)
    assert multilayer_inductance(layers * turns, *size) == pytest.approx(summed, rel=OUTSIDE_SPREAD)
