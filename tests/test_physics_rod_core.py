"""A coil on a rod by table, against the boundary elements behind it and the demagnetising factors of rods."""

from __future__ import annotations

import numpy as np
import pytest

from partpick.physics.demagnetising import demagnetising_factor, rod_permeability
from partpick.physics.rod_core import rod_coil_in_range, rod_coil_rise, rod_coil_spread
from partpick.physics.sheet import sheet_inductance
from partpick.physics.sliding_core import core_inductance_rise

ROD = 10e-3


@pytest.mark.parametrize(
    ("slender", "covered", "clearance", "permeability"),
    [(3.7, 0.3, 1.05, 60), (6.3, 0.15, 1.2, 400), (10.0, 0.33, 1.04, 120), (11.0, 0.6, 1.08, 900),
     (16.0, 0.12, 1.03, 250), (27.0, 0.1, 1.25, 206), (25.7, 0.26, 1.03, 965)],
)  # fmt: skip
def test_between_its_cells_the_table_meets_boundary_elements(
    slender: float, covered: float, clearance: float, permeability: float
) -> None:
    """Places off the grid, one rod solved for each: the stated model error covers the difference."""
    length, coil, wound = slender * ROD, clearance * ROD, covered * slender * ROD
    solved = core_inductance_rise(50, coil, wound, ROD, length, permeability, 0.0)
    read = rod_coil_rise(50, coil, wound, ROD, length, permeability)
    assert abs(read / solved - 1) <= rod_coil_spread(coil, wound, ROD, length, permeability, 0.0)


@pytest.mark.parametrize("slender", [5.0, 10.0, 20.0])
def test_a_short_coil_in_the_middle_gains_about_the_rod_permeability(slender: float) -> None:
    """Cousin: the quick estimate by demagnetising factor (Bozorth and Chapin 1942), flux through the middle.

    A short tight coil sees less than that, for its own flux closes outside; a longer one comes near it.
    """
    length = slender * ROD
    quick = rod_permeability(400.0, demagnetising_factor(slender))
    gains = []
    for covered in (0.05, 0.35):
        empty = sheet_inductance(50, 1.02 * ROD, covered * length)
        gains.append(1 + rod_coil_rise(50, 1.02 * ROD, covered * length, ROD, length, 400.0) / empty)
    assert gains[0] < gains[1] < 1.5 * quick
    assert gains[1] > 0.4 * quick


def test_more_permeability_and_more_length_never_lower_the_inductance() -> None:
    """Monotonic in material and rod, as physics has it."""
    material = rod_coil_rise(50, 10.3e-3, 20e-3, ROD, 0.1, np.array([50.0, 120.0, 400.0, 1000.0]))
    lengths = rod_coil_rise(50, 10.3e-3, 20e-3, ROD, np.array([0.05, 0.08, 0.1, 0.16, 0.2, 0.3]), 400.0)
    assert (np.diff(material) > 0).all() and (np.diff(lengths) > 0).all()


def test_all_lengths_by_k_scale_the_rise_by_k() -> None:
    """Dimensional: an inductance is mu0 times a length."""
    once = rod_coil_rise(50, 10.3e-3, 20e-3, ROD, 0.1, 120.0)
    assert rod_coil_rise(50, 30.9e-3, 60e-3, 3 * ROD, 0.3, 120.0) == pytest.approx(3 * once)


def test_an_open_rod_hides_most_of_the_tolerance_of_its_material() -> None:
    """20 % of permeability moves a stubby rod of 400 by a few per cent only; a long one of 120 by more."""
    stubby = rod_coil_spread(10.3e-3, 10e-3, ROD, 50e-3, 400.0, 0.2)
    long = rod_coil_spread(10.3e-3, 60e-3, ROD, 0.2, 120.0, 0.2)
    assert 0.02 < stubby < 0.04 < long < 0.2
    for size, tolerance, spread in ((50e-3, 0.2, stubby), (0.2, 0.2, long)):
        wound, mu = (10e-3, 400.0) if size < 0.1 else (60e-3, 120.0)
        moved = rod_coil_rise(50, 10.3e-3, wound, ROD, size, mu * (1 - tolerance))
        assert abs(moved / rod_coil_rise(50, 10.3e-3, wound, ROD, size, mu) - 1) < 1.4 * spread


def test_outside_the_table_the_spread_is_wide() -> None:
    """A coil longer than the rod, or a low permeability: said, not guessed silently."""
    assert not rod_coil_in_range(10.3e-3, 20e-3, ROD, 0.1, 10.0)
    assert not rod_coil_in_range(10.3e-3, 0.12, ROD, 0.1, 400.0)
    assert rod_coil_in_range(10.3e-3, 20e-3, ROD, 0.1, 400.0)
    assert rod_coil_spread(10.3e-3, 0.12, ROD, 0.1, 400.0, 0.0) == pytest.approx(0.20)
