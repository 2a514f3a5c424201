"""Loss by cause, load, damping, selectivity, ringing and lossy resonances of tanks as picked."""

from __future__ import annotations

import math
import re
from functools import cache
from typing import Any

import numpy as np
import pytest
import skrf

import partpick
from partpick.physics.resonance import tank_impedance
from partpick.planfile import request_from_tables
from partpick.report.table import result_table
from partpick.result import BandFigures, Candidate, Result

MEDIUM: dict[str, Any] = {"band": [{"at": "1.9 MHz"}], "coil": {"forms": ["solenoid"]}}


@cache
def _catalogue() -> partpick.Catalogue:
    return partpick.load_catalogue()


def solved(tables: dict[str, Any]) -> Result:
    return partpick.solve(request_from_tables(tables, "pair"), _catalogue(), top=1)


def first(tables: dict[str, Any]) -> Candidate:
    return solved(tables).candidates[0]


def band_of(**load: Any) -> BandFigures:
    """Return the one band of a solenoid tank at 1.9 MHz, with a load if any is stated."""
    (band,) = first({**MEDIUM, **({"load": load} if load else {})}).bands
    return band


def load_of(band: BandFigures) -> dict[str, Any]:
    load = band.extra["load"]
    assert isinstance(load, dict)
    return load


def characteristic(band: BandFigures) -> float:
    assert band.capacitance is not None
    return math.sqrt(band.inductance / band.capacitance)


def test_loss_by_cause_adds_up_to_q() -> None:
    """Coil and capacitors make the whole; skin, proximity, core and former make the coil."""
    band = band_of()
    loss = band.extra["loss"]
    assert isinstance(loss, dict) and band.q is not None and band.coil_q is not None
    assert loss["total"] == pytest.approx(1 / band.q)
    assert loss["coil"] + loss["capacitors"] + loss["trimmer"] + loss["tuning"] == pytest.approx(loss["total"])
    assert loss["skin"] + loss["proximity"] + loss["core"] + loss["former"] == pytest.approx(loss["coil"])
    assert loss["coil"] == pytest.approx(1 / band.coil_q)
    assert loss["core"] == 0.0 and loss["former"] > 0.0


def test_a_bought_coil_has_its_loss_as_a_whole() -> None:
    """Nobody states what it is made of: null, and the table says "coil"."""
    result = solved({"band": [{"at": "2.5 MHz"}], "coil": {"forms": ["bought"]}})
    loss = result.candidates[0].bands[0].extra["loss"]
    assert isinstance(loss, dict)
    assert loss["skin"] is None and loss["coil"] > 0
    assert "loss: coil " in " ".join(result_table(result).split())


def test_a_resistance_across_the_tank_loads_it() -> None:
    """The impedance at resonance with the load in parallel, computed afresh, against the unloaded Q."""
    plain, loaded = band_of(), band_of(resistance="10 kohm")
    assert plain.q == loaded.q and plain.q is not None and plain.resonance is not None
    x = characteristic(plain)
    parallel = 1 / (1 / 10e3 + 1 / (plain.q * x))
    assert load_of(loaded)["loaded_q"] == pytest.approx(parallel / x)
    assert loaded.bandwidth == pytest.approx(plain.resonance * x / parallel, rel=1e-3)
    assert plain.bandwidth is not None and loaded.bandwidth is not None and loaded.bandwidth > plain.bandwidth


def test_a_wanted_bandwidth_gets_a_damping_resistor_of_a_standard_value() -> None:
    """E24 (IEC 60063): the width comes within the half step of the series, 5 %, in a circuit of scikit-rf too."""
    band = band_of(bandwidth="60 kHz")
    load = load_of(band)
    ohms = load["damping_resistor_ohm"]
    mantissa = ohms / 10 ** math.floor(math.log10(ohms))
    e24 = (1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8,
           7.5, 8.2, 9.1)  # fmt: skip
    assert min(abs(mantissa - value) for value in e24) < 1e-9
    assert load["bandwidth_hz"] == band.bandwidth == pytest.approx(60e3, rel=0.06)
    assert band.resonance is not None and band.capacitance is not None and band.q is not None
    sweep = skrf.Frequency(band.resonance - 60e3, band.resonance + 60e3, 12001, unit="Hz")
    line = skrf.media.DefinedGammaZ0(sweep, z0=1000.0)
    coil = line.resistor(characteristic(band) / band.q) ** line.inductor(band.inductance) ** line.short()
    tank = line.shunt(line.resistor(ohms) ** line.short()) ** line.shunt_capacitor(band.capacitance) ** coil
    size = np.abs(tank.z[:, 0, 0])
    inside = sweep.f[size >= size.max() / math.sqrt(2)]
    assert inside[-1] - inside[0] == pytest.approx(band.bandwidth, rel=5e-3)


