"""Tests of the bill of material: the contract's columns, shared rows, prices, cells that do no harm."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

import handmade
import pytest

from partpick.report.bom import bom_csv
from partpick.result import Result

# the contract's header, as it is written there
HEADER = (
    "rank,reference,quantity,kind,value,value_si,unit,tolerance,description,"
    "bands,unit_price,line_price,source"
)


def _rows(result: Result) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(bom_csv(result), newline="")))


def test_the_header_is_the_contract_s() -> None:
    """Spreadsheets and scripts address the columns by these names."""
    assert bom_csv(handmade.result(handmade.candidate())).splitlines()[0] == HEADER


def test_nothing_fits_leaves_the_header_alone() -> None:
    """The nearest miss breaks a limit: nobody must buy it from this list."""
    assert bom_csv(handmade.nothing()) == HEADER + "\r\n"


def test_lines_end_as_rfc_4180_says() -> None:
    """RFC 4180, section 2, item 1: each record ends with CRLF."""
    text = bom_csv(handmade.result(handmade.candidate()))
    assert text.count("\r\n") == text.count("\n") == 5


def test_equal_parts_share_a_row() -> None:
    """Three pieces to pull from one drawer are one line with a quantity."""
    rows = _rows(handmade.result(handmade.two_bands()))
    shared = {row["reference"]: row for row in rows}
    assert shared["C1 C3"]["quantity"] == "2"
    assert shared["C1 C3"]["bands"] == "beacon; weather"
    assert shared["C4 C5"]["quantity"] == "2"
    assert shared["C2"]["quantity"] == "1"


def test_parts_of_another_grade_or_price_do_not_share_a_row() -> None:
    """100 pF C0G and 100 pF mica are two things to buy."""
    parts = (
        handmade.capacitor("C1"),
        handmade.capacitor("C2", description="100 pF mica", grade="mica"),
        handmade.capacitor("C3", unit_price=0.3),
    )
    rows = _rows(handmade.result(handmade.candidate(parts=parts)))
    assert [row["reference"] for row in rows] == ["C1", "C2", "C3"]


def test_wire_is_a_row_with_its_length() -> None:
    """Wire is bought by the metre: the row says how much of which."""
    rows = _rows(handmade.result(handmade.candidate()))
    wire = next(row for row in rows if row["kind"] == "wire")
    assert (wire["reference"], wire["value"], wire["value_si"], wire["unit"]) == ("L1", "1.24 m", "1.24", "m")
    assert wire["description"] == "enamelled 0.5 mm"
    assert float(wire["line_price"]) == pytest.approx(1.24 * 0.05)
    former = next(row for row in rows if row["kind"] == "coil")
    assert former["unit_price"] == "0.8"  # 0.862 with its wire


def test_line_prices_add_up_to_the_price_of_the_candidate() -> None:
    """Who adds the column must arrive at the price that ranked the candidate."""
    candidate = handmade.two_bands()
    rows = _rows(handmade.result(candidate))
    assert sum(float(row["line_price"]) for row in rows) == pytest.approx(candidate.price)
    assert all(
        float(row["line_price"]) == pytest.approx(float(row["unit_price"]) * int(row["quantity"]))
        for row in rows
    )


def test_an_unknown_price_is_an_empty_cell() -> None:
    """Unknown is not free of charge."""
    rows = _rows(handmade.result(handmade.candidate(parts=(handmade.capacitor("C1", unit_price=None),))))
    assert (rows[0]["unit_price"], rows[0]["line_price"]) == ("", "")


def test_candidates_stand_in_rank_order() -> None:
    """All candidates are listed, each row with the rank that it belongs to."""
    rows = _rows(handmade.result(handmade.candidate(1), handmade.candidate(2), handmade.candidate(3)))
    assert [row["rank"] for row in rows] == ["1"] * 4 + ["2"] * 4 + ["3"] * 4


def test_values_stand_both_written_and_in_si() -> None:
    """The bench reads 47 pF, the spreadsheet 4.7e-11, the same number."""
    part = handmade.capacitor("C1", 47e-12, "47 pF")
    row = _rows(handmade.result(handmade.candidate(parts=(part,))))[0]
    assert row["value"] == "47 pF"
    assert float(row["value_si"]) == 47e-12
    assert (row["unit"], row["tolerance"]) == ("F", "5 %")


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t=", "\r=", " =", "\n@", "\uff1d"])
def test_a_cell_that_a_spreadsheet_would_run_is_defused(start: str) -> None:
    """A label from a stranger's drawer must not run when the list is opened."""
    harm = f'{start}HYPERLINK("x","y")'
    part = handmade.capacitor("C1", description=harm, source=harm, bands=("beacon", harm))
    row = _rows(handmade.result(handmade.candidate(parts=(part,))))[0]
    assert row["description"].startswith("'")
    assert row["source"].startswith("'")
    assert all(name.startswith(("'", "beacon")) for name in row["bands"].split("; "))


def test_quotes_and_commas_survive() -> None:
    """RFC 4180, section 2, items 6 and 7: such cells are quoted, quotes doubled."""
    part = handmade.capacitor("C1", description='47 pF, "red" box')
    assert _rows(handmade.result(handmade.candidate(parts=(part,))))[0]["description"] == '47 pF, "red" box'


def test_several_units_add_a_column_with_the_pieces_for_all() -> None:
    """The quantity stays that of one unit; the shop wants the sum."""
    one = list(csv.reader(io.StringIO(bom_csv(handmade.result(handmade.candidate())))))
    request = replace(handmade.request("beacon"), units=3)
    three = list(csv.reader(io.StringIO(bom_csv(handmade.result(handmade.candidate(), request=request)))))
    assert [row[:-1] for row in three] == one
    assert three[0][-1] == "quantity_all_units"
    assert all(int(row[-1]) == 3 * int(row[2]) for row in three[1:])
