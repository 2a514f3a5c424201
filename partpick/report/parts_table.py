"""The parts in use as text: how many of what, in which range, and what was filled in for empty cells."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

from partpick.forms.unwound import unwound
from partpick.parts import Catalogue
from partpick.quantities import format_quantity
from partpick.report.text import clean, columns, cut, length, plural, wrapped

LONGEST_NAME = 34
MOST_NOTES = 10


def parts_table(catalogue: Catalogue) -> str:
    """Return counts and ranges by file and kind, in lines of at most 80 columns."""
    lines = wrapped(_origin(catalogue))
    blocks = (
        ("capacitors.csv", _capacitor_kind, catalogue.capacitors, lambda part: part.value, _farad),
        ("inductors.csv", _inductor_kind, catalogue.inductors, lambda part: part.value, _henry),
        ("wires.csv", _wire_kind, catalogue.wires, lambda part: part.bare_diameter, length),
        ("formers.csv", lambda part: part.support, catalogue.formers, lambda part: part.diameter, length),
        ("cores.csv", _core_kind, catalogue.cores, lambda part: part.outer_diameter, length),
        ("trimmers.csv", lambda part: "trimmer", catalogue.trimmers, lambda part: part.high, _farad),
    )  # fmt: skip
    for file, kind, parts, size, show in blocks:
        lines += ["", *_block(file, _origin_of(file, catalogue), kind, parts, size, show)]
    return "\n".join(lines + _notes(catalogue)) + "\n"


def _origin(catalogue: Catalogue) -> str:
    if not catalogue.drawer:
        return "The shipped parts: working figures, to be replaced by your own in a drawer."
    return f"The drawer's {', '.join(catalogue.drawer_files)}; the other files are the shipped ones."


def _origin_of(file: str, catalogue: Catalogue) -> str:
    return " (drawer)" if file in catalogue.drawer_files else ""


def _block(
    file: str,
    origin: str,
    kind: Callable[[Any], str],
    parts: Sequence[Any],
    size: Callable[[Any], float],
    show: Callable[[float], str],
) -> list[str]:
    head = f"{file}{origin}: {plural(len(parts), 'part')}"
    groups: dict[str, list[Any]] = {}
    for part in parts:
        groups.setdefault(kind(part) or "no kind stated", []).append(part)
    rows = []
    for name, members in groups.items():
        sizes = [size(part) for part in members]
        rows.append([
            cut(clean(name), LONGEST_NAME),
            str(len(members)),
            _span(min(sizes), max(sizes), show),
            _stock(members),
        ])  # fmt: skip
    return [head, *("  " + line for line in columns(rows, left=(0, 2, 3)))]


def _span(low: float, high: float, show: Callable[[float], str]) -> str:
    return show(low) if low == high else f"{show(low)} to {show(high)}"


def _stock(parts: Iterable[Any]) -> str:
    """Return how many pieces there are, where every part of a group says so."""
    counts = [getattr(part, "quantity", None) for part in parts]
    known = [count for count in counts if count is not None]
    if not known:
        return ""
    pieces = plural(sum(known), "piece")
    return pieces if len(known) == len(counts) else f"{pieces}, some without end"


def _capacitor_kind(part: Any) -> str:
    return " ".join(word for word in (part.grade or "no grade", part.family) if word)


def _inductor_kind(part: Any) -> str:
    return "adjustable" if part.adjust else "fixed"


def _wire_kind(part: Any) -> str:
    if part.strands > 1:
        return "stranded"
    return "bare" if part.bare else "covered"


def _core_kind(part: Any) -> str:
    return f"{part.shape} {part.material}".strip()


def _farad(value: float) -> str:
    return format_quantity(value, "F")


def _henry(value: float) -> str:
    return format_quantity(value, "H")


def _notes(catalogue: Catalogue) -> list[str]:
    """Return what was filled in for empty cells, and what no wire fits, each sentence once."""
    counts: dict[str, int] = {}
    parts: tuple[Any, ...] = (
        *catalogue.capacitors,
        *catalogue.inductors,
        *catalogue.formers,
        *catalogue.cores,
        *catalogue.trimmers,
    )
    for part in parts:
        for note in part.notes:
            counts[note] = counts.get(note, 0) + 1
    counts.update(dict.fromkeys(unwound(catalogue), 1))
    lines: list[str] = [""] if counts else []
    for note, count in list(counts.items())[:MOST_NOTES]:
        lines += wrapped(f"Note: {note}" + (f" ({plural(count, 'part')})" if count > 1 else ""), 0, 2)
    if len(counts) > MOST_NOTES:
        lines += wrapped(f"... and {plural(len(counts) - MOST_NOTES, 'note')} more.")
    return lines
