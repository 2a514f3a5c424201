"""Oscillators from the plan and the command line: what is told, and what is refused."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pytest
from workbench import FORMERS, plan, run, write_drawer

import partpick
from partpick.physics.oscillator import hartley, threshold
from partpick.physics.solenoid import solenoid_family
from partpick.planfile import request_from_tables

VALUES = (33, 47, 68, 100, 150, 220, 330, 470, 680, 1000)
CAPACITORS = [{"value": f"{v} pF", "grade": "C0G", "tolerance": "5 %", "q": 1000} for v in VALUES]
GIVEN = ("--transconductance", "5mS", "--input-capacitance", "5pF", "--output-capacitance", "2pF", "--error", "2%")
DEVICE = '[oscillator]\ncircuit = "colpitts"\ntransconductance = "5 mS"\n'


@pytest.fixture
def drawer(tmp_path: Path) -> Path:
    former = {**FORMERS[0], "winding_length": "40 mm"}
    return write_drawer(tmp_path / "drawer", capacitors=CAPACITORS, inductors=(), formers=[former])


@pytest.mark.parametrize("circuit", ["colpitts", "clapp", "hartley"])
def test_it_is_told_what_the_device_must_give(circuit: str, drawer: Path) -> None:
    """Roles, margin and the resonance of the contract's sum, with the device in circuit."""
    done = run("pair", "7.1MHz", "--drawer", drawer, "--oscillator", circuit, "--parts", 3, *GIVEN, "--json", "-")
    assert done.code == 0, done.err
    for candidate in done.json["candidates"]:
        band = candidate["bands"][0]
        keys = band["oscillator"]
        assert keys["margin"] == pytest.approx(5e-3 / keys["needed_s"]) and keys["margin"] >= 3
        total = sum(band[name] for name in ("network_f", "stray_f", "self_capacitance_f"))
        assert band["capacitance_f"] == pytest.approx(total, rel=1e-9)
        if circuit == "hartley":
            assert 1 <= keys["common_turns"] < candidate["coils"][0]["turns"]
        else:
            assert {keys["output_capacitor"], keys["control_capacitor"]} < {*band["capacitors"], "C0"}
            values = {p["reference"]: p["value_f"] for p in candidate["parts"] if p["kind"] == "capacitor"}
            halves = values[keys["output_capacitor"]] + 2e-12, values[keys["control_capacitor"]] + 5e-12
            inner = 1 / sum(1 / half for half in halves)
            if circuit == "clapp":
                inner = 1 / (1 / inner + 1 / values[keys["series_capacitor"]])
            own = {keys["output_capacitor"], keys["control_capacitor"], keys["series_capacitor"]}
            beside = sum(values[name] for name in band["capacitors"] if name not in own)
            assert band["network_f"] == pytest.approx(inner + beside, rel=1e-9)


def test_the_limiting_end_is_named(drawer: Path) -> None:
    """A Colpitts circuit needs most where its frequency is lowest: r over w^2 falls with frequency."""
    tuning = ("--tuning", "variable capacitor:12pF..150pF")
    done = run("pair", "7MHz..7.3MHz", "--drawer", drawer, "--oscillator", "colpitts", *tuning, *GIVEN, "--json", "-")
    assert done.code == 0, done.err
    keys = done.json["candidates"][0]["bands"][0]["oscillator"]
    needed = [setting["needed_s"] for setting in keys["settings"]]
    assert keys["limited_at"] == "low end" and keys["needed_s"] == needed[0] == max(needed)


def test_the_bill_tells_the_halves_apart(drawer: Path, tmp_path: Path) -> None:
    """Two capacitors in the wrong places make another oscillator."""
    bill, sheet, deck = (tmp_path / name for name in ("bill.csv", "sheet.html", "deck.cir"))
    outputs = ("--bom", bill, "--sheet", sheet, "--netlist", deck)
    done = run("pair", "7.1MHz", "--drawer", drawer, "--oscillator", "colpitts", *GIVEN, *outputs)
    assert done.code == 0, done.err
    rows = list(csv.DictReader(io.StringIO(bill.read_text(encoding="utf-8"))))
    told = [row["description"] for row in rows if row["rank"] == "1" and row["kind"] == "capacitor"]
    assert any("output to common" in text for text in told) and any("control to common" in text for text in told)
    assert "Start of the oscillator" in sheet.read_text(encoding="utf-8")
    assert "Cdevice" in deck.read_text(encoding="utf-8")
    assert "output to common" in done.out


