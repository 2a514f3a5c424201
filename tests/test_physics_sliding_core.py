"""Rod in a coil: boundary elements of another kind, weak-field and cylinder limits, the table."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.sheet import nagaoka_coefficient, sheet_inductance
from partpick.physics.skin import MU_0
from partpick.physics.sliding_core import (
    core_inductance_rise,
    core_modes,
    core_offset,
    tabulated_inductance_rise,
)

PUBLISHED = Path(__file__).parent / "published"
COIL = (0.012, 0.02)  # diameter and length of S1 in sliding_core.csv
ROD = (0.008, 0.02)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def figures(row: dict[str, str], *names: str) -> list[float]:
    return [float(row[name]) for name in names]


@pytest.mark.parametrize(
    "row", rows("sliding_core.csv"), ids=lambda r: f"{r['case']}-{r['mu_r']}-{r['inserted_fraction_of_core']}"
)
def test_inductance_agrees_with_surface_charges(row: dict[str, str]) -> None:
    """The same problem by charges instead of currents, by other code: within its 1 %."""
    turns, diameter, length = figures(row, "N", "coil_D_m", "coil_length_m")
    core_d, core_l, permeability = figures(row, "core_d_m", "core_length_m", "mu_r")
    offset = core_offset(float(row["inserted_fraction_of_core"]) * core_l, length, core_l)
    assert offset == pytest.approx(float(row["core_centre_z_m"]), abs=1e-12)
    empty = sheet_inductance(turns, diameter, length)
    assert empty == pytest.approx(float(row["L0_sheet_H"]), rel=1e-5)
    direct = core_inductance_rise(turns, diameter, length, core_d, core_l, permeability, offset)
    table = core_modes(core_d, core_l, permeability, diameter)
    for rise in (direct, tabulated_inductance_rise(table, turns, length, offset)):
        assert 1.0 + rise / empty == pytest.approx(float(row["ratio_L_over_L0"]), rel=float(row["rel_tol"]))


@pytest.mark.parametrize("row", rows("sliding_core_weak.csv"), ids=lambda r: f"{r['case']}-{r['inserted_fraction']}")
def test_weak_rod_sees_the_field_of_the_coil_alone(row: dict[str, str]) -> None:
    """For chi -> 0 the rise is chi times the coil's field energy in the rod."""
    core_d, core_l, diameter, length = figures(row, "core_d_m", "core_length_m", "coil_D_m", "coil_length_m")
    offset = core_offset(float(row["inserted_fraction"]) * core_l, length, core_l)
    rise = core_inductance_rise(1.0, diameter, length, core_d, core_l, 1.0 + 1e-6, offset)
    slope = rise / sheet_inductance(1.0, diameter, length) / 1e-6
    assert slope == pytest.approx(float(row["g=dlnL/dchi_at_chi0"]), rel=float(row["rel_tol"]))


@pytest.mark.parametrize("proportion", [0.5, 1.0, 3.0, 10.0])
def test_even_field_gives_the_demagnetising_factor_of_a_cylinder(proportion: float) -> None:
    """In a long wide coil a weak rod has N = 1 - K (0.3116 at l/d = 1: Chen, Brug, Goldfarb 1991, from memory)."""
    chi, core_d = 1e-3, 0.001
    core_l = proportion * core_d
    length = 3000 * core_l
    weak, weaker = (
        core_inductance_rise(1.0, 30 * core_l, length, core_d, core_l, 1.0 + x, 0.0) / x for x in (chi, chi / 100)
    )
    factor = (1.0 - weak / weaker) / (chi * 0.99)
    volume = np.pi / 4 * core_d**2 * core_l
    field = 1.0 / np.hypot(length, 30 * core_l)  # of the coil in its middle, for one ampere-turn
    assert weaker == pytest.approx(MU_0 * volume * field**2, rel=1e-3)
    assert factor == pytest.approx(1.0 - nagaoka_coefficient(proportion), rel=0.005)


@pytest.mark.parametrize(("proportion", "published"), [(5.0, 0.04), (10.0, 0.0172), (20.0, 0.00617)])
def test_soft_rod_has_the_ballistic_factor_in_its_middle(proportion: float, published: float) -> None:
    """R. M. Bozorth and D. M. Chapin, J. Appl. Phys. 13 (1942) 320, from memory, two to three figures: 15 %.

    A short coil round the middle of the rod picks up the flux that the even field of an endless coil makes there.
    """
    core_d, permeability = 0.01, 1e5
    table = core_modes(core_d, proportion * core_d, permeability, 1.02 * core_d)
    left, right, below, above = table.spline([-table.reach, table.reach, -core_d / 20, core_d / 20])
    flux = np.sum((right - left) * (above - below)) / (core_d / 10) / (MU_0 * np.pi / 4 * core_d**2)
    magnetisation = (flux + 1.0) / (1.0 + 1.0 / (permeability - 1.0))  # flux = M - N M, H = M/chi = 1 - N M
    factor = 1.0 / magnetisation - 1.0 / (permeability - 1.0)
    assert factor == pytest.approx(published, rel=0.15)


