"""Drift of built units over temperature, and the swap that takes a measured drift out."""

from __future__ import annotations

import csv
from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from varying import on_one_coil, without_strays
from workbench import CAPACITORS, INDUCTORS, plan, ranked, run, write_drawer

from partpick.built.refit import swaps
from partpick.built.tank import VaryingTank
from partpick.built.variation import Variation
from partpick.built.warming import band_drift
from partpick.catalogue_defaults import GRADES
from partpick.parts import Capacitor
from partpick.request import Trimmer

PUBLISHED = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


CERAMICS = rows("class1_ceramics.csv")


def warmed(coil: float, capacitors: list[tuple[float, float, float]], coil_size: float = 0.0) -> Variation:
    """Return one band without strays: tempco of the coil, then (capacitance, tempco, its tolerance) of each."""
    variation = without_strays(on_one_coil([[value for value, _, _ in capacitors]]))
    tank = first(variation)
    sources = list(variation.sources)
    sources[tank.coil] = replace(sources[tank.coil], tempco_size=coil_size)
    for place, (_, tempco, size) in zip(tank.parts, capacitors, strict=True):
        sources[place] = replace(sources[place], tempco=tempco, tempco_size=size)
    return replace(variation, sources=tuple(sources), tanks=(replace(tank, coil_tempco=coil),))


def first(variation: Variation) -> VaryingTank:
    tank = variation.tanks[0]
    return tank


def eia_limits(code: str) -> tuple[float, float]:
    """Decode a class 1 code: figure, multiplier, tolerance. [1/K]"""
    meaning = {(row["position"], row["letter"]): float(row["meaning_ppm_per_k"]) for row in rows("class1_letters.csv")}
    figure, multiplier, tolerance = code
    value = meaning["figure", figure] * meaning["multiplier", multiplier] * 1e-6
    return value, meaning["tolerance", tolerance] * 1e-6


@pytest.mark.parametrize("row", CERAMICS, ids=lambda row: row["eia_code"])
def test_class_1_limits_bound_the_drift(row: dict[str, str]) -> None:
    """A tank of one ceramic drifts by half its coefficient, to the ends of EIA-198 and IEC 60384."""
    tempco, size = eia_limits(row["eia_code"])
    stated = float(row["tempco_ppm_per_k"]) * 1e-6, float(row["tempco_tolerance_ppm_per_k"]) * 1e-6
    assert (tempco, size) == pytest.approx(stated, abs=1e-12)
    variation = warmed(0.0, [(100e-12, tempco, size)])
    found = band_drift(variation, first(variation), 40.0)
    assert found is not None
    ends = found.nominal - found.spread, found.nominal + found.spread
    assert ends == pytest.approx((-(tempco + size) / 2, -(tempco - size) / 2), abs=1e-12)
    assert found.low == pytest.approx(found.nominal - 0.9 * found.spread, abs=1e-9)  # uniform: 5 % at each end


@pytest.mark.parametrize("row", CERAMICS, ids=lambda row: row["eia_code"])
def test_grades_without_stated_tempco_take_the_class_1_limits(row: dict[str, str]) -> None:
    """The defaults that the drift rests on are those of the codes."""
    for name in (row["eia_code"], row["traditional"]):
        grade = GRADES.get(name.casefold())
        if grade is not None:
            assert grade.tempco == pytest.approx(float(row["tempco_ppm_per_k"]) * 1e-6, abs=1e-12)
            assert grade.tempco_tolerance == pytest.approx(float(row["tempco_tolerance_ppm_per_k"]) * 1e-6)


def test_a_small_share_of_n750_takes_out_a_coil_of_40_ppm() -> None:
    """94.67 % C0G and 5.33 % N750: the row of temperature_drift.csv, alpha_L/750 of the capacitance."""
    variation = warmed(40e-6, [(94.67e-12, 0.0, 30e-6), (5.33e-12, -750e-6, 120e-6)])
    found = band_drift(variation, first(variation), 40.0)
    assert found is not None
    assert found.nominal == pytest.approx(0.0, abs=0.02e-6)
    assert found.spread == pytest.approx((0.9467 * 30e-6 + 0.0533 * 120e-6) / 2, rel=1e-3)


