"""Copper and the skin effect against published constants and the exact solution."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import skin

PUBLISHED = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_copper_has_the_standard_constants() -> None:
    """IEC 60028 (from memory): every resistance starts from these."""
    computed = {
        "resistivity annealed Cu 20C": skin.copper_resistivity(20.0),
        "conductivity": 1.0 / skin.COPPER_RESISTIVITY,
        "TCR at 20C constant mass": skin.COPPER_TEMPERATURE_COEFFICIENT,
        "resistivity at 75C": skin.copper_resistivity(75.0),
        "skin depth 1 MHz 20C": skin.skin_depth(1e6),
        "skin depth 10 MHz 20C": skin.skin_depth(10e6),
        "skin depth 100 MHz 20C": skin.skin_depth(100e6),
    }
    for row in rows("loss_copper.csv"):
        if row["quantity"] in computed:
            assert computed.pop(row["quantity"]) == pytest.approx(float(row["value"]), rel=1e-8)
    assert not computed


@pytest.mark.parametrize("row", rows("loss_skin_effect.csv"), ids=lambda row: row["a_over_delta"])
def test_skin_effect_is_the_exact_solution(row: dict[str, str]) -> None:
    """Kelvin's solution to 30 digits, rounded to 9 places in the table."""
    x = float(row["a_over_delta"])
    tolerance = float(row["rel_tol"])
    assert skin.skin_ratio(x) == pytest.approx(float(row["Rac_over_Rdc"]), rel=tolerance)
    assert skin.internal_inductance_ratio(x) == pytest.approx(float(row["Lint_over_Lint_dc"]), rel=tolerance)


@pytest.mark.parametrize(
    "function", [skin.skin_ratio, skin.internal_inductance_ratio, skin.transverse_loss_ratio]
)
@pytest.mark.parametrize("seam", [0.05, 1000.0])
def test_the_series_join_the_bessel_functions(function, seam: float) -> None:  # type: ignore[no-untyped-def]
    """A step between the branches would rank two nearly equal wires wrongly."""
    before, after = function(np.array([seam * (1 - 1e-9), seam * (1 + 1e-9)]))
    assert before == pytest.approx(after, rel=2e-8)


@given(st.floats(min_value=0.05, max_value=1000.0))
def test_loss_in_a_transverse_field_follows_its_limits(x: float) -> None:
    """Below both limits everywhere: (a/delta)^4/8 at low and a/(2 delta) at high frequency."""
    ratio = skin.transverse_loss_ratio(x)
    assert 0.0 < ratio < min(x**4 / 8.0, x / 2.0)
    if x > 5.0:
        assert ratio == pytest.approx(x / 2.0 - 0.25, rel=1e-2)


@given(st.floats(min_value=0.0, max_value=1e6), st.floats(min_value=1.0001, max_value=10.0))
def test_skin_effect_never_falls_with_frequency(x: float, step: float) -> None:
    """Resistance rises and internal inductance falls as the current is pushed outward."""
    assert skin.skin_ratio(x * step) >= skin.skin_ratio(x) >= 1.0
    assert skin.internal_inductance_ratio(x * step) <= skin.internal_inductance_ratio(x) <= 1.0


def test_unphysical_arguments_are_unknown_not_numbers() -> None:
    """Unknown travels on and never ranks; a number would."""
    assert np.isnan(skin.skin_ratio([-1.0, np.nan])).all()
    assert skin.skin_ratio(0.0) == 1.0
    assert skin.internal_inductance_ratio(0.0) == 1.0
    assert skin.transverse_loss_ratio(0.0) == 0.0


def test_shape_is_kept_through_the_distinct_values() -> None:
    """Each wire is evaluated once, each winding gets its own wire's figure."""
    x = np.array([[1.0, 2.0, 1.0], [4.0, 2.0, 10.0]])
    expected = np.array([[skin.skin_ratio(v) for v in line] for line in x])
    assert (skin.skin_ratio(x) == expected).all()


def test_strands_share_the_current() -> None:
    """Four strands of half the diameter are as good as the one wire at direct current."""
    one = skin.wire_resistance(2.0, 1e-3)
    assert skin.wire_resistance(2.0, 0.5e-3, strands=4) == pytest.approx(one)
    # 1 mm2 of standard copper, 1 km at 20 degC: 17.24 ohm (IEC 60028, from memory).
    assert skin.wire_resistance(1000.0, np.sqrt(4e-6 / np.pi)) == pytest.approx(17.241, rel=1e-4)
