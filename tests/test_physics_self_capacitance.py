"""Self-capacitance and self-resonance of windings."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import self_capacitance

PUBLISHED = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("self_capacitance.csv"), ids=lambda r: r["l_over_D"])
def test_the_published_table_is_returned(row: dict[str, str]) -> None:
    """Medhurst 1947, from memory; pF per cm of diameter, so a 1 cm coil shows the figure in pF."""
    value = self_capacitance.solenoid_self_capacitance(0.01, float(row["l_over_D"]))
    assert value * 1e12 == pytest.approx(float(row["picofarad_per_cm"]), rel=1e-9)


@pytest.mark.parametrize("row", rows("self_capacitance.csv")[1:-1], ids=lambda r: r["l_over_D"])
def test_a_row_left_out_comes_back_by_interpolation(
    row: dict[str, str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The error of interpolating between rows, within the 5 % that the source states for its own."""
    ratio = float(row["l_over_D"])
    keep = ratio != self_capacitance._LENGTH_RATIO
    monkeypatch.setattr(self_capacitance, "_PICOFARAD_PER_CM", self_capacitance._PICOFARAD_PER_CM[keep])
    monkeypatch.setattr(self_capacitance, "_LENGTH_RATIO", self_capacitance._LENGTH_RATIO[keep])
    value = self_capacitance.solenoid_self_capacitance(0.01, ratio)
    assert value * 1e12 == pytest.approx(float(row["picofarad_per_cm"]), rel=0.03)


@pytest.mark.parametrize("row", rows("self_capacitance.csv"), ids=lambda r: r["l_over_D"])
def test_the_spread_reaches_from_air_to_solid_polystyrene(row: dict[str, str]) -> None:
    """Knight's values (from memory) for both formers lie inside the stated spread."""
    ratio = float(row["l_over_D"])
    nominal = self_capacitance.solenoid_self_capacitance(0.01, ratio) * 1e12
    below, above = self_capacitance.solenoid_spread(ratio)
    assert float(row["air_picofarad_per_cm"]) >= nominal * (1.0 - below) * 0.96
    assert float(row["polystyrene_picofarad_per_cm"]) <= nominal * (1.0 + above)


@pytest.mark.parametrize("row", rows("self_capacitance.csv"), ids=lambda r: r["l_over_D"])
def test_the_share_of_a_former_is_how_its_permittivity_raises_the_capacitance(row: dict[str, str]) -> None:
    """Between air and polystyrene (Knight, from memory) the share's mean must raise C by the published ratio."""
    ratio = float(row["l_over_D"])
    permittivity = np.exp(np.linspace(0.0, np.log(2.56), 201))
    share = self_capacitance.dielectric_share(ratio, permittivity)
    rise = np.exp(np.trapezoid(share, np.log(permittivity)))
    published = float(row["polystyrene_picofarad_per_cm"]) / float(row["air_picofarad_per_cm"])
    assert rise == pytest.approx(published, rel=0.01)


@given(st.floats(0.05, 60.0), st.floats(1.0, 10.0))
def test_the_share_of_a_former_is_a_share(ratio: float, permittivity: float) -> None:
    """Between 0 and 1, more in a better dielectric, less in a longer coil; no coil has none."""
    share = self_capacitance.dielectric_share(ratio, permittivity)
    assert 0.0 < share < 1.0
    assert self_capacitance.dielectric_share(2 * ratio, permittivity) < share
    assert self_capacitance.dielectric_share(ratio, 2 * permittivity) > share
    assert np.isnan(self_capacitance.dielectric_share(0.0))


@pytest.mark.parametrize("row", rows("self_resonance.csv"), ids=lambda r: r["N"])
def test_self_resonance_agrees_with_the_published_form(row: dict[str, str]) -> None:
    """Four coils; the table's capacitance against the closed form, root of the difference."""
    c = self_capacitance.solenoid_self_capacitance(float(row["D_m"]), float(row["l_over_D"]))
    f = self_capacitance.self_resonance_frequency(float(row["L_rosa_H"]), c)
    assert f == pytest.approx(float(row["f_sr_Hz"]), rel=float(row["rel_tol"]))


@given(st.floats(0.02, 100.0), st.floats(0.1, 50.0))
def test_capacitance_scales_with_size(ratio: float, k: float) -> None:
    """All lengths times k: capacitance times k."""
    one = self_capacitance.solenoid_self_capacitance(0.01, ratio)
    assert self_capacitance.solenoid_self_capacitance(0.01 * k, ratio) == pytest.approx(k * one)


def test_a_ring_of_ten_millimetres_has_under_a_picofarad() -> None:
    """0.08 pF per millimetre: common practice, no source."""
    assert self_capacitance.ring_self_capacitance(0.010) == pytest.approx(0.8e-12)


def test_two_layers_are_a_third_of_their_plates() -> None:
    """Energy by hand: between two layers, back and forth, the voltage rises evenly from 0 to U: U^2/3."""
    plates = self_capacitance.VACUUM_PERMITTIVITY * np.pi * 0.01 * 0.005 / 0.1e-3
    value = self_capacitance.layered_self_capacitance(0.01, 0.005, 2, 0.1e-3, permittivity=1.0)
    assert value == pytest.approx(plates / 3.0)
    assert np.isnan(self_capacitance.layered_self_capacitance(0.01, 0.005, 1, 0.1e-3))


def test_no_length_is_unknown_and_no_capacitance_never_resonates() -> None:
    """Unknown where the formula says nothing; infinity where it does."""
    assert np.isnan(self_capacitance.solenoid_self_capacitance(0.01, [0.0, -1.0])).all()
    assert np.isinf(self_capacitance.self_resonance_frequency(1e-6, 0.0))


def test_layers_of_round_wire_act_as_plates_further_apart_than_their_coverings() -> None:
    """Straight field lines between two cylinders, integrated here."""
    bare, overall = 0.4e-3, 0.44e-3
    distance = self_capacitance.layer_distance(bare, overall)
    assert overall - bare < distance < overall
    strip = np.linspace(-bare / 2, bare / 2, 20001)
    gap = overall - 2 * np.sqrt((bare / 2) ** 2 - strip**2)
    assert overall / distance == pytest.approx(np.trapezoid(1 / gap, strip), rel=1e-4)
    # Never more than two lone parallel wires, whose field goes round: pi/arcosh(s/d) (Smythe 1950, from memory).
    assert overall / distance < np.pi / np.arccosh(overall / bare)