def test_shifts_are_those_of_a_tank_evaluated_warm() -> None:
    """The frequency at the upper temperature from L and C there, against the linear figure; strays are there too."""
    variation = on_one_coil([[100e-12, 47e-12]], inductance=4e-6)
    sources = list(variation.sources)
    tank = replace(first(variation), coil_tempco=80e-6)
    tempcos = [0.0, 100e-6, 100e-6, -30e-6, 150e-6]
    sources = [replace(source, tempco=t) for source, t in zip(sources, tempcos, strict=True)]
    variation = replace(variation, sources=tuple(sources), tanks=(tank,))
    found = band_drift(variation, tank, 30.0)
    warm = np.array([[80e-6], [100e-6], [100e-6], [-30e-6], [150e-6]]) * 30.0
    expected = float(tank.resonance(warm)[0]) - tank.frequency
    assert found is not None
    assert found.shift == pytest.approx(expected, rel=0.005)


def test_random_coefficients_fill_the_range_that_is_told() -> None:
    """Nine of ten units drift within the range: against draws of the coefficients themselves."""
    variation = warmed(50e-6, [(100e-12, 0.0, 30e-6), (47e-12, -150e-6, 30e-6)], coil_size=20e-6)
    found = band_drift(variation, first(variation), 40.0)
    assert found is not None
    draw = np.random.default_rng(2).uniform(-1, 1, (3, 200_000))
    capacitance = (100 * (30e-6 * draw[0]) + 47 * (-150e-6 + 30e-6 * draw[1])) / 147
    drift = -(50e-6 + 20e-6 * draw[2] + capacitance) / 2
    assert (found.low, found.high) == pytest.approx(tuple(np.quantile(drift, (0.05, 0.95))), abs=0.2e-6)


def test_a_trimmer_drifts_where_it_is_set() -> None:
    """Its share is that of the setting on frequency, not that of its middle; unknown, the drift is unknown."""
    trimmer = Trimmer(low=2e-12, high=22e-12, tempco=-200e-6)
    variation = on_one_coil([[100e-12]], strays=0.0, winding=0.0, trimmers=[trimmer])
    tank = replace(first(variation), inductance=4e-6 * (112 / 105))  # wants 5 pF of it
    found = band_drift(variation, tank, 1.0)
    assert found is not None
    assert found.nominal == pytest.approx(200e-6 * 5 / 105 / 2, rel=1e-9)
    unknown = replace(tank, trimmer=replace(trimmer, tempco=None))
    assert band_drift(variation, unknown, 1.0) is None


# ---------------------------------------------------------------- refit


def part(value: float, grade: str, tempco: float, size: float, q_below: float | None = None) -> Capacitor:
    return Capacitor(
        value=value * 1e-12, exact=Fraction(str(value)) / 10**12, grade=grade, tolerance=0.05, tempco=tempco,
        tempco_tolerance=size, q=1000, q_below=q_below, voltage=None, rf_current=None, series_inductance=None,
        quantity=None, unit_price=None, label=f"{value:g} pF {grade}", family="", source="",
    )  # fmt: skip


POOL = [part(v, "C0G", 0.0, 30e-6) for v in (33, 39, 47, 82, 91, 95, 100)] + [
    part(v, "N750", -750e-6, 120e-6) for v in (3.3, 4.7, 5, 6.8, 10)
]


def cool(value: float = 100e-12) -> Variation:
    """One C0G capacitor of 100 pF; its label is that of the pool."""
    variation = warmed(40e-6, [(value, 0.0, 30e-6)])
    sources = [replace(s, label="100 pF C0G") if s.kind == "capacitor" else s for s in variation.sources]
    return replace(variation, sources=tuple(sources))


def test_a_measured_drift_is_swapped_out_at_constant_capacitance() -> None:
    """-18 ppm/K asks for 36/750 of all in N750: 4.8 pF of 100 pF; 5 pF and 95 pF C0G take it to +0.75."""
    variation = cool()
    best = swaps(variation, first(variation), -18e-6, POOL)[0]
    assert best.by == ("5 pF N750", "95 pF C0G")
    assert best.drift == pytest.approx(-18e-6 + 0.05 * 750e-6 / 2)
    assert best.capacitance_change == pytest.approx(0.0, abs=1e-20)
    assert best.drift_spread == pytest.approx((0.05 * 120e-6 + 0.95 * 30e-6 + 30e-6) / 2)


