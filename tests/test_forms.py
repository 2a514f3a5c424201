"""Coils of every winding form from a stock of a few parts: what fits, limits, spread, loss and words."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from smallstock import bundle, core, former, inductor, of_turns, stock, wire, wound

from partpick import candidates
from partpick.candidates import FORMS
from partpick.catalogue import load_catalogue
from partpick.forms.unwound import unwound
from partpick.physics.cores import ring_leak
from partpick.physics.filaments import loop_inductance
from partpick.physics.multilayer import layered_inductance
from partpick.physics.sliding_core import core_inductance_rise
from partpick.physics.solenoid import solenoid_family
from partpick.plankeys import FORMS as KNOWN_FORMS
from partpick.request import Band, CoilRules, Request

POT = core("pot", 18, None, 11, al=160e-9, permeability=None, tolerance=0.03, frequency_low=50e3, frequency_high=500e3)
ROD = core("rod", 10, None, 100, permeability=120.0, tolerance=0.2)
THIN, THICK = wire(0.2, 0.226), wire(0.5, 0.544)


def test_every_form_may_be_asked_for_in_a_plan() -> None:
    """A form that the plan does not know could never be chosen alone."""
    assert tuple(FORMS) == KNOWN_FORMS


# ---------------------------------------------------------------- pot cores


def test_a_pot_core_has_al_times_turns_squared() -> None:
    """Definition of the inductance factor (IEC 60205); 63 turns on 250 nH are 0.992 mH."""
    coils = wound("pot core", 200e3, core("pot", 22, None, 13, al=250e-9), THIN)
    assert coils.inductance[of_turns(coils, 63), 0] == pytest.approx(63**2 * 250e-9)
    assert coils.inductance[of_turns(coils, 63), 0] == pytest.approx(1e-3, rel=0.01)


def test_a_pot_core_takes_no_more_than_its_window_holds() -> None:
    """Square lay: a wire twice as thick leaves a quarter of the turns, or fewer."""
    thin = wound("pot core", 200e3, POT, wire(0.45, 0.5))
    thick = wound("pot core", 200e3, POT, wire(0.9, 1.0))
    assert 0 < thick.turns.max() <= thin.turns.max() / 4
    assert not len(wound("pot core", 200e3, POT, wire(3.0, 3.2)))


def test_bare_wire_does_not_go_into_a_window() -> None:
    """Its turns would touch."""
    assert not len(wound("pot core", 200e3, POT, wire(0.5)))


def test_thinner_wire_serves_where_thicker_has_no_room() -> None:
    """Three gauges: a count of turns takes the two thickest that fit it, never none."""
    coils = wound("pot core", 200e3, POT, wire(0.25, 0.281), wire(0.4, 0.439), wire(0.63, 0.679))
    bare = coils.wire_diameter * 1e3
    assert set(np.round(bare[coils.turns == 10], 3)) == {0.63, 0.4}
    most = {gauge: coils.turns[np.isclose(bare, gauge)].max() for gauge in (0.25, 0.4, 0.63)}
    assert set(np.round(bare[coils.turns == most[0.63] + 1], 3)) == {0.4, 0.25}
    assert set(np.round(bare[coils.turns == most[0.4] + 1], 3)) == {0.25}


def test_stranded_wire_gives_a_pot_core_more_q_than_solid() -> None:
    """The reason for stranded wire at 50 to 500 kHz (common practice, no source); never above the material's."""
    solid = wound("pot core", 300e3, POT, THICK)
    strands = wound("pot core", 300e3, POT, bundle(60, 0.05))
    turns = 40
    by_kind = [coils.q[of_turns(coils, turns), 0] for coils in (solid, strands)]
    assert by_kind[0] < by_kind[1] < 200.0


def test_a_core_outside_its_range_has_no_q_and_says_why() -> None:
    """Issue: material out of its frequency range is a warning, and Q is null."""
    coils = wound("pot core", 1.5e6, POT, THIN)
    assert np.isnan(coils.q).all() and np.isnan(coils.q_spread).all()
    assert coils.band_notes(0, 0) == ("pot 18 is outside its useful range, 50 kHz to 500 kHz: Q unknown",)
    assert coils.loss_by_cause(0, 0)["core"] is None
    assert wound("pot core", 200e3, POT, THIN).band_notes(0, 0) == ()


# ---------------------------------------------------------------- rods


