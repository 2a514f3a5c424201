"""Cells that several kinds of parts share: values and families, coefficients, words for notes."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

from partpick.catalogue_table import Row
from partpick.errors import QuantityError
from partpick.preferred import SERIES, series_values
from partpick.quantities import Tolerance, format_quantity, parse_number, parse_tempco, refusal


def read_values(row: Row, parse: Callable[[str], Fraction]) -> tuple[str, tuple[Fraction, ...]]:
    """Return the series ("" for a single value) and the values of a row."""
    stated = [column for column in ("series", "from", "to") if row.has(column)]
    if row.has("value"):
        if stated:
            raise row.wrong(stated[0], "a row is one value or a family, not both")
        return "", (row.need("value", parse),)
    if not stated:
        raise row.wrong("value", "empty, and no family (series, from, to) in its place")
    series = row.need("series", _series)
    low, high = row.need("from", parse), row.need("to", parse)
    if low > high:
        raise row.wrong("to", "below from")
    values = series_values(series, low, high)
    if not values:
        raise row.wrong("series", f"no value of {series} lies from {row.cells['from']} to {row.cells['to']}")
    return series, values


def _series(text: str) -> str:
    if text.upper() not in SERIES:
        raise refusal(text, f"no series of preferred numbers; known are {', '.join(SERIES)}")
    return text.upper()


def read_tempco(row: Row) -> tuple[float | None, float | None]:
    """Return the temperature coefficient and its spread in 1/K, None where not stated.

    A bare number is ppm/K, as the name of the first column says.
    """

    def read(text: str, signed: bool) -> float:
        try:
            parse_number(text)
        except QuantityError:
            return parse_tempco(text, signed)
        return parse_tempco(f"{text} ppm", signed)

    def spread(text: str) -> float:
        # This column's name states no unit: 30 can only be ppm/K, and 0.00003 only 1/K.
        try:
            return parse_tempco(text, signed=False)
        except QuantityError:
            return read(text, signed=False)

    return row.read("tempco_ppm_per_k", lambda text: read(text, True)), row.read("tempco_tolerance", spread)


def read_positive(row: Row, column: str) -> float | None:
    """Return a plain number above zero."""
    value = row.read(column, parse_number)
    if value is not None and value <= 0:
        raise row.wrong(column, f"read {row.cells[column]}: more than zero is wanted")
    return value


def read_price(row: Row, column: str) -> float | None:
    """Return a price, zero or more."""
    return row.read(column, lambda text: parse_number(text, low=0))


def read_one_of(row: Row, column: str, known: tuple[str, ...]) -> str | None:
    """Return one of the known words, in small letters."""

    def read(text: str) -> str:
        if text.casefold() not in known:
            raise refusal(text, f"known are {', '.join(known)}")
        return text.casefold()

    return row.read(column, read)


def relative_tolerance(row: Row, stated: Tolerance, value: float) -> float:
    """Return the stated tolerance as a fraction of a value of the row."""
    try:
        return stated.of(value)
    except QuantityError as error:
        raise row.wrong("tolerance", str(error)) from None


def note_taken(what: str, taken: str, kind: str, source: str) -> str:
    """Return the note on an empty cell."""
    if not taken:
        return f"{what} not stated: unknown"
    return f"{what} not stated: {taken} taken for {kind} ({source})"


def ppm_words(tempco: float | None, tolerance: float | None) -> str:
    """Return a temperature coefficient in words, "" where it is unknown."""
    if tempco is None:
        return ""
    spread = "" if tolerance is None else f" \u00b1{tolerance * 1e6:.6g}"
    return f"{tempco * 1e6:.6g}{spread} ppm/K"


def value_words(value: float, unit: str) -> str:
    """Return a value for a label with all its figures, so that close ones stay apart."""
    return format_quantity(value, unit, digits=12)
