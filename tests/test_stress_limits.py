"""Ratings as limits, from plan to result: grades that bear it, parts that share it, what is told where none does."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from typing import Any

import pytest
from scipy.special import jv

import partpick
from partpick.parts import Catalogue
from partpick.physics.variable_capacitor import gap_breakdown_voltage
from partpick.report.result_json import result_json
from partpick.report.table import result_table
from partpick.result import Candidate, Result

MEASURED = {"measured": "2 µH", "self_capacitance": "1 pF"}
CATALOGUE = partpick.load_catalogue()


def solve(drive: dict[str, Any], limits: dict[str, Any] | None = None, **more: Any) -> Result:
    catalogue = more.pop("catalogue", CATALOGUE)
    band = [{"name": "b", "at": "7.1 MHz"}]
    tables = {"band": band, "coil": MEASURED, "drive": drive, "limits": limits or {}, **more}
    return partpick.solve(partpick.request_from_tables(tables, "bands"), catalogue, top=1)


def stress(candidate: Candidate, band: int = 0) -> dict[str, Any]:
    found = candidate.bands[band].extra["stress"]
    assert isinstance(found, dict)
    return found


def part(candidate: Candidate, reference: str, band: int = 0) -> dict[str, Any]:
    found: dict[str, Any] = next(p for p in stress(candidate, band)["parts"] if p["reference"] == reference)
    return found


def grades(result: Result) -> set[str | None]:
    return {line.grade for line in result.candidates[0].parts if line.kind == "capacitor"}


def rated(volts: float | None, amperes: float | None) -> Catalogue:
    """Return the shipped parts, every capacitor with these ratings."""
    capacitors = tuple(replace(c, voltage=volts, rf_current=amperes) for c in CATALOGUE.capacitors)
    return replace(CATALOGUE, capacitors=capacitors)


def test_a_grade_of_higher_voltage_is_picked_where_one_will_not_do() -> None:
    """40 V peak is inside half of 100 V, 60 V is not; the currents are inside 0.7 of each rating."""
    low, high = solve({"voltage": "40 V"}), solve({"voltage": "60 V"})
    assert "C0G high voltage" not in grades(low)
    assert grades(high) <= {"C0G high voltage", "mica"}
    for result, volts in ((low, 40.0), (high, 60.0)):
        for line in result.candidates[0].parts:
            if line.kind == "capacitor":
                assert line.voltage is not None and line.rf_current is not None
                assert volts <= 0.5 * line.voltage * 1.001
                assert part(result.candidates[0], line.reference)["current_rms_a"] <= 0.7 * line.rf_current


def test_two_capacitors_share_the_current_that_one_cannot_carry() -> None:
    """240 pF at 100 V, 7.1 MHz carry 0.757 A: by hand w C V / sqrt 2. One part rated at 1 A may carry 0.7."""
    one = solve({"voltage": "100 V"}, catalogue=rated(500.0, 1.5)).candidates[0]
    two = solve({"voltage": "100 V"}, catalogue=rated(500.0, 1.0)).candidates[0]
    assert (one.part_count, two.part_count) == (1, 2)
    for line in two.parts:
        if line.kind == "capacitor":
            assert line.value is not None
            by_hand = 2 * math.pi * 7.1e6 * line.value * 100.0 / math.sqrt(2)
            assert part(two, line.reference)["current_rms_a"] == pytest.approx(by_hand, rel=0.02)
            assert by_hand < 0.7


def test_a_series_network_shares_the_voltage() -> None:
    """Three equal parts in series bear a third each: 150 V across parts that may bear 100 V."""
    limits = {"parts_per_band": 3}
    kept = {"connect": "any"}
    result = solve({"voltage": "150 V"}, limits, capacitors=kept, catalogue=rated(200.0, 20.0))
    assert result.candidates and "+" in result.candidates[0].bands[0].connection
    for line in result.candidates[0].parts:
        if line.kind == "capacitor":
            assert part(result.candidates[0], line.reference)["voltage_peak_v"] <= 100.0 * (1 + 1e-6)


def test_ratings_in_full_and_no_limit_are_asked_for_by_name() -> None:
    """What is past the derating is offered on request, and flagged."""
    past = solve({"voltage": "80 V"}, {"stress": "rated"}, catalogue=rated(100.0, 5.0)).candidates[0]
    assert any("near" in p["verdict"] for p in stress(past)["parts"])
    over = solve({"voltage": "300 V"}, {"stress": "none"}).candidates[0]
    assert any(p["verdict"] == "over" for p in stress(over)["parts"])
    assert any("over the rating: C1 at b (" in warning and " of " in warning for warning in over.warnings)
    assert "over" in result_table(solve({"voltage": "300 V"}, {"stress": "none"}))


def test_nothing_fits_names_the_limit_and_what_ratings_would_do() -> None:
    """3 kV peak is beyond every part: at least 6 kV of rating, or less drive."""
    result = solve({"voltage": "3 kV"})
    assert not result.candidates and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "stress"
    assert "6 kV" in result.ruled_out_by.text and "of drive" in result.ruled_out_by.text
    assert result.nearest_miss is not None and result.nearest_miss.extra["cautions"]
    assert "Caution: Local law" in result_table(result)
    told = json.loads(result_json(result))
    assert told["ruled_out_by"]["needed"] == "none" and told["request"]["limits"]["stress"] == "derated"


def test_parts_without_a_rating_are_offered_and_never_called_fine() -> None:
    """Nobody knows what they bear."""
    candidate = solve({"voltage": "3 kV"}, catalogue=rated(None, None)).candidates[0]
    assert {p["verdict"] for p in stress(candidate)["parts"] if p["kind"] == "capacitor"} == {"not rated"}
    assert any("nothing says that it is fine" in warning for warning in candidate.warnings)


def test_a_stress_that_is_unknown_does_not_pass_a_rating() -> None:
    """A measured coil has no known Q: under a power its voltage is not known, so that no rated part is inside."""
    result = solve({"power": "0.1 W"})
    assert not result.candidates and result.ruled_out_by is not None
    assert result.ruled_out_by.limit == "stress"
    assert solve({"power": "0.1 W"}, catalogue=rated(None, None)).candidates


def test_a_bought_coil_keeps_to_its_current() -> None:
    """0.7 of what its row states."""
    tables = {"band": [{"at": "7.1 MHz"}], "coil": {"forms": ["bought"]}, "drive": {"voltage": "40 V"}}
    result = partpick.solve(partpick.request_from_tables(tables, "pair"), CATALOGUE, top=5)
    free = partpick.solve(
        partpick.request_from_tables({**tables, "limits": {"stress": "none"}}, "pair"), CATALOGUE, top=5
    )
    uses = [part(candidate, "L1")["current_use"] for candidate in result.candidates]
    assert uses and max(uses) <= 0.7 * (1 + 1e-9)
    assert max(part(candidate, "L1")["current_use"] for candidate in free.candidates) > 0.7


def test_the_dc_across_the_capacitors_counts() -> None:
    """40 V of rf alone are inside 50 V, 40 V with 30 V of bias are not."""
    assert "C0G high voltage" not in grades(solve({"voltage": "40 V"}))
    biased = solve({"voltage": "40 V", "bias": "30 V"})
    assert grades(biased) <= {"C0G high voltage", "mica"}


@pytest.mark.parametrize(("spacing", "fits"), [("0.5 mm", True), ("0.2 mm", False)])
def test_the_air_gap_of_a_variable_capacitor_is_a_rating(spacing: str, fits: bool) -> None:
    """Half of the breakdown in an even field: 0.5 mm bears 2.7 kV, 0.2 mm 1.4 kV (Kuffel 2000, from memory)."""
    tables = {
        "band": [{"name": "b", "from": "7.0 MHz", "to": "7.3 MHz"}],
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF", "spacing": spacing},
        "coil": {"measured": "4 µH", "self_capacitance": "1 pF"},
        "limits": {"parts_per_band": 0},
        "drive": {"voltage": "1 kV"},
        "stray": {"share": "none"},
    }
    result = partpick.solve(partpick.request_from_tables(tables, "bands"), CATALOGUE, top=1)
    assert bool(result.candidates) == fits
    metres = float(spacing.split()[0]) * 1e-3
    assert (0.5 * float(gap_breakdown_voltage(metres)) >= 1000.0) == fits
    if fits:
        element = part(result.candidates[0], "T")
        assert element["voltage_rating_v"] == pytest.approx(float(gap_breakdown_voltage(metres)))
        assert element["verdict"] == "inside"
    else:
        assert result.ruled_out_by is not None and result.ruled_out_by.limit == "stress"


def test_a_trimmer_keeps_to_its_voltage() -> None:
    """It has the whole tank voltage."""
    trimmer = {"low": "3 pF", "high": "20 pF", "voltage": "100 V"}
    assert solve({"voltage": "49 V"}, trimmer=trimmer).candidates
    assert not solve({"voltage": "51 V"}, trimmer=trimmer).candidates


def test_kirchhoff_holds_at_both_ends_of_a_range() -> None:
    """At resonance the coil carries what all capacitance carries: element, padders, trimmer and strays."""
    from partpick.ratings import DriveTable
    from partpick.stress import _at_end, ends_of

    tables = {
        "band": [{"name": "b", "from": "7.0 MHz", "to": "7.3 MHz", "trimmer": {"low": "3 pF", "high": "9 pF"}}],
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"},
        "coil": {"measured": "4 µH", "self_capacitance": "1 pF"},
        "limits": {"parts_per_band": 3, "excess": "40 %", "margin": "1 %"},
        "stray": {"inductance": "10 nH"},
    }
    candidate = partpick.solve(partpick.request_from_tables(tables, "bands"), CATALOGUE, top=1).candidates[0]
    band = candidate.bands[0]
    assert "(T + C" in band.connection and len(band.capacitors) == 3
    for end in ends_of(band):
        coil, *others = _at_end(DriveTable(voltage=100.0), band, candidate, 10e-9, end) or ()
        strays = (band.stray + band.self_capacitance) * end.omega * 100.0 / math.sqrt(2)
        amperes = {one.reference: one.current_load_off for one in others}
        padder = next(c for c in band.capacitors if f"(T + {c})" in band.connection)
        assert amperes["T"] == pytest.approx(amperes[padder], rel=1e-9)
        into = math.fsum(a for name, a in amperes.items() if name != padder)
        assert into + strays == pytest.approx(coil.current_load_off, rel=1e-9)


def test_skin_effect_heats_a_coil_as_by_hand() -> None:
    """I^2 R of the wire, R by Bessel functions of a round wire of copper at 20 C (1/58e6 ohm m)."""
    tables = {"band": [{"at": "3.5 MHz"}], "coil": {"forms": ["solenoid"]}, "drive": {"voltage": "30 V"}}
    candidate = partpick.solve(partpick.request_from_tables(tables, "pair"), CATALOGUE, top=1).candidates[0]
    coil, band = candidate.coils[0], candidate.bands[0]
    wire = next(w for w in CATALOGUE.wires if w.name == coil.wire)
    assert coil.wire_length is not None and wire.strands == 1
    length = coil.wire_length - 0.1  # two tails of 50 mm are wound off
    radius, conductivity = wire.bare_diameter / 2, 58e6
    k = (1 - 1j) / math.sqrt(2 / (2 * math.pi * 3.5e6 * 4e-7 * math.pi * conductivity))
    ratio = (k * radius / 2 * jv(0, k * radius) / jv(1, k * radius)).real
    resistance = ratio * length / (conductivity * math.pi * radius**2)
    amperes = 30.0 / band.reactance / math.sqrt(2)
    loss = band.extra["loss"]
    assert isinstance(loss, dict)
    skin = loss["skin"] / loss["coil"]
    assert part(candidate, "L1")["current_rms_a"] == pytest.approx(amperes)
    assert part(candidate, "L1")["dissipation_w"] * skin == pytest.approx(amperes**2 * resistance, rel=2e-3)


def test_modulation_raises_peaks_by_its_depth_and_heat_by_half_its_square() -> None:
    """Full depth: twice the peak, sqrt(1.5) of the current, 1.5 of the heat (Terman 1943)."""
    tables = {"band": [{"at": "3.5 MHz"}], "coil": {"forms": ["solenoid"]}, "limits": {"stress": "none"}}
    plain, full = (
        partpick.solve(
            partpick.request_from_tables({**tables, "drive": {"power": "0.1 W", "modulation": f"{depth} %"}}, "pair"),
            CATALOGUE,
            top=1,
        ).candidates[0]
        for depth in (0, 100)
    )
    for key, ratio in (
        ("voltage_load_off_peak_v", 2.0),
        ("current_load_off_rms_a", math.sqrt(1.5)),
        ("dissipation_w", 1.5),
    ):
        assert part(full, "C1")[key] == pytest.approx(ratio * part(plain, "C1")[key])
        assert part(full, "L1")[key] == pytest.approx(ratio * part(plain, "L1")[key])


def test_a_ring_is_told_its_flux_density() -> None:
    """V/(2 pi f N A) by hand from the core's row; 15 mT sqrt(1 MHz/f) is usual (common practice, from memory)."""
    tables = {
        "band": [{"at": "7.1 MHz"}],
        "coil": {"forms": ["ring core"], "reactance": ["100 Ω", "300 Ω"]},
        "drive": {"voltage": "100 V"},
        "limits": {"stress": "none", "q": 100},
    }
    result = partpick.solve(partpick.request_from_tables(tables, "pair"), CATALOGUE, top=20)
    seen = 0
    for candidate in result.candidates:
        coil = candidate.coils[0]
        core = next(c for c in CATALOGUE.cores if c.name == coil.former)
        if core.permeability == 1.0:
            assert part(candidate, "L1")["flux_density_t"] is None
            continue
        assert core.inner_diameter is not None and core.height is not None and coil.turns is not None
        area = (core.outer_diameter - core.inner_diameter) / 2 * core.height
        flux = 100.0 / (2 * math.pi * 7.1e6 * coil.turns * area)
        assert part(candidate, "L1")["flux_density_t"] == pytest.approx(flux)
        usual = 15e-3 / math.sqrt(7.1)
        assert any("peak in the core" in w for w in candidate.warnings) == (flux > usual)
        seen += 1
    assert seen > 2


