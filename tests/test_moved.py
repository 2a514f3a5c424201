"""Elements that move inductance on real coils: both ends against physics one coil at a time, limits, dial, result."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from smallstock import former, stock, wire
from workbench import run

import partpick
from partpick.candidates import Coils, realisable_coils
from partpick.errors import RequestError
from partpick.moved.coils import MovedCoils
from partpick.physics.loss import dielectric_loss
from partpick.physics.moving_contact import section_inductance
from partpick.physics.self_capacitance import solenoid_self_capacitance
from partpick.physics.sliding_core import core_inductance_rise, core_offset
from partpick.physics.solenoid import solenoid_family
from partpick.physics.variometer import coil_rings, parallel_inductance, tilted_mutual_inductance
from partpick.planfile import request_from_tables
from partpick.request import Request
from partpick.result import Candidate, Result

PUBLISHED = Path(__file__).parent / "published"
CORE = {"kind": "sliding core", "diameter": "6 mm", "length": "20 mm", "permeability": 10, "travel": "25 mm"}
CONTACT = {"kind": "moving contact"}
ROTOR = {"kind": "variometer", "rotor": "20 mm", "from": 0, "to": 180}
TUBE = former(25, 40, 2.0)
FREE = {"self_resonance": "none", "reactance": "none", "proportions": "none"}


def request(tuning: dict[str, Any], low: str = "3 MHz", high: str = "4 MHz", **tables: Any) -> Request:
    whole = {"band": [{"name": "a", "from": low, "to": high}], "coil": FREE, **tables, "tuning": tuning}
    return request_from_tables(whole, "bands")


def coils_with(asked: Request, *parts: Any) -> tuple[Coils, MovedCoils]:
    coils = realisable_coils(asked, stock(*parts))
    assert coils.moved is not None
    return coils, coils.moved


# ---------------------------------------------------------------- sliding core


def test_a_core_adds_what_boundary_elements_say() -> None:
    """The coil's own inductance at the frequency of the end, and the rise of one rod in it, computed for it alone."""
    asked = request(CORE, coil={**FREE, "forms": ["solenoid"]})
    coils, moved = coils_with(asked, wire(0.5, 0.55), former(10, 30), former(25, 40, 2.0))
    for coil in (5, 20, 40, len(coils) - 3):
        block, row = coils.locate(coil)
        size = int(block.turns[row]), float(block.mean_diameter[row]), float(block.winding_length[row])
        pushed = min(0.025, (size[2] + 0.02) / 2)
        assert moved.setting(coil, low_end=True) == pytest.approx(1e3 * pushed)
        offsets = core_offset(np.array([pushed, 0.0]), size[2], 0.02)
        rise = core_inductance_rise(*size, 0.006, 0.02, 10.0, offsets)
        low = float(block.inductance[row, 1]) + rise[0]
        assert coils.inductance_low[coil, 0] == pytest.approx(low, abs=6e-4 * rise.max())
        assert coils.inductance[coil, 0] == pytest.approx(coils.alone[coil, 0] + rise[1], abs=6e-4 * rise.max())
        assert moved.own_low[coil, 0] == moved.own_high[coil, 0] == 0.0


def test_a_core_lowers_the_copper_share_of_the_loss_and_adds_its_own() -> None:
    """Q lies between that of the material and that of the empty coil raised by what the core adds."""
    coils, _ = coils_with(request({**CORE, "q": 120}), wire(0.5, 0.55), former(10, 30))
    block, row = coils.locate(30)
    losses = block.losses
    gain = coils.inductance_low[30, 0] / block.inductance[row, 1]
    copper = (losses.skin + losses.proximity)[row, 1] / gain
    around = losses.former[row, 1] * gain  # its conductance stays, the inductance does not
    assert around > 0
    assert 1 / coils.q_low[30, 0] == pytest.approx(copper + around + (1 - 1 / gain) / 120)


def test_a_core_goes_into_bores_that_take_it_and_into_no_mandrel() -> None:
    """Nine tenths of the diameter, common practice; a coil that stands by itself has nothing to guide a core."""
    mandrel = former(12, 30, 2.0, support="mandrel")
    parts = (wire(1.0), former(6.6, 20, 2.0), former(6.7, 20, 2.0), mandrel)
    coils, moved = coils_with(request(CORE), *parts)
    names = {coils.supports[int(coils.support[coil])].name for coil in np.flatnonzero(moved.able)}
    assert names == {"tube 6.7x20"}


