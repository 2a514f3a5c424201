"""Loads at a tap, selectivity with the load on, and output tanks, from plan to answer."""

from __future__ import annotations

import math
from functools import cache
from typing import Any

import numpy as np
import pytest
import skrf

import partpick
from partpick.errors import RequestError
from partpick.physics.solenoid import solenoid_family
from partpick.planfile import request_from_tables
from partpick.result import BandFigures, Candidate

PLAN: dict[str, Any] = {
    "band": [{"at": "7.1 MHz"}],
    "coil": {"forms": ["solenoid"], "inductance": ["1 µH", "4 µH"]},
}


@cache
def catalogue() -> partpick.Catalogue:
    return partpick.load_catalogue()


def first(**tables: Any) -> Candidate:
    request = request_from_tables({**PLAN, **tables}, "pair")
    return partpick.solve(request, catalogue(), top=1).candidates[0]


def load_of(band: BandFigures) -> dict[str, Any]:
    load = band.extra["load"]
    assert isinstance(load, dict)
    return load


@pytest.mark.parametrize(("resistance", "wanted"), [("50 ohm", 20), ("50 ohm", 60), ("300 ohm", 12), ("1 kohm", 40)])
def test_the_tap_of_a_load_is_the_nearest_of_all_turns(resistance: str, wanted: float) -> None:
    """Every turn enumerated: the impedance of both sections with the load across one, sections by coaxial rings."""
    candidate = first(load={"resistance": resistance, "loaded_q": wanted, "connection": "tap"})
    (band,), (coil,) = candidate.bands, candidate.coils
    told = load_of(band)
    wire = next(w for w in catalogue().wires if w.name == coil.wire)
    assert coil.turns and coil.mean_diameter and coil.pitch and band.q
    family = solenoid_family(coil.turns, coil.mean_diameter, wire.bare_diameter, coil.pitch)
    ohms = {"50 ohm": 50.0, "300 ohm": 300.0, "1 kohm": 1000.0}[resistance]
    reached = {}
    for turn in range(1, coil.turns + 1):
        rest = family[coil.turns - turn - 1] if turn < coil.turns else 0.0
        section = family[turn - 1] / family[-1] * band.inductance
        shared = section + (family[-1] - family[turn - 1] - rest) / 2 / family[-1] * band.inductance
        omega = 2 * math.pi * (band.resonance or 0)
        impedance = 1j * omega * band.inductance + (omega * shared) ** 2 / (ohms + 1j * omega * section)
        seen = (1 / impedance).real
        reached[turn] = 1 / (1 / band.q + math.sqrt(band.inductance / (band.capacitance or 0)) * seen)
    nearest = min(reached, key=lambda turn: abs(math.log(reached[turn] / wanted)))
    assert told["tap_turns"] == nearest
    assert told["loaded_q"] == pytest.approx(reached[nearest], rel=1e-3)
    missed = abs(math.log(told["loaded_q"] / wanted)) > 0.1
    assert any("nearest tap" in warning for warning in candidate.warnings) == missed


def transfer(band: BandFigures, load: dict[str, Any], frequencies: list[float]) -> np.ndarray:
    """Return the size of the voltage across the loaded tank for one ampere, by scikit-rf, at each frequency. [-]"""
    x = math.sqrt(band.inductance / (band.capacitance or 0))
    assert band.q
    frequency = skrf.Frequency.from_f(np.array(frequencies), unit="hz")
    line = skrf.media.DefinedGammaZ0(frequency, z0=50.0, gamma=1j)
    coil = line.resistor(x / band.q) ** line.inductor(band.inductance) ** line.short()
    tank = line.shunt(coil) ** line.shunt_capacitor(band.capacitance)
    added = 1 / load["loaded_q"] - 1 / band.q
    tank = tank ** line.shunt(line.resistor(x / added) ** line.short())
    return np.abs(tank.z[:, 1, 0])


def test_selectivity_agrees_with_scikit_rf() -> None:
    """Neighbours on both sides and two harmonics, within 0.1 dB."""
    load = {"resistance": "3 kohm", "offset": "455 kHz"}
    (band,) = first(load=load, drive={"power": "1 W"}).bands
    told, resonance = load_of(band), band.resonance or 0.0
    size = transfer(band, told, [resonance - 455e3, resonance, resonance + 455e3, 2 * resonance, 3 * resonance])
    found = 20 * np.log10(size[1] / size[[0, 2, 3, 4]])
    answered = [*told["rejection_db"].values(), *told["harmonics_db"].values()]
    assert answered == pytest.approx(list(found), abs=0.1)


