"""The current sheet and the corrections for round wire, against published tables and cousins."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import hyp2f1

from partpick.physics import sheet
from partpick.physics.filaments import mutual_inductance
from partpick.physics.skin import MU_0

PUBLISHED = Path(__file__).parent / "published"
INCH = 0.0254


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("nagaoka.csv"), ids=lambda r: r["l_over_d"])
def test_nagaoka_coefficient_is_exact(row: dict[str, str]) -> None:
    """40-digit evaluation of the published formula."""
    computed = sheet.nagaoka_coefficient(float(row["l_over_d"]))
    assert computed == pytest.approx(float(row["K_nagaoka"]), rel=float(row["rel_tol"]))


@pytest.mark.parametrize("row", rows("nagaoka_printed.csv"), ids=lambda r: r["d_over_l"])
def test_nagaoka_coefficient_is_the_printed_one(row: dict[str, str]) -> None:
    """Four figures of the handbooks, which did not come from a computer."""
    computed = sheet.nagaoka_coefficient(1.0 / float(row["d_over_l"]))
    assert computed == pytest.approx(float(row["K_published_4digits"]), abs=float(row["abs_tol"]))


@given(st.floats(0.2, 1e4))
def test_nagaoka_coefficient_is_the_hypergeometric_function(x: float) -> None:
    """A cousin formula, 2F1(-1/2, 1/2; 2; -u) - 4/(3 pi) sqrt(u), u = (d/l)^2."""
    cousin = hyp2f1(-0.5, 0.5, 2.0, -(x**-2)) - 4.0 / (3.0 * np.pi * x)
    assert sheet.nagaoka_coefficient(x) == pytest.approx(cousin, rel=1e-10)


@given(st.floats(1e-5, 10.0))
def test_the_sheet_is_made_of_rings(x: float) -> None:
    """2/l^2 times the integral of (l - z) M(z) over the distances of its rings, short sheets too."""
    nodes, weights = np.polynomial.legendre.leggauss(60)
    v = (nodes + 1.0) / 2.0
    z, width = x * v**6, 6.0 * x * v**5 * weights / 2.0  # dense where M grows without limit
    rings = np.sum(2.0 / x**2 * (x - z) * mutual_inductance(0.5, 0.5, z) * width)
    assert sheet.sheet_inductance(1.0, 1.0, x) == pytest.approx(rings, rel=1e-8)


def test_nagaoka_coefficient_runs_from_nothing_to_one() -> None:
    """A ring without length, an endless coil, and what is neither."""
    assert sheet.nagaoka_coefficient([0.0, np.inf]).tolist() == [0.0, 1.0]
    assert np.isnan(sheet.nagaoka_coefficient([-1.0, np.nan])).all()
    grid = np.geomspace(1e-5, 1e5, 2001)
    assert np.all(np.diff(sheet.nagaoka_coefficient(grid)) > 0.0)


@pytest.mark.parametrize("seam", [2e-3, 10.0])
def test_the_series_join_the_elliptic_integrals(seam: float) -> None:
    """A step between the branches would rank two nearly equal coils wrongly."""
    pair = seam * (1.0 + np.array([-1e-12, 1e-12]))
    before, after = sheet.nagaoka_coefficient(pair)
    assert before == pytest.approx(after, rel=5e-11)
    before, after = sheet.inductance_sensitivities(pair).diameter
    assert before == pytest.approx(after, rel=5e-10)


@pytest.mark.parametrize("row", rows("rosa_pitch.csv"), ids=lambda r: r["wire_d_over_pitch"])
def test_pitch_correction_is_the_printed_one(row: dict[str, str]) -> None:
    """Rosa and Grover's table to its four figures."""
    computed = sheet.pitch_correction(float(row["wire_d_over_pitch"]))
    assert computed == pytest.approx(float(row["A_published_from_memory"]), abs=float(row["abs_tol"]))


@pytest.mark.parametrize("row", rows("rosa_turns.csv"), ids=lambda r: r["N"])
def test_turns_correction_is_the_printed_one(row: dict[str, str]) -> None:
    """Rosa's sum, and Grover's table to one in its fourth figure."""
    computed = sheet.turns_correction(float(row["N"]))
    assert computed == pytest.approx(float(row["B"]), abs=float(row["abs_tol"]))
    if row["B_printed"]:
        assert computed == pytest.approx(float(row["B_printed"]), abs=1e-4)


