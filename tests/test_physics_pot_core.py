"""Winding space of pot cores against the printed sizes of the standard."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from partpick.physics.geometry import window_turns_that_fit
from partpick.physics.pot_core import pot_window

with (Path(__file__).parent / "published" / "pot_window.csv").open(encoding="utf-8", newline="") as file:
    ROWS = list(csv.DictReader(file))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["size"])
def test_the_winding_area_of_a_former_is_met(row: dict[str, str]) -> None:
    """Winding area of a former of one section, to the tolerance of proportions."""
    window = pot_window(float(row["outer_m"]), float(row["height_m"]))
    area = window.width * window.depth
    assert area == pytest.approx(float(row["area_m2"]), rel=float(row["rel_tol"])), row["source"]


def test_a_tiny_core_has_no_room() -> None:
    """The walls of the former take it all; nothing is negative."""
    window = pot_window(3e-3, 1e-3)
    assert window.depth >= 0.0 and window.width == 0.0
    assert window_turns_that_fit(window.width, window.depth, 0.1e-3) == 0
