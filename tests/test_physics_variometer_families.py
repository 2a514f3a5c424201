"""Many variometers at once: published angles, one pair at a time by the line integral, limits."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.variometer import coil_rings, tilted_mutual_by_line_integral, tilted_mutual_inductance
from partpick.physics.variometer_families import SERIES_SPREAD, family_mutual_inductance

PUBLISHED = Path(__file__).parent / "published"


def test_published_mutual_inductance_against_angle() -> None:
    """Case A of tests/published/variometer.csv, which has no gap at the shaft: within its 0.1 % of M at 0."""
    with (PUBLISHED / "variometer.csv").open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["centre_gap_m"] == "0"]
    assert len(rows) > 5
    sizes = [float(rows[0][name]) for name in ("N1", "D1_m", "pitch1_m", "N2", "D2_m", "pitch2_m")]
    sizes[0], sizes[3] = int(sizes[0]), int(sizes[3])
    angle = np.array([float(row["theta_deg"]) for row in rows])
    published = np.array([float(row["M_H"]) for row in rows])
    mutual = family_mutual_inductance(*sizes, angle)[0]
    assert mutual == pytest.approx(published, abs=1e-3 * published.max())


@settings(max_examples=20, deadline=None)
@given(st.integers(0, 10**6))
def test_every_pair_equals_one_by_one(seed: int) -> None:
    """The line integral shares no step with the series; families and parities are mixed."""
    rng = np.random.default_rng(seed)
    count = 6
    diameter, pitch = rng.choice([0.03, 0.04, 0.05], count), rng.choice([0.0008, 0.0015], count)
    outer = rng.integers(1, 30, count)
    rotor = 0.016
    room = np.sqrt((0.8 * diameter / 2) ** 2 - (rotor / 2) ** 2)
    inner = np.minimum(rng.integers(1, 20, count), 1 + (2 * room / pitch).astype(int))
    angle = np.array([0.0, 35.0, 90.0, 171.0])
    mutual = family_mutual_inductance(outer, diameter, pitch, inner, rotor, pitch, angle)
    for place in range(count):
        pair = (
            coil_rings(int(outer[place]), float(diameter[place]), float(pitch[place])),
            coil_rings(int(inner[place]), rotor, float(pitch[place])),
        )
        most = tilted_mutual_inductance(*pair, 0.0)
        assert mutual[place] == pytest.approx(tilted_mutual_inductance(*pair, angle), abs=SERIES_SPREAD * most)
    assert mutual[-1] == pytest.approx(tilted_mutual_by_line_integral(*pair, angle, 180), abs=2e-6 * most)


def test_a_rotor_that_does_not_turn_through_is_refused() -> None:
    """Where the series does not converge no figure is given."""
    with pytest.raises(ValueError, match="sphere"):
        family_mutual_inductance([4], [0.05], [0.002], [40], [0.045], [0.0015], [0.0])
    assert family_mutual_inductance([], [], [], [], [], [], [0.0]).shape == (0, 1)
