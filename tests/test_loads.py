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
    candidate = first(load={"resistance": "500 ohm", "loaded_q": 30})
    (told,) = [warning for warning in candidate.warnings if "would do" in warning]
    band = candidate.bands[0]
    most = float(told.split("at most ")[1].split(" ")[0])
    assert band.q and 1 / (1 / band.q + most / 500) == pytest.approx(30, rel=0.01)


def test_a_switching_stage_is_refused_by_name() -> None:
    """Its network does not resonate at the carrier."""
    with pytest.raises(RequestError, match=r'class = "E".*does not resonate at the carrier'):
        first(load={"resistance": "50 ohm"}, drive={"power": "1 W", "class": "E"})