# ---------------------------------------------------------------- moving contact


@pytest.mark.parametrize("unused", ["open", "shorted"])
@pytest.mark.parametrize("least", [3, 3.5])
def test_a_contact_leaves_the_inductance_of_the_turns_in_use(unused: str, least: float) -> None:
    """At a low frequency, against the spline through the exact family: exact at whole turns, 0.2 % between."""
    tuning = {**CONTACT, "continuous": True, "least_turns": least, "unused": unused}
    asked = request(tuning, "2 kHz", "3 kHz")
    coils, moved = coils_with(asked, wire(0.5, 0.55), TUBE)
    for coil in (6, 12, 19):
        family = solenoid_family(coil + 1, 0.02555, 0.0005, 0.002)
        wanted = section_inductance(family, least, unused == "shorted")
        assert coils.inductance[coil, 0] == pytest.approx(float(wanted), rel=1e-4 if least == 3 else 2e-3)
        assert coils.inductance_low[coil, 0] == pytest.approx(family[-1], rel=1e-4)
        assert (moved.setting(coil, low_end=True), moved.setting(coil, low_end=False)) == (coil + 1, least)


def test_published_sections_of_a_coil() -> None:
    """tests/published/tapped_solenoid.csv (07a): section, and section with the rest shorted, L_s - M^2/L_r."""
    with (PUBLISHED / "tapped_solenoid.csv").open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["first_turn_index"] == "0"]
    assert len(rows) >= 4
    for row in rows:
        diameter, pitch, bare = (1e3 * float(row[name]) for name in ("d_m", "pitch_m", "wire_d_m"))
        turns = int(row["N"])
        parts = (wire(bare), former(diameter - bare, turns * pitch + 0.01, pitch))
        mutual, rest = float(row["M_H"]), float(row["L_rest_H"])
        for unused, lost in (("open", 0.0), ("shorted", mutual**2 / rest)):
            tuning = {**CONTACT, "least_turns": int(row["n_section"]), "unused": unused}
            coils, _ = coils_with(request(tuning, "1.1 kHz", "1.2 kHz"), *parts)
            assert coils.inductance[turns - 1, 0] == pytest.approx(float(row["L_section_H"]) - lost, rel=1e-3)
            assert coils.inductance_low[turns - 1, 0] == pytest.approx(float(row["L_total_H"]), rel=1e-3)


def test_idle_turns_bring_their_capacitance_when_open_and_their_loss_when_shorted() -> None:
    """Open: the whole coil's, by the square of the voltage step-up. Shorted: R_r (M/L_r)^2 comes across."""
    at_rest, _ = coils_with(request(CONTACT), wire(0.5, 0.55), TUBE)
    shorted, moved = coils_with(request({**CONTACT, "unused": "shorted"}), wire(0.5, 0.55), TUBE)
    coil = 15  # of 16 turns
    assert at_rest.moved is not None
    open_own = at_rest.self_capacitance[coil] + at_rest.moved.own_high[coil, 0]
    assert open_own == pytest.approx(at_rest.section_self_capacitance(coil, 3), rel=1e-9)
    assert shorted.self_capacitance[coil] + moved.own_high[coil, 0] == pytest.approx(at_rest.self_capacitance[2])
    assert shorted.inductance[coil, 0] < at_rest.inductance[coil, 0]
    assert shorted.q[coil, 0] < at_rest.q[coil, 0]
    block, _ = at_rest.locate(coil)
    dc = block.inductance_dc
    ratio = (dc[15] - dc[2] - dc[12]) / 2 / dc[12]
    copper = block.losses.skin + block.losses.proximity
    own, rest = (block.inductance[n, 0] * copper[n, 0] for n in (2, 12))
    left = shorted.inductance[coil, 0]
    around = dielectric_loss(left, at_rest.self_capacitance[2], 4e6, block.loss_tangent[coil])
    assert 1 / shorted.q[coil, 0] == pytest.approx((own + ratio**2 * rest) / left + around)


def test_stranded_wire_has_no_track_for_a_contact() -> None:
    """And a coil with no more turns than must stay in use cannot be tuned."""
    litz = wire(0.6, 0.7, strands=7, strand_diameter=0.2e-3)
    _, moved = coils_with(request(CONTACT), wire(0.5, 0.55), litz, TUBE)
    block = moved.ends
    assert len(block.rows) == 17 and int(block.high.setting[0]) == 3


