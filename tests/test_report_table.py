"""Tests of the table for the bench: what must be said, in words, within 80 columns."""

from __future__ import annotations

from dataclasses import replace

import handmade
import pytest

from partpick.report.table import result_table
from partpick.report.text import columns_of, figure, length, signed_percent, signed_shift, slope
from partpick.report.windings_table import windings_table
from partpick.result import Proof, Result, Stage

LONG = "a name that goes on and on " * 8


def _stopped(status: str, *candidates: object, reason: str = "time limit") -> Result:
    stages = (Stage(objective="worst_error", value=0.002, bound=0.0015),)
    proof = Proof(status=status, searched="some windings", stages=stages, stopped_by=reason)
    return handmade.result(*candidates, proof=proof)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    "result",
    [
        handmade.result(handmade.candidate(), handmade.candidate(2)),
        handmade.result(handmade.two_bands(), request=handmade.request("beacon", "weather")),
        handmade.result(
            handmade.candidate(bands=(handmade.swept_band(),), worst_error=None, worst_excess=1.0)
        ),
        handmade.nothing(),
        handmade.result(
            handmade.candidate(
                bands=(handmade.band("\u96fb" * 60, 7.1e6, 118e-12, ["C1", "C2"]),),
                coils=(handmade.coil(label=LONG),),
                parts=(handmade.capacitor("C1", label=LONG, description=LONG), handmade.capacitor("C2")),
                warnings=(LONG,),
                price=123456.78,
                alternatives=1234567,
            ),
            request=handmade.request(title="\u96fb" * 90),
            warnings=("x" * 200,),
        ),
    ],
)
def test_no_line_is_wider_than_80_columns(result: Result) -> None:
    """A terminal or a printed page of 80 columns breaks longer lines at any place."""
    assert max(columns_of(line) for line in result_table(result).splitlines()) <= 80


def test_a_pair_says_all_that_is_needed_to_wind_and_solder_it() -> None:
    """Coil in words, parts, error with its sign, Q, reactance, shift per picofarad, strays."""
    text = " ".join(result_table(handmade.result(handmade.candidate())).split())
    for words in (
        "14 turns of 0.5 mm on 20 mm former, winding 7.8 mm long, 1.24 m of wire",
        "100 pF | 18 pF with 14 turns",
        "C1 100 pF | C2 18 pF",
        "-0.052 %",  # 1/(2 pi sqrt(4.05 uH * 124.2 pF)) = 7.0963 MHz
        "-3.7 kHz",
        "187",  # Q
        "181",  # 2 pi 7.1 MHz * 4.05 uH = 180.7 ohm
        "-28.6 kHz",  # f/(2C) = 7.0963 MHz / (2 * 124.2 pF)
        "5 %",  # 6.2 pF of 124.2 pF
    ):
        assert words in text


def test_each_band_of_a_plan_has_its_parts_by_name_and_value() -> None:
    """Who solders the second band needs its own network, brackets included."""
    text = result_table(handmade.result(handmade.two_bands(), request=handmade.request("beacon", "weather")))
    assert "L1: C3 100 pF | (C4 270 pF + C5 270 pF)" in text
    assert "2 of 270 pF C0G" in text


def test_the_floor_is_said_in_words() -> None:
    """Nobody should chase an error that the parts' own tolerance hides."""
    assert "Errors below 0.21 % are noise" in result_table(handmade.result(handmade.candidate()))


def test_a_proven_answer_says_so_and_a_stopped_one_does_not() -> None:
    """Best found and best possible differ; the table must not blur it."""
    assert "Proven" in result_table(handmade.result(handmade.candidate()))
    stopped = result_table(_stopped("feasible", handmade.candidate()))
    assert "Not proven: the search was stopped (time limit); there may be better ones." in stopped
    assert "worst error 0.2 %, perhaps down to 0.15 %" in stopped.replace("\n  ", " ")
    assert "Proven:" not in stopped


