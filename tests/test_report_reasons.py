"""Reasons in words: the step that decides, the limits that are near, what more pieces would buy."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import handmade
import pytest
import solved

from partpick.errors import RequestError
from partpick.quantities import format_percent
from partpick.report.reasons import reasons
from partpick.report.sensitivity_table import sensitivity_rows
from partpick.report.text import columns_of
from partpick.request import CoilRules, Limits, Trimmer
from partpick.result import Candidate, Result

ORDER = (
    ("pieces", 3),
    ("error_class", 2100000),
    ("q_class", 0),
    ("stray_class", 0),
    ("reactance_class", 0),
    ("effort", (2, 0, 40)),
    ("commonness", 1),
    ("error_rank", 520000),
    ("price", 106),
)


def ranked(step: str, figure: object, **changes: Any) -> Result:
    """Return two candidates that first differ at a step of the order, and after it in everything."""
    place = [name for name, _ in ORDER].index(step)
    worse = [(name, value) for name, value in ORDER[:place]] + [(step, figure)]
    worse += [(name, 10**9) for name, _ in ORDER[place + 1 :]]
    second = handmade.candidate(2, coils=(handmade.coil(label="9 turns on ring"),), **changes)
    return handmade.result(
        replace(handmade.candidate(1), order=ORDER), replace(second, order=tuple(worse)), front=(handmade.candidate(1),)
    )


def told(result: Result, rank: int) -> str:
    return " ".join(reasons(result, rank).split())


@pytest.mark.parametrize(
    ("step", "figure", "changes", "words"),
    [
        ("pieces", 4, {"piece_count": 4}, "by pieces: 3 against 4"),
        (
            "error_class",
            4000000,
            {"worst_error": 0.004},
            "by the worst error: 0.052 % against 0.400 %; below 0.21 % all count as equal",
        ),
        ("stray_class", 2, {}, "by strays, in classes up to 10 %, up to 20 % and more"),
        ("reactance_class", 1, {}, "by reactance: 0 against 1 octaves"),
        ("effort", (3, 0, 10), {}, "by the kind of winding, rank 1 the easier"),
        ("effort", (2, 1, 10), {}, "by wire: 0 against 1 coil with wire outside 0.3 to 1.0 mm"),
        ("effort", (2, 0, 44), {}, "by the size of the coils, in steps of 25 %: rank 1 has the smaller"),
        ("commonness", 5, {}, "by capacitor values: rank 1 has the commoner"),
        ("price", 999, {"price": 9.99}, "by price: 1.06 against 9.99"),
    ],
)
def test_the_first_step_that_differs_decides(step: str, figure: object, changes: dict[str, Any], words: str) -> None:
    """Later steps count only among equals, so that they are no reason."""
    result = ranked(step, figure, **changes)
    assert f"Rank 2 is after it {words}" in told(result, 1)
    assert f"Rank 1 is before it {words}" in told(result, 2)


def test_equal_steps_leave_the_name() -> None:
    """The order is total: among equals the parts' names decide, and that is no merit."""
    first, second = (replace(handmade.candidate(rank), order=ORDER) for rank in (1, 2))
    assert "by name alone" in told(handmade.result(first, second), 2)


def test_limits_that_are_used_up_are_named_and_others_are_not() -> None:
    """A person loosens the limit that is near, not the one that has room."""
    own = handmade.candidate()  # 0.052 % off, Q 187, 181 ohm, two capacitors
    tight = handmade.request(
        limits=Limits(error=0.00055, parts_per_band=2, q=180.0, price=50.0), coil=CoilRules(reactance=(60.0, 190.0))
    )
    tight = replace(tight, bands=(replace(tight.bands[0], q=180.0),))
    text = told(handmade.result(own, request=tight), 1)
    for words in ("parts_per_band 2 of 2", "error 0.052 % of 0.055 %", "q 187 of 180", "at most 190"):
        assert words in text, words
    assert "price 1.06" not in text
    loose = handmade.request(limits=Limits(error=0.01, parts_per_band=4))
    assert "No limit is near" in told(handmade.result(own, request=loose), 1)


def test_what_one_more_piece_buys_is_weighed_against_the_floor() -> None:
    """Below the floor parts vary more than the gain, and the text says so."""
    better = handmade.candidate(None, piece_count=4, worst_error=0.0001)
    own = handmade.candidate()
    drowned = told(handmade.result(own, front=(own, better)), 1)
    assert "1 piece more would bring the error from 0.052 % to 0.010 %" in drowned and "tolerance drowns" in drowned
    assert "tolerance drowns" not in told(handmade.result(own, front=(own, better), floor=0.0003), 1)
    assert "More pieces would buy nothing" in told(handmade.result(own), 1)


