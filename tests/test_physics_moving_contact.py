"""Moving contact: published sections, the shorted rest, the curve between whole turns."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.moving_contact import section_inductance, usable_turns
from partpick.physics.sheet import solenoid_inductance
from partpick.physics.solenoid import solenoid_family
from partpick.physics.taps import tapped_section

PUBLISHED = Path(__file__).parent / "published"
FAMILY = solenoid_family(20, 0.025, 0.001, 0.002)
sizes = st.tuples(st.integers(5, 60), st.floats(0.01, 0.08), st.floats(1.05, 3.0))


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return [row for row in csv.DictReader(file) if row["first_turn_index"] == "0"]


@pytest.mark.parametrize("row", rows("tapped_solenoid.csv"), ids=lambda r: f"{r['N']}-{r['n_section']}")
def test_section_with_the_rest_open_and_shorted(row: dict[str, str]) -> None:
    """L_s, and L_s - M^2/L_r, from the published L_s, L_r and M."""
    size = (float(row[key]) for key in ("d_m", "wire_d_m", "pitch_m"))
    family = solenoid_family(int(row["N"]), *size)
    section, rest, mutual = (float(row[key]) for key in ("L_section_H", "L_rest_H", "M_H"))
    turns, tolerance = int(row["n_section"]), float(row["rel_tol"])
    assert section_inductance(family, turns) == pytest.approx(section, rel=tolerance)
    shorted = section - mutual**2 / rest
    assert section_inductance(family, turns, rest_shorted=True) == pytest.approx(shorted, rel=tolerance)


def test_agrees_with_the_tap_of_a_coil() -> None:
    """A contact at a whole turn is a tap."""
    turns = np.arange(1, 21)
    parts = tapped_section(FAMILY, turns)
    assert section_inductance(FAMILY, turns) == pytest.approx(parts.section, rel=1e-12)
    assert section_inductance(FAMILY, turns, rest_shorted=True) == pytest.approx(parts.rest_shorted, rel=1e-9)


@settings(max_examples=30)
@given(sizes)
def test_shorting_the_rest_lowers_the_inductance_all_but_at_the_end(size: tuple[int, float, float]) -> None:
    """Shorted turns push the field back; with every turn in use there are none. Both rise along the coil."""
    count, diameter, spacing = size
    family = solenoid_family(count, diameter, 0.0005, 0.0005 * spacing)
    turns = np.linspace(3.0, count, 50)
    openly, shorted = section_inductance(family, turns), section_inductance(family, turns, rest_shorted=True)
    assert np.all(shorted[:-1] < openly[:-1])
    assert [shorted[-1], openly[-1]] == pytest.approx([family[-1]] * 2, rel=1e-12)
    assert np.all(np.diff(openly) > 0.0) and np.all(np.diff(shorted) > 0.0)


@settings(max_examples=30)
@given(sizes)
def test_fractions_of_a_turn_follow_the_sheet(size: tuple[int, float, float]) -> None:
    """The closed form takes any number of turns: the ratio to it must not swing between whole turns."""
    count, diameter, spacing = size
    pitch = 0.0005 * spacing
    family = solenoid_family(count, diameter, 0.0005, pitch)
    whole, half = np.arange(3.0, count + 1), np.arange(3.5, count)
    ratio, between = (
        section_inductance(family, n) / solenoid_inductance(n, diameter, 0.0005, pitch) for n in (whole, half)
    )
    assert between == pytest.approx((ratio[1:] + ratio[:-1]) / 2, rel=2e-3)


def test_travel_starts_at_the_least_turns() -> None:
    """Rounded up where the contact steps; a shorter coil is refused; beyond the ends there is nothing."""
    assert usable_turns(FAMILY) == (3.0, 20.0)
    assert usable_turns(FAMILY, 3.2) == (4.0, 20.0)
    assert usable_turns(FAMILY, 3.2, continuous=True) == (3.2, 20.0)
    with pytest.raises(ValueError, match="20 turns"):
        usable_turns(FAMILY, 21.0)
    assert np.isnan(section_inductance(FAMILY, [0.5, 20.5])).all()
