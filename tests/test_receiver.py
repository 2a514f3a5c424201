"""Receivers from plan to result: published three-point examples, the error curve, what rounding costs, bad plans."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from workbench import read_json, run, write_drawer

from partpick.physics.tracking import PaddedCircuit, padded_frequency, plain_circuit, section_capacitance
from partpick.receiver import least_error

PUBLISHED = Path(__file__).parent / "published" / "tracking.csv"
PLAN = """
[limits]
margin = "none"
[coil]
forms = ["bought"]
self_resonance = "none"
[stray]
capacitance = "0 pF"
[tuning]
kind = "variable capacitor"
low = "{low} pF"
high = "{high} pF"
sections = 2
[receiver]
intermediate = "{intermediate} kHz"
[[band]]
name = "medium wave"
from = "{start} kHz"
to = "{stop} kHz"
"""
SIZES = {"low": 11.9, "high": 366, "intermediate": 455, "start": 540, "stop": 1600}


def rows() -> list[dict[str, str]]:
    with PUBLISHED.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def as_wired(row: dict[str, str]) -> tuple[float, float, float]:
    """Return coil [uH], padder and capacitance across the coil [pF] of a circuit that acts the same.

    Published circuits have the trimmer across the gang section, behind the padder. A larger padder, a smaller
    coil and the rest across the coil do exactly the same: L C is a - b/(section + padder + trimmer) in both.
    """
    coil, padder, trimmer, across = (float(row[k]) for k in ("padded_uH", "padder_pF", "trimmer_pF", "across_pF"))
    whole = padder + trimmer
    a, b = coil * (across + padder), coil * padder**2
    return b / whole**2, whole, a / (b / whole**2) - whole


def drawer(folder: Path, row: dict[str, str], off: float = 1.0) -> Path:
    """Write a drawer that holds the published parts and decoys."""
    coil, padder, across = as_wired(row)
    common = {"tolerance": "5 %", "tempco_ppm_per_k": 0, "q": 100}
    coils = [{"value": f"{v:.9g} \u00b5H", "label": f"coil {k}", "self_capacitance": "0 pF", **common}
             for k, v in enumerate((float(row["plain_uH"]), coil * off, coil * 1.3))]  # fmt: skip
    capacitors = [{"value": f"{v:.9g} pF", "grade": "C0G", **common}
                  for v in (float(row["fixed_pF"]), padder, across, 68.0)]  # fmt: skip
    return write_drawer(folder, capacitors=capacitors, inductors=coils, formers=(), wires=())


def plan(folder: Path, **changes: object) -> Path:
    path = folder / "plan.toml"
    path.write_text(PLAN.format(**{**SIZES, **changes}), encoding="utf-8")
    return path


def solved(folder: Path, row: dict[str, str], *options: object, off: float = 1.0) -> Any:
    path = plan(folder, intermediate=row["intermediate_kHz"], start=row["rf_low_kHz"], stop=row["rf_high_kHz"])
    done = run("bands", path, "--drawer", drawer(folder / "drawer", row, off), "--json", "-", *options)
    assert done.code == 0, done.err + done.out
    return done.json


@pytest.mark.parametrize("row", rows(), ids=lambda r: r["case"])
def test_published_three_point_receivers(row: dict[str, str], tmp_path: Path) -> None:
    """From a drawer that holds their parts the published sets are picked, with the published error curve."""
    curve_file = tmp_path / "curve.json"
    first = solved(tmp_path, row, "--tracking", curve_file, "--by", "error")["candidates"][0]
    values = sorted(part["value_f"] * 1e12 for part in first["parts"] if part["kind"] == "capacitor")
    _, padder, across = as_wired(row)
    assert values == pytest.approx(sorted((float(row["fixed_pF"]), padder, across)), rel=1e-6)
    assert first["worst_tracking_hz"] / 1e3 == pytest.approx(float(row["worst_kHz"]), abs=1e-3)
    points = read_json(curve_file.read_text())["bands"][0]["points"]
    signal, error = (np.array([p[key] for p in points]) / 1e3 for key in ("signal_hz", "error_hz"))
    inner = {name: row[f"{name}_kHz"] for name in ("inner1", "inner2")}
    places = {"low": row["rf_low_kHz"], "high": row["rf_high_kHz"], **inner}
    for name, place in places.items():
        assert np.interp(float(place), signal, error) == pytest.approx(float(row[f"error_{name}_kHz"]), abs=4e-3), name
    for number in (1, 2, 3):  # where the published set tracks exactly
        assert abs(np.interp(float(row[f"point{number}_kHz"]), signal, error)) < 4e-3


def test_what_rounding_costs(tmp_path: Path) -> None:
    """The least of unrounded parts is below the three-point set's error; the parts told for it do reach it."""
    row = rows()[0]
    told = solved(tmp_path, row)["candidates"][0]["tracking"][0]
    assert told["worst_error_hz"] > told["unrounded_error_hz"] > 0.5 * told["worst_error_hz"]
    assert told["rounding_cost_hz"] == pytest.approx(told["worst_error_hz"] - told["unrounded_error_hz"])
    free = told["unrounded_oscillator"]
    circuit = PaddedCircuit(*(np.asarray(free[k]) for k in ("inductance_h", "series_padder_f")), np.zeros(()),
                            np.asarray(free["across_f"]))  # fmt: skip
    grid = np.linspace(540e3, 1600e3, 1001)
    plain = plain_circuit(540e3, 1600e3, 12e-12, 365e-12)
    error = padded_frequency(circuit, section_capacitance(plain, grid)) - grid - 455e3
    assert np.abs(error).max() == pytest.approx(told["unrounded_error_hz"], rel=1e-3)
    assert least_error(540e3, 1600e3, 455e3) == pytest.approx(told["unrounded_error_hz"], rel=1e-3)


