"""Stress under a drive, held against energy, ngspice and hand computation; cautions that cannot be silenced."""

from __future__ import annotations

import csv
import json
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import handmade
import pytest
from test_report_netlist import needs_ngspice, simulate

import partpick
from partpick.catalogue_defaults import is_class_2
from partpick.ratings import DriveTable
from partpick.report.netlist import netlist
from partpick.report.result_json import result_json
from partpick.report.sheet import sheet
from partpick.report.table import result_table
from partpick.result import BandFigures, Candidate, PartLine, Result
from partpick.stress import DEVICE_PEAK, band_stress, with_stress
from partpick.stressed import PartStress

PUBLISHED = Path(__file__).parent / "published" / "loading_stress.csv"
QUIET = {"power": None, "voltage": None, "current": None, "supply": None, "class": "C", "modulation": 0.0, "bias": 0.0}
CAUTIONS = ("qualified", "touch", "discharge", "licence", "Class 2", "Heat", "flash-over", "medical", "exposure")


def driven(candidate: Candidate | None = None, **drive: Any) -> Candidate:
    """Return a candidate under a drive; by default one band of Q 187 and 180.7 ohm."""
    extra = (("drive", tuple({**QUIET, **drive}.items())),)
    return with_stress(handmade.request(extra=extra), candidate or rated())


def rated(**changes: Any) -> Candidate:
    """Return the candidate made by hand with losses and ratings known."""
    own = handmade.candidate()
    ratings: dict[str, Any] = {"q": 1000.0, "voltage": 500.0, "rf_current": 1.0, **changes}
    parts = tuple(replace(part, **ratings) if part.kind == "capacitor" else part for part in own.parts)
    return replace(own, bands=tuple(replace(band, coil_q=230.0) for band in own.bands), parts=parts)


def borne(band: BandFigures, *parts: PartLine, **drive: float) -> tuple[PartStress, ...]:
    """Return what the parts of a band bear."""
    found = band_stress(DriveTable(**drive), band, replace(handmade.candidate(), parts=parts))
    assert found is not None
    return found


def stress_of(candidate: Candidate, band: int = 0) -> dict[str, Any]:
    found = candidate.bands[band].extra["stress"]
    assert isinstance(found, dict)
    return found


@pytest.mark.parametrize(
    "row", list(csv.DictReader(PUBLISHED.read_text(encoding="utf-8").splitlines())), ids=lambda row: row["f_Hz"]
)
def test_published_tanks_bear_the_published_volts_and_amperes(row: dict[str, str]) -> None:
    """Energy definition of Q (Terman 1943): peak voltage and circulating current, loaded and with the load off."""
    frequency, inductance, capacitance = (float(row[key]) for key in ("f_Hz", "L_H", "C_F"))
    unloaded, loaded = float(row["Q_unloaded"]), float(row["Q_loaded"])
    band = replace(
        handmade.band("tank", frequency, capacitance, ["C1"]),
        inductance=inductance,
        network=capacitance,
        reactance=2 * math.pi * frequency * inductance,
        q=unloaded,
        extra={"load": {"loaded_q": loaded}},
    )
    parts = handmade.capacitor("C1", capacitance), handmade.coil_part()
    coil, capacitor = borne(band, *parts, power=float(row["P_into_tank_W"]))
    assert coil.voltage is not None
    tolerance = float(row["rel_tol"])
    assert coil.voltage == pytest.approx(float(row["V_peak_V"]), rel=tolerance)
    assert coil.current == pytest.approx(float(row["I_circulating_rms_A"]), rel=tolerance)
    assert capacitor.voltage == pytest.approx(float(row["V_peak_V"]), rel=tolerance)
    assert capacitor.current == pytest.approx(float(row["I_circulating_rms_A"]), rel=tolerance)
    # the same file: "with no load set Q_L = Q_U: voltage rises by sqrt(Q_U/Q_L) at the same power"
    assert coil.voltage_load_off == pytest.approx(coil.voltage * math.sqrt(unloaded / loaded), rel=1e-12)