def test_tolerance_is_that_of_the_widest_band() -> None:
    """The band that strays most decides whether the plan needs trimmers."""
    near, far = (
        {"spread": {"error_5_percent": -end / 2, "error_95_percent": end / 2, "error_least": -end, "error_most": end}}
        for end in (0.01, 0.04)
    )
    own = handmade.two_bands()
    first, second = own.bands
    bands: tuple[Any, ...] = (replace(first, extra=near), replace(second, extra=far))
    result = handmade.result(replace(own, bands=bands), request=handmade.request("beacon", "weather"))
    assert "at weather, the widest band, 9 of 10 units fall between -2.00 % and +2.00 %" in told(result, 1)


@pytest.mark.parametrize("rank", [0, 3, 99])
def test_a_rank_that_is_not_there_is_refused_with_those_that_are(rank: int) -> None:
    """A typing error gets an answer that can be acted on."""
    both = handmade.result(handmade.candidate(1), handmade.candidate(2))
    with pytest.raises(RequestError, match="1 to 2 can be asked for"):
        reasons(both, rank)


def test_reasons_of_the_demo_plan_name_every_step_in_words() -> None:
    """A figure of the search in an answer for the bench would be noise; lines keep to 80 columns."""
    result = solved.demo()
    for candidate in result.candidates:
        assert isinstance(candidate, Candidate) and candidate.rank is not None and candidate.order
        text = reasons(result, candidate.rank)
        assert "_class" not in text and "_rank" not in text
        assert max(columns_of(line) for line in text.splitlines()) <= 80
        assert "inductors 2 of 2" in " ".join(text.split())


def test_contacts_and_tracking_are_limits_that_are_told() -> None:
    """A switch with no contact to spare, an oscillator that is as far off as is allowed."""
    entry = {"band": "medium wave", "worst_error_hz": 7600.0, "limit_hz": 8000.0}
    extra = {"switch": {"contacts": 6}, "tracking": [entry], "worst_tracking_hz": 7600.0}
    own, other = replace(handmade.candidate(1), extra=extra), handmade.candidate(2, coils=(handmade.coil(label="x"),))
    limits = Limits(contacts=6, error_stated=True)
    request = replace(handmade.request("beacon"), limits=limits)
    words = told(handmade.result(own, other, request=request), 1)
    assert "contacts 6 of 6" in words and "tracking 7.6 kHz of 8 kHz at medium wave" in words


def test_an_error_limit_that_a_trimmer_has_taken_away_is_no_limit() -> None:
    """By default a band with a trimmer has none: 1.34 % of 0.5 % would make no sense."""
    off = replace(handmade.candidate(1), worst_error=0.0134)
    off = replace(off, bands=(replace(off.bands[0], error=0.0134),))
    request = handmade.request("beacon")
    trimmed = replace(request, bands=(replace(request.bands[0], trimmer=Trimmer(low=3e-12, high=20e-12)),))
    assert "error 1.34 %" not in told(handmade.result(off, request=trimmed), 1)
    assert "error 1.34 % of 0.5 %" in told(handmade.result(off, request=request), 1)


def test_what_each_part_contributes_is_told() -> None:
    """Figures of the JSON, in the units of the bench; shares of a band come to all of its spread."""
    candidate = solved.demo().candidates[0]
    assert "What each part contributes" in reasons(solved.demo(), 1)
    entries = candidate.extra["sensitivity"]
    assert isinstance(entries, list)
    shown = {(row[0], row[1]): row for row in sensitivity_rows(candidate)}
    compared = 0
    for entry in entries:
        row = shown.get((entry["band"], entry["reference"]))
        if row is not None:
            number, unit = row[3].split()
            hertz = float(number) * {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6}[unit]
            assert hertz == pytest.approx(entry["hertz_per_percent"], rel=0.006)
            assert row[5] == format_percent(entry["share_of_variance"], 2)
            compared += 1
    assert compared >= 9, "every coil and capacitor that counts"
    by_band: dict[str, float] = {}
    for entry in entries:
        by_band[entry["band"]] = by_band.get(entry["band"], 0.0) + (entry["share_of_variance"] or 0.0)
    assert all(share == pytest.approx(1.0, abs=0.01) for share in by_band.values())
