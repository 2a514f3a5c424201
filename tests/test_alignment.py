"""Adjusting built units: shares against closed forms and against every corner, settings that do what they say."""

from __future__ import annotations

import itertools
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from handmade import band as band_figures
from handmade import candidate as one_candidate
from handmade import capacitor, coil
from hypothesis import given, settings
from hypothesis import strategies as st
from varying import COIL_PLACE, on_one_coil, swept, without_strays
from workbench import INDUCTORS, plan, ranked, run, write_drawer

from partpick.built.alignment import Alignment, alignment
from partpick.built.series import series
from partpick.built.steps import COIL_FIRST, EVENLY, HIGH_END, LOW_END, NOTHING, OWN_TRIMMER, Step, steps
from partpick.built.tank import VaryingTank
from partpick.built.variation import Variation
from partpick.catalogue import load_catalogue
from partpick.parts import Catalogue
from partpick.planfile import request_from_tables
from partpick.report.table import result_table
from partpick.request import Trimmer
from partpick.solving import solve

BUILDS = 100_000
WIDE, NARROW = Trimmer(low=2e-12, high=42e-12), Trimmer(low=2e-12, high=12e-12)


def aligned(variation: Variation, adjust: float = 0.0, limit: float | None = None, builds: int = BUILDS) -> Alignment:
    found = alignment(variation, {COIL_PLACE: adjust} if adjust else {}, limit, variation.draw(builds, 1))
    assert found is not None
    return found


def tanks(variation: Variation) -> list[VaryingTank]:
    return list(variation.tanks)


def test_nothing_to_adjust_is_no_alignment() -> None:
    """A unit without trimmer and slug has no such figures."""
    variation = on_one_coil([[100e-12]])
    assert alignment(variation, {}, 0.005, variation.draw(10, 1)) is None


def test_a_slug_aligns_the_share_of_coils_within_its_travel() -> None:
    """Uniform coil of 10 %, slug of 8 %: inner travel is 4.8 %; (1 + x)(1 + a) = 1 for x from 1/1.048 - 1 up."""
    size, adjust = 0.10, 0.08
    inner = 0.6 * adjust
    variation = without_strays(on_one_coil([[100e-12]], coil_size=size, part_size=0.0))
    found = aligned(variation, adjust, 1e-9)
    expected = (1 / (1 - inner) - 1 / (1 + inner)) / (2 * size)
    assert found.share == pytest.approx(expected, abs=0.005)
    assert not found.worst_case
    assert aligned(variation, 0.12, 1e-9).worst_case


def test_a_trimmer_aligns_the_share_of_capacitors_within_its_travel() -> None:
    """One uniform capacitor of 10 % = 10 pF; a trimmer of 2 to 12 pF moves 4 to 10 pF inside 20 to 80 %."""
    variation = without_strays(on_one_coil([[100e-12]], coil_size=0.0, part_size=0.10, trimmers=[NARROW]))
    found = aligned(variation)
    assert found.share == pytest.approx(6 / 20, abs=0.005)  # the middle is on frequency, so 3 pF either way of 10
    assert not found.worst_case
    closer = on_one_coil([[100e-12]], coil_size=0.0, part_size=0.049, trimmers=[NARROW])
    assert aligned(without_strays(closer)).worst_case


@settings(max_examples=60, deadline=None)
@given(
    sizes=st.tuples(*[st.floats(0.0, 0.12)] * 2),
    spans=st.tuples(*[st.floats(2e-12, 60e-12)] * 2),
    adjust=st.sampled_from([0.0, 0.03, 0.1]),
    limit=st.sampled_from([None, 0.004]),
    plain=st.booleans(),
)
def test_the_worst_case_is_that_of_every_corner(
    sizes: tuple[float, float], spans: tuple[float, float], adjust: float, limit: float | None, plain: bool
) -> None:
    """Each of the 2^6 corners of two bands on one coil is tried over a fine grid of coil settings.

    Self-capacitance is none: two bands that share it may get a careful no.
    """
    trimmers = [Trimmer(low=1e-12, high=1e-12 + spans[0]), None if plain else Trimmer(low=1e-12, high=1e-12 + spans[1])]
    variation = on_one_coil(
        [[100e-12], [47e-12]], coil_size=sizes[0], part_size=sizes[1], winding=0.0, trimmers=trimmers
    )
    found = aligned(variation, adjust, limit, builds=10)
    signs = np.array(list(itertools.product((-1.0, 1.0), repeat=len(variation.sources)))).T
    x = signs * variation.sizes[:, None]
    setting = np.linspace(-adjust, adjust, 1 + 400 * (adjust > 0))[:, None]
    answers = set()
    for give in (-3e-4, 3e-4):  # what is within a step of the grid from an end may count either way
        both = np.all([_comes_right(tank, x, setting, limit, give) for tank in tanks(variation)], axis=0)
        answers.add(bool(both.any(axis=0).all()))
    assert found.worst_case in answers