# ---------------------------------------------------------------- variometer


@pytest.mark.parametrize(("connection", "stators"), [("series", (8, 13, 19)), ("parallel", (2, 3, 4))])
def test_a_rotor_adds_by_the_exact_mutual_inductance(connection: str, stators: tuple[int, ...]) -> None:
    """At a low frequency, each pair by itself: L1 + L2 + 2 M, or (L1 L2 - M^2)/(L1 + L2 - 2 M)."""
    tuning = {**ROTOR, "rotor": "18 mm", "turns": 5, "connection": connection, "from": 10, "to": 170}
    coils, moved = coils_with(request(tuning, "2 kHz", "3 kHz"), wire(0.5, 0.55), TUBE)
    rotor = solenoid_family(5, 0.018, 0.0005, 0.002)[-1]
    rings = coil_rings(5, 0.018, 0.002)
    for coil in stators:
        stator = solenoid_family(coil + 1, 0.02555, 0.0005, 0.002)[-1]
        mutual = tilted_mutual_inductance(coil_rings(coil + 1, 0.02555, 0.002), rings, np.array([10.0, 170.0]))
        wanted = stator + rotor + 2 * mutual
        if connection == "parallel":
            wanted = parallel_inductance(stator, rotor, mutual)
        assert coils.inductance_low[coil, 0] == pytest.approx(wanted[0], rel=2e-4)
        assert coils.inductance[coil, 0] == pytest.approx(wanted[1], rel=2e-4)
        assert moved.able[coil]


def test_a_rotor_has_as_many_turns_as_turn_inside_the_bore() -> None:
    """The corner of the rotor stays 0.5 mm clear of nine tenths of the former's diameter."""
    _, moved = coils_with(request({**ROTOR, "rotor": "15 mm"}), wire(0.5, 0.55), TUBE)
    reach = (0.9 * 25 - 0.55) / 2 - 0.5
    most = 1 + int(2 * np.sqrt(reach**2 - 7.5**2) / 2.0)
    assert "rotor of 1 turn " in moved.label(0)
    assert f"rotor of {most} turns" in moved.label(19)


def test_a_parallel_rotor_that_turns_the_dial_back_is_left_out() -> None:
    """Above M = L2 more coupling lowers the inductance again: one frequency at two places."""
    tuning = {**ROTOR, "rotor": "19 mm", "turns": 1, "connection": "parallel"}
    coils, moved = coils_with(request(tuning, "2 kHz", "3 kHz"), wire(0.2, 0.22), former(25, 40))
    assert not moved.able.all()
    assert np.all(np.isfinite(coils.inductance)) and not coils.in_play[~moved.able].any()


# ---------------------------------------------------------------- limits and the plan


def solved(tuning: dict[str, Any], low: str = "3 MHz", high: str = "4 MHz", **tables: Any) -> Result:
    return partpick.solve(request(tuning, low, high, **tables), partpick.load_catalogue(), top=2)


ELEMENTS = {"core": CORE, "contact": {**CONTACT, "continuous": True}, "rotor": ROTOR}


@pytest.mark.parametrize("name", ELEMENTS)
def test_limits_hold_at_both_ends(name: str) -> None:
    """Q, reactance, inductance and the coil's own resonance, with the element at either end."""
    coil = {"reactance": ["40 Ω", "600 Ω"], "inductance": ["1.5 µH", "12 µH"], "self_resonance": 2}
    result = solved(ELEMENTS[name], coil=coil, limits={"q": 60, "parts_per_band": 1})
    assert result.candidates
    for candidate in result.candidates:
        (band,) = candidate.bands
        extra = band.extra
        for end, inductance, frequency in (
            ("low", extra["inductance_low_h"], 3e6),
            ("high", extra["inductance_high_h"], 4e6),
        ):
            assert isinstance(inductance, float)
            own = extra[f"self_capacitance_{end}_f"]
            assert 40 <= 2 * np.pi * frequency * inductance <= 600
            assert 1.5e-6 <= inductance <= 12e-6
            assert isinstance(own, float)
            assert 1 / (2 * np.pi * np.sqrt(inductance * own)) >= 2 * 4e6
        assert band.q is not None and band.q >= 60


