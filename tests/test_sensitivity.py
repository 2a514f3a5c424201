"""What each part does, against the resonance itself with that part moved."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from varying import on_one_coil, without_strays
from workbench import plan, ranked, write_drawer

from partpick.built.sensitivity import sensitivity, worth_improving
from partpick.built.variation import NORMAL_PARTS, UNIFORM_PARTS, Variation, deviation_of

UNIFORM = deviation_of(UNIFORM_PARTS)


def with_sizes(variation: Variation, **sizes: float) -> Variation:
    """Return the same with the tolerance of some references changed."""
    return replace(
        variation,
        sources=tuple(replace(s, size=sizes.get(s.reference, s.size)) for s in variation.sources),
    )


def test_each_part_shifts_as_the_resonance_does() -> None:
    """One per cent more of one source, all others nominal, against the table's figure."""
    variation = on_one_coil([[100e-12, 33e-12], [47e-12]])
    for row in sensitivity(variation, UNIFORM):
        place = next(i for i, s in enumerate(variation.sources) if s.reference == row.reference)
        tank = next(t for t in variation.tanks if t.name == row.band)
        x = np.zeros((len(variation.sources), 2))
        x[place] = (-0.005, 0.005)
        low, high = tank.resonance(x)
        assert row.hertz_per_percent == pytest.approx(high - low, rel=1e-4)


def test_shares_of_each_band_add_up_to_all_of_it() -> None:
    """Every source is in the table: wiring and self-capacitance too, the shared coil on each of its bands."""
    variation = on_one_coil([[100e-12, 33e-12], [47e-12]])
    rows = sensitivity(variation, UNIFORM)
    for tank in variation.tanks:
        own = [row for row in rows if row.band == tank.name]
        assert sum(row.share_of_variance for row in own) == pytest.approx(1.0)
        assert {"L1", "self-capacitance of L1"} <= {row.reference for row in own}


def test_shares_are_what_goes_when_a_part_is_exact() -> None:
    """Counted in builds: the variance of a band with one part made exact, against that part's share."""
    variation = on_one_coil([[100e-12, 47e-12]], coil_size=0.02, part_size=0.02, stray_size=0.1)
    tank = variation.tanks[0]
    whole = tank.resonance(variation.draw(200_000, 1)).var()
    for row in sensitivity(variation, UNIFORM):
        exact = with_sizes(variation, **{row.reference: 0.0})
        left = tank.resonance(exact.draw(200_000, 1)).var()
        assert 1 - left / whole == pytest.approx(row.share_of_variance, abs=0.02)


def test_drifts_of_the_parts_add_up_to_that_of_the_band() -> None:
    """Every contribution, strays included, sums to -(a_L + a_C)/2 of a tank of one coefficient."""
    variation = on_one_coil([[100e-12, 47e-12]])
    tank = variation.tanks[0]
    sources = tuple(replace(source, tempco=50e-6) for source in variation.sources)
    warm = Variation(sources=sources, tanks=(replace(tank, coil_tempco=30e-6),))
    drifts = [row.drift for row in sensitivity(warm, UNIFORM)]
    assert None not in drifts
    assert sum(each for each in drifts if each is not None) == pytest.approx(-(30e-6 + 50e-6) / 2)


def test_a_trimmer_drifts_as_far_as_it_is_set(tmp_path: Path) -> None:
    """With it the parts of a band add up to the band's drift, from the plan to the result."""
    drawer = write_drawer(tmp_path / "drawer")
    head = (
        '[coil]\nforms = ["bought"]\n[stray]\nshare = "none"\n[temperature]\nfrom = "10 \u00b0C"\nto = "30 \u00b0C"\n'
        '[trimmer]\nlow = "3 pF"\nhigh = "20 pF"\ntempco = "-200 ppm"\n'
    )
    best = ranked("bands", plan(tmp_path / "plan.toml", [("b", "6.6 MHz")], head), "--drawer", drawer)[0]
    rows = {row["reference"]: row for row in best["sensitivity"]}
    band, own = best["bands"][0], rows["trimmer of b"]
    assert sum(row["drift_per_k"] for row in rows.values()) == pytest.approx(band["temperature"]["drift_per_k"])
    set_to = band["alignment"]["trimmer"]["set_to_f"]
    fixed = band["capacitance_f"] - band["trimmer_f"]
    assert own["drift_per_k"] == pytest.approx(100e-6 * set_to / (fixed + set_to), rel=0.05)
    assert own["tolerance"] is None and own["share_of_variance"] == 0.0


