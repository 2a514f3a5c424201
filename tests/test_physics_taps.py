"""Sections of a coil: inductance, coupling to the rest, and the rest open or shorted."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics.filaments import mutual_inductance
from partpick.physics.solenoid import solenoid_family
from partpick.physics.taps import tapped_section

PUBLISHED = Path(__file__).parent / "published"


def rows() -> list[dict[str, str]]:
    with (PUBLISHED / "tapped_solenoid.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows(), ids=lambda r: f"{r['N']}/{r['n_section']}")
def test_sections_are_those_summed_apart(row: dict[str, str]) -> None:
    """Published sums treat section and rest as two coils; ours come from whole families."""
    family = solenoid_family(int(row["N"]), float(row["d_m"]), float(row["wire_d_m"]), float(row["pitch_m"]))
    parts = tapped_section(family, int(row["n_section"]), int(row["first_turn_index"]))
    tolerance = float(row["rel_tol"])
    assert parts.total == pytest.approx(float(row["L_total_H"]), rel=tolerance)
    assert parts.section == pytest.approx(float(row["L_section_H"]), rel=tolerance)
    assert parts.rest == pytest.approx(float(row["L_rest_H"]), rel=tolerance)
    assert parts.mutual == pytest.approx(float(row["M_H"]), rel=tolerance)
    assert parts.coupling == pytest.approx(float(row["k"]), rel=tolerance)
    assert parts.voltage_ratio == pytest.approx(float(row["voltage_ratio_open=(Ls+M)/Lt"]), rel=tolerance)


def test_mutual_inductance_is_the_sum_over_pairs_of_turns() -> None:
    """A section in the middle, every pair counted."""
    n, d, w, p = 17, 0.03, 0.001, 0.002
    inside = np.arange(4, 9)
    outside = np.setdiff1d(np.arange(n), inside)
    apart = p * np.subtract.outer(inside, outside)
    parts = tapped_section(solenoid_family(n, d, w, p), len(inside), 4)
    assert parts.mutual == pytest.approx(mutual_inductance(d / 2, d / 2, apart).sum(), rel=1e-12)


@given(st.integers(2, 60), st.data())
def test_every_tap_keeps_the_order_of_nature(n: int, data: st.DataObject) -> None:
    """0 < k < 1, more turns more inductance, shorted turns take inductance away, and the parts add up."""
    size = data.draw(st.integers(1, n - 1))
    start = data.draw(st.integers(0, n - size))
    family = solenoid_family(n, 0.025, 0.001, 0.002)
    parts = tapped_section(family, size, start)
    assert 0.0 < parts.coupling < 1.0
    assert 0.0 < parts.rest_shorted < parts.section < parts.total
    assert 0.0 < parts.voltage_ratio < 1.0
    assert parts.section + parts.rest + 2.0 * parts.mutual == pytest.approx(parts.total, rel=1e-12)
    assert parts.section == family[size - 1]


def test_from_either_end_the_same() -> None:
    """A coil looks the same from both ends."""
    family = solenoid_family(20, 0.025, 0.001, 0.002)
    left, right = tapped_section(family, 6, 0), tapped_section(family, 6, 14)
    assert left.rest == pytest.approx(right.rest, rel=1e-12)
    assert left.mutual == pytest.approx(right.mutual, rel=1e-12)


def test_the_whole_coil_has_no_rest() -> None:
    """The last tap: nothing to couple to, nothing to short."""
    parts = tapped_section(solenoid_family(10, 0.025, 0.001, 0.002), 10)
    assert (parts.rest, parts.mutual, parts.coupling) == (0.0, 0.0, 0.0)
    assert parts.rest_shorted == parts.section == parts.total
    assert parts.voltage_ratio == 1.0


def test_all_taps_at_once() -> None:
    """Arrays of taps, as a search asks for them."""
    family = solenoid_family(12, 0.025, 0.001, 0.002)
    taps = np.arange(3, 13)
    parts = tapped_section(family, taps)
    each = [tapped_section(family, tap) for tap in taps.tolist()]
    assert parts.rest_shorted.tolist() == [float(one.rest_shorted) for one in each]
    assert parts.coupling.tolist() == [float(one.coupling) for one in each]


@pytest.mark.parametrize(("size", "start"), [(0, 0), (11, 0), (5, 6), (3, -1)])
def test_a_section_outside_the_coil_is_refused(size: int, start: int) -> None:
    """A negative index would silently read from the other end."""
    with pytest.raises(ValueError, match="within the coil's 10 turns"):
        tapped_section(solenoid_family(10, 0.025, 0.001, 0.002), size, start)