def test_the_heat_of_all_parts_is_the_power_that_goes_in() -> None:
    """With the load off nothing else can take it; strays are lossless, so that Q is made to fit."""
    own = rated()
    band = own.bands[0]
    assert band.capacitance is not None and band.network is not None and band.coil_q is not None
    q = 1 / (1 / band.coil_q + band.network / band.capacitance / 1000.0)
    # reactance as at resonance, where coil and capacitance carry the same current
    at_resonance = math.sqrt(band.inductance / band.capacitance)
    candidate = driven(replace(own, bands=(replace(band, q=q, reactance=at_resonance),)), power=5.0)
    heat = math.fsum(part["dissipation_load_off_w"] for part in stress_of(candidate)["parts"])
    assert heat == pytest.approx(5.0, rel=1e-6)


def test_parts_in_series_share_the_voltage_and_carry_one_current() -> None:
    """20 pF and 60 pF across 100 V: 75 V and 25 V; by hand."""
    band = handmade.band("tank", 7.1e6, 15e-12, ["C1", "C2"], connection="C1 + C2")
    parts = handmade.capacitor("C1", 20e-12), handmade.capacitor("C2", 60e-12)
    _, first, second = borne(band, *parts, voltage=100.0)
    assert (first.voltage, second.voltage) == (pytest.approx(75.0), pytest.approx(25.0))
    assert first.current == pytest.approx(second.current)
    assert first.current == pytest.approx(2 * math.pi * 7.1e6 * 15e-12 * 100 / math.sqrt(2), rel=1e-3)


@needs_ngspice
@pytest.mark.parametrize(
    "tables",
    [
        {"band": [{"at": "3.58 MHz"}], "load": {"loaded_q": 12, "resistance": "50 ohm", "connection": "link"}},
        {"band": [{"at": "14.2 MHz"}], "load": {"resistance": "4 kohm"}, "stray": {"inductance": "10 nH"}},
        {
            "band": [{"at": "7.1 MHz"}],
            "load": {"loaded_q": 30},
            "capacitors": {"connect": "any", "to": "100 pF"},
            "limits": {"q": 100},
        },
    ],
    ids=["link", "across, with leads", "damped"],
)
def test_volts_and_amperes_agree_with_ngspice(tables: dict[str, Any], tmp_path: Path) -> None:
    """Three tanks that partpick picks for 1 W: tank voltage and capacitor current within 0.5 %, load on and off."""
    power = 1.0
    request = partpick.request_from_tables({**tables, "drive": {"power": "1 W"}}, "pair")
    result = partpick.solve(request, partpick.load_catalogue(), top=1)
    candidate = result.candidates[0]
    band, stress = candidate.bands[0], stress_of(candidate)
    load = band.extra["load"]
    assert isinstance(load, dict) and band.q is not None
    across = band.reactance / (1 / load["loaded_q"] - 1 / band.q)
    probes = ["let amperes = mag(i(vprobe))", "meas ac probe_a MAX amperes", "quit"]
    for loaded, key in ((True, "voltage_peak_v"), (False, "voltage_load_off_peak_v")):
        # a source of no voltage in the first capacitor's lead reads its current
        lines, done = [], False
        for line in netlist(result).splitlines():
            if line.startswith("CC1t1 ") and not done:
                name, high, low, value = line.split()
                lines += [f"Vprobe {high} probed 0", f"{name} probed {low} {value}"]
                done = True
            elif line == "quit":
                lines += probes
            elif line == ".control" and loaded:
                lines += [f"Rload t1 0 {across!r}", line]
            else:
                lines.append(line)
        got = simulate("\n".join(lines) + "\n", tmp_path)
        volts = math.sqrt(2 * power * got["t1_peak_ohm"])
        assert stress[key] == pytest.approx(volts, rel=5e-3)
        amperes = got["probe_a"] / got["t1_peak_ohm"] * volts / math.sqrt(2)
        first = next(part for part in stress["parts"] if part["reference"] == "C1")
        told = first["current_rms_a" if loaded else "current_load_off_rms_a"]
        assert told == pytest.approx(amperes, rel=5e-3)