def _comes_right(
    tank: VaryingTank, x: np.ndarray, setting: np.ndarray, limit: float | None, give: float
) -> np.ndarray:
    inductance = tank.built_inductance(x) * (1 + setting)
    missing = 1 / ((2 * np.pi * tank.frequency) ** 2 * inductance) - tank.fixed_capacitance(x)
    if tank.trimmer is not None:
        edge = give * 100e-12
        return (missing >= tank.trimmer.low - edge) & (missing <= tank.trimmer.high + edge)
    error = 1 / (2 * np.pi * np.sqrt(inductance * tank.fixed_capacitance(x))) / tank.frequency - 1
    return np.ones(error.shape, dtype=bool) if limit is None else np.abs(error) <= limit + give


@pytest.mark.parametrize("adjust", [0.0, 0.06])
@pytest.mark.parametrize("trimmer", [None, WIDE])
def test_a_swept_band_is_aligned_where_one_setting_reaches_both_ends(adjust: float, trimmer: Trimmer | None) -> None:
    """Each build is tried over a fine grid of trimmer and slug: the lower end by one, the upper by the other."""
    if not adjust and trimmer is None:
        return  # nothing to adjust
    one = on_one_coil([[27e-12]], coil_size=0.08, part_size=0.1, trimmers=[trimmer])
    variation = swept(one, low=12e-12, high=90e-12, padder=330e-12, wanted=0.97)
    x = variation.draw(200, 1)
    found = alignment(variation, {COIL_PLACE: adjust} if adjust else {}, None, x)
    upper = variation.tanks[0]
    lower = upper.low_end
    assert found is not None and lower is not None
    slug = np.linspace(-0.6 * adjust, 0.6 * adjust, 1 + 120 * (adjust > 0))[:, None, None]
    turned = np.linspace(10e-12, 34e-12, 121)[None, :, None] if trimmer else np.zeros((1, 1, 1))

    def resonance(tank: VaryingTank) -> np.ndarray:
        total = tank.fixed_capacitance(x) + turned
        return 1 / (2 * np.pi * np.sqrt(tank.built_inductance(x) * (1 + slug) * total))

    down, up = resonance(lower) / lower.frequency, resonance(upper) / upper.frequency
    bounds = []
    for give in (-1e-3, 1e-3):  # a step of the grid
        bounds.append(((down <= 1 + give) & (up >= 1 - give)).any(axis=(0, 1)).mean())
    assert bounds[0] <= found.share <= bounds[1] < bounds[0] + 0.15
    assert 0.05 < found.share < 0.999


def test_a_unit_can_be_aligned_only_where_each_band_can() -> None:
    """Independent trimmers on sound coils: chances multiply; with all spread in the coil they do not."""
    parts = without_strays(on_one_coil([[100e-12]] * 2, coil_size=0.0, part_size=0.10, trimmers=[NARROW] * 2))
    winding = without_strays(on_one_coil([[100e-12]] * 2, coil_size=0.10, part_size=0.0, trimmers=[NARROW] * 2))
    for variation, power in ((parts, 2), (winding, 1)):
        found = aligned(variation)
        one = found.bands[0]
        assert one.share is not None
        assert found.share == pytest.approx(one.share**power, abs=0.005)


def test_a_slug_and_trimmers_do_together_what_neither_does_alone() -> None:
    """Coil 10 %: the slug takes the coil's error, the trimmers those of the capacitors."""
    networks = [[100e-12], [220e-12]]
    both = on_one_coil(networks, coil_size=0.10, part_size=0.05, stray_size=0.1, trimmers=[WIDE, WIDE])
    bare = replace(both, tanks=tuple(replace(tank, trimmer=None) for tank in tanks(both)))
    slug_alone = aligned(bare, 0.15, 0.002).share
    assert aligned(both).share < 0.9 and slug_alone < 0.5
    assert aligned(both, 0.15).share > 0.95


