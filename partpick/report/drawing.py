"""Circuit of a tank and its switch as an inline SVG: lines, plates, loops of wire, contacts, values."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from partpick.connection import Connection, Part, Series
from partpick.report.circuit_rows import Row, rows_of
from partpick.report.text import quantity
from partpick.report.vector import circle, line, number, svg, words
from partpick.result import Candidate, PartLine

LETTER = 7.0  # width of a letter at 12 units, generous
BOLD = 7.8
CELL_HEIGHT = 46.0
LEAST_CELL = 64.0
PLATE, GAP = 9.0, 3.0  # half height of a plate, half distance between two
BUS = 16.0  # x of the line from the hot end of the coil
CONTACT = 62.0  # width of a switch contact with its leads
MOST_LETTERS = 8  # that fit below a contact of that width
HEADING = 26.0  # room for the title of a row


@dataclass(frozen=True)
class _Box:
    """A connection laid out: what stands in it and the room that it takes."""

    tree: Connection
    width: float
    height: float
    inner: tuple[_Box, ...] = ()


def circuit(candidate: Candidate, reference: str) -> str:
    """Return the drawing of one coil with what each band puts across it, as SVG that scales with the page."""
    rows, labels = rows_of(candidate, reference), _labels(candidate.parts)
    boxes = [_layout(row.tree, labels) if row.tree else None for row in rows]
    contacts = max((CONTACT + LETTER * (len(_told(row)) - MOST_LETTERS) for row in rows if row.contacts), default=0.0)
    start = BUS + (max(CONTACT, contacts) if contacts else 18.0)
    longest = max(
        [LEAST_CELL * 2, *(box.width for box in boxes if box), *(_width_of_title(row, start) for row in rows)]
    )
    rail = start + longest + 18.0
    lines, y, last = _coil(candidate, reference, rail), 54.0, 40.0
    for row, box in zip(rows, boxes, strict=True):
        drawn, last, y = _branch(row, box, labels, start, rail, y)
        lines += drawn
    lines += [line(BUS, 40.0, BUS, last), line(rail, 40.0, rail, y + 14), *_ground(rail, y + 14)]
    return svg(rail + 16.0, y + 34.0, lines, f"Circuit of {reference} and what each position puts across it")


def _labels(parts: tuple[PartLine, ...]) -> dict[str, str]:
    """Return reference and value of each part; a range is written short."""
    return {part.reference: f"{part.reference} " + part.label.replace(" to ", "\u2013") for part in parts}


def _width_of_title(row: Row, start: float) -> float:
    return BOLD * len(row.title) + BUS + 8.0 - start


def _told(row: Row) -> str:
    return " ".join(row.contacts)


# ---------------------------------------------------------------- layout


def _layout(tree: Connection, labels: Mapping[str, str]) -> _Box:
    if isinstance(tree, Part):
        width = max(LEAST_CELL, LETTER * len(labels.get(tree.reference, tree.reference)) + 8)
        return _Box(tree, width, CELL_HEIGHT)
    inner = tuple(_layout(branch, labels) for branch in tree.branches)
    if isinstance(tree, Series):
        return _Box(tree, sum(box.width for box in inner), max(box.height for box in inner), inner)
    return _Box(tree, max(box.width for box in inner) + 16, sum(box.height for box in inner), inner)


def _draw(box: _Box, labels: Mapping[str, str], x: float, y: float, width: float) -> list[str]:
    """Return a box between x and x + width, its line on y."""
    if isinstance(box.tree, Part):
        return _capacitor(box.tree.reference, labels, x, y, width)
    if isinstance(box.tree, Series):
        lines, spare = [], (width - box.width) / len(box.inner)
        for inner in box.inner:
            lines += _draw(inner, labels, x, y, inner.width + spare)
            x += inner.width + spare
        return lines
    lines = [line(x, y, x + 8, y), line(x + width - 8, y, x + width, y)]
    heights, top = [], y - box.height / 2
    for inner in box.inner:
        heights.append(top + inner.height / 2)
        lines += _draw(inner, labels, x + 8, heights[-1], width - 16)
        top += inner.height
    ends = (x + 8, x + width - 8)
    return [*lines, *(line(end, heights[0], end, heights[-1]) for end in ends)]


# ---------------------------------------------------------------- symbols


def _branch(
    row: Row, box: _Box | None, labels: Mapping[str, str], start: float, rail: float, y: float
) -> tuple[list[str], float, float]:
    """Return one row below y, the y of its line, and that of its lower end."""
    height = box.height if box else CELL_HEIGHT
    middle = y + HEADING + height / 2
    lines = [words(BUS + 8, y + 14, row.title, "strong")]
    lines += _contact(row, start, middle) if row.contacts else [line(BUS, middle, start, middle)]
    if box is None:
        lines += [words(start + 6, middle + 4, "no capacitor: strays alone", "")]
    else:
        lines += _draw(box, labels, start, middle, rail - start)
    return lines, middle, y + HEADING + height


def _contact(row: Row, start: float, y: float) -> list[str]:
    """Return a contact that is open, with its name over it."""
    left, right = BUS + 16, start - 14
    return [
        line(BUS, y, left - 3, y),
        circle(left, y),
        line(left + 2, y - 2, right - 2, y - 9),
        circle(right, y),
        line(right + 3, y, start, y),
        words((left + right) / 2, y + 16, _told(row), "", "middle"),
    ]


def _capacitor(reference: str, labels: Mapping[str, str], x: float, y: float, width: float) -> list[str]:
    middle = x + width / 2
    lines = [
        line(x, y, middle - GAP, y),
        line(middle - GAP, y - PLATE, middle - GAP, y + PLATE, "plate"),
        line(middle + GAP, y - PLATE, middle + GAP, y + PLATE, "plate"),
        line(middle + GAP, y, x + width, y),
        words(middle, y - PLATE - 4, labels.get(reference, reference), "", "middle"),
    ]
    if not reference.startswith("C") or reference.startswith("CT"):  # set on the bench or by a knob
        lines.append(line(middle - 11, y + 10, middle + 11, y - 8))
        lines.append(f'<path class="wire" d="M{number(middle + 5)} {number(y - 8)}h6v6"/>')
    return lines


def _coil(candidate: Candidate, reference: str, rail: float) -> list[str]:
    coil = next(coil for coil in candidate.coils if coil.reference == reference)
    middle, loop, y = (BUS + rail) / 2, 13.0, 40.0
    first = middle - 2 * loop
    loops = "".join(f"a{number(loop / 2)} {number(loop / 2)} 0 0 1 {number(loop)} 0" for _ in range(4))
    turns = "" if coil.turns is None else f", {coil.turns} turns"
    return [
        line(BUS, y, first, y),
        f'<path class="wire" d="M{number(first)} {number(y)}{loops}"/>',
        line(first + 4 * loop, y, rail, y),
        words(middle, 22, f"{reference} {quantity(coil.inductance, 'H', 4)}{turns}", "strong", "middle"),
    ]


def _ground(x: float, y: float) -> list[str]:
    return [line(x - size, y + 4 * place, x + size, y + 4 * place) for place, size in enumerate((10.0, 6.0, 2.0))]