def test_a_swap_does_what_the_drift_of_the_new_parts_says() -> None:
    """The measured drift less that of the tank before, plus that of the tank after."""
    variation = cool()
    before = band_drift(variation, first(variation), 1.0)
    after = warmed(40e-6, [(5e-12, -750e-6, 120e-6), (95e-12, 0.0, 30e-6)])
    then = band_drift(after, first(after), 1.0)
    best = swaps(variation, first(variation), -18e-6, POOL)[0]
    assert before is not None and then is not None
    assert best.drift == pytest.approx(-18e-6 + then.nominal - before.nominal, abs=1e-12)


def test_no_swap_is_told_that_makes_it_worse_or_moves_the_band() -> None:
    """An upward drift needs a positive grade, which is not there; and values that do not add up are no swap."""
    variation = cool()
    assert swaps(variation, first(variation), +18e-6, POOL) == ()
    assert swaps(variation, first(variation), -18e-6, [part(5, "N750", -750e-6, 120e-6), POOL[0]]) == ()


def test_a_grade_of_unknown_loss_is_no_way_out() -> None:
    """A film above its frequency would take the Q for the drift."""
    variation = cool()
    film = [part(5, "film", -750e-6, 120e-6, q_below=1e5), *POOL[:7]]
    assert swaps(variation, first(variation), -18e-6, film) == ()


# ---------------------------------------------------------------- from outside


def test_a_plan_gets_its_shift_over_the_range(tmp_path: Path) -> None:
    """[temperature] from and to: the shift of the result's own drift over the difference."""
    drawer = write_drawer(tmp_path / "drawer")
    head = '[limits]\nerror = "8 %"\n[temperature]\nfrom = "-10 \u00b0C"\nto = "40 \u00b0C"\n'
    job = plan(tmp_path / "plan.toml", [("beacon", "7.1 MHz")], head)
    best = ranked("bands", job, "--drawer", drawer)[0]
    band: dict[str, Any] = best["bands"][0]
    assert best["temperature"] == {"from_c": -10.0, "to_c": 40.0}
    assert band["temperature"]["drift_per_k"] == pytest.approx(band["drift_per_k"], rel=1e-3)
    assert band["temperature"]["shift_hz"] == pytest.approx(band["drift_per_k"] * 50 * 7.1e6, rel=1e-3)
    assert band["temperature"]["drift_spread_per_k"] == pytest.approx(band["drift_spread_per_k"], rel=1e-3)
    out = run("bands", job, "--drawer", drawer).out
    assert "Drift from -10 to 40 \u00b0C" in out and max(map(len, out.splitlines())) <= 80


def test_a_plan_with_a_measured_drift_gets_a_swap(tmp_path: Path) -> None:
    """Two N750 rows in the drawer are enough for one that leaves less than was measured."""
    more = [
        {"value": value, "grade": grade, "tolerance": "5 %", "q": 500}
        for value, grade in (("3.9 pF", "N750"), ("10 pF", "N750"), ("91 pF", "C0G"), ("95 pF", "C0G"))
    ]
    drawer = write_drawer(tmp_path / "drawer", capacitors=[*CAPACITORS, *more], inductors=INDUCTORS[1:])
    head = (
        '[coil]\nforms = ["bought"]\nself_resonance = "none"\n[capacitors]\ngrades = ["C0G"]\n'
        '[limits]\nerror = "10 %"\n'
        'parts_per_band = 1\n[temperature]\nfrom = "0 \u00b0C"\nto = "40 \u00b0C"\nmeasured_drift = "-18 ppm"\n'
    )
    job = plan(tmp_path / "plan.toml", [("beacon", "7.1 MHz")], head)
    best = ranked("bands", job, "--drawer", drawer)[0]
    assert abs(best["refit"][0]["drift_per_k"]) < 18e-6
    assert any("N750" in label for label in best["refit"][0]["by"])
    assert "To take out the measured drift" in run("bands", job, "--drawer", drawer).out