def test_settings_bring_the_nominal_unit_on_frequency() -> None:
    """The capacitance told resonates at the target with the coil as told."""
    for adjust in (0.0, 0.1):
        variation = on_one_coil([[100e-12], [220e-12]], trimmers=[WIDE, WIDE], off=0.005)
        found = aligned(variation, adjust)
        factor = found.coils[0].value if adjust else 1.0
        nothing = np.zeros((len(variation.sources), 1))
        for tank, own in zip(tanks(variation), found.bands, strict=True):
            assert own.trimmer is not None
            total = float(tank.fixed_capacitance(nothing)[0]) + own.trimmer.value
            resonance = 1 / (2 * np.pi * np.sqrt(tank.inductance * factor * total))
            assert resonance == pytest.approx(tank.frequency, rel=1e-12)
            assert own.trimmer.low <= own.trimmer.nominal <= own.trimmer.high


def test_settings_of_aligned_units_are_inside_20_to_80_per_cent() -> None:
    """What is counted as aligned has no setting near an end."""
    variation = on_one_coil([[100e-12], [220e-12]], coil_size=0.08, trimmers=[WIDE, WIDE])
    found = aligned(variation, 0.1)
    settings_told = [*found.coils, *(own.trimmer for own in found.bands if own.trimmer)]
    assert len(settings_told) == 3
    assert all(0.2 - 1e-9 <= each.low <= each.high <= 0.8 + 1e-9 for each in settings_told)


def test_slopes_are_those_of_a_turn_of_each_adjustment() -> None:
    """Shift for a pF and per cent of inductance against the resonance formula, central differences."""
    variation = on_one_coil([[100e-12]], trimmers=[WIDE])
    found = aligned(variation)
    tank, own = tanks(variation)[0], found.bands[0]
    assert own.trimmer is not None
    total = tank.nominal_fixed() + own.trimmer.value

    def resonance(inductance: float, capacitance: float) -> float:
        return float(1 / (2 * np.pi * np.sqrt(inductance * capacitance)))

    by_pf = resonance(tank.inductance, total + 5e-14) - resonance(tank.inductance, total - 5e-14)
    by_percent = resonance(tank.inductance * 1.005, total) - resonance(tank.inductance * 0.995, total)
    assert own.hertz_per_farad * 1e-13 == pytest.approx(by_pf, rel=1e-5)
    assert own.hertz_per_percent == pytest.approx(by_percent, rel=1e-4)


# ---------------------------------------------------------------- order of adjustment


def test_a_coil_is_set_before_the_trimmers_that_it_moves() -> None:
    """On its lowest band with the trimmer in the middle; then every trimmer, lowest band first."""
    variation = on_one_coil([[100e-12], [220e-12]], trimmers=[WIDE, WIDE])
    told = steps(aligned(variation, 0.1, builds=100), _two_bands(trimmers=(0, 1)))
    assert [(step.adjust, step.band, step.why) for step in told] == [
        ("L1", "band 1", COIL_FIRST),
        ("CT2", "band 1", OWN_TRIMMER),
        ("CT1", "band 0", OWN_TRIMMER),
    ]


def test_a_band_without_adjustment_is_measured() -> None:
    """Its place in the order is kept; a coil with two plain bands is set between them."""
    one = on_one_coil([[100e-12], [220e-12]], trimmers=[WIDE, None])
    told = steps(aligned(one, limit=0.005, builds=100), _two_bands(trimmers=(0,)))
    assert told == (
        Step(adjust=None, band="band 1", frequency=5e6, why=NOTHING),
        replace(told[1], adjust="CT1", band="band 0", why=OWN_TRIMMER),
    )
    none = on_one_coil([[100e-12], [220e-12]])
    told = steps(aligned(none, 0.1, 0.005, builds=100), _two_bands(trimmers=()))
    assert (told[0].adjust, told[0].why) == ("L1", EVENLY)


def _two_bands(trimmers: tuple[int, ...]) -> object:
    own = (band_figures("band 0", 7e6, 100e-12, ["C1"]), band_figures("band 1", 5e6, 220e-12, ["C2"]))
    parts = [
        capacitor(f"CT{place + 1}", kind="trimmer", label="2 pF to 42 pF", bands=(f"band {place}",))
        for place in trimmers
    ]
    return one_candidate(bands=own, coils=(coil(),), parts=tuple(parts))


LAYOUTS = {
    "separate": {"switching": "separate"},
    "stacked": {"switching": "stacked"},
    "shared": {"switching": "shared", "limits": {"parts": 3}},
}


