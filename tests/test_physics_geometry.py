"""Lengths of wire and counts of turns, by plain geometry."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import geometry


def test_wire_of_a_solenoid_is_a_helix() -> None:
    """A turn unrolled is a right triangle: 3, 4, 5."""
    assert geometry.solenoid_wire_length(10, 4.0 / np.pi, 3.0) == pytest.approx(50.0)
    points = np.linspace(0.0, 7 * 2 * np.pi, 100_001)
    helix = np.stack([0.01 * np.cos(points), 0.01 * np.sin(points), 0.002 / (2 * np.pi) * points])
    along = np.linalg.norm(np.diff(helix), axis=0).sum()
    assert geometry.solenoid_wire_length(7, 0.02, 0.002) == pytest.approx(along, rel=1e-8)


def test_wire_of_a_ring_goes_round_its_section() -> None:
    """Thin wire: the outline of the section; thick wire: quarter circles at the corners."""
    assert geometry.ring_wire_length(5, 20e-3, 10e-3, 7e-3, 0.0) == pytest.approx(5 * 24e-3)
    corners = 4 * np.pi / 2 * 0.5e-3
    assert geometry.ring_wire_length(1, 20e-3, 10e-3, 7e-3, 1e-3) == pytest.approx(24e-3 + corners)


def test_wire_of_layers_is_that_of_its_layers() -> None:
    """Turn by turn, 4 layers of 5."""
    each = [geometry.solenoid_wire_length(5, 0.01 + 1e-3 * (i + 0.5) * 2, 0.0) for i in range(4)]
    assert geometry.layered_wire_length(20, 0.01, 4e-3) == pytest.approx(sum(each))


def test_mean_diameter_is_that_of_the_wire_s_centre() -> None:
    """Half a wire outside the former on either side."""
    assert geometry.mean_diameter(20e-3, 0.55e-3) == pytest.approx(20.55e-3)


def test_a_winding_that_fits_exactly_fits() -> None:
    """0.3/0.1 is 2.9999999999999996 in binary; 0.7/0.1 likewise."""
    assert geometry.solenoid_turns_that_fit([0.3, 0.7, 0.29999], 0.1).tolist() == [3, 7, 2]
    assert geometry.window_turns_that_fit(0.3, 0.7, 0.1) == 21
    assert geometry.window_turns_that_fit(0.05, 0.7, 0.1) == 0


@given(st.floats(1e-3, 1.0), st.floats(1e-4, 1e-2))
def test_turns_that_fit_do_fit_and_one_more_does_not(room: float, pitch: float) -> None:
    """Turns times pitch must not exceed the room."""
    n = int(geometry.solenoid_turns_that_fit(room, pitch))
    assert n * pitch <= room * (1 + 1e-8)
    assert (n + 1) * pitch > room * (1 - 1e-8)
