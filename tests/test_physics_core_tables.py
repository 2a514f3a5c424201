"""One rod in many coils: published figures by way of the tables, and the stated interpolation error."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from partpick.physics.core_tables import INTERPOLATION_SPREAD, inductance_rises
from partpick.physics.sheet import sheet_inductance
from partpick.physics.sliding_core import core_inductance_rise

PUBLISHED = Path(__file__).parent / "published"


def test_published_ratios_come_out_of_the_tables() -> None:
    """tests/published/sliding_core.csv, surface charges by other code: every rod at all positions, within its 1 %."""
    with (PUBLISHED / "sliding_core.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    for key in {(row["core_d_m"], row["core_length_m"], row["mu_r"]) for row in rows}:
        own = [row for row in rows if (row["core_d_m"], row["core_length_m"], row["mu_r"]) == key]
        names = ("N", "coil_D_m", "coil_length_m", "core_centre_z_m", "ratio_L_over_L0")
        column = {name: np.array([float(row[name]) for row in own]) for name in names}
        coil = column["N"], column["coil_D_m"], column["coil_length_m"]
        rise = inductance_rises(*map(float, key), *coil, column["core_centre_z_m"])
        ratio = 1.0 + rise / sheet_inductance(*coil)
        assert ratio == pytest.approx(column["ratio_L_over_L0"], rel=0.01)


@settings(max_examples=3, deadline=None)
@given(st.floats(0.8, 6.0), st.floats(1.5, 300.0), st.integers(0, 10**6))
def test_the_stated_error_of_interpolation_holds(proportion: float, permeability: float, seed: int) -> None:
    """Against boundary elements of each coil, as a share of the rise with the rod centred."""
    rng = np.random.default_rng(seed)
    core_d, core_l = 0.006, 0.006 * proportion
    diameter = core_d * rng.uniform(1.1, 3.0, 4)
    length, turns = core_l * rng.uniform(0.3, 2.0, 4), rng.integers(1, 80, 4)
    for share in (0.0, 0.6, 1.0):
        offset = (share - 1.0) * (length + core_l) / 2
        quick = inductance_rises(core_d, core_l, permeability, turns, diameter, length, offset)
        for place in range(4):
            coil = float(turns[place]), float(diameter[place]), float(length[place])
            direct, most = core_inductance_rise(*coil, core_d, core_l, permeability, np.array([offset[place], 0.0]))
            assert abs(quick[place] - direct) < INTERPOLATION_SPREAD * most


def test_air_and_no_coils_add_nothing() -> None:
    """Permeability 1 is no rod."""
    assert inductance_rises(0.006, 0.02, 1.0, [10.0], [0.01], [0.01], [0.0]) == pytest.approx([0.0])
    assert len(inductance_rises(0.006, 0.02, 10.0, [], [], [], [])) == 0


def test_a_coil_comes_out_alike_whatever_the_others_are() -> None:
    """Tables stand at fixed gaps: same parts, same figure."""
    alone = inductance_rises(0.006, 0.02, 10.0, [10.0], [0.0101], [0.01], [0.0])
    among = inductance_rises(0.006, 0.02, 10.0, [10.0, 5.0], [0.0101, 0.03], [0.01, 0.02], [0.0, -0.01])
    assert among[0] == pytest.approx(alone[0], rel=2e-4)