def test_nothing_starts_and_what_would(drawer: Path) -> None:
    """The transconductance is named with a figure that lets a plan through."""
    weak = ("--transconductance", "50uS")
    done = run("pair", "7.1MHz", "--drawer", drawer, "--oscillator", "colpitts", *weak, "--error", "2%", "--json", "-")
    assert done.code == 1
    ruled = done.json["ruled_out_by"]
    assert ruled["limit"] == "transconductance"
    again = ("--transconductance", f"{1.001 * ruled['needed']:.9g}")
    done = run("pair", "7.1MHz", "--drawer", drawer, "--oscillator", "colpitts", *again, "--error", "2%")
    assert done.code == 0, done.err


@pytest.mark.parametrize(
    ("head", "named", "instead"),
    [
        (f'switching = "stacked"\n{DEVICE}', "stacked", "separate"),
        (f"{DEVICE}[coil]\ntaps = true\n", "coil.taps", "false"),
        (f'{DEVICE}[capacitors]\nconnect = "any"\n', "connect", "parallel"),
        (f'{DEVICE}[stray]\ninductance = "5 nH"\n', "stray.inductance", "0 nH"),
        (f'{DEVICE}[coil]\nmeasured = "4 µH"\n', "measured", "Q"),
        (f"{DEVICE}[limits]\nparts_per_band = 1\n", "parts_per_band 1", "at least 2"),
        (DEVICE.replace("colpitts", "clapp"), "parts_per_band 2", "at least 3"),
        (DEVICE.replace("5 mS", "0 S"), "transconductance", ""),
    ],
)
def test_what_is_not_planned_is_refused_in_one_line(head: str, named: str, instead: str, tmp_path: Path) -> None:
    """Exit 2, the key and what would do."""
    done = run("bands", plan(tmp_path / "plan.toml", [("one", "7.1 MHz")], head))
    assert done.code == 2
    assert named in done.err and instead in done.err and done.err.count("\n") == 1


def test_the_tap_of_a_hartley_coil_divides_it_as_its_turns_do() -> None:
    """Sections by the sum over coaxial rings; limits on inductance must not hide the shorter windings."""
    tables = {
        "band": [{"at": "7.1 MHz"}],
        "coil": {"forms": ["solenoid"], "inductance": ["1 \u00b5H", "4 \u00b5H"]},
        "oscillator": {"circuit": "hartley", "transconductance": "5 mS"},
    }
    catalogue = partpick.load_catalogue()
    candidate = partpick.solve(request_from_tables(tables, "pair"), catalogue, top=1).candidates[0]
    coil, keys = candidate.coils[0], candidate.bands[0].extra["oscillator"]
    assert isinstance(keys, dict) and coil.turns and coil.mean_diameter and coil.pitch
    wire = next(w for w in catalogue.wires if w.name == coil.wire)
    family = solenoid_family(coil.turns, coil.mean_diameter, wire.bare_diameter, coil.pitch)
    (setting,) = keys["settings"]
    turns, scale = keys["common_turns"], setting["inductance_h"] / family[-1]
    one, two = family[turns - 1] * scale, family[coil.turns - turns - 1] * scale
    mutual = (setting["inductance_h"] - one - two) / 2
    shares = turns / coil.turns, 1 - turns / coil.turns
    losses = [share * setting["resistance_ohm"] for share in shares]
    found = threshold(hartley(one, two, mutual, *losses, setting["capacitance_f"]))
    assert keys["needed_s"] == pytest.approx(float(found.transconductance), rel=1e-6)