@pytest.mark.parametrize("row", rows("solenoid_round_wire.csv"), ids=lambda r: r["N"])
def test_closed_form_is_sheet_less_corrections(row: dict[str, str]) -> None:
    """Each part and the whole, evaluated by the published formulas."""
    n, d, p, w = (float(row[key]) for key in ("N", "d_mean_m", "pitch_m", "wire_d_m"))
    tolerance = float(row["rel_tol"])
    assert sheet.sheet_inductance(n, d, n * p) == pytest.approx(float(row["L_sheet_H"]), rel=tolerance)
    assert sheet.pitch_correction(w / p) == pytest.approx(float(row["rosa_A"]), abs=1e-6)
    closed = sheet.solenoid_inductance(n, d, w, p)
    assert closed == pytest.approx(float(row["L_sheet_minus_rosa_H"]), rel=tolerance)
    # 0.3 %: what is claimed for coils of 10 wires' width or more
    assert closed == pytest.approx(float(row["L_discrete_loops_H"]), rel=3e-3)


@pytest.mark.parametrize("row", rows("solenoid_printed_examples.csv"), ids=lambda r: r["turns"])
def test_handbook_examples(row: dict[str, str]) -> None:
    """Worked by slide rule and an approximate formula: 1 %."""
    d, length = float(row["diameter_in"]) * INCH, float(row["length_in"]) * INCH
    computed = sheet.sheet_inductance(float(row["turns"]), d, length) * 1e6
    assert computed == pytest.approx(float(row["inductance_uH"]), rel=float(row["rel_tol"]))


@given(st.floats(0.45, 10.0))
def test_handbook_formula_is_a_cousin(x: float) -> None:
    """a^2 N^2/(9 a + 10 l) in microhenry and inches: 1 % from l/D = 0.4 (Wheeler 1928)."""
    a, length = 1.0, 2.0 * x
    cousin = a**2 / (9.0 * a + 10.0 * length) * 1e-6
    assert sheet.sheet_inductance(1.0, 2.0 * a * INCH, length * INCH) == pytest.approx(cousin, rel=0.01)


def test_a_very_long_coil_is_the_textbook_solenoid() -> None:
    """mu0 N^2 S/l less its ends: 1 - 4 d/(3 pi l)."""
    ideal = MU_0 * np.pi / 4.0 * 0.01**2 * 1000.0**2 / 50.0
    ends = 1.0 - 4.0 * 0.01 / (3.0 * np.pi * 50.0)
    assert sheet.sheet_inductance(1000.0, 0.01, 50.0) == pytest.approx(ideal * ends, rel=1e-8)


@given(st.integers(1, 500), st.floats(1e-3, 0.5), st.floats(0.01, 0.3), st.floats(1.0, 3.0), st.floats(0.1, 10.0))
def test_larger_coils_have_more_inductance_in_proportion(
    n: int, d: float, wire: float, spacing: float, k: float
) -> None:
    """Magnetostatics has no length of its own."""
    w = wire * d
    small, large = (sheet.solenoid_inductance(n, s * d, s * w, s * w * spacing) for s in (1.0, k))
    assert large == pytest.approx(k * small, rel=1e-9)


@pytest.mark.parametrize("row", rows("sheet_sensitivity.csv"), ids=lambda r: r["l_over_d"])
def test_sensitivities_are_the_derivatives(row: dict[str, str]) -> None:
    """By diameter and by length, from a numerical derivative with many digits."""
    by = sheet.inductance_sensitivities(float(row["l_over_d"]))
    assert by.diameter == pytest.approx(float(row["dlnL_dlnD"]), abs=float(row["abs_tol"]))
    assert by.length == pytest.approx(float(row["dlnL_dlnl"]), abs=float(row["abs_tol"]))


@given(st.floats(1e-4, 1e4))
def test_even_growth_raises_inductance_by_as_much(x: float) -> None:
    """The two sensitivities add up to one, and each keeps its sign: wider is more, longer is less."""
    by = sheet.inductance_sensitivities(x)
    assert by.diameter + by.length == pytest.approx(1.0, abs=1e-12)
    assert 1.0 < by.diameter < 2.0
    step = 1e-5
    up, down = (np.log(sheet.sheet_inductance(1.0, 1.0, x * np.exp(s))) for s in (step, -step))
    assert by.length == pytest.approx((up - down) / (2.0 * step), abs=3e-6)
