"""The bill of material as CSV (RFC 4180): what to buy, pull or wind, every candidate in rank order.

Figures are for one unit; where several are built a last column has the pieces for all of them. Wire is a row
of its own: its value is the length of one piece, and its price is taken out of the price of the coil that it
is wound into, so that the column adds up.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable
from dataclasses import dataclass

from partpick.quantities import format_percent, format_quantity
from partpick.result import Candidate, PartLine, Result

COLUMNS = (
    "rank", "reference", "quantity", "kind", "value", "value_si", "unit", "tolerance", "description",
    "bands", "unit_price", "line_price", "source",
)  # fmt: skip

ALL_UNITS = "quantity_all_units"  # a further column where more than one unit is built

# A spreadsheet runs a cell that starts with one of these (the wide forms too) as a formula.
_FORMULA_STARTS = "=+-@|%\uff1d\uff0b\uff0d\uff20"


@dataclass(frozen=True, kw_only=True)
class _Line:
    """What makes two pieces equal: everything in a row but reference, quantity and bands."""

    kind: str
    value: float | None
    unit: str
    tolerance: float | None
    description: str
    unit_price: float | None
    source: str
    told_apart: tuple[object, ...]  # not printed, but two pieces that differ here are not the same part


def bom_csv(result: Result) -> str:
    """Return the bill of material of all candidates; the header alone where nothing fits."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\r\n")
    units = result.request.units
    writer.writerow(COLUMNS if units == 1 else (*COLUMNS, ALL_UNITS))
    for candidate in result.candidates:
        for row in _rows(candidate):
            writer.writerow(row if units == 1 else [*row, str(int(row[2]) * units)])
    return text.getvalue()


def _rows(candidate: Candidate) -> list[list[str]]:
    """Return a candidate's rows in order of first reference, wires last."""
    pieces = [(_line(part), part) for part in candidate.parts]
    pieces += [(wire, part) for part in candidate.parts if (wire := _wire_line(part)) is not None]
    alike: dict[_Line, list[PartLine]] = {}
    for line, part in pieces:
        alike.setdefault(line, []).append(part)
    return [_row(candidate.rank, line, parts) for line, parts in alike.items()]


def _line(part: PartLine) -> _Line:
    return _Line(
        kind=part.kind,
        value=part.value,
        unit=part.unit,
        tolerance=part.tolerance,
        description=part.description,
        unit_price=price_without_wire(part),
        source=part.source,
        told_apart=(part.label, part.grade, part.tempco, part.wire, part.wire_length),
    )


def _wire_price(part: PartLine) -> float | None:
    if part.wire_length is None or part.wire_price_per_m is None:
        return None
    return part.wire_length * part.wire_price_per_m


def price_without_wire(part: PartLine) -> float | None:
    """Return the price of a piece, of a wound coil that of its former or core alone."""
    wire = _wire_price(part)
    if part.unit_price is None or wire is None:
        return part.unit_price
    return max(part.unit_price - wire, 0.0)


def _wire_line(part: PartLine) -> _Line | None:
    if part.wire is None or part.wire_length is None:
        return None
    return _Line(
        kind="wire",
        value=part.wire_length,
        unit="m",
        tolerance=None,
        description=part.wire,
        unit_price=_wire_price(part),
        source="",
        told_apart=(part.wire_price_per_m,),
    )


def _row(rank: int | None, line: _Line, parts: list[PartLine]) -> list[str]:
    price = line.unit_price
    return [
        "" if rank is None else str(rank),
        _safe(" ".join(part.reference for part in parts)),
        str(len(parts)),
        line.kind,
        "" if line.value is None else format_quantity(line.value, line.unit, 4),
        "" if line.value is None else repr(float(line.value)),
        line.unit,
        "" if line.tolerance is None else format_percent(line.tolerance),
        _safe(line.description),
        "; ".join(_safe(name) for name in _in_order(name for part in parts for name in part.bands)),
        _money(price),
        _money(None if price is None else price * len(parts)),
        _safe(line.source),
    ]


def _in_order(names: Iterable[str]) -> list[str]:
    """Return the names without repeats, first come first."""
    return list(dict.fromkeys(names))


def _money(price: float | None) -> str:
    """Return a price without the tail of binary fractions, which no price list has."""
    return "" if price is None else f"{float(price):.10g}"


def _safe(text: str) -> str:
    """Return a cell that no spreadsheet runs: a formula gets an apostrophe, control characters a blank."""
    clean = "".join(letter if letter.isprintable() else " " for letter in text)
    return "'" + clean if clean.lstrip()[:1] in tuple(_FORMULA_STARTS) else clean