@pytest.mark.parametrize("name", ELEMENTS)
def test_the_tuned_ends_follow_from_what_is_told(name: str) -> None:
    """Covered with the margin; nulls where there is no capacitance; settings and the coil's table agree."""
    result = solved(ELEMENTS[name])
    candidate = result.candidates[0]
    (band,) = candidate.bands
    extra = band.extra
    for end in ("low", "high"):
        product = extra[f"inductance_{end}_h"] * extra[f"capacitance_{end}_f"]  # type: ignore[operator]
        assert extra[f"tuned_{end}_hz"] == pytest.approx(1 / (2 * np.pi * np.sqrt(product)), rel=1e-12)
    assert extra["tuned_low_hz"] <= 3e6 * 0.97 * (1 + 1e-9)  # type: ignore[operator]
    assert extra["tuned_high_hz"] >= 4e6 * 1.03 * (1 - 1e-9)  # type: ignore[operator]
    assert extra["tuning_low_f"] is None and extra["tuning_high_f"] is None and extra["series_padder_f"] is None
    assert "T" not in band.connection
    tuned = candidate.coils[0].extra["tuned"]
    assert isinstance(tuned, dict)
    assert tuned["setting"][0] == pytest.approx(extra["setting_low"])
    assert tuned["setting"][-1] == pytest.approx(extra["setting_high"])
    assert tuned["inductance_h"][-1] == pytest.approx(band.inductance, rel=1e-6)
    (element,) = [part for part in candidate.parts if part.kind == "tuning"]
    assert element.value is None and element.unit_price == 0.0 and element.description


def test_a_fixed_band_takes_the_coil_without_its_element() -> None:
    """Core drawn out, contact at the end, rotor off: the coil as wound, whose inductance the card tells."""
    bands = [{"name": "a", "from": "3 MHz", "to": "4 MHz"}, {"name": "b", "at": "7 MHz"}]
    for tuning in ELEMENTS.values():
        result = solved(tuning, band=bands)
        (coil,) = result.candidates[0].coils
        fixed = result.candidates[0].bands[1]
        assert coil.inductance == pytest.approx(fixed.inductance, rel=0.01)


def test_one_core_tunes_one_coil() -> None:
    """More coils than cores on the carriage are refused; [cover] stays within them."""
    bands = [{"name": "a", "from": "3 MHz", "to": "4 MHz"}, {"name": "b", "from": "6 MHz", "to": "7 MHz"}]
    with pytest.raises(RequestError, match="the sliding core tunes one coil"):
        request(CORE, band=bands, limits={"inductors": 2})
    assert request({**CORE, "sections": 2}, band=bands, limits={"inductors": 2}).limits.inductors == 2
    asked = request_from_tables({"cover": {"from": "3 MHz", "to": "6 MHz"}, "tuning": ROTOR}, "bands")
    result = partpick.solve(asked, partpick.load_catalogue(), top=1)
    assert result.candidates and result.candidates[0].inductor_count == 1
    assert "at most" in result.proof.searched


def test_nothing_fits_says_how_far_the_element_moves_the_inductance() -> None:
    """The ratio of inductance, what it gives in frequency, what the band needs, and ways out."""
    for tuning, way in ((CORE, "moves further"), (ROTOR, "fits its stator closer")):
        ruled = solved(tuning, "3 MHz", "14 MHz").ruled_out_by
        assert ruled is not None and ruled.limit == "tuning"
        assert "moves the inductance" in ruled.text and "in frequency; band a needs 4.95" in ruled.text
        assert way in ruled.text and "bands, or" in ruled.text


