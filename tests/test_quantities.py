"""Quantities: what is read, what is refused and with which hint, and the way back."""

from __future__ import annotations

import csv
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import assume, example, given
from hypothesis import strategies as st

from partpick import quantities as q
from partpick.errors import QuantityError
from partpick.reading import TOLERANCE_LETTERS

PUBLISHED = Path(__file__).parent / "published"
PARSERS: tuple[Callable[[object], object], ...] = (
    q.parse_frequency,
    q.parse_bandwidth,
    q.parse_capacitance,
    q.parse_inductance,
    q.parse_resistance,
    q.parse_length,
    q.parse_voltage,
    q.parse_current,
    q.parse_power,
    q.parse_transconductance,
    q.parse_angle,
    q.parse_temperature,
    q.parse_number,
    q.parse_count,
    q.parse_fraction,
    q.parse_tolerance,
    q.parse_tempco,
    lambda given: q.parse_range(given, q.parse_frequency),
)


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def refused(parse: Callable[[object], object], given: object) -> str:
    with pytest.raises(QuantityError) as caught:
        parse(given)
    return str(caught.value)


@pytest.mark.parametrize("row", rows("letter_codes.csv"), ids=lambda row: row["code"])
def test_letter_codes_are_read_as_the_standard_says_or_refused(row: dict[str, str]) -> None:
    """IEC 60062; codes with a tolerance letter are refused so that no tolerance is lost unseen."""
    parse = {"capacitance": q.parse_capacitance, "resistance": q.parse_resistance}[row["kind"]]
    if row["value_si"]:
        assert parse(row["code"]) == float(Fraction(row["value_si"]))
    else:
        assert row["code"][-1] in refused(parse, row["code"])


def test_tolerance_letters_mean_what_the_standard_says() -> None:
    """The refusal of "4n7J" tells the tolerance, so its table must be the published one."""
    published = {row["letter"]: row["meaning"].removeprefix("+-") for row in rows("tolerance_letters.csv")}
    assert published == TOLERANCE_LETTERS
    for row in rows("tolerance_letters.csv"):
        small = row["meaning_below_10_pf"].removeprefix("+-").removesuffix(" below 10 pF")
        assert f"({small or published[row['letter']]})" in refused(q.parse_capacitance, "4p7" + row["letter"])
        assert f"({published[row['letter']]})" in refused(q.parse_capacitance, "33p2" + row["letter"])


@pytest.mark.parametrize("row", rows("three_figure_codes.csv"), ids=lambda row: row["code"])
def test_three_figure_codes_are_never_read(row: dict[str, str]) -> None:
    """As "104" may be a number, its hint names what the marking would mean."""
    message = refused(q.parse_capacitance, row["code"])
    if row["code"].isdigit():
        meaning = q.parse_capacitance(row["value"])
        assert q.format_quantity(meaning, "F") in message


@pytest.mark.parametrize(
    ("parse", "given", "value"),
    [
        (q.parse_frequency, "7.1 MHz", 7.1e6),
        (q.parse_frequency, "7.1MHz", 7.1e6),
        (q.parse_frequency, "4M7", 4.7e6),
        (q.parse_frequency, "+455e3", 455e3),
        (q.parse_frequency, 455000, 455e3),
        (q.parse_capacitance, "4.7nF", 4.7e-9),
        (q.parse_capacitance, "4p7F", 4.7e-12),
        (q.parse_capacitance, "4.7e-12", 4.7e-12),
        (q.parse_capacitance, 4.7e-12, 4.7e-12),
        (q.parse_capacitance, "2.2\u03bcF", 2.2e-6),
        (q.parse_inductance, "4.05 \u00b5H", 4.05e-6),
        (q.parse_inductance, "4u7", 4.7e-6),
        (q.parse_resistance, "50 \u03a9", 50.0),
        (q.parse_resistance, "1k\u2126", 1000.0),
        (q.parse_length, "20 mm", 0.02),
        (q.parse_length, "1.5 cm", 0.015),
        (q.parse_length, "0.3 m", 0.3),
        (q.parse_fraction, "0.5 %", 0.005),
        (q.parse_fraction, "500 ppm", 0.0005),
        (q.parse_fraction, 0.05, 0.05),
        (q.parse_tempco, "-150 ppm/K", -150e-6),
        (q.parse_tempco, "30 ppm", 30e-6),
        (q.parse_temperature, "-10 \u00b0C", -10.0),
        (q.parse_angle, "180", 180.0),
        (q.parse_bandwidth, "200 Hz", 200.0),
    ],
)
def test_a_value_becomes_the_nearest_double(
    parse: Callable[[object], float], given: object, value: float
) -> None:
    """The double is that of the decimal, not a product of rounded factors (expected values: arithmetic)."""
    assert parse(given) == value


