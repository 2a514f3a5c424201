"""Circuit of a tank and its switch as an inline SVG: lines, plates, loops of wire, contacts, values."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from partpick.connection import Connection, Parallel, Part, Series, parse_connection
from partpick.quantities import format_quantity
from partpick.report.text import cut, quantity
from partpick.report.vector import circle, line, number, svg, words
from partpick.result import BandFigures, Candidate, PartLine

LETTER = 7.0  # width of a letter at 12 units, generous
BOLD = 7.8
CELL_HEIGHT = 46.0
LEAST_CELL = 64.0
PLATE, GAP = 9.0, 3.0  # half height of a plate, half distance between two
BUS = 16.0  # x of the line from the hot end of the coil
CONTACT = 62.0  # width of a switch contact with its leads
HEADING = 26.0  # room for the name of a band
LONGEST_NAME = 34


@dataclass(frozen=True)
class _Box:
    """A connection laid out: what stands in it and the room that it takes."""

    tree: Connection
    width: float
    height: float
    inner: tuple[_Box, ...] = ()


def circuit(candidate: Candidate, reference: str) -> str:
    """Return the drawing of one coil with what lies across it, as SVG that scales with the page.

    A row is a band with its own capacitors; where bands share capacitors, it is what one contact brings in.
    """
    bands = [band for band in candidate.bands if band.coil == reference]
    labels = _labels(candidate.parts)
    if any(len(part.bands) > 1 for part in candidate.parts if part.kind == "capacitor"):
        rows = _joint_rows(candidate, bands)
    else:
        rows = [_Row(_name(band), " ".join(band.contacts), _tree(band, candidate)) for band in bands]
    boxes = [_layout(row.tree, labels) if row.tree else None for row in rows]
    start = BUS + (CONTACT if any(row.contact for row in rows) else 18.0)
    longest = max([LEAST_CELL * 2, *(box.width for box in boxes if box), *(BOLD * len(r.name) - CONTACT for r in rows)])
    rail = start + longest + 18.0
    lines, y, last = _coil(candidate, reference, rail), 54.0, 40.0
    for row, box in zip(rows, boxes, strict=True):
        drawn, last, y = _branch(row, box, labels, start, rail, y)
        lines += drawn
    lines += [line(BUS, 40.0, BUS, last), line(rail, 40.0, rail, y + 14), *_ground(rail, y + 14)]
    return svg(rail + 16.0, y + 34.0, lines, f"Circuit of {reference} and what each position puts across it")


@dataclass(frozen=True)
class _Row:
    """One branch across a coil: its name, the contact in it, and what stands in it."""

    name: str
    contact: str
    tree: Connection | None


def _joint_rows(candidate: Candidate, bands: Sequence[BandFigures]) -> list[_Row]:
    """Return each capacitor of a coil once: those always in circuit first, then by the bands that they serve."""
    serves: dict[tuple[str, Connection], list[str]] = {}
    for band in bands:
        for branch in _branches(band, candidate):
            serves.setdefault((_pole(branch), branch), []).append(band.name)
    by_contact: dict[tuple[str, tuple[str, ...], str], list[Connection]] = {}
    for (pole, branch), names in serves.items():
        contact = _contact_of(candidate, pole, branch, names)
        by_contact.setdefault((contact, tuple(names), pole), []).append(branch)
    rows = []
    tapped = {band.name: band.tap_turns for band in bands if band.tap_turns is not None}
    for (contact, served, _), branches in sorted(by_contact.items(), key=lambda item: (-len(item[0][1]), item[0][0])):
        tree = branches[0] if len(branches) == 1 else Parallel(tuple(branches))
        told = ", ".join(f"{name} from tap {tapped[name]}" if name in tapped else name for name in served)
        every = len(served) == len(bands) and not tapped
        rows.append(_Row("every band" if every else cut(told, 2 * LONGEST_NAME), contact, tree))
    return [*rows, *(_Row(_name(band), "", None) for band in bands if not _branches(band, candidate))]


def _branches(band: BandFigures, candidate: Candidate) -> tuple[Connection, ...]:
    """Return what lies side by side across the coil at a band."""
    tree = _tree(band, candidate)
    return tree.branches if isinstance(tree, Parallel) else (tree,) if tree else ()


def _pole(branch: Connection) -> str:
    """Return the pole of the switch that a branch belongs to."""
    if isinstance(branch, Series) or (isinstance(branch, Part) and branch.reference == "T"):
        return "tuning element"
    return "trimmers" if isinstance(branch, Part) and branch.reference.startswith("CT") else "capacitors"


def _contact_of(candidate: Candidate, pole: str, branch: Connection, names: Sequence[str]) -> str:
    """Return the contacts that bring a branch in, "" where it is wired."""
    switch = candidate.extra.get("switch")
    closes = switch.get("closes", ()) if isinstance(switch, dict) else ()
    own = [c for c in closes if isinstance(c, dict) and c.get("pole") == pole]
    if pole == "tuning element":  # one contact a band, all to the same branch
        return " ".join(str(c["contact"]) for c in own if set(c["bands"]) <= set(names))
    fitting = [str(c["contact"]) for c in own if list(c["bands"]) == list(names)]
    if len(fitting) > 1 and isinstance(branch, Part):  # each capacitor of a set has the contact of its number
        fitting = [c for c in fitting if c[1:] == branch.reference[1:]] or fitting
    return fitting[0] if fitting else ""


def _tree(band: BandFigures, candidate: Candidate) -> Connection | None:
    """Return all that the band puts across the coil: its capacitors and its trimmer."""
    tree = parse_connection(band.connection)
    trimmers = [p for p in candidate.parts if p.kind == "trimmer" and band.name in p.bands]
    if not trimmers or band.trimmer is None:
        return tree
    own = tree.branches if isinstance(tree, Parallel) else (tree,) if tree else ()
    branches = (*own, Part(trimmers[0].reference))
    return branches[0] if len(branches) == 1 else Parallel(branches)


def _labels(parts: tuple[PartLine, ...]) -> dict[str, str]:
    """Return reference and value of each part; a range is written short."""
    return {part.reference: f"{part.reference} " + part.label.replace(" to ", "\u2013") for part in parts}


def _name(band: BandFigures) -> str:
    tap = "" if band.tap_turns is None else f", from tap at turn {band.tap_turns}"
    target = "" if band.target is None else f" {format_quantity(band.target, 'Hz', 6)}"
    name = "" if target.strip() == band.name else cut(band.name, LONGEST_NAME)
    return f"{name}{target}{tap}".strip()


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
    row: _Row, box: _Box | None, labels: Mapping[str, str], start: float, rail: float, y: float
) -> tuple[list[str], float, float]:
    """Return one row below y, the y of its line, and that of its lower end."""
    height = box.height if box else CELL_HEIGHT
    middle = y + HEADING + height / 2
    lines = [words(BUS + 8, y + 14, row.name, "strong")]
    lines += _contact(row.contact, start, middle) if row.contact else [line(BUS, middle, start, middle)]
    if box is None:
        lines += [words(start + 6, middle + 4, "no capacitor: strays alone", "")]
    else:
        lines += _draw(box, labels, start, middle, rail - start)
    return lines, middle, y + HEADING + height


def _contact(name: str, start: float, y: float) -> list[str]:
    """Return a contact that is open, with its name over it."""
    left, right = BUS + 16, start - 14
    return [
        line(BUS, y, left - 3, y),
        circle(left, y),
        line(left + 2, y - 2, right - 2, y - 9),
        circle(right, y),
        line(right + 3, y, start, y),
        words((left + right) / 2, y + 16, name, "", "middle"),
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