def test_a_load_whose_ratio_nobody_states_leaves_the_worse_state_known() -> None:
    """A tap without a wanted Q: loaded figures are unknown, those with the load off are not."""
    tables = {
        "band": [{"at": "7.1 MHz"}],
        "coil": {"forms": ["solenoid"]},
        "load": {"resistance": "50 Ω", "connection": "tap"},
        "drive": {"power": "0.1 W"},
    }
    candidate = partpick.solve(partpick.request_from_tables(tables, "pair"), CATALOGUE, top=1).candidates[0]
    assert stress(candidate)["voltage_peak_v"] is None
    assert stress(candidate)["voltage_load_off_peak_v"] > 10


def test_contacts_carry_what_they_switch() -> None:
    """Stacked: the contact of a band carries the capacitors that it adds; shared: one each."""
    bands = [{"name": "low", "at": "3.5 MHz"}, {"name": "high", "at": "7.1 MHz"}]
    tables = {"band": bands, "coil": {"measured": "4 µH"}, "drive": {"voltage": "40 V"}, "stray": {"share": "none"}}
    for layout, limits in (("separate", {}), ("stacked", {}), ("shared", {"parts": 5})):
        made = {**tables, "switching": layout, "limits": {"parts_per_band": 3, **limits}}
        candidate = partpick.solve(partpick.request_from_tables(made, "bands"), CATALOGUE, top=1).candidates[0]
        for place, band in enumerate(candidate.bands):
            found = stress(candidate, place)
            currents = {p["reference"]: p["current_load_off_rms_a"] for p in found["parts"]}
            told = {one["contact"]: one["load_off_rms_a"] for one in found["contacts"]}
            highest = candidate.bands[1].capacitors if layout == "stacked" else ()  # wired, on no contact
            switched = math.fsum(currents[c] for c in band.capacitors if c not in highest)
            assert math.fsum(told.values()) == pytest.approx(switched)
            assert found["contact_open_peak_v"] == (pytest.approx(40.0) if told else None)
            assert set(told) <= set(band.contacts)


def test_a_plan_without_a_drive_asks_nothing_of_the_search() -> None:
    """Ratings then rule nothing out, and cost nothing."""
    from partpick.candidates import realisable_coils
    from partpick.objective import build_problem

    for extra, limits, driven in (({}, {}, False), ({"drive": {"voltage": "9 V"}}, {}, True)):
        tables = {"band": [{"at": "7.1 MHz"}], "coil": MEASURED, "limits": limits, **extra}
        request = partpick.request_from_tables(tables, "pair")
        problem = build_problem(request, realisable_coils(request, CATALOGUE), CATALOGUE.capacitors[:9], 0.001)
        assert (problem.drive is not None) == driven