@pytest.mark.parametrize(
    ("parse", "given", "hints"),
    [
        (q.parse_capacitance, "4,7 nF", ["write 4.7 nF"]),
        (q.parse_frequency, "7.1mhz", ["MHz?"]),
        (q.parse_frequency, "7.1 KHz", ["kHz?"]),
        (q.parse_capacitance, "104", ["104 F; 100 nF?"]),
        (q.parse_frequency, "7.1", ["7.1 Hz is below 1 kHz; 7.1 MHz?", "lumped"]),
        (q.parse_frequency, "455", ["455 kHz?"]),
        (q.parse_frequency, "2.4 GHz", ["above 1 GHz", "lumped"]),
        (q.parse_capacitance, "47", ["47 pF?"]),
        (q.parse_inductance, "4.05", ["4.05 \u00b5H?"]),
        (q.parse_frequency, "5 nF", ["nF", "capacitance", "Hz"]),
        (q.parse_capacitance, "4.7 mH", ["mH", "inductance", "in F"]),
        (q.parse_length, "20", ["needs its unit", "20 mm"]),
        (q.parse_length, 20, ["needs its unit", "20 mm"]),
        (q.parse_length, "20 m", ["20 mm?"]),
        (q.parse_fraction, "0.5", ["write 50 %"]),
        (q.parse_fraction, 5, ["write 5 %"]),
        (q.parse_tempco, "30", ["30 ppm?"]),
        (q.parse_frequency, "inf", ["not a finite number"]),
        (q.parse_frequency, float("nan"), ["not a finite number"]),
        (q.parse_frequency, "1_000 kHz", ["underscore"]),
        (q.parse_frequency, "\u0667 MHz", ["digits 0 to 9"]),
        (q.parse_frequency, True, ["read true"]),
        (q.parse_frequency, 0, ["above zero"]),
        (q.parse_frequency, "-7 MHz", ["above zero"]),
        (q.parse_frequency, "1e999999999", ["exponent"]),
        (q.parse_frequency, "", ["nothing given"]),
        (q.parse_frequency, "7.1.2 MHz", ["not one number"]),
        (q.parse_count, 2.0, ["whole number"]),
        (q.parse_number, "3 MHz", ["plain number"]),
        (q.parse_tolerance, "120 %", ["100 %"]),
        (q.parse_tolerance, "-1 %", ["zero or more"]),
    ],
)
def test_a_refusal_names_what_was_read_and_what_was_probably_meant(
    parse: Callable[[object], object], given: object, hints: list[str]
) -> None:
    """Contract, "Quantities": a value in the wrong unit must not pass, and its hint must help at once."""
    message = refused(parse, given)
    assert message.startswith("read ") and "\n" not in message
    for hint in hints:
        assert hint in message


def test_frequencies_end_at_1_khz_and_1_ghz() -> None:
    """The limits themselves are accepted, the next value outside is not."""
    assert q.parse_frequency("1 kHz") == 1e3
    assert q.parse_frequency("1 GHz") == 1e9
    refused(q.parse_frequency, "0.999999 kHz")
    refused(q.parse_frequency, "1.000001 GHz")