def test_a_rod_coil_is_the_empty_coil_and_what_the_rod_adds() -> None:
    """Boundary elements for this one coil, which the table only interpolates: within 2 %."""
    coils = wound("rod core", 500e3, ROD, THICK)
    turns = 40
    diameter, length = 10e-3 + 0.544e-3, turns * 0.544e-3
    empty = solenoid_family(turns, diameter, 0.5e-3, 0.544e-3)[-1]
    rise = core_inductance_rise(turns, diameter, length, 10e-3, 0.1, 120.0, 0.0)
    assert coils.inductance_dc[of_turns(coils, turns)] == pytest.approx(empty + rise, rel=0.02)


def test_a_measured_al_of_a_rod_wins_over_its_permeability() -> None:
    """Contract: `al`, where it is known, wins."""
    coils = wound("rod core", 500e3, core("rod", 10, None, 100, permeability=120.0, al=60e-9, tolerance=0.05), THICK)
    place = of_turns(coils, 40)
    assert coils.inductance_dc[place] == pytest.approx(40**2 * 60e-9)
    assert coils.spread[place] == pytest.approx(0.05)


def test_a_rod_outside_the_computed_range_is_said_and_spread_wide() -> None:
    """Issue: outside a formula's range a warning that says the range and a wider spread."""
    inside = wound("rod core", 500e3, ROD, THICK)
    outside = wound("rod core", 500e3, core("rod", 10, None, 100, permeability=20.0, tolerance=0.2), THICK)
    assert not inside.band_notes(of_turns(inside, 40), 0)
    assert "permeability 50 to 1000" in outside.band_notes(of_turns(outside, 40), 0)[0]
    assert outside.spread[of_turns(outside, 40)] > inside.spread[of_turns(inside, 40)]


# ---------------------------------------------------------------- many layers


@pytest.mark.parametrize("layers", [3, 5, 8])
def test_full_layers_are_within_their_spread_of_the_sum_over_turns(layers: int) -> None:
    """The published formula against coaxial rings, one by one."""
    coils = wound("multilayer", 200e3, former(8, 18), wire(0.25, 0.281))
    a_layer = int(4e-3 / 0.281e-3)
    place = of_turns(coils, layers * a_layer)
    summed = layered_inductance(layers, a_layer, 8e-3, 0.281e-3, 0.281e-3, 0.25e-3)
    assert abs(coils.inductance_dc[place] / summed - 1) <= coils.spread[place]


def test_more_turns_never_lower_the_inductance() -> None:
    """Monotonic in turns, over every layer that begins."""
    coils = wound("multilayer", 200e3, former(8, 18), THIN)
    assert (np.diff(coils.inductance_dc[np.argsort(coils.turns)]) > 0).all()


def test_many_layers_go_on_small_plain_tubes_only() -> None:
    """Layers fill a groove, slip on a mandrel, and make no coil of sense on a wide tube."""
    wide, grooved = former(50, 50), former(10, 25, 1.0, support="ribbed")
    assert not len(wound("multilayer", 200e3, wide, THIN))
    assert not len(wound("multilayer", 200e3, grooved, THIN))
    assert len(wound("multilayer", 200e3, former(10, 25), THIN))


def test_a_short_tube_leaves_the_formulas_range_and_says_so() -> None:
    """A winding 0.4 mm long on a tube of 10 mm is a flat disc: warned, 20 % of spread."""
    coils = wound("multilayer", 200e3, former(10, 0.4), THIN)
    assert len(coils)
    assert any("outside the formula's range" in note for note in coils.band_notes(0, 0))
    assert coils.spread[0] > 0.2


def test_many_layers_need_twice_the_frequency_as_self_resonance() -> None:
    """Contract: self_resonance is 3 by default, for bought and multilayer coils 2."""
    parts: tuple[Any, ...] = (former(8, 18), THIN)
    free = wound("multilayer", 1.4e6, *parts)
    own = 1 / (2 * np.pi * np.sqrt(free.inductance[:, 0] * free.self_capacitance))
    default = wound("multilayer", 1.4e6, *parts, self_resonance=3.0, self_resonance_stated=False)
    stated = wound("multilayer", 1.4e6, *parts, self_resonance=3.0, self_resonance_stated=True)
    assert list(free.turns[own >= 2 * 1.4e6]) == list(default.turns[default.in_play[:, 0]])
    assert stated.in_play.sum() < default.in_play.sum()


# ---------------------------------------------------------------- single layers