def test_an_unknown_tempco_is_told_as_unknown() -> None:
    """Of that part alone; the others keep theirs."""
    variation = on_one_coil([[100e-12]])
    sources = tuple(replace(s, tempco=None) if s.kind == "capacitor" else s for s in variation.sources)
    rows = sensitivity(replace(variation, sources=sources), UNIFORM)
    assert [row.reference for row in rows if row.drift is None] == ["C3"]


def test_the_widest_part_is_the_one_to_buy_better() -> None:
    """Coil 2 %, capacitors 5 %: the larger capacitor; coil 10 %: the coil; strays cannot be bought."""
    variation = on_one_coil([[100e-12, 33e-12]], coil_size=0.02, stray_size=0.9)
    best = worth_improving(variation, UNIFORM)
    assert best is not None and best.reference == "C3"
    best = worth_improving(with_sizes(variation, L1=0.10), UNIFORM)
    assert best is not None and best.reference == "L1"


@pytest.mark.parametrize("parts", [UNIFORM_PARTS, NORMAL_PARTS])
def test_the_promise_of_a_better_part_is_kept(parts: str) -> None:
    """The spread told for the better part is that of builds with it."""
    variation = without_strays(on_one_coil([[100e-12]], coil_size=0.01, part_size=0.05))
    best = worth_improving(variation, deviation_of(parts))
    tank = variation.tanks[0]
    assert best is not None and best.reference == "C3"
    then = with_sizes(variation, C3=best.better)
    for told, built in ((best.deviation, variation), (best.deviation_then, then)):
        counted = np.log(tank.resonance(built.draw(200_000, 1, parts))).std()
        assert told == pytest.approx(counted, rel=0.01)


def test_nothing_is_worth_improving_where_every_part_is_close() -> None:
    """At 1 % and better there is no part to buy."""
    assert worth_improving(on_one_coil([[100e-12]], coil_size=0.01, part_size=0.005), UNIFORM) is None


def test_a_capacitor_of_a_stack_is_one_source_on_all_its_bands(tmp_path: Path) -> None:
    """Pieces that two bands share vary once: one reference, in the table of both bands, in the order of the parts."""
    rows = [{"value": f"{value} pF", "grade": "C0G", "tolerance": "5 %", "q": 1000} for value in (33, 47, 68, 120, 150)]
    drawer = write_drawer(tmp_path / "drawer", capacitors=rows)
    head = 'switching = "stacked"\n[coil]\nforms = ["bought"]\n[limits]\nerror = "5 %"\n[stray]\nshare = "none"\n'
    job = plan(tmp_path / "plan.toml", [("low", "5 MHz"), ("high", "7.1 MHz")], head)
    best = ranked("bands", job, "--drawer", drawer)[0]
    values = {part["reference"]: part["value_f"] for part in best["parts"] if part["kind"] == "capacitor"}
    low, high = best["bands"]
    assert set(high["capacitors"]) < set(low["capacitors"])
    for band in best["bands"]:
        own = {row["reference"]: row for row in best["sensitivity"] if row["band"] == band["name"]}
        assert {name for name in own if name.startswith("C")} == set(band["capacitors"])
        for name in band["capacitors"]:  # in parallel: half the share of each in all capacitance
            expected = -0.005 * band["resonance_hz"] * values[name] / band["capacitance_f"]
            assert own[name]["hertz_per_percent"] == pytest.approx(expected, rel=0.05)