def test_an_output_tank_says_that_a_low_pass_is_needed() -> None:
    """No tank alone is enough for a transmitter; without a drive nothing is said of harmonics."""
    load = {"resistance": "3 kohm"}
    driven = first(load=load, drive={"power": "1 W"})
    assert any("low-pass is still needed" in warning for warning in driven.warnings)
    assert not any("low-pass" in warning for warning in first(load=load).warnings)


def test_a_load_that_leaves_too_little_q_says_what_would_do() -> None:
    """The reactance told gives the wanted Q where it is taken."""
    load = {"resistance": "500 ohm", "loaded_q": 30, "q_tolerance": "none"}
    candidate = first(load=load)
    (told,) = [warning for warning in candidate.warnings if "would do" in warning]
    band = candidate.bands[0]
    most = float(told.split("at most ")[1].split(" ")[0])
    assert band.q and 1 / (1 / band.q + most / 500) == pytest.approx(30, rel=0.01)


def test_a_switching_stage_is_refused_by_name() -> None:
    """Its network does not resonate at the carrier."""
    with pytest.raises(RequestError, match=r'class = "E".*does not resonate at the carrier'):
        first(load={"resistance": "50 ohm"}, drive={"power": "1 W", "class": "E"})


@pytest.mark.parametrize("drive", [{}, {"drive": {"power": "1 W"}}])
@pytest.mark.parametrize(("resistance", "wanted"), [("3 kohm", 12.0), ("1 kohm", 8.0)])
def test_a_load_across_picks_the_reactance(resistance: str, wanted: float, drive: dict[str, Any]) -> None:
    """Every coil on offer leaves the loaded Q that is asked for, as its own reactance and loss give it."""
    load = {"resistance": resistance, "loaded_q": wanted}
    request = request_from_tables({"band": [{"at": "7.1 MHz"}], "load": load, **drive}, "pair")
    candidates = partpick.solve(request, catalogue(), top=8).candidates
    ohms = {"3 kohm": 3e3, "1 kohm": 1e3}[resistance]
    assert len(candidates) == 8
    for candidate in candidates:
        (band,) = candidate.bands
        assert band.coil_q
        reached = 1 / (1 / band.coil_q + 2 * math.pi * 7.1e6 * band.inductance / ohms)
        assert 0.75 * wanted <= reached <= 1.25 * wanted


def test_a_load_that_no_coil_suits_says_what_would_do() -> None:
    """With the tolerance and with the reactance that are told something fits."""
    tables = {**PLAN, "load": {"resistance": "500 ohm", "loaded_q": 30}}
    result = partpick.solve(request_from_tables(tables, "pair"), catalogue(), top=1)
    assert not result.candidates and result.ruled_out_by is not None
    told = next(each for each in (result.ruled_out_by, *result.ruled_out_by.others) if each.limit == "q_tolerance")
    assert isinstance(told.needed, float) and "of reactance gives 30" in told.text
    wide = {"resistance": "500 ohm", "loaded_q": 30, "q_tolerance": f"{100.1 * told.needed:.6g} %"}
    assert first(load=wide).bands[0].target == 7.1e6
    ohms = float(told.text.split("7.1 MHz: ")[1].split(" ")[0])
    own = 1e6 * ohms / (2 * math.pi * 7.1e6)
    tables["coil"] = {"forms": ["solenoid"], "inductance": [f"{0.9 * own:.4g} µH", f"{1.1 * own:.4g} µH"]}
    tables["limits"] = {"parts_per_band": 4}
    assert partpick.solve(request_from_tables(tables, "pair"), catalogue(), top=1).candidates


def divided(**tables: Any) -> partpick.Result:
    load = {"resistance": "50 ohm", "loaded_q": 20, "connection": "divider"}
    plan = {"band": [{"at": "7.1 MHz"}], "load": load, **tables}
    return partpick.solve(request_from_tables(plan, "pair"), catalogue())