def test_zero_is_a_capacitance_only_where_it_is_allowed() -> None:
    """No strays is a wish, a capacitor of nothing is a slip."""
    assert q.parse_capacitance("0 pF", zero=True) == 0.0
    refused(q.parse_capacitance, "0 pF")


def test_exact_capacitances_add_up_exactly() -> None:
    """Floats do not: 0.1 + 0.2 pF differs from 0.3 pF in the last bit."""
    total = q.parse_exact_capacitance("0.1 pF") + q.parse_exact_capacitance(2e-13)
    assert total == q.parse_exact_capacitance("p3") == Fraction(3, 10**13)


def test_an_absolute_tolerance_is_taken_of_each_value() -> None:
    """A quarter picofarad is 5 % of 5 pF and 2.5 % of 10 pF (arithmetic)."""
    tolerance = q.parse_tolerance("\u00b10.25 pF")
    assert tolerance.of(5e-12) == pytest.approx(0.05, rel=1e-12)
    assert tolerance.of(10e-12) == pytest.approx(0.025, rel=1e-12)
    assert q.parse_tolerance("5 %").of(5e-12) == 0.05
    with pytest.raises(QuantityError, match="over 100 %"):
        tolerance.of(0.1e-12)


def test_a_range_has_two_ends_in_rising_order() -> None:
    """An empty or half range is a slip."""
    assert q.parse_range("7.0MHz..7.3MHz", q.parse_frequency) == (7.0e6, 7.3e6)
    for wrong in ("7.3MHz..7.0MHz", "7MHz..7MHz", "7MHz..", "7MHz", "7MHz..8MHz..9MHz", 7e6):
        refused(lambda given: q.parse_range(given, q.parse_frequency), wrong)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (47e-12, "F", "47 pF"),
        (7.1e6, "Hz", "7.1 MHz"),
        (4.05e-6, "H", "4.05 \u00b5H"),
        (999.6e-12, "F", "1 nF"),
        (1e-10, "F", "100 pF"),
        (0.02, "m", "20 mm"),
        (0.0, "F", "0 F"),
        (-2.5e-12, "F", "-2.5 pF"),
    ],
)
def test_values_are_written_in_engineering_form(value: float, unit: str, text: str) -> None:
    """Contract, "Quantities": the written form, with U+00B5 for micro."""
    assert q.format_quantity(value, unit) == text


@given(st.floats(1e-15, 1e-3))
def test_a_written_capacitance_reads_back_as_the_same_double(value: float) -> None:
    """Seventeen figures are enough for any double, so nothing may be lost on the way."""
    assert q.parse_capacitance(q.format_quantity(value, "F", digits=17)) == value


@given(st.floats(1e3, 1e9), st.integers(1, 9))
def test_a_shortened_value_is_off_by_half_a_figure_at_most(value: float, digits: int) -> None:
    """`digits` are significant figures; more is lost only if the prefix is wrong."""
    back = q.parse_frequency(q.format_quantity(value, "Hz", digits))
    assert abs(back - value) <= 0.5000001 * 10.0 ** (1 - digits) * value


@given(st.integers(1, 999), st.integers(-13, -6))
def test_three_figures_survive_the_way_out_and_back(figures: int, power: int) -> None:
    """Every E-series value must read back as itself from the table that is printed."""
    value = float(figures * Fraction(10) ** power)
    assume(value <= 1e-3)
    assert q.parse_capacitance(q.format_quantity(value, "F")) == value


@given(
    st.one_of(
        st.text(max_size=100),
        st.text(alphabet="0123456789.,eE+-_ pnukMGHzF\u00b5\u03bc%rR", max_size=20),
        st.floats(),
        st.integers(),
        st.booleans(),
        st.none(),
        st.lists(st.integers(), max_size=2),
    )
)
@example(10**5000)
@example("9" * 5000)
def test_anything_is_read_or_refused_in_one_line(given: object) -> None:
    """No input of any type may end in a traceback or in a message of several lines."""
    for parse in PARSERS:
        try:
            parse(given)
        except QuantityError as problem:
            assert len(str(problem).splitlines()) == 1