def test_scikit_rf_sees_the_impedance_that_the_figures_say() -> None:
    """Coil with its loss, and all capacitance in circuit, over one bandwidth to either side."""
    band = band_of()
    assert band.resonance and band.capacitance and band.bandwidth and band.q
    sweep = skrf.Frequency(band.resonance - band.bandwidth, band.resonance + band.bandwidth, 101, unit="Hz")
    line = skrf.media.DefinedGammaZ0(sweep, z0=1000.0)
    resistance = characteristic(band) / band.q
    coil = line.resistor(resistance) ** line.inductor(band.inductance) ** line.short()
    built = (line.shunt_capacitor(band.capacitance) ** coil).z[:, 0, 0]
    assert np.allclose(built, tank_impedance(sweep.f, band.inductance, band.capacitance, resistance), rtol=1e-6)
    assert np.abs(built).max() == pytest.approx(band.q * characteristic(band), rel=1e-3)


def test_a_q_that_the_tank_does_not_have_cannot_be_damped_to() -> None:
    """A resistor only lowers it: said, with both figures, and no resistor."""
    candidate = first({**MEDIUM, "load": {"loaded_q": 5000}})
    load = load_of(candidate.bands[0])
    assert load["damping_resistor_ohm"] is None
    assert load["loaded_q"] == pytest.approx(candidate.bands[0].q)
    assert any("a Q of 5000 is wanted" in text for text in candidate.warnings)


def test_a_load_by_tap_link_or_divider_is_matched_not_damped() -> None:
    """What must appear across the tank is told; nothing stands across it that was not asked for."""
    load = load_of(band_of(resistance="50 ohm", loaded_q=20, connection="link"))
    assert load["link_turns"] >= 1 and load["damping_resistor_ohm"] is None  # whole turns: near 20, not 20
    assert load["loaded_q"] == pytest.approx(20, rel=0.25)
    assert load["across_ohm"] > 50
    unknown = band_of(resistance="50 ohm", connection="link")
    assert load_of(unknown)["loaded_q"] is None and unknown.bandwidth is None


def test_a_neighbour_is_rejected_by_the_universal_resonance_curve() -> None:
    """An offset of half the bandwidth is 3 dB down (definition), one of ten about 26 dB (20 log10 of 20)."""
    narrow = band_of()
    assert narrow.bandwidth is not None
    half = load_of(band_of(offset=narrow.bandwidth / 2))["rejection_db"]
    assert half["below"] == pytest.approx(3.0, abs=0.1) and half["above"] == pytest.approx(3.0, abs=0.1)
    far = load_of(band_of(offset=narrow.bandwidth * 10))["rejection_db"]
    assert far["above"] == pytest.approx(26.0, abs=1.5)
    below_zero = load_of(band_of(offset="5 MHz"))["rejection_db"]
    assert below_zero["below"] is None and below_zero["above"] > 30


def test_ringing_follows_q() -> None:
    """Q/pi cycles while the voltage falls to 1/e (Thomson 1853)."""
    band = band_of()
    assert band.q is not None and band.resonance is not None
    assert band.extra["ringing_cycles"] == pytest.approx(band.q / math.pi, rel=2e-3)
    assert band.extra["ringing_time_s"] == pytest.approx(band.q / math.pi / band.resonance, rel=2e-3)


def test_lossy_resonances_are_told_where_they_part() -> None:
    """Q about 200: apart by some 1e-5, and the table keeps quiet; the JSON has them always."""
    result = solved(MEDIUM)
    (band,) = result.candidates[0].bands
    parted = band.extra["lossy_resonances"]
    assert isinstance(parted, dict) and band.resonance is not None
    assert parted["unity_power_factor_hz"] < parted["ringing_hz"] < band.resonance
    assert "greatest impedance" not in result_table(result)


def test_an_unknown_q_leaves_the_figures_that_need_it_unknown() -> None:
    """Rods are shipped without Q: null everywhere, and no crash with a load."""
    tables = {"band": [{"at": "500 kHz"}], "coil": {"forms": ["rod core"]}, "load": {"resistance": "10 kohm"}}
    (band,) = first(tables).bands
    assert band.q is None and band.bandwidth is None
    assert load_of(band)["loaded_q"] is None
    assert band.extra["ringing_time_s"] is None and band.extra["lossy_resonances"] is None
    loss = band.extra["loss"]
    assert isinstance(loss, dict) and loss["core"] is None and loss["total"] is None and loss["skin"] > 0


def test_the_table_shows_spread_loss_and_load() -> None:
    """What the bench reads: the coil with its spread, where the loss is, what to put across."""
    text = result_table(solved({**MEDIUM, "load": {"bandwidth": "60 kHz", "offset": "100 kHz"}}))
    assert "H \u00b1" in text and "loss: skin" in text
    assert "loaded Q" in " ".join(text.split()) and "across it to damp" in " ".join(text.split())
    assert "100 kHz off down by" in " ".join(text.split())