def test_one_turn_on_a_former_is_the_loop_of_its_wire() -> None:
    """Limiting case: the published inductance of a thin ring, less what radio frequency takes of its inside."""
    coils = wound("solenoid", 100e6, former(50, 10), wire(1.0, 1.062))
    loop = loop_inductance(51.062e-3, 1e-3)
    place = of_turns(coils, 1)
    assert coils.inductance_dc[place] == pytest.approx(loop)
    internal = 4e-7 * np.pi * 51.062e-3 / 8
    assert loop - internal < coils.inductance[place, 0] < loop
    assert coils.loss_by_cause(place, 0)["proximity"] == 0.0
    assert coils.blocks[0].label(place).startswith("1 turn of")


def test_stranded_wire_goes_on_tubes_and_rings_and_loses_less_at_medium_frequency() -> None:
    """About equal copper, 60 strands of 0.05 mm against 0.4 mm solid: at 500 kHz the strands win."""
    tube = former(32, 40, "twin")
    for form, support in (("solenoid", tube), ("ring core", core("ring", 36, 23, 12, permeability=9.0))):
        strands = wound(form, 500e3, support, bundle(60, 0.05))
        solid = wound(form, 500e3, support, wire(0.4, 0.484))  # the same pitch
        both = [
            sum(coils.loss_by_cause(of_turns(coils, 30), 0)[cause] or 0.0 for cause in ("skin", "proximity"))
            for coils in (strands, solid)
        ]
        assert both[0] < both[1], form


def test_stranded_wire_above_its_range_has_no_q() -> None:
    """The formula ends at 3 MHz: null and a word, never a silent number."""
    coils = wound("solenoid", 7e6, former(32, 40, "twin"), bundle(60, 0.05))
    assert np.isnan(coils.q).all()
    assert "above 3 MHz" in coils.band_notes(0, 0)[0]
    assert np.isfinite(wound("solenoid", 2e6, former(32, 40, "twin"), bundle(60, 0.05)).q).all()


def test_close_winding_on_a_short_coil_is_said_to_be_doubtful() -> None:
    """The corner of the published proximity table that computations contradict: d/s 0.7 and more, l/D to 1."""
    close = wound("solenoid", 7e6, former(20, 40), THICK)
    said = {turns: close.band_notes(of_turns(close, turns), 0) for turns in (1, 10, 70)}
    assert "doubtful" in said[10][0]
    assert not said[1] and not said[70]
    spaced = wound("solenoid", 7e6, former(20, 40, "twin"), THICK)
    assert not spaced.band_notes(of_turns(spaced, 10), 0)
    assert close.q_spread[of_turns(close, 10), 0] > spaced.q_spread[of_turns(spaced, 10), 0]


def test_springback_widens_the_spread_of_a_self_supporting_coil() -> None:
    """The same coil on a grooved former is held; off a mandrel it opens by about 2 % (common practice, no source)."""
    bare = wire(1.0)
    held = wound("solenoid", 30e6, former(10, 20, 3.0, support="ribbed", tolerance=0.005), bare)
    free = wound("solenoid", 30e6, former(10, 20, 3.0, support="mandrel", tolerance=0.005), bare)
    pair = [coils.spread[of_turns(coils, 6)] for coils in (held, free)]
    assert pair[1] > 2 * pair[0]


def test_the_spread_follows_the_former() -> None:
    """Propagated, not a fixed percentage: four times the tolerance of the tube shows."""
    close, loose = (
        wound("solenoid", 7e6, former(20, 40, 2.0, support="ribbed", tolerance=tolerance), wire(1.0, 1.062))
        for tolerance in (0.005, 0.02)
    )
    place = of_turns(close, 15)
    assert 0.005 < close.spread[place] < 0.02 < loose.spread[place] < 0.05


def test_a_leaking_ring_says_so_and_spreads_as_far() -> None:
    """Issue: low-permeability rings leak. A plastic ring with few turns leaks much, ferrite hardly."""
    plastic = wound("ring core", 30e6, core("ring", 20, 10, 7, permeability=1.0, tolerance=0.03), THICK)
    ferrite = wound("ring core", 30e6, core("ring", 20, 10, 7, permeability=850.0, tolerance=0.03), THICK)
    place = of_turns(plastic, 8)
    leak = ring_leak(8, 20e-3, 10e-3, 7e-3, 1.0, 0.544e-3)
    assert plastic.spread[place] > leak > 0.2
    assert "leaks" in plastic.band_notes(place, 0)[0]
    assert ferrite.spread[place] == pytest.approx(0.03, rel=0.01)
    assert not ferrite.band_notes(place, 0)