def test_curve_dial_and_bands_tell_the_same(tmp_path: Path) -> None:
    """At one setting of the gang the dial charts of both circuits are an intermediate frequency and the error apart."""
    curve_file, dial_file = tmp_path / "curve.csv", tmp_path / "dial.json"
    result = solved(tmp_path, rows()[0], "--tracking", curve_file, "--dial", dial_file)
    first = result["candidates"][0]
    table = list(csv.DictReader(io.StringIO(curve_file.read_text())))
    assert len(table) == 121
    assert max(abs(float(r["error_hz"])) for r in table) == pytest.approx(first["worst_tracking_hz"], rel=1e-6)
    signal, oscillator = json.loads(dial_file.read_text())["bands"]
    for dial, column in ((signal, "signal_hz"), (oscillator, "tuned_hz")):
        at = np.array([[p["element_f"], p["frequency_hz"]] for p in dial["points"]])
        for r in table[::20]:
            frequency = np.interp(-float(r["section_f"]), -at[:, 0], at[:, 1])
            assert frequency == pytest.approx(float(r[column]), rel=0.02)  # the chart has 21 lines
    assert [band["name"] for band in first["bands"]] == ["medium wave", "medium wave oscillator"]
    assert first["bands"][1]["follows"] == "medium wave" and first["inductor_count"] == 2
    assert first["piece_count"] == first["part_count"] + 2
    assert result["request"]["receiver"]["intermediate"] == 455e3


def test_table_bill_and_reasons(tmp_path: Path) -> None:
    """What stands at the bench: how far off, where, and what the next piece would bring."""
    stock = drawer(tmp_path / "drawer", rows()[0])
    done = run("bands", plan(tmp_path), "--drawer", stock, "--why", "1", "--bom", tmp_path / "bom.csv")
    assert done.code == 0
    assert "Tracking, the oscillator 455 kHz above the signal:" in done.out and "rounding costs" in done.out
    assert max(map(len, done.out.splitlines())) <= 80
    bill = (tmp_path / "bom.csv").read_text()
    assert "variable capacitor of 2 equal sections" in bill and "medium wave oscillator" in bill