@pytest.mark.parametrize("layout", LAYOUTS)
def test_the_steps_of_each_layout_leave_the_nominal_parts_on_frequency(layout: str) -> None:
    """Coil and trimmers set as told, one after the other: every band is on its target."""
    tables = {
        **LAYOUTS[layout],
        "coil": {"forms": ["bought"]},
        "trimmer": "4 pF..60 pF",
        "band": [{"name": "low", "at": "3.58 MHz"}, {"name": "high", "at": "5.2 MHz"}],
    }
    best = solve(request_from_tables(tables, "bands"), _all_adjustable(), top=1).candidates[0]
    told = best.extra["alignment"]
    assert isinstance(told, dict)
    assert [(step["adjust"], step["band"]) for step in told["steps"]] == [
        ("L1", "low"),
        ("CT1", "low"),
        ("CT2", "high"),
    ]
    coil_set = told["coils"][0]["inductance_over_nominal"]
    for band in best.bands:
        own = band.extra["alignment"]
        assert isinstance(own, dict) and band.capacitance is not None and band.trimmer is not None
        total = band.capacitance - band.trimmer + own["trimmer"]["set_to_f"]
        resonance = 1 / (2 * np.pi * np.sqrt(band.inductance * coil_set * total))
        assert resonance == pytest.approx(band.target, rel=1e-9)


def test_a_swept_band_has_its_low_end_set_by_the_coil_and_its_high_end_by_the_trimmer() -> None:
    """In turn until both stay; as told, the nominal parts cover the range."""
    tables = {
        "coil": {"forms": ["bought"]},
        "trimmer": "4 pF..60 pF",
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"},
        "band": [{"name": "coast", "from": "3.5 MHz", "to": "3.9 MHz"}],
    }
    result = solve(request_from_tables(tables, "bands"), _all_adjustable(), top=1)
    (band,), told = result.candidates[0].bands, result.candidates[0].extra["alignment"]
    assert isinstance(told, dict) and isinstance(band.extra["alignment"], dict)
    assert [(step["adjust"], step["to_hz"], step["why"]) for step in told["steps"]] == [
        ("L1", 3.5e6, LOW_END),
        ("CT1", 3.9e6, HIGH_END),
    ]
    moved = band.extra["alignment"]["trimmer"]["set_to_f"] - 32e-12
    y = told["coils"][0]["inductance_over_nominal"]
    ends = [
        1 / (2 * np.pi * np.sqrt(float(str(band.extra[inductance])) * y * (float(str(band.extra[total])) + moved)))
        for inductance, total in (("inductance_low_h", "capacitance_low_f"), ("inductance_low_h", "capacitance_high_f"))
    ]
    assert ends[0] <= 3.5e6 * (1 + 1e-9) and ends[1] >= 3.9e6 * (1 - 1e-3)
    text = " ".join(result_table(result).split())
    assert "1. L1 for coast (3.5 MHz), the tuning element closed" in text
    assert "the low end again, in turn until both stay" in text


def _all_adjustable() -> Catalogue:
    parts = load_catalogue(None)
    return replace(parts, inductors=tuple(replace(part, adjust=0.15) for part in parts.inductors))


# ---------------------------------------------------------------- a series of units


def test_spares_follow_from_the_yield() -> None:
    """Half of the units right: 50 are expected of 100 sets; nothing known or too few right: no spares."""
    unit = one_candidate()
    found = series(unit, 50, 0.8, {"C1": 60, "C2": None, "L1": 100})
    assert found.sets == 63  # 50/0.8 = 62.5
    first = found.pieces[0]
    assert (first.references, first.needed, first.spares, first.stock) == (("C1",), 50, 13, 60)
    assert series(unit, 50, None, {}).sets is None and series(unit, 50, 0.1, {}).sets is None
    assert series(unit, 50, 1.0, {}).price == pytest.approx(50 * 1.062)


# ---------------------------------------------------------------- from outside


def test_a_plan_with_trimmers_tells_how_to_align(tmp_path: Path) -> None:
    """Share, setting and steps reach the result file and the bench; a slug is a step of its own."""
    adjustable = [{**row, "adjust": "15 %"} for row in INDUCTORS]
    drawer = write_drawer(tmp_path / "drawer", inductors=adjustable)
    head = '[coil]\nforms = ["bought"]\n[trimmer]\nlow = "3 pF"\nhigh = "80 pF"\n[stray]\nshare = "none"\n'
    job = plan(tmp_path / "plan.toml", [("beacon", "7.1 MHz")], "units = 5\n" + head)
    best = ranked("bands", job, "--drawer", drawer)[0]
    own = best["alignment"]
    assert own["share_aligned"] > 0.99 and own["coils"][0]["reference"] == "L1"
    assert [step["adjust"] for step in own["steps"]] == ["L1", "CT1"]
    assert best["series"]["yield"] == own["share_aligned"]
    out = run("bands", job, "--drawer", drawer).out
    assert "1. L1 for beacon" in out and "2. CT1 for beacon" in out and "For 5 units" in out
    assert max(map(len, out.splitlines())) <= 80