def test_a_ring_with_measured_al_has_nothing_to_leak() -> None:
    """What was measured holds its leak."""
    coils = wound("ring core", 30e6, core("ring", 20, 10, 7, permeability=1.0, al=1.5e-9, tolerance=0.03), THICK)
    assert coils.spread[0] == pytest.approx(0.03)
    assert coils.inductance[of_turns(coils, 10), 0] == pytest.approx(150e-9)


def test_losses_by_cause_add_up_to_q() -> None:
    """Whatever the form, 1/Q is the sum of what its causes take."""
    cases: dict[str, tuple[Any, ...]] = {
        "solenoid": (former(20, 40), THICK),
        "ring core": (core("ring", 20, 10, 7, permeability=9.0), THICK),
        "pot core": (POT, THICK),
        "rod core": (ROD, THICK),
        "multilayer": (former(8, 18), THIN),
    }
    for form, parts in cases.items():
        coils = wound(form, 300e3, *parts)
        causes = coils.loss_by_cause(0, 0)
        assert sum(loss or 0.0 for loss in causes.values()) == pytest.approx(1 / coils.q[0, 0]), form
        assert None not in causes.values()
        below, above = coils.q_spread[0]
        assert 0 < below < 1 and above >= 0, form


def test_the_loss_in_a_former_by_hand() -> None:
    """20 turns at pitch 1 mm on 20 mm: w^2 L C p tan d with the coil's own L, Medhurst's C and Knight's share.

    l/D = 20/20.544, H = 0.46 pF/cm near l/D = 1 (Medhurst 1947), so C = 0.945 pF; k = 1.820 at D/l = 1.0272, so
    p = 2.56 k/(2 + 3.56 k) = 0.5495.
    """
    coils = wound("solenoid", 10e6, former(20, 40, 1.0, support="ribbed", loss_tangent=0.02), THICK)
    place = of_turns(coils, 20)
    expected = (2 * np.pi * 10e6) ** 2 * coils.inductance[place, 0] * 0.945e-12 * 0.5495 * 0.02
    assert coils.loss_by_cause(place, 0)["former"] == pytest.approx(expected, rel=2e-3)


def test_former_loss_follows_what_the_field_is_in() -> None:
    """None in air and in a core's own Q; the tube's material decides; between layers it is the wire's covering."""
    tube = {t: wound("solenoid", 7e6, former(20, 40, loss_tangent=t), THICK) for t in (0.0, 0.01, 0.02)}
    loss = {t: coils.loss_by_cause(9, 0)["former"] for t, coils in tube.items()}
    assert loss[0.0] == 0.0 and loss[0.02] == pytest.approx(2 * (loss[0.01] or 0.0))
    assert tube[0.02].q[9, 0] < tube[0.01].q[9, 0] < tube[0.0].q[9, 0]
    assert tube[0.02].q_spread[9, 1] > tube[0.0].q_spread[9, 1]
    for form, support in {"ring core": core("ring", 20, 10, 7, permeability=9.0), "rod core": ROD}.items():
        assert wound(form, 300e3, support, THICK).loss_by_cause(5, 0)["former"] == 0.0
    layers = [wound("multilayer", 300e3, former(8, 18, loss_tangent=t), THIN) for t in (0.0, 0.1)]
    both = [coils.loss_by_cause(9, 0)["former"] or 0.0 for coils in layers]
    assert both[0] == both[1] > 0.0


def test_idle_turns_of_a_tapped_coil_lose_in_the_former_too() -> None:
    """Energy apart: half in the whole coil's field at the voltage that the idle turns swing to."""
    coils = wound("solenoid", 7e6, former(20, 40, loss_tangent=0.02), THICK)
    whole, turns = of_turns(coils, 30), 12
    row, across = of_turns(coils, turns), coils.section_self_capacitance(of_turns(coils, 30), turns)
    further = float(coils.section_loss(row, across)[0])
    omega = 2 * np.pi * 7e6
    conductance = omega * across * coils.loss_tangent[row]  # of the whole field, seen across the section
    whole_loss = conductance * omega * coils.inductance[row, 0]
    assert coils.loss_by_cause(row, 0)["former"] + further == pytest.approx(whole_loss)
    assert further > 0.0 and coils.section_loss(whole, coils.self_capacitance[whole])[0] == 0.0