def test_a_drive_of_current_meets_the_resistance_of_the_tank() -> None:
    """10 mA into Q X: 187 times 180.7 ohm makes 338 V; by hand. Full modulation doubles it."""
    band = handmade.candidate().bands[0]
    assert band.q is not None
    volts = 0.010 * band.q * band.reactance
    assert stress_of(driven(current=0.010))["voltage_peak_v"] == pytest.approx(volts)
    assert stress_of(driven(current=0.010, modulation=1.0))["voltage_peak_v"] == pytest.approx(2 * volts)


def test_the_device_sees_twice_its_supply_and_more_in_class_e() -> None:
    """Twice in a tuned stage (common practice, no source); class E 3.56 times (Sokal 1975, from memory)."""
    assert driven(power=0.1, supply=12.0).extra["device_peak_v"] == 24.0
    assert driven(power=0.1, supply=12.0, **{"class": "E"}).extra["device_peak_v"] == pytest.approx(12 * 3.56)
    assert set(DEVICE_PEAK) == {"A", "B", "C", "E"}


# ---------------------------------------------------------------- ratings


@pytest.mark.parametrize(
    ("ratings", "verdict"),
    [
        ({}, "inside"),  # 100 V of 500 V, 0.32 A of 1 A in the larger
        ({"voltage": 150.0}, "near"),
        ({"voltage": 99.0}, "over"),
        ({"rf_current": 0.4}, "near"),
        ({"rf_current": 0.3}, "over"),
        ({"voltage": None}, "not rated"),
        ({"rf_current": None}, "not rated"),
        ({"voltage": None, "rf_current": 0.3}, "over"),
    ],
)
def test_a_rating_is_weighed_with_its_margin(ratings: dict[str, Any], verdict: str) -> None:
    """Half of the voltage and 0.7 of the current are usual (common practice); without a rating nothing is fine."""
    candidate = driven(rated(**ratings), voltage=100.0)
    larger = next(part for part in stress_of(candidate)["parts"] if part["reference"] == "C1")
    assert larger["current_rms_a"] == pytest.approx(0.3154, rel=1e-3)  # 2 pi 7.1 MHz 100 pF 100 V / sqrt 2
    assert larger["verdict"] == verdict
    assert any("C1 at beacon" in warning for warning in candidate.warnings) == (verdict != "inside")


# ---------------------------------------------------------------- cautions


def outputs(candidate: Candidate) -> list[str]:
    result = handmade.result(candidate)
    return [" ".join(text.split()) for text in (result_table(result), sheet(result), result_json(result))]


@pytest.mark.parametrize(
    "drive",
    [
        {"power": 1.0},
        {"power": 100.0, "modulation": 1.0},
        {"voltage": 30.0},
        {"current": 0.001},
        {"power": 0.1, "supply": 15.0},
    ],
)
def test_cautions_come_from_one_watt_or_thirty_volts(drive: dict[str, Any]) -> None:
    """Every caution, in table, sheet and JSON, with the figure that triggered it."""
    candidate = driven(**drive)
    worst = max(part["voltage_load_off_peak_v"] for part in stress_of(candidate)["parts"])
    for text in outputs(candidate):
        for words in CAUTIONS:
            assert words.lower() in text.lower(), words
        assert f"{partpick.quantities.format_quantity(worst, 'V')} peak" in text


@pytest.mark.parametrize("drive", [{"voltage": 29.0}, {"power": 0.001}, {"current": 1e-4}])
def test_a_small_drive_is_told_without_cautions(drive: dict[str, Any]) -> None:
    """A caution on every receiver would be read by nobody."""
    assert driven(**drive).extra["cautions"] == []


