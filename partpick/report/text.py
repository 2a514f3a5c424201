"""Plain text in columns for the bench: widths, wrapping, figures in words; at most 80 columns."""

from __future__ import annotations

import textwrap
import unicodedata
from collections.abc import Sequence
from decimal import Decimal

from partpick.quantities import format_quantity

WIDTH = 80
FEMTO, PICO = 1e-15, 1e-12


def clean(text: str) -> str:
    """Return text from a plan or drawer without anything that could steer a terminal."""
    return "".join(letter if letter.isprintable() else "\ufffd" for letter in text)


def columns_of(text: str) -> int:
    """Return how many columns of a terminal a text takes."""
    return sum(
        0 if unicodedata.combining(letter) else 2 if unicodedata.east_asian_width(letter) in "WF" else 1
        for letter in text
    )


def cut(text: str, columns: int) -> str:
    """Return text that fits, its end marked by an ellipsis where it was cut."""
    if columns_of(text) <= columns:
        return text
    while text and columns_of(text) > columns - 1:
        text = text[:-1]
    return text.rstrip() + "\u2026"


def wrapped(text: str, indent: int = 0, hang: int = 0) -> list[str]:
    """Return text in lines of at most `WIDTH` columns; lines after the first stand `hang` further in."""
    text = clean(text)
    wide = columns_of(text) > len(text)  # full-width letters take two columns
    return textwrap.wrap(
        text,
        WIDTH // 2 if wide else WIDTH,
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + hang),
        break_on_hyphens=False,
    )


def columns(rows: Sequence[Sequence[str]], left: Sequence[int] = (), gap: int = 2) -> list[str]:
    """Return rows of cells as aligned lines; figures to the right, the columns in `left` to the left."""
    if not rows:
        return []
    widths = [max(columns_of(row[place]) for row in rows) for place in range(len(rows[0]))]
    lines = []
    for row in rows:
        cells = []
        for place, (cell, width) in enumerate(zip(row, widths, strict=True)):
            blanks = " " * (width - columns_of(cell))
            cells.append(cell + blanks if place in left else blanks + cell)
        lines.append((" " * gap).join(cells).rstrip())
    return lines


def figure(value: float | None, digits: int = 3, sign: str = "") -> str:
    """Return a figure without unit, exponent and needless zeros; "?" where it is unknown."""
    if value is None:
        return "?"
    rounded = Decimal(f"{value:.{digits - 1}e}").normalize()
    return f"{rounded:{sign}f}"


def quantity(value: float | None, unit: str, digits: int = 3) -> str:
    """Return a quantity with its unit, "?" where it is unknown; below 1 pF in pF, as the bench says it."""
    if value is not None and unit == "F" and FEMTO < abs(value) < PICO:
        return f"{value / PICO:.{digits}g} pF"
    return "?" if value is None else format_quantity(value, unit, digits)


def length(metres: float) -> str:
    """Return a length as it is measured at the bench: metres from one metre, else millimetres."""
    return f"{metres:.2f} m" if metres >= 1 else f"{figure(metres * 1000)} mm"


def signed_percent(fraction: float | None) -> str:
    """Return an error with its sign; a tiny one to its first figure."""
    if fraction is None:
        return "-"
    percent = fraction * 100
    if 0 < abs(percent) < 0.0005:
        return f"{figure(percent, 1, '+')} %"
    return f"{percent:+.{2 if abs(percent) >= 1 else 3}f} %"


def signed_shift(hertz: float | None) -> str:
    """Return an error in hertz, kilohertz or megahertz with its sign."""
    if hertz is None:
        return ""
    scale, unit = (1e6, "MHz") if abs(hertz) >= 1e6 else (1e3, "kHz") if abs(hertz) >= 1e3 else (1.0, "Hz")
    return f"{figure(hertz / scale, 3, '+')} {unit}"


def slope(hertz_per_farad: float | None) -> str:
    """Return how far one picofarad more moves the frequency, with its sign and unit."""
    return "?" if hertz_per_farad is None else signed_shift(hertz_per_farad * 1e-12)


def plural(count: int, noun: str) -> str:
    """Return a count with its noun, such as "1 part", "2 parts"."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"
