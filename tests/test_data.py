"""The shipped files: every row has a source, wires are those of their standards, grids are complete."""

from __future__ import annotations

import csv
import math
from itertools import pairwise
from pathlib import Path

import pytest

from partpick.catalogue import KNOWN_FILES, data_folder, load_catalogue
from partpick.parts import Former, Wire
from partpick.quantities import parse_capacitance, parse_tempco

PUBLISHED = Path(__file__).parent / "published"
PARTS = load_catalogue(None)


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("name", KNOWN_FILES)
def test_every_shipped_row_has_a_source_and_no_price(name: str) -> None:
    """Working figures must not pass for a maker's data, and we know no prices."""
    shipped = rows(data_folder() / name)
    assert shipped
    for row in shipped:
        source = row["source"]
        assert any(word in source for word in ("from memory", "invented", "formula")), row
        assert not row.get("unit_price")
        assert not row.get("price_per_m")


def test_no_shipped_row_needs_a_default() -> None:
    """A default is for what a user left out; only rods are shipped without Q and tempco."""
    rods = [core for core in PARTS.cores if core.shape == "rod"]
    others = [core for core in PARTS.cores if core.shape != "rod"]
    assert rods
    for part in (*PARTS.capacitors, *PARTS.inductors, *PARTS.formers, *others):
        assert part.notes == ()


# ---------------------------------------------------------------- wire


WIRE_TABLE = rows(PUBLISHED / "wire.csv")
WIRES = {wire.name: wire for wire in PARTS.wires}


def wire_of(name: str) -> Wire | None:
    if name.startswith("enamelled"):
        size = float(name.split(" ")[1])
        enamelled = [wire for wire in PARTS.wires if wire.name.startswith("enamelled")]
        return next((wire for wire in enamelled if float(wire.name.split(" ")[1]) == size), None)
    return WIRES.get(name)


CHECKED = [row for row in WIRE_TABLE if wire_of(row["wire"]) is not None]


@pytest.mark.parametrize("row", CHECKED, ids=lambda row: f"{row['wire']} {row['quantity']} {row['value_mm']}")
def test_wires_have_the_published_diameters(row: dict[str, str]) -> None:
    """ASTM B258 by formula and print, IEC 60317-0-1 grade 1; sources and tolerances in wire.csv."""
    wire = wire_of(row["wire"])
    assert wire is not None
    published = float(row["value_mm"]) * 1e-3
    if row["quantity"] == "least_overall_diameter":
        assert wire.overall_diameter >= published
    else:
        assert getattr(wire, row["quantity"]) == pytest.approx(published, rel=float(row["rel_tol"]))


def test_the_wire_table_covers_both_systems() -> None:
    """Guards against a renamed wire that would silently drop out of the check above."""
    names = {row["wire"] for row in CHECKED}
    assert {f"AWG {size}" for size in range(12, 37, 2) if size != 12} <= names
    assert sum(name.startswith("enamelled") for name in names) >= 8


def test_thicker_wire_has_a_thicker_and_relatively_thinner_covering() -> None:
    """Grade 1 coverings grow with the wire, more slowly than it does (IEC 60317-0-1, from memory)."""
    for start in ("enamelled", "AWG"):
        sizes = sorted((w.bare_diameter, w.overall_diameter) for w in PARTS.wires if w.name.startswith(start))
        increases = [overall - bare for bare, overall in sizes]
        ratios = [overall / bare for bare, overall in sizes]
        assert increases == sorted(increases)
        # Rounding to the micrometre and to the next larger size leaves steps of under one per cent.
        assert all(later <= earlier * 1.01 for earlier, later in pairwise(ratios))


def test_stranded_wire_has_room_for_its_strands() -> None:
    """Round strands fill at most the hexagonal packing, 0.9069 of the bundle."""
    stranded = [wire for wire in PARTS.wires if wire.strands > 1]
    assert len(stranded) == 6
    for wire in stranded:
        assert wire.strand_diameter is not None
        filled = wire.strands * (wire.strand_diameter / wire.bare_diameter) ** 2
        assert 0.4 < filled < 0.9069
        assert not wire.bare


# ---------------------------------------------------------------- capacitors and inductors


@pytest.mark.parametrize(
    ("grade", "low", "high", "per_decade", "tempco"),
    [
        ("C0G", 1e-12, 10e-9, 24, 0),
        ("C0G high voltage", 10e-12, 1e-9, 12, 0),
        ("N150", 4.7e-12, 330e-12, 12, -150),
        ("N330", 4.7e-12, 330e-12, 12, -330),
        ("N750", 2.2e-12, 330e-12, 12, -750),
        ("P100", 2.2e-12, 47e-12, 12, 100),
        ("mica", 10e-12, 10e-9, 12, 35),
        ("polystyrene", 47e-12, 22e-9, 12, -120),
        ("polypropylene", 100e-12, 100e-9, 12, -200),
    ],
)
def test_each_grade_covers_its_range(
    grade: str, low: float, high: float, per_decade: int, tempco: float
) -> None:
    """Ranges of common practice; within them no step may be wider than that of the series."""
    parts = [part for part in PARTS.capacitors if part.grade == grade]
    values = sorted({part.value for part in parts})
    assert (values[0], values[-1]) == (low, high)
    widest = {12: 15 / 12, 24: 15 / 13}  # IEC 60063; the small values of C0G are E12
    for first, second in pairwise(values):
        assert second / first <= widest[per_decade if first >= 10e-12 else 12] * (1 + 1e-9)
    assert [part.tempco for part in parts] == pytest.approx([tempco * 1e-6] * len(parts))
    assert all(part.q is not None and part.voltage and part.rf_current for part in parts)