def test_nobody_says_what_the_loss_of_a_bought_coil_is_made_of() -> None:
    """Its Q is known as a whole, within 30 % (common practice, no source)."""
    coils = wound("bought", 7e6, inductor(4.7e-6), inductor(1e-6, self_capacitance=None))
    assert set(coils.loss_by_cause(0, 0).values()) == {None}
    assert coils.q_spread[0] == pytest.approx([0.3, 0.3])
    assert np.isfinite(coils.self_capacitance_spread[0]).all() and np.isnan(coils.self_capacitance_spread[1]).all()


def test_strays_of_a_coil_spread_by_what_is_known_of_its_form() -> None:
    """A solenoid's table is close, a ring's rule of thumb is not."""
    solenoid = wound("solenoid", 7e6, former(20, 40), THICK)
    ring = wound("ring core", 7e6, core("ring", 20, 10, 7, permeability=9.0), THICK)
    place = of_turns(solenoid, 36)
    assert solenoid.self_capacitance_spread[place, 1] == pytest.approx(0.08)
    assert solenoid.self_capacitance_spread[place, 0] > 0.2  # down to a coil in air
    assert ring.self_capacitance_spread[0] == pytest.approx([0.5, 0.5])


# ---------------------------------------------------------------- the whole


def test_all_figures_scale_with_size() -> None:
    """All lengths by 2: low-frequency inductance by 2, whatever the form."""
    for form, parts in {
        "solenoid": (lambda k: (former(10 * k, 20 * k), wire(0.5 * k, 0.55 * k))),
        "multilayer": (lambda k: (former(4 * k, 9 * k), wire(0.2 * k, 0.22 * k))),
        "rod core": (lambda k: (core("rod", 8 * k, None, 80 * k, permeability=120.0), wire(0.5 * k, 0.55 * k))),
    }.items():
        once, twice = (wound(form, 1e6, *parts(k)) for k in (1, 2))
        place = int(np.flatnonzero(once.turns == np.median(once.turns).round())[0])
        same = of_turns(twice, int(once.turns[place]))
        assert twice.inductance_dc[same] == pytest.approx(2 * once.inductance_dc[place]), form


def test_few_gauges_leave_no_wire_of_a_small_drawer_out() -> None:
    """Thinning is for long lists: with a dozen gauges each of them is wound on a rod."""
    wires = [wire(0.2 * 1.05**i, 0.23 * 1.05**i) for i in range(12)]
    coils = wound("rod core", 500e3, ROD, *wires)
    assert len({round(d, 9) for d in coils.wire_diameter}) == 12
    more = wound("rod core", 500e3, ROD, *wires, wire(0.6, 0.65))
    assert 1 < len({round(d, 9) for d in more.wire_diameter}) < 12


def test_the_shipped_stock_is_wound_in_every_form_within_its_size() -> None:
    """Some 120,000 windings and no more: start-up and search are paid by the coil."""
    request = Request(command="pair", bands=(Band(name="if", at=455e3),), coil=CoilRules())
    coils = candidates.realisable_coils(request, load_catalogue())
    assert {block.form for block in coils.blocks} == set(FORMS)
    assert len(coils) < 125_000
    assert np.isfinite(coils.inductance).all() and (coils.inductance > 0).all()
    assert np.isfinite(coils.self_capacitance).all() and (coils.spread > 0).all()
    assert len(set(coils.rank)) == len(coils)


def test_no_stock_gives_no_coil() -> None:
    """Every form bears an empty catalogue."""
    request = Request(command="pair", bands=(Band(name="if", at=455e3),), coil=CoilRules())
    assert not len(candidates.realisable_coils(request, stock()))
    assert not len(candidates.realisable_coils(request, stock(POT, ROD, former(8, 18))))


def test_what_no_wire_fits_is_named_with_its_column() -> None:
    """Issue: wire that does not fit groove or window is one clear line, not a silence."""
    fine = (former(20, 25), former(20, 25, 1.0, support="ribbed"), POT, core("ring", 20, 10, 7, permeability=9.0), ROD)
    assert not unwound(stock(THICK, *fine))
    narrow = former(30, 25, 0.3, support="ribbed")
    tiny = (core("ring", 4, 0.5, 2, permeability=9.0), core("pot", 4, None, 2, al=1e-7))
    said = unwound(stock(THICK, *fine, narrow, *tiny))
    assert [text.split(":")[0] for text in said] == ["formers.csv, tube 30x25", "cores.csv, ring 4", "cores.csv, pot 4"]
    assert "300 \u00b5m (pitch)" in said[0] and "inner_diameter" in said[1] and "outer_diameter" in said[2]
    assert not unwound(stock(narrow))
    assert not unwound(load_catalogue())
