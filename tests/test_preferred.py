"""Preferred numbers against the published lists, and the look-ups built on them."""

from __future__ import annotations

import csv
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick import preferred

PUBLISHED = Path(__file__).parent / "published"


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("name", list(preferred.SERIES))
def test_a_series_is_the_published_list(name: str) -> None:
    """IEC 60063; the count guards against a list cut short in the table."""
    published = [Fraction(row["value"]) for row in rows("e_series.csv") if row["series"] == name]
    assert len(published) == int(name[1:])
    assert [Fraction(figures, 100) for figures in preferred.SERIES[name]] == published


@pytest.mark.parametrize("row", rows("nearest_value.csv"), ids=lambda row: row["target_f"])
def test_the_nearest_value_is_nearest_by_ratio(row: dict[str, str]) -> None:
    """Frequency depends on the ratio of capacitances, not on their difference."""
    target = float(row["target_f"])
    for name in ("E6", "E12", "E24", "E96", "E192"):
        assert preferred.nearest(name, target) == Fraction(row[name])
    below, above = preferred.neighbours("E24", target)
    assert (below, above) == (Fraction(row["E24_below"]), Fraction(row["E24_above"]))


def test_both_ends_of_a_range_belong_to_it() -> None:
    """A family "1 pF to 10 pF" offers both; in floats one of them may fall out."""
    values = preferred.series_values("E6", 1e-12, 10e-12)
    tenths = [Fraction(v, 10**13) for v in (10, 15, 22, 33, 47, 68, 100)]  # IEC 60063, E6
    assert list(values) == tenths


def test_every_decade_repeats_the_series() -> None:
    """Seven decades of E24 hold 7 times 24 values and the closing one (IEC 60063)."""
    values = preferred.series_values("E24", Fraction(1, 10**12), Fraction(1, 10**5))
    assert len(values) == 7 * 24 + 1
    assert list(values) == sorted(set(values))


def test_an_empty_range_has_no_values() -> None:
    """Between two neighbours there is nothing to offer."""
    assert preferred.series_values("E12", 1.01e-12, 1.19e-12) == ()


@pytest.mark.parametrize("name", list(preferred.SERIES))
def test_commonness_is_the_coarsest_series_that_holds_the_value(name: str) -> None:
    """Checked against the published lists, over the decades in use."""
    lists: dict[str, set[Fraction]] = {}
    for row in rows("e_series.csv"):
        lists.setdefault(row["series"], set()).add(Fraction(row["value"]))
    for power in (-13, -12, -10, -9, -6, 0, 5):
        members = sorted(lists[name])
        found = preferred.commonness([float(member * Fraction(10) ** power) for member in members])
        for member, rank in zip(members, found, strict=True):
            holders = [i for i, series in enumerate(preferred.COMMONNESS_ORDER) if member in lists[series]]
            assert rank == holders[0]


def test_a_measured_value_is_in_no_series() -> None:
    """46.83 pF from a drawer is less common than anything that can be ordered."""
    assert preferred.commonness(46.83e-12) == 6


def test_commonness_keeps_the_shape_of_its_input() -> None:
    """Candidates come as (coil, part) arrays."""
    values = np.array([[1e-12, 1.2e-12], [1.1e-12, 4.64e-12]])
    assert preferred.commonness(values).tolist() == [[0, 1], [2, 3]]  # E6, E12; E24, E48 of IEC 60063


@given(st.sampled_from(list(preferred.SERIES)), st.floats(1e-15, 1e6))
def test_no_member_is_nearer_than_the_nearest(name: str, value: float) -> None:
    """Compared with all members around, exactly."""
    exact = Fraction(repr(value))

    def ratio(member: Fraction) -> Fraction:
        return max(member / exact, exact / member)

    around = preferred.series_values(name, exact / 20, exact * 20)
    assert ratio(preferred.nearest(name, value)) == min(ratio(member) for member in around)