def test_mica_comes_in_two_tolerances_with_labels_apart() -> None:
    """1 % and 5 % of one value are two parts on the shelf."""
    labels = {part.label for part in PARTS.capacitors if part.grade == "mica" and part.value == 100e-12}
    assert labels == {"100 pF mica 1 %", "100 pF mica 5 %"}


def test_labels_and_names_are_unique() -> None:
    """A label is unique in its file."""
    for parts in (PARTS.capacitors, PARTS.inductors):
        assert len({part.label for part in parts}) == len(parts)


def test_an_inductor_stays_below_its_own_resonance_where_its_q_is_stated() -> None:
    """A Q at a frequency above self-resonance would make no sense."""
    for part in PARTS.inductors:
        assert part.self_capacitance is not None
        assert part.q_frequency is not None
        resonance = 1 / (2 * math.pi * math.sqrt(part.value * part.self_capacitance))
        assert resonance > 1.2 * part.q_frequency, part.label


# ---------------------------------------------------------------- formers and cores


def pitch_of(former: Former, wire: Wire) -> float | None:
    """The contract's rules on which wire goes on which former, written once more."""
    if former.support == "mandrel":
        stands = wire.bare and wire.bare_diameter >= max(0.8e-3, former.diameter / 12) * (1 - 1e-9)
        factor = 2.0 if former.pitch == "twin" else 1.3
        return factor * wire.overall_diameter if stands else None
    if former.pitch is None:
        return None if wire.bare else wire.overall_diameter
    if former.pitch == "twin":
        return 2 * wire.overall_diameter
    assert isinstance(former.pitch, float)
    return former.pitch if wire.overall_diameter <= former.pitch * (1 + 1e-9) else None


def windings(former: Former) -> int:
    """Every whole number of turns from 2 up that fits, over all wires."""
    pitches = [pitch_of(former, wire) for wire in PARTS.wires]
    return sum(max(0, int(former.winding_length / p * (1 + 1e-9)) - 1) for p in pitches if p is not None)


def test_the_formers_take_twenty_to_forty_five_thousand_windings() -> None:
    """Enough to choose from, few enough to evaluate all of them in a moment."""
    assert 20_000 <= sum(windings(former) for former in PARTS.formers) <= 45_000


def test_every_former_takes_a_winding() -> None:
    """A mandrel thicker than twelve times the stiffest wire would be a dead row."""
    for former in PARTS.formers:
        assert windings(former) >= 5, former.name


def test_every_wire_goes_on_some_former() -> None:
    """A wire that fits nowhere would be a dead row."""
    for wire in PARTS.wires:
        assert any(pitch_of(former, wire) for former in PARTS.formers), wire.name


def test_each_support_comes_in_its_diameters() -> None:
    """The grid of common sizes, in millimetres (invented round numbers)."""
    expected = {
        "mandrel": {3, 4, 5, 6, 8, 10, 12, 16, 20},
        "slug former": {4, 5, 6, 8},
        "plastic tube": {10, 12, 16, 20, 25, 32, 40, 50, 75, 110},
        "ceramic tube": {8, 12, 20, 30, 40},
        "ribbed former": {20, 25, 32, 40, 50},
        "open frame": {200, 300, 500},
    }
    for words, diameters in expected.items():
        found = {round(f.diameter * 1e3) for f in PARTS.formers if f.name.startswith(words)}
        assert found == diameters


def test_rings_come_in_every_size_and_material() -> None:
    """Eight sizes and seven materials, each at least once; not every pairing, which would only be slow."""
    rings = [core for core in PARTS.cores if core.shape == "ring"]
    assert len({core.outer_diameter for core in rings}) == 8
    materials = {core.material for core in rings}
    assert materials == {"plastic", *(f"powder {x}" for x in "ABC"), *(f"ferrite {x}" for x in "DEF")}
    for core in rings:
        assert core.q is not None
        assert core.frequency_low is not None
        assert core.frequency_high is not None


def test_pot_cores_and_rods_are_complete() -> None:
    """Four sizes with four gaps, four rods in two materials."""
    pots = {(c.outer_diameter, c.al) for c in PARTS.cores if c.shape == "pot"}
    rods = {(c.outer_diameter, c.height, c.permeability) for c in PARTS.cores if c.shape == "rod"}
    assert (len(pots), len(rods)) == (16, 8)


# ---------------------------------------------------------------- shipped for later


@pytest.mark.parametrize("name", ["trimmers.csv", "variable_capacitors.csv"])
def test_adjustable_capacitors_have_two_readable_ends(name: str) -> None:
    """The lower end below the upper, a spread beside every coefficient."""
    shipped = rows(data_folder() / name)
    assert len({row["name"] for row in shipped}) == len(shipped)
    for row in shipped:
        assert 0 < parse_capacitance(row["low"]) < parse_capacitance(row["high"])
        if row.get("tempco_ppm_per_k"):
            assert parse_tempco(row["tempco_tolerance"], signed=False) > 0


def test_varactors_state_their_law() -> None:
    """C = zero_bias / (1 + V/potential)^grading needs all three."""
    for row in rows(data_folder() / "varactors.csv"):
        assert parse_capacitance(row["zero_bias"]) > 0
        assert 0.3 <= float(row["grading"]) <= 2
        assert row["potential"] == "0.7 V"