def test_nothing_found_in_time_is_not_said_as_nothing_fits() -> None:
    """An unfinished search proves nothing."""
    text = result_table(_stopped("unknown"))
    assert "Nothing was found before the search stopped" in text
    assert "Nothing fits" not in text


def test_nothing_fits_names_the_limit_and_what_would_do() -> None:
    """The way on is the limit that rules the nearest one out, and the figure that would let it through."""
    text = result_table(handmade.nothing())
    assert "Nothing fits: error rules out every choice; " in text
    assert "the least that these parts reach is 0.83 %" in " ".join(text.split())
    assert "nearest miss" in text


def test_an_unknown_q_is_a_question_mark() -> None:
    """A blank or a zero would be read as a figure."""
    band = replace(handmade.candidate().bands[0], q=None)
    line = next(
        line
        for line in result_table(handmade.result(handmade.candidate(bands=(band,)))).splitlines()
        if line.strip().startswith("beacon")
    )
    assert line.split()[7] == "?"


def test_a_warning_is_told_once_with_the_ranks_it_is_about() -> None:
    """Ten candidates with one remark must not print it ten times."""
    remark = "tolerance of former taken as 1 %"
    result = handmade.result(
        handmade.candidate(1, warnings=(remark,)),
        handmade.candidate(2),
        handmade.candidate(3, warnings=(remark,)),
    )
    text = result_table(result)
    assert text.count(remark) == 1
    assert f"Note: rank 1, 3: {remark}" in text


def test_names_cannot_steer_the_terminal() -> None:
    """A title or label with escape sequences must not reach the terminal as such."""
    harm = "\x1b[2J\x07harm"
    result = handmade.result(
        handmade.candidate(coils=(handmade.coil(label=harm),), warnings=(harm,)),
        request=handmade.request(title=harm),
    )
    text = result_table(result)
    assert "\x1b" not in text and "\x07" not in text and "harm" in text


def test_windings_show_the_first_and_say_how_many_there_are() -> None:
    """`--top` shortens the table, not the count in its heading."""
    coils = tuple(handmade.coil("", extra={"q": 187.0, "series_resistance_ohm": 0.97}) for _ in range(25))
    text = windings_table(coils, inductance=4e-6, at=7.1e6, top=3)
    assert "25 coils, nearest to 4 \u00b5H first, figures at 7.1 MHz" in text
    assert text.count("14 turns") == 3
    assert "+1.25 %" in text  # 4.05/4 - 1
    assert max(columns_of(line) for line in text.splitlines()) <= 80


@pytest.mark.parametrize(
    ("value", "written"),
    [(None, "?"), (0.0, "0"), (187.04, "187"), (0.0001234, "0.000123"), (999.7, "1000"), (12345.0, "12300")],
)
def test_figures_have_no_exponent(value: float | None, written: str) -> None:
    """At the bench nobody reads 1.2e+03."""
    assert figure(value) == written


def test_lengths_read_as_on_a_ruler() -> None:
    """A wire is cut in metres, a winding is measured in millimetres."""
    assert (length(0.0005), length(0.0078), length(1.238)) == ("0.5 mm", "7.8 mm", "1.24 m")


def test_signs_are_always_written() -> None:
    """Too high and too low call for opposite corrections."""
    assert signed_percent(0.0031) == "+0.310 %"
    assert signed_percent(-2e-9) == "-0.0000002 %"
    assert signed_shift(999.9996e3) == "+1000 kHz"
    assert slope(-3.0e16) == "-30 kHz"


def test_less_than_a_picofarad_is_told_in_picofarad() -> None:
    """Nobody at the bench says 500 fF."""
    from partpick.report.text import quantity

    assert quantity(0.5e-12, "F") == "0.5 pF"
    assert quantity(1.2e-12, "F") == "1.2 pF"
    assert quantity(0.66e-12, "F", 2) == "0.66 pF"