def test_a_divider_gives_the_loaded_q_on_frequency_by_scikit_rf() -> None:
    """The circuit with its load across the lower capacitor: where it peaks, and how wide it is there."""
    for candidate in divided().candidates[:4]:
        (band,), parts = candidate.bands, {p.reference: p for p in candidate.parts}
        told = load_of(band)
        upper, lower = (parts[name] for name in told["divider"])
        resonance = band.resonance or 0.0
        assert abs(resonance / 7.1e6 - 1) < 0.005 and band.q
        x = 2 * math.pi * resonance * band.inductance
        grid = np.linspace(0.94, 1.06, 20_001) * resonance
        frequency = skrf.Frequency.from_f(grid, unit="hz")
        line = skrf.media.DefinedGammaZ0(frequency, z0=50.0, gamma=1j)
        below = line.capacitor(lower.value) ** line.inductor(lower.series_inductance or 0.0) ** line.short()
        above = line.capacitor(upper.value) ** line.inductor(upper.series_inductance or 0.0)
        load = above ** line.shunt(below) ** line.shunt(line.resistor(50.0) ** line.short())
        coil = line.shunt(line.resistor(x / band.q) ** line.inductor(band.inductance) ** line.short())
        size = np.abs((coil ** line.shunt_capacitor(band.stray + band.self_capacitance) ** load).z[:, 0, 0])
        peak = grid[int(np.argmax(size))]
        inside = grid[size >= size.max() / math.sqrt(2)]
        assert peak == pytest.approx(resonance, rel=5e-4)
        assert peak / (inside[-1] - inside[0]) == pytest.approx(told["loaded_q"], rel=0.02)
        assert 18 <= told["loaded_q"] <= 22


@pytest.mark.parametrize(
    ("tables", "said"),
    [
        ({"coil": {"taps": True}}, "coil.taps"),
        ({"drive": {"power": "1 W"}}, "drive"),
        ({"limits": {"parts_per_band": 1}}, "a divider has 2"),
        ({"load": {"resistance": "50 ohm", "connection": "tap", "q_tolerance": "5 %"}}, "nearest whole turn"),
    ],
)
def test_what_goes_with_no_divider_is_refused(tables: dict[str, Any], said: str) -> None:
    """One line that says what would do."""
    with pytest.raises(RequestError, match=said):
        divided(**tables)


@pytest.mark.parametrize(("resistance", "wanted"), [("50 ohm", 20), ("50 ohm", 60), ("300 ohm", 40)])
def test_the_link_of_a_load_is_the_nearest_of_all_turns(resistance: str, wanted: float) -> None:
    """Every number of turns enumerated: Neumann's integral of each pair of turns, the circuit solved for two loops."""
    candidate = first(load={"resistance": resistance, "loaded_q": wanted, "connection": "link"})
    (band,), (coil,) = candidate.bands, candidate.coils
    told = load_of(band)
    wire = next(w for w in catalogue().wires if w.name == coil.wire)
    assert coil.turns and coil.mean_diameter and coil.pitch and band.q
    angle = (np.arange(2000) + 0.5) * 2 * math.pi / 2000
    a, b = coil.mean_diameter / 2, coil.mean_diameter / 2 + wire.overall_diameter
    apart = np.arange(coil.turns)[:, None] * coil.pitch
    ring = (4e-7 * math.pi * a * b * 2 * math.pi / 2) * np.mean(
        np.cos(angle) / np.sqrt(a * a + b * b - 2 * a * b * np.cos(angle) + apart**2), axis=1
    )
    ohms = {"50 ohm": 50.0, "300 ohm": 300.0}[resistance]
    omega, own = 2 * math.pi * (band.resonance or 0), solenoid_family(coil.turns, 2 * b, wire.bare_diameter, coil.pitch)
    reached, coupled = {}, {}
    for turns in range(1, coil.turns + 1):
        mutual = sum(ring[abs(i - j)] for i in range(coil.turns) for j in range(turns))
        loops = 1j * omega * np.array([[band.inductance, mutual], [mutual, own[turns - 1]]]) + np.diag([0, ohms])
        seen = np.linalg.inv(loops)[0, 0].real
        reached[turns] = 1 / (1 / band.q + math.sqrt(band.inductance / (band.capacitance or 0)) * seen)
        coupled[turns] = mutual / math.sqrt(band.inductance * own[turns - 1])
    nearest = min(reached, key=lambda turns: abs(math.log(reached[turns] / wanted)))
    assert told["link_turns"] == nearest
    assert told["loaded_q"] == pytest.approx(reached[nearest], rel=1e-3)
    assert told["link_coupling"] == pytest.approx(coupled[nearest], rel=1e-3)