REFUSED = {
    "a core longer than its travel": ({**CORE, "travel": "15 mm"}, {}, "tuning.length.*longer than the travel"),
    "a core for no former": ({**CORE, "diameter": "600 mm"}, {}, "tuning.diameter.*goes into no former"),
    "a rotor that does not fit": ({**ROTOR, "rotor": "600 mm"}, {}, "tuning.rotor.*does not turn inside any former"),
    "rotor turns that do not fit": ({**ROTOR, "turns": 1000}, {}, "tuning.rotor.*with 1000 turns"),
    "an angle beyond half a turn": ({**ROTOR, "to": 270}, {}, "tuning.to.*0 .aiding. to 180"),
    "a contact that cannot move": ({**CONTACT, "least_turns": 900}, {}, "tuning.least_turns.*no contact would move"),
    "a measured coil": (CORE, {"coil": {"measured": "4 µH"}}, "coil.measured.*does not say"),
    "alignment": (CORE, {"limits": {"alignable": "worst case"}}, "limits.alignable.*only with tuned capacitances"),
    "taps": (CONTACT, {"coil": {"taps": True}}, "coil.taps.*without taps"),
    "a stack": (CORE, {"switching": "stacked"}, 'a sliding core is planned only with switching = "separate"'),
    "other forms": (CORE, {"coil": {"forms": ["ring core"]}}, "goes with single-layer coils"),
    "more sections than there are": (
        {"kind": "variable capacitor", "low": "10 pF", "high": "100 pF", "sections": 2, "parallel": 3},
        {},
        "tuning.parallel: read 3: there are only 2 sections",
    ),
    "a varactor biased forwards": (
        {"kind": "varactor", "zero_bias": "30 pF", "grading": 0.5, "from": "-0.5 V", "to": "9 V"},
        {},
        "tuning.from.*-0.5 V",
    ),
    "ends the wrong way round": (
        {"kind": "variable capacitor", "low": "100 pF", "high": "10 pF"},
        {},
        "tuning.low: is not below tuning.high",
    ),
}


@pytest.mark.parametrize("name", REFUSED)
def test_bad_elements_are_refused_in_one_line(name: str) -> None:
    """The key, what was read, what would be accepted."""
    tuning, tables, said = REFUSED[name]
    with pytest.raises(RequestError, match=said) as refusal:
        partpick.solve(request(tuning, **tables), partpick.load_catalogue(), top=1)
    assert "\n" not in str(refusal.value)


# ---------------------------------------------------------------- the dial, the command line


def dial_of(candidate: Candidate, asked: Request) -> Any:
    from partpick.report.dial import dial_of as chart

    assert asked.tuning is not None
    return chart(asked.tuning, candidate, candidate.bands[0])


@pytest.mark.parametrize("name", ELEMENTS)
def test_the_dial_leads_back_to_the_frequency(name: str) -> None:
    """Each setting of the chart, put into the physics of that one coil: within the 0.05 % that the chart states."""
    asked = request(ELEMENTS[name])
    candidate = partpick.solve(asked, partpick.load_catalogue(), top=1).candidates[0]
    dial = dial_of(candidate, asked)
    coils = realisable_coils(asked, partpick.load_catalogue())
    labels = (coils.locate(coil)[0].label(coils.locate(coil)[1]) for coil in np.flatnonzero(coils.in_play[:, 0]))
    place = next(i for i, label in enumerate(labels) if label == candidate.coils[0].label)
    coil = int(np.flatnonzero(coils.in_play[:, 0])[place])
    moved = coils.moved
    assert moved is not None
    _, inductance, _ = moved.curve(coil)
    extra = candidate.bands[0].extra
    fixed = [extra[f"capacitance_{end}_f"] - extra[f"self_capacitance_{end}_f"] for end in ("low", "high")]  # type: ignore[operator]
    ends = [extra["tuned_low_hz"], extra["tuned_high_hz"]]
    for point in dial.points:
        exact, own = exact_coil(name, coils, coil, point.setting)
        exact += np.interp(point.frequency, ends, [extra["inductance_low_h"] - inductance[0], 0.0])  # type: ignore[operator, list-item]
        total = np.interp(point.frequency, ends, fixed) + own  # type: ignore[arg-type]
        assert 1 / (2 * np.pi * np.sqrt(exact * total)) == pytest.approx(point.frequency, rel=5e-4)
    rates = {np.sign(point.rate) for point in dial.points if point.point != "tuned end"}
    assert len(rates) == 1, "a dial that turns back"


