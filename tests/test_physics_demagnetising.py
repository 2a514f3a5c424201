"""Demagnetising factors against published tables, and the permeability that a rod keeps."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.demagnetising import demagnetising_factor, rod_permeability
from partpick.physics.sheet import nagaoka_coefficient
from partpick.physics.sliding_core import core_inductance_rise

PUBLISHED = Path(__file__).parent / "published"


def rows(kind: str) -> list[dict[str, str]]:
    with (PUBLISHED / "demagnetising.csv").open(encoding="utf-8", newline="") as file:
        return [row for row in csv.DictReader(file) if row["kind"] == kind]


@pytest.mark.parametrize("row", rows("spheroid"), ids=lambda r: r["length_over_diameter"])
def test_spheroids_are_the_published_ones(row: dict[str, str]) -> None:
    """Osborn's closed form, and his printed table from memory."""
    computed = demagnetising_factor(float(row["length_over_diameter"]))
    assert computed == pytest.approx(float(row["factor"]), rel=float(row["rel_tol"]), abs=6e-8)


@pytest.mark.parametrize("row", rows("rod"), ids=lambda r: r["length_over_diameter"])
def test_rods_have_a_little_less_than_spheroids(row: dict[str, str]) -> None:
    """The stated 0.7 to 0.9, within the two figures of a table from memory."""
    share = float(row["factor"]) / demagnetising_factor(float(row["length_over_diameter"]))
    tolerance = float(row["rel_tol"])
    assert 0.7 * (1 - tolerance) < share < 0.9 * (1 + tolerance)


@pytest.mark.parametrize("row", rows("weak cylinder"), ids=lambda r: r["length_over_diameter"])
def test_a_weak_magnet_is_a_current_sheet(row: dict[str, str]) -> None:
    """1 - K: published factors of cylinders check Nagaoka's coefficient from another side."""
    computed = 1.0 - nagaoka_coefficient(float(row["length_over_diameter"]))
    assert computed == pytest.approx(float(row["factor"]), rel=5e-5, abs=1e-6)


def test_the_branches_join_at_the_sphere() -> None:
    """One third, with equal slope from both sides, and no step where the series begins."""
    assert demagnetising_factor(1.0) == pytest.approx(1.0 / 3.0, rel=1e-14)
    seams = np.sqrt(1.0 + 0.01 * np.array([-1.0, 1.0]))
    for seam in seams:
        before, after = demagnetising_factor(seam * (1.0 + np.array([-1e-10, 1e-10])))
        assert before == pytest.approx(after, rel=1e-9)


@given(st.floats(1e-4, 1e4), st.floats(1.001, 10.0))
def test_longer_spheroids_demagnetise_less(m: float, longer: float) -> None:
    """From a disc to a needle."""
    short, long = demagnetising_factor([m, m * longer])
    assert 0.0 < long < short < 1.0


def test_three_axes_add_up_to_one() -> None:
    """The trace: a flat disc leaves next to nothing for its two other axes, a needle half for each."""
    assert demagnetising_factor(1e-6) == pytest.approx(1.0 - np.pi / 2 * 1e-6, rel=1e-9)
    assert np.isnan(demagnetising_factor([0.0, -1.0])).all()


def test_a_rod_keeps_at_most_what_its_shape_allows() -> None:
    """No core, no gain; endless permeability, one over the factor."""
    assert rod_permeability(1.0, 0.02) == 1.0
    assert rod_permeability(400.0, 0.0) == 400.0
    assert rod_permeability(1e12, 0.02) == pytest.approx(50.0)


@pytest.mark.parametrize("permeability", [5.0, 20.0])
def test_the_estimate_agrees_with_the_solved_rod_in_a_long_coil(permeability: float) -> None:
    """In an even field a rod gains chi/(1 + N chi) of its volume; 15 % is what the simple model is good for."""
    coil, long, core, length = 0.012, 1.0, 0.008, 0.04
    rise = core_inductance_rise(1.0, coil, long, core, length, permeability, 0.0)
    field_square = 1.0 / long**2  # of one turn's ampere, even over the rod
    moment = rise / (4e-7 * np.pi * field_square * np.pi / 4 * core**2 * length)
    chi = permeability - 1.0
    assert moment == pytest.approx(chi / (1.0 + demagnetising_factor(length / core) * chi), rel=0.15)
