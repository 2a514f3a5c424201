"""Tests of the list of parts in use: counts, ranges, stock, and what was filled in."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

from partpick.parts import Capacitor, Catalogue, Core, Former, Wire
from partpick.report.parts_table import parts_table


def _capacitor(value: float, **changes: Any) -> Capacitor:
    fields: dict[str, Any] = {
        "value": value, "exact": Fraction(repr(value)), "grade": "C0G", "tolerance": 0.05, "tempco": 0.0,
        "tempco_tolerance": 3e-5, "q": 1000.0, "q_below": None, "voltage": 100.0, "rf_current": 0.5,
        "series_inductance": 1.2e-9, "quantity": None, "unit_price": 0.1, "label": "", "family": "E24",
        "source": "invented",
    }  # fmt: skip
    return Capacitor(**{**fields, **changes})


def _catalogue(**parts: Any) -> Catalogue:
    wire = Wire(name="enamelled 0.5 mm", bare_diameter=0.5e-3, overall_diameter=0.542e-3)
    former = Former(
        name="tube 20 mm", support="tube", diameter=20e-3, winding_length=50e-3, pitch=None, tolerance=0.01,
        tempco=1e-4, tempco_tolerance=5e-5, loss_tangent=0.01, quantity=3, unit_price=0.8, source="invented",
    )  # fmt: skip
    core = Core(
        name="ring 13 mm", shape="ring", outer_diameter=13e-3, inner_diameter=7.5e-3, height=5e-3,
        material="powder B", permeability=9.0, al=None, q=200.0, frequency_low=2e6, frequency_high=20e6,
        tolerance=0.05, tempco=9.5e-5, tempco_tolerance=3e-5, adjust=None, quantity=None, unit_price=None,
        source="invented",
    )  # fmt: skip
    fields: dict[str, Any] = {
        "capacitors": (_capacitor(10e-12), _capacitor(10e-9)), "inductors": (), "wires": (wire,),
        "formers": (former,), "cores": (core,), "drawer": False,
    }  # fmt: skip
    return Catalogue(**{**fields, **parts})


def test_each_file_is_listed_with_counts_and_ranges() -> None:
    """Who looks for a missing part must see at once which file would hold it."""
    text = parts_table(_catalogue())
    assert "capacitors.csv: 2 parts" in text
    assert "C0G E24" in text and "10 pF to 10 nF" in text
    assert "inductors.csv: 0 parts" in text
    assert "tube" in text and "20 mm" in text and "3 pieces" in text
    assert "ring powder B" in text and "13 mm" in text


def test_stock_without_end_is_not_counted_as_pieces() -> None:
    """An empty quantity means as many as wanted, not none."""
    text = parts_table(_catalogue(capacitors=(_capacitor(10e-12, quantity=4), _capacitor(22e-12))))
    assert "4 pieces, some without end" in text


def test_what_was_filled_in_is_said_once_with_its_count() -> None:
    """A default taken for an empty cell is never silent."""
    note = "tolerance not stated, 5 % taken"
    parts = tuple(_capacitor(value, notes=(note,)) for value in (10e-12, 22e-12, 33e-12))
    text = parts_table(_catalogue(capacitors=parts))
    assert text.count(note) == 1
    assert f"Note: {note} (3 parts)" in text


def test_the_origin_of_each_file_is_said() -> None:
    """A drawer replaces files one by one; the list shows which."""
    text = parts_table(_catalogue(drawer=True, drawer_files=("capacitors.csv",)))
    assert "capacitors.csv (drawer)" in text
    assert "cores.csv (drawer)" not in text


def test_lines_keep_to_80_columns_whatever_a_drawer_says() -> None:
    """Long grades and notes are cut or wrapped."""
    part = _capacitor(10e-12, grade="x" * 200, notes=("y " * 200,))
    text = parts_table(_catalogue(capacitors=(part,)))
    assert max(len(line) for line in text.splitlines()) <= 80