def exact_coil(name: str, coils: Coils, coil: int, setting: float) -> tuple[float, float]:
    """Return inductance and self-capacitance with the element at a setting."""
    block, row = coils.locate(coil)
    turns, mean, pitch = int(block.turns[row]), float(block.mean_diameter[row]), float(block.pitch[row])
    empty, own = float(block.inductance[row, 0]), float(block.self_capacitance[row])
    if name == "core":
        offset = core_offset(setting / 1e3, turns * pitch, 0.02)
        return empty + float(core_inductance_rise(turns, mean, turns * pitch, 0.006, 0.02, 10.0, offset)), own
    if name == "contact":
        make = block.inductance[row - turns + 1 : row + 1, 0]
        slow = block.inductance_dc[row - turns + 1 : row + 1]
        left = max(turns - setting, 1.0)  # of a part of a turn its share
        used, rest = (float(section_inductance(slow, count)) for count in (turns - left, left))
        mutual = (slow[-1] - used - rest) / 2 * min(turns - setting, 1.0)
        return float(section_inductance(make, setting)), own * (1 + mutual / used) ** 2
    moved = coils.moved
    assert moved is not None
    count = int(moved.label(coil).split()[2])
    pair = coil_rings(turns, mean, pitch), coil_rings(count, 0.02, pitch)
    opposed = float(tilted_mutual_inductance(*pair, 180.0))
    whole = float(coils.inductance[coil, 0]) + 2 * (float(tilted_mutual_inductance(*pair, setting)) - opposed)
    share = (empty + float(tilted_mutual_inductance(*pair, setting))) / whole
    rotor = float(solenoid_self_capacitance(0.02, count * pitch / 0.02))
    return whole, own * share**2 + rotor * (1 - share) ** 2


def test_a_contact_that_steps_has_one_point_a_turn() -> None:
    """It stands nowhere else."""
    asked = request(CONTACT)
    candidate = partpick.solve(asked, partpick.load_catalogue(), top=1).candidates[0]
    dial = dial_of(candidate, asked)
    settings = [point.setting for point in dial.points]
    assert settings == list(range(int(settings[0]), 2, -1))
    assert any("steps from turn to turn" in said for said in candidate.warnings)


def test_a_pair_with_a_range_takes_an_element_of_any_kind(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Keys after the kind, as the plan has them; JSON, parts list, dial, netlist and sheet are written."""
    monkeypatch.chdir(tmp_path)
    element = "sliding core:diameter=6mm;length=20mm;permeability=10;travel=25mm"
    outputs = ("--json", "r.json", "--bom", "b.csv", "--dial", "d.csv", "--netlist", "n.cir", "--sheet", "s.html")
    done = run("pair", "3MHz..4MHz", "--tuning", element, "--top", 1, *outputs)
    assert done.code == 0, done.err
    assert ",tuning,,,H,,\"sliding core: core of 6 mm by 20 mm" in Path("b.csv").read_text(encoding="utf-8")
    chart = Path("d.csv").read_text(encoding="utf-8").splitlines()
    assert chart[0].endswith("element_h") and len(chart) > 21 and ",mm," in chart[1]
    assert "tuned to its low end" in Path("n.cir").read_text(encoding="utf-8")
    done = run("pair", "3MHz..4MHz", "--tuning", "moving contact:continuous=true", "--top", 1)
    assert done.code == 0 and "turns" in done.out


def test_what_varies_in_an_element_shows_in_the_spread() -> None:
    """A core's tolerance weighs by its share of the inductance, so the pushed-in end spreads more."""
    result = solved({**CORE, "tolerance": "10 %"}, spread={"builds": 2000})
    wide = result.candidates[0].bands[0].extra["spread"]
    closer = solved({**CORE, "tolerance": "0.1 %"}, spread={"builds": 2000})
    narrow = closer.candidates[0].bands[0].extra["spread"]
    assert isinstance(wide, dict) and isinstance(narrow, dict)
    assert wide["tuned_low_most_hz"] > narrow["tuned_low_most_hz"]


def test_every_candidate_is_of_the_asked_kind_only() -> None:
    """Other forms than single layers cannot be tuned so."""
    for tuning in ELEMENTS.values():
        assert {coil.form for c in solved(tuning).candidates for coil in c.coils} == {"solenoid"}


def test_figures_of_the_search_are_those_of_the_parts() -> None:
    """The recheck runs on every candidate; a coil that is not tuned is untouched."""
    asked = request(CORE)
    every = replace(asked.coil, least_wound=0.0)  # or coils that no band can use would be left out
    plain = replace(asked, coil=every, bands=(replace(asked.bands[0], at=4e6, low=None, high=None),))
    tuned, fixed = (realisable_coils(each, partpick.load_catalogue()) for each in (asked, plain))
    assert np.array_equal(tuned.alone, fixed.inductance)