def test_inductance_of_leads_shows_in_capacitance_and_bandwidth() -> None:
    """C/(1 - w^2 L C) (Terman 1943): with 20 nH at 28.5 MHz the same capacitor acts as several per cent more."""
    tables: dict[str, Any] = {"band": [{"at": "28.5 MHz"}], "coil": {"forms": ["solenoid"]}}
    (band,) = first({**tables, "stray": {"inductance": "20 nH"}}).bands
    candidate = first({**tables, "stray": {"inductance": "20 nH"}})
    (capacitor,) = [part for part in candidate.parts if part.kind == "capacitor"]
    assert capacitor.value is not None and band.network is not None
    u = (2 * math.pi * 28.5e6) ** 2 * (20e-9 + 1.2e-9) * capacitor.value
    assert band.network == pytest.approx(capacitor.value / (1 - u), rel=1e-3)
    assert band.bandwidth is not None and band.q is not None and band.resonance is not None
    assert band.bandwidth < band.resonance / band.q


def test_no_capacitor_near_its_own_resonance_is_offered() -> None:
    """At 145 MHz 8 nH make mica of 150 pF and more useless; what is offered has w^2 Ls C to 0.25."""
    tables = {"band": [{"at": "145 MHz"}], "capacitors": {"grades": ["mica"]}}
    result = partpick.solve(request_from_tables(tables, "pair"), _catalogue(), top=50)
    omega = 2 * math.pi * 145e6
    inductance = {part.label: part.series_inductance or 0.0 for part in _catalogue().capacitors}
    offered = [part for c in result.candidates for part in c.parts if part.kind == "capacitor"]
    assert offered
    assert all(omega**2 * inductance[part.description] * (part.value or 0.0) <= 0.25 for part in offered)


@pytest.mark.parametrize(("at", "connect"), [("28.5 MHz", "parallel"), ("28.5 MHz", "any"), ("50 MHz", "any")])
def test_q_counts_the_current_that_series_inductance_lets_through(at: str, connect: str) -> None:
    """The tank built part by part, each with its inductance and loss, behind the leads: 1/Q is G X at resonance."""
    tables: dict[str, Any] = {"band": [{"at": at}], "stray": {"inductance": "20 nH"}, "coil": {"forms": ["solenoid"]}}
    tables["limits"] = {"parts_per_band": 3}
    tables["capacitors"] = {"connect": connect, "grades": ["C0G"], "from": "100 pF"}
    candidate = first(tables)
    (band,) = candidate.bands
    assert band.q is not None and band.coil_q is not None and band.capacitance is not None
    omega = 2 * np.pi * band.resonance
    by_label = {part.label: part for part in _catalogue().capacitors}
    sweep = skrf.Frequency(band.resonance, band.resonance, 1, unit="Hz")
    line = skrf.media.DefinedGammaZ0(sweep, z0=50.0)

    def impedance(reference: str) -> complex:
        (line_of,) = [part for part in candidate.parts if reference in part.reference.split()]
        part = by_label[line_of.label if line_of.label in by_label else line_of.description]
        loss = line.resistor(1 / (omega * part.value * (part.q or math.inf)))
        built = loss ** line.inductor(part.series_inductance) ** line.capacitor(part.value) ** line.short()
        return complex(built.z[0, 0, 0])

    network = _impedance(band.connection, impedance)
    coil = omega * band.inductance * (1j + 1 / band.coil_q)
    fixed = 1j * omega * (band.stray + band.self_capacitance)
    admittance = 1 / coil + 1 / (network + 1j * omega * 20e-9) + fixed
    assert admittance.real * characteristic(band) == pytest.approx(1 / band.q, rel=2e-4)
    assert abs(admittance.imag) < 1e-3 * omega * band.capacitance  # capacitance is that at the target
    # not to be had by value alone
    loss = band.extra["loss"]
    assert isinstance(loss, dict)
    share = (band.network or 0.0) / band.capacitance
    assert loss["capacitors"] > 1.03 * share / 1000


def _impedance(connection: str, of_part: Any) -> complex:
    """Return the impedance of a network in words, such as `C1 | (C2 + C3)`."""
    outer = re.sub(r"\([^()]*\)", lambda inner: inner[0].replace(" | ", "|").replace(" + ", "+"), connection)
    if " + " in outer:
        return sum(_impedance(term, of_part) for term in outer.split(" + "))
    if " | " in outer:
        return 1 / sum(1 / _impedance(term, of_part) for term in outer.split(" | "))
    if outer.startswith("("):
        return _impedance(outer[1:-1].replace("|", " | ").replace("+", " + "), of_part)
    return complex(of_part(outer))