def test_endless_coil_and_rod_multiply_by_the_filling() -> None:
    """Rod longer than a long coil: L = L0 (1 + chi area ratio), but for the ends."""
    length, permeability = 0.5, 5.0
    rise = core_inductance_rise(100.0, 0.02, length, 0.016, 2 * length, permeability, 0.0)
    assert rise / sheet_inductance(100.0, 0.02, length) == pytest.approx(4 * 0.8**2, rel=0.04)


def test_air_rod_changes_nothing() -> None:
    """Permeability 1 is no rod; neither is one far away."""
    assert core_inductance_rise(40.0, *COIL, *ROD, 1.0, 0.0) == 0.0
    assert tabulated_inductance_rise(core_modes(*ROD, 1.0, COIL[0]), 40.0, COIL[1], 0.0) == 0.0
    far = core_inductance_rise(40.0, *COIL, *ROD, 50.0, 2.0)
    assert 0.0 <= far < 1e-5 * core_inductance_rise(40.0, *COIL, *ROD, 50.0, 0.0)


@settings(max_examples=8, deadline=None)
@given(st.floats(0.6, 6.0), st.floats(1.15, 2.5), st.floats(0.3, 2.0), st.floats(1.5, 300.0))
def test_pushing_in_raises_the_inductance_up_to_the_centre(
    rod_proportion: float, clearance: float, length_ratio: float, permeability: float
) -> None:
    """A dial that turned back would tune one frequency at two places; the mirror position is the same."""
    core_d, core_l = 0.008, 0.008 * rod_proportion
    diameter, length = clearance * core_d, length_ratio * core_l
    offset = core_offset(np.linspace(0.0, 1.0, 41) * (core_l + length) / 2, length, core_l)
    assert offset[-1] == pytest.approx(0.0, abs=1e-12)
    table = core_modes(core_d, core_l, permeability, diameter)
    rise = tabulated_inductance_rise(table, 10.0, length, offset)
    assert np.all(np.diff(rise) > 0.0)
    assert tabulated_inductance_rise(table, 10.0, length, -offset) == pytest.approx(rise, rel=1e-6)
    assert rise[-1] < (permeability - 1.0) * sheet_inductance(10.0, diameter, length)


@settings(max_examples=8, deadline=None)
@given(st.floats(0.6, 8.0), st.floats(1.05, 2.5), st.floats(0.1, 2.0), st.floats(1.1, 1000.0))
def test_table_keeps_to_the_direct_figure(
    rod_proportion: float, clearance: float, length_ratio: float, permeability: float
) -> None:
    """The stated interpolation error: 0.05 % of the greatest rise."""
    core_d, core_l = 0.008, 0.008 * rod_proportion
    diameter, length = clearance * core_d, length_ratio * core_l
    offset = np.linspace(-0.7, 0.0, 23) * (core_l + length)
    direct = core_inductance_rise(10.0, diameter, length, core_d, core_l, permeability, offset)
    table = core_modes(core_d, core_l, permeability, diameter)
    quick = tabulated_inductance_rise(table, 10.0, length, offset)
    assert np.max(np.abs(quick - direct)) < 5e-4 * np.max(direct)


def test_more_permeability_never_lowers_the_inductance() -> None:
    """And the gain levels off: a short rod's shape, not its material, sets the limit."""
    rise = [float(core_inductance_rise(40.0, *COIL, *ROD, mu, 0.0)) for mu in (2, 5, 20, 100, 1000, 1e5)]
    assert np.all(np.diff(rise) > 0.0)
    assert rise[-1] < 1.02 * rise[-2]


def test_length_scales_the_inductance() -> None:
    """Every size doubled, the turns kept: twice the inductance."""
    small = core_inductance_rise(40.0, *COIL, *ROD, 20.0, -0.004)
    large = core_inductance_rise(40.0, *(2 * x for x in COIL), *(2 * x for x in ROD), 20.0, -0.008)
    assert large == pytest.approx(2 * small, rel=1e-9)


def test_many_coils_share_a_table() -> None:
    """Turns, lengths and offsets broadcast."""
    table = core_modes(*ROD, 20.0, COIL[0])
    length = np.array([[0.01], [0.02]])
    offset = np.array([-0.01, -0.005, 0.0])
    together = tabulated_inductance_rise(table, 30.0, length, offset)
    assert together.shape == (2, 3)
    assert together[1, 1] == tabulated_inductance_rise(table, 30.0, 0.02, -0.005)
    assert core_modes(*ROD, 20.0, COIL[0]) is table


@pytest.mark.parametrize(("core_d", "core_l", "permeability"), [(0.012, 0.02, 5), (0.008, 0.0, 5), (0.008, 0.02, 0.5)])
def test_impossible_rod_is_refused(core_d: float, core_l: float, permeability: float) -> None:
    """A rod as wide as the coil, of no length, or of diamagnetic material."""
    with pytest.raises(ValueError, match=r"does not fit|is below 1"):
        core_inductance_rise(40.0, *COIL, core_d, core_l, permeability, 0.0)
    with pytest.raises(ValueError, match=r"does not fit|is below 1"):
        core_modes(core_d, core_l, permeability, COIL[0])