def test_a_tank_of_unknown_q_is_taken_for_dangerous() -> None:
    """What is not known is not fine."""
    own = rated()
    unknown = driven(replace(own, bands=tuple(replace(band, q=None) for band in own.bands)), power=0.01)
    assert stress_unknown(unknown.bands[0]) and unknown.extra["cautions"]
    assert any("take it for dangerous" in warning for warning in unknown.warnings)


def stress_unknown(band: BandFigures) -> bool:
    return band.extra["stress"] is None


@pytest.mark.parametrize("by", ["build", "error", "price"])
@pytest.mark.parametrize("more", [{}, {"error": "none", "q": "none", "drift": "none"}])
def test_no_plan_and_no_order_silences_the_cautions(by: str, more: dict[str, str]) -> None:
    """From the plan to the printed page."""
    limits = {"stress": "none", **more}
    tables = {"band": [{"at": "7.1 MHz"}], "coil": {"measured": "4 uH"}, "drive": {"power": "5 W"}, "limits": limits}
    result: Result = partpick.solve(
        partpick.request_from_tables(tables, "pair", by=by), partpick.load_catalogue(), top=1
    )
    assert "Caution: Local law" in result_table(result)
    assert json.loads(result_json(result))["candidates"][0]["cautions"]
    assert "Cautions" in sheet(result)


def test_without_a_drive_nothing_is_added() -> None:
    """A plan that states no drive prints as before."""
    own = handmade.candidate()
    assert with_stress(handmade.request(), own) is own


CAUTION_OF_EACH_KIND = {
    "local rules": "Local law, electrical codes",
    "burns and flash-over": "burns and flash-over: {volts} peak on C1 at beacon with the load off",
    "stored charge": "hold charge after switching off ({volts} peak on C1 at beacon)",
    "licence and exposure": "Transmitting needs a licence nearly everywhere ({volts} peak on C1 at beacon)",
    "class 2": "no tank capacitors: at this drive ({volts} peak on C1 at beacon, load off)",
    "heat": "Heat: {heat} in C1 at beacon",
}


@pytest.mark.parametrize("kind", CAUTION_OF_EACH_KIND)
@pytest.mark.parametrize("limit", ["derated", "rated", None])
def test_each_caution_tells_the_figure_that_called_for_it(kind: str, limit: str | None) -> None:
    """At 30 V peak each is there, in table, sheet and JSON, whatever the limits; at 29 V none."""
    own = rated(series_inductance=2e-9, q=100.0)
    extra = (("drive", tuple({**QUIET, "voltage": 30.0}.items())),)
    request = handmade.request(extra=extra)
    candidate = with_stress(replace(request, limits=replace(request.limits, stress=limit)), own)
    first = next(part for part in stress_of(candidate)["parts"] if part["reference"] == "C1")
    shown = partpick.quantities.format_quantity
    words = CAUTION_OF_EACH_KIND[kind].format(
        volts=shown(first["voltage_load_off_peak_v"], "V"), heat=shown(first["dissipation_w"], "W")
    )
    for text in outputs(candidate):
        assert words in text
    assert not driven(own, voltage=29.0).extra["cautions"]


def test_class_2_capacitors_that_were_picked_are_named() -> None:
    """X7R is class 2 (EIA-198, from memory); C0G is not."""
    assert any("Here: C1, C2." in text for text in driven(rated(grade="X7R"), voltage=100.0).extra["cautions"])
    assert not any("Here:" in text for text in driven(voltage=100.0).extra["cautions"])


@pytest.mark.parametrize("grade", ["C0G", "NP0", "N750", "U2J", "mica", "C0G high voltage", ""])
def test_no_other_grade_is_called_class_2(grade: str) -> None:
    """Class 1 and film are tank capacitors."""
    assert not is_class_2(grade)
