"""Turns the rows of one CSV file into parts: one function a kind, every cell checked.

Empty cells take the defaults of `catalogue_defaults.py`, and the part's notes say so.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from fractions import Fraction
from typing import TypeVar

from partpick.catalogue_cells import (
    note_taken,
    ppm_words,
    read_one_of,
    read_positive,
    read_price,
    read_tempco,
    read_values,
    relative_tolerance,
    value_words,
)
from partpick.catalogue_defaults import (
    FORMER_LOSS_TANGENT,
    FORMER_TEMPCO,
    FORMER_TOLERANCE,
    GRADES,
    INDUCTOR_TOLERANCE,
    PRACTICE,
    TRIMMER_Q,
    UNKNOWN_GRADE,
    Grade,
    core_tolerance,
)
from partpick.catalogue_labels import labelled, only_once
from partpick.catalogue_table import Row
from partpick.parts import Capacitor, Core, Former, Inductor, TrimmerPart, Wire
from partpick.quantities import (
    format_percent,
    format_quantity,
    parse_capacitance,
    parse_count,
    parse_current,
    parse_exact_capacitance,
    parse_fraction,
    parse_frequency,
    parse_inductance,
    parse_length,
    parse_number,
    parse_tolerance,
    parse_voltage,
)

VALUE_OR_FAMILY = (("value",), ("series", "from", "to"))
WIRE_SIZES = (("name", "bare_diameter", "overall_diameter"),)
FORMER_SIZES = (("name", "diameter", "winding_length"),)
CORE_SIZES = (("name", "outer_diameter"),)
TRIMMER_ENDS = (("name", "low", "high"),)
SUPPORTS = ("tube", "ribbed", "mandrel")
SHAPES = ("ring", "pot", "rod")
MOST_LOSS_TANGENT = 0.5  # damp wood; more is a slip of the pen
_HEIGHT_OF = {"pot": "of both halves together", "rod": "its length"}

Named = TypeVar("Named", Wire, Former, Core, TrimmerPart)


# ---------------------------------------------------------------- capacitors


def capacitors(rows: Iterable[Row]) -> tuple[Capacitor, ...]:
    """Return the capacitors of a file, families written out, each with a label of its own."""
    return labelled(rows, _capacitors_of_row, _capacitor_label)


def _capacitors_of_row(row: Row) -> Iterator[Capacitor]:
    family, values = read_values(row, parse_exact_capacitance)
    grade = row.text("grade")
    default = GRADES.get(grade.casefold(), UNKNOWN_GRADE)
    tempco, tempco_tolerance = read_tempco(row)
    q, q_below = read_positive(row, "q"), row.read("q_below", parse_frequency)
    notes: list[str] = []
    named = grade if grade.casefold() in GRADES else "an unknown grade"
    if q is None:
        q, q_below = default.q, q_below if q_below is not None else default.q_below
        notes.append(note_taken("Q", "" if q is None else f"{q:g}", named, PRACTICE))
    if tempco is None:
        tempco = default.tempco
        tempco_tolerance = default.tempco_tolerance if tempco_tolerance is None else tempco_tolerance
        notes.append(note_taken("tempco", ppm_words(tempco, tempco_tolerance), named, default.tempco_source))
    part = Capacitor(
        value=0.0,
        exact=Fraction(0),
        grade=grade,
        tolerance=0.0,
        tempco=tempco,
        tempco_tolerance=tempco_tolerance,
        q=q,
        q_below=q_below,
        voltage=row.read("voltage", parse_voltage),
        rf_current=row.read("rf_current", parse_current),
        series_inductance=row.read("series_inductance", lambda text: parse_inductance(text, zero=True)),
        quantity=row.read("quantity", parse_count),
        unit_price=read_price(row, "unit_price"),
        label=row.text("label"),
        family=family,
        source=row.text("source"),
    )
    tolerance_of = _capacitor_tolerance(row, default, named)
    for exact in values:
        tolerance, note = tolerance_of(float(exact))
        own = tuple(notes) if note is None else (note, *notes)
        yield replace(part, value=float(exact), exact=exact, tolerance=tolerance, notes=own)


def _capacitor_tolerance(row: Row, default: Grade, named: str) -> Callable[[float], tuple[float, str | None]]:
    """Return what gives each value of the row its tolerance, and the note if that is a default."""
    stated = row.read("tolerance", parse_tolerance)
    if stated is not None:
        return lambda value: (relative_tolerance(row, stated, value), None)
    usual = note_taken("tolerance", format_percent(default.tolerance), named, PRACTICE)
    least = note_taken("tolerance", format_quantity(default.least_tolerance, "F"), named, PRACTICE)

    def of(value: float) -> tuple[float, str | None]:
        smallest = default.least_tolerance / value
        return (default.tolerance, usual) if smallest <= default.tolerance else (min(smallest, 1.0), least)

    return of


def _capacitor_label(part: Capacitor) -> tuple[str, ...]:
    """Return the words of a label; the last two stand only where they tell parts apart."""
    voltage = "" if part.voltage is None else format_quantity(part.voltage, "V")
    return value_words(part.value, "F"), part.grade, format_percent(part.tolerance), voltage


# ---------------------------------------------------------------- inductors


def inductors(rows: Iterable[Row]) -> tuple[Inductor, ...]:
    """Return the bought inductors of a file, families written out, each with a label of its own."""
    return labelled(rows, _inductors_of_row, _inductor_label)


def _inductors_of_row(row: Row) -> Iterator[Inductor]:
    _, values = read_values(row, lambda text: Fraction(repr(parse_inductance(text))))
    tempco, tempco_tolerance = read_tempco(row)
    q, stated = read_positive(row, "q"), row.read("tolerance", lambda text: parse_tolerance(text, "H"))
    notes: list[str] = []
    if stated is None:
        notes.append(note_taken("tolerance", format_percent(INDUCTOR_TOLERANCE), "an inductor", PRACTICE))
    if q is None:
        notes.append(note_taken("Q", "", "an inductor", PRACTICE))
    if tempco is None:
        notes.append(note_taken("tempco", "", "an inductor", PRACTICE))
    part = Inductor(
        value=0.0,
        tolerance=INDUCTOR_TOLERANCE,
        tempco=tempco,
        tempco_tolerance=tempco_tolerance,
        q=q,
        q_frequency=row.read("q_frequency", parse_frequency),
        self_capacitance=row.read("self_capacitance", lambda text: parse_capacitance(text, zero=True)),
        current=row.read("current", parse_current),
        adjust=row.read("adjust", parse_fraction),
        quantity=row.read("quantity", parse_count),
        unit_price=read_price(row, "unit_price"),
        label=row.text("label"),
        source=row.text("source"),
        notes=tuple(notes),
    )
    for exact in values:
        value = float(exact)
        tolerance = INDUCTOR_TOLERANCE if stated is None else relative_tolerance(row, stated, value)
        yield replace(part, value=value, tolerance=tolerance)


def _inductor_label(part: Inductor) -> tuple[str, ...]:
    current = "" if part.current is None else format_quantity(part.current, "A")
    return value_words(part.value, "H"), "inductor", format_percent(part.tolerance), current


# ---------------------------------------------------------------- trimmers


def trimmers(rows: Iterable[Row]) -> tuple[TrimmerPart, ...]:
    """Return the trimmers of a file."""
    return _named(rows, _trimmer)


def _trimmer(row: Row) -> TrimmerPart:
    low, high = row.need("low", parse_capacitance), row.need("high", parse_capacitance)
    if not low < high:
        raise row.wrong("high", f"read {row.cells['high']}: not above low")
    tempco, tempco_tolerance = read_tempco(row)
    q = read_positive(row, "q")
    notes: list[str] = []
    if q is None:
        notes.append(note_taken("Q", f"{TRIMMER_Q:g}", "a trimmer", PRACTICE))
    if tempco is None:
        notes.append(note_taken("tempco", "", "a trimmer", PRACTICE))
    return TrimmerPart(
        name=row.text("name"),
        low=low,
        high=high,
        tempco=tempco,
        tempco_tolerance=tempco_tolerance,
        q=q,
        voltage=row.read("voltage", parse_voltage),
        quantity=row.read("quantity", parse_count),
        unit_price=read_price(row, "unit_price"),
        label=row.text("label"),
        source=row.text("source"),
        notes=tuple(notes),
    )


# ---------------------------------------------------------------- wires, formers, cores


def wires(rows: Iterable[Row]) -> tuple[Wire, ...]:
    """Return the wires of a file."""
    return _named(rows, _wire)


def _wire(row: Row) -> Wire:
    bare, overall = row.need("bare_diameter", parse_length), row.need("overall_diameter", parse_length)
    if overall < bare:
        raise row.wrong("overall_diameter", "less than bare_diameter; bare wire has both alike")
    strands = row.read("strands", lambda text: parse_count(text, low=1)) or 1
    strand = row.read("strand_diameter", parse_length)
    if strands > 1 and strand is None:
        raise row.wrong("strand_diameter", f"empty, but needed for {strands} strands")
    if strand is not None and strands * strand**2 > bare**2 * (1 + 1e-9):
        raise row.wrong("strand_diameter", "the strands have more copper than bare_diameter has room for")
    return Wire(
        name=row.text("name"),
        bare_diameter=bare,
        overall_diameter=overall,
        strands=strands,
        strand_diameter=strand,
        price_per_m=read_price(row, "price_per_m"),
        source=row.text("source"),
    )


def formers(rows: Iterable[Row]) -> tuple[Former, ...]:
    """Return the formers and mandrels of a file."""
    return _named(rows, _former)


def _former(row: Row) -> Former:
    notes: list[str] = []
    support = read_one_of(row, "support", SUPPORTS)
    if support is None:
        support = "tube"
        notes.append("support not stated: tube taken")
    diameter = row.need("diameter", parse_length)
    tolerance, stated = FORMER_TOLERANCE, row.read("tolerance", lambda text: parse_tolerance(text, "m"))
    if stated is not None:
        tolerance = relative_tolerance(row, stated, diameter)
    else:
        notes.append(note_taken("tolerance", format_percent(tolerance), f"a {support} former", PRACTICE))
    tempco, tempco_tolerance = read_tempco(row)
    if tempco is None:
        tempco, spread = FORMER_TEMPCO[support]
        tempco_tolerance = spread if tempco_tolerance is None else tempco_tolerance
        notes.append(
            note_taken("tempco", ppm_words(tempco, tempco_tolerance), f"a {support} former", PRACTICE)
        )
    loss_tangent = row.read("loss_tangent", lambda text: parse_number(text, low=0))
    if loss_tangent is None:
        loss_tangent = FORMER_LOSS_TANGENT[support]
        # a mandrel leaves nothing behind but air: there is nothing to take for it
        if support != "mandrel":
            notes.append(note_taken("loss_tangent", f"{loss_tangent:g}", f"a {support} former", PRACTICE))
    elif loss_tangent > MOST_LOSS_TANGENT:
        usual = f"above {MOST_LOSS_TANGENT:g} is no former's; dry plastic has 0.005 to 0.02"
        raise row.wrong("loss_tangent", f"read {row.cells['loss_tangent']}: {usual}")
    return Former(
        name=row.text("name"),
        support=support,
        diameter=diameter,
        winding_length=row.need("winding_length", parse_length),
        pitch=row.read("pitch", lambda text: "twin" if text == "twin" else parse_length(text)),
        tolerance=tolerance,
        tempco=tempco,
        tempco_tolerance=tempco_tolerance,
        loss_tangent=loss_tangent,
        quantity=row.read("quantity", parse_count),
        unit_price=read_price(row, "unit_price"),
        source=row.text("source"),
        adjust=row.read("adjust", parse_fraction),
        notes=tuple(notes),
    )


def cores(rows: Iterable[Row]) -> tuple[Core, ...]:
    """Return the cores of a file."""
    return _named(rows, _core)


def _core(row: Row) -> Core:
    shape = read_one_of(row, "shape", SHAPES) or "ring"
    outer, inner, height = _core_sizes(row, shape)
    permeability = row.read("permeability", parse_number)
    if permeability is not None and permeability < 1:
        raise row.wrong("permeability", "below 1, which no core has; 1 is a plastic ring")
    al = row.read("al", parse_inductance)
    if al is None and shape == "pot":
        raise row.wrong("al", "empty, but needed for a pot")
    if al is None and permeability is None:
        raise row.wrong("permeability", "empty, and al as well; one of them is needed")
    low, high = row.read("frequency_low", parse_frequency), row.read("frequency_high", parse_frequency)
    if low is not None and high is not None and not low < high:
        raise row.wrong("frequency_high", "not above frequency_low")
    tolerance, q = row.read("tolerance", parse_fraction), read_positive(row, "q")
    tempco, tempco_tolerance = read_tempco(row)
    notes: list[str] = []
    if tolerance is None:
        tolerance = core_tolerance(permeability, al)
        notes.append(note_taken("tolerance", format_percent(tolerance), "such a core", PRACTICE))
    if q is None:
        notes.append(note_taken("Q", "", "a core", PRACTICE))
    if tempco is None:
        notes.append(note_taken("tempco", "", "a core", PRACTICE))
    return Core(
        name=row.text("name"),
        shape=shape,
        outer_diameter=outer,
        inner_diameter=inner,
        height=height,
        material=row.text("material"),
        permeability=permeability,
        al=al,
        q=q,
        frequency_low=low,
        frequency_high=high,
        tolerance=tolerance,
        tempco=tempco,
        tempco_tolerance=tempco_tolerance,
        adjust=row.read("adjust", parse_fraction),
        quantity=row.read("quantity", parse_count),
        unit_price=read_price(row, "unit_price"),
        source=row.text("source"),
        notes=tuple(notes),
    )


def _core_sizes(row: Row, shape: str) -> tuple[float, float | None, float | None]:
    outer = row.need("outer_diameter", parse_length)
    read = row.need if shape == "ring" else row.read
    inner, height = read("inner_diameter", parse_length), read("height", parse_length)
    if inner is not None and inner >= outer:
        raise row.wrong("inner_diameter", "the hole is not smaller than the core (outer_diameter)")
    if shape != "ring" and height is None:
        raise row.wrong("height", f"empty, but needed for a {shape} ({_HEIGHT_OF[shape]})")
    return outer, inner, height


def _named(rows: Iterable[Row], read: Callable[[Row], Named]) -> tuple[Named, ...]:
    parts: list[Named] = []
    first: dict[str, int] = {}
    for row in rows:
        if not row.text("name"):
            raise row.wrong("name", "empty, but needed")
        part = read(row)
        only_once(first, part.name, row, "name")
        parts.append(part)
    return tuple(parts)