def test_nothing_tracks(tmp_path: Path) -> None:
    """An oscillator coil far off: the least error that the drawer reaches is told."""
    path = plan(tmp_path)
    path.write_text(path.read_text().replace("[[band]]", 'tracking = "100 Hz"\n[[band]]'), encoding="utf-8")
    done = run("bands", path, "--drawer", drawer(tmp_path / "drawer", rows()[0], off=1.05), "--json", "-")
    assert done.code == 1
    result = done.json
    assert result["proof"]["status"] == "infeasible"
    assert result["ruled_out_by"]["limit"] == "tracking"
    assert result["ruled_out_by"]["needed"] == pytest.approx(result["nearest_miss"]["worst_tracking_hz"])


def test_oscillator_that_no_section_sweeps(tmp_path: Path) -> None:
    """Below the signal the oscillator has the larger ratio, which the gang may not reach: said with the figures."""
    path = plan(tmp_path, intermediate=400)
    path.write_text(path.read_text().replace("[[band]]", 'side = "below"\n[[band]]'), encoding="utf-8")
    done = run("bands", path, "--drawer", drawer(tmp_path / "drawer", rows()[0]), "--json", "-")
    assert done.code == 1
    assert done.json["ruled_out_by"]["limit"] == "tuning"
    assert "band medium wave oscillator needs" in done.json["ruled_out_by"]["text"]


BAD = {
    "inside the band": ({"intermediate": 600}, "", "inside band medium wave"),
    "below zero": ({"intermediate": 700}, 'side = "below"', "oscillator of band medium wave at -160 kHz"),
    "oscillator close by": ({"intermediate": 20}, "", "one above 32 kHz is wanted"),
    "a limit that is none": ({}, 'tracking = "300 kHz"', "receiver.tracking"),
}


@pytest.mark.parametrize("case", BAD)
def test_intermediate_frequencies_that_make_no_receiver(case: str, tmp_path: Path) -> None:
    """One line that says what was read and what would do."""
    changes, line, words = BAD[case]
    path = plan(tmp_path, **changes)
    path.write_text(path.read_text().replace("[[band]]", f"{line}\n[[band]]"), encoding="utf-8")
    refused(path, words)


REPLACED = {
    "one section": ("sections = 2", "sections = 1", "an equal one for the oscillator; 2 is wanted"),
    "sections that differ": ("sections = 2", 'sections = ["12 pF..365 pF", "10 pF..180 pF"]', "sections that differ"),
    "a core": ('kind = "variable capacitor"\nlow = "11.9 pF"\nhigh = "366 pF"',
               'kind = "sliding core"\ndiameter = "5 mm"\nlength = "20 mm"\npermeability = 100\ntravel = "20 mm"',
               "receiver"),
    "one frequency": ('from = "540 kHz"\nto = "1600 kHz"', 'at = "700 kHz"', "from and to are wanted"),
    "stacked": ("[limits]", 'switching = "stacked"\n[limits]', "separate"),
    "taps": ("[coil]", "[coil]\ntaps = true", "coil.taps"),
    "one coil": ("[limits]", "[limits]\ninductors = 1", "2 in all"),
    "no gang": (PLAN[PLAN.index("[tuning]") : PLAN.index("[receiver]")].format(**SIZES), "", "needs tuning"),
}  # fmt: skip


@pytest.mark.parametrize("case", REPLACED)
def test_plans_that_make_no_receiver(case: str, tmp_path: Path) -> None:
    """A gang, a layout or a band that no receiver has."""
    before, after, words = REPLACED[case]
    path = plan(tmp_path)
    assert before in path.read_text()
    path.write_text(path.read_text().replace(before, after), encoding="utf-8")
    refused(path, words)


def refused(path: Path, words: str) -> None:
    done = run("bands", path)
    assert done.code == 2 and done.out == ""
    assert words in done.err and len(done.err.splitlines()) == 1


def test_curves_need_a_receiver_and_a_known_ending(tmp_path: Path) -> None:
    """Said before anything is solved."""
    path = plan(tmp_path)
    assert "ends in .csv or .json" in run("bands", path, "--tracking", tmp_path / "curve.txt").err
    path.write_text(path.read_text().replace('[receiver]\nintermediate = "455 kHz"\n', ""), encoding="utf-8")
    assert "a plan with [receiver] is wanted" in run("bands", path, "--tracking", tmp_path / "curve.csv").err
    assert "build or error would do" in run("bands", plan(tmp_path), "--by", "price").err
