"""[cover]: the fewest bands, their edges, the plan for them; and what would do where a swept band has none."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from workbench import read_json, run

import partpick
from partpick.cover import MOST_BANDS, with_bands
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.request import Request
from partpick.result import Result
from partpick.tuning_range import least_bands

AIR = {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"}
SPAN = {"from": "3 MHz", "to": "9 MHz"}


def request(**tables: Any) -> Request:
    whole = {"cover": SPAN, "tuning": AIR, "coil": {"forms": ["bought"]}, "title": "Invented", **tables}
    return request_from_tables(whole, "bands")


def solved(**tables: Any) -> Result:
    return partpick.solve(request(**tables), partpick.load_catalogue(), top=1)


def test_bands_made_have_equal_ratios_and_leave_no_gap() -> None:
    """Of all edges these make the widest band narrowest; what the plan states goes to every band."""
    stated = request(trimmer="3 pF..20 pF", stray={"capacitance": "7 pF"}, limits={"q": 80})
    bands = with_bands(stated, 4).bands
    assert (bands[0].low, bands[-1].high) == (3e6, 9e6)
    for below, above in pairwise(bands):
        assert below.high == above.low
    ratios = [band.highest / band.lowest for band in bands]
    assert ratios == pytest.approx([3 ** (1 / 4)] * 4, rel=1e-12)
    assert {(band.trimmer, band.stray, band.q) for band in bands} == {(stated.trimmer, 7e-12, 80.0)}


def test_every_band_may_have_a_coil_unless_the_plan_says_how_many() -> None:
    """One coil a band is what a coil box has; a stated number holds."""
    assert with_bands(request(), 3).limits.inductors == 3
    assert with_bands(request(limits={"inductors": 2}), 3).limits.inductors == 2
    assert with_bands(request(limits={"inductors": 1}), 3).limits.inductors == 1


def test_the_span_is_covered_by_as_few_bands_as_the_element_can() -> None:
    """(150 + 10)/(12 + 10) of 12..150 pF with 10 pF is a ratio below 3 in frequency: one band cannot, two do."""
    assert math.sqrt((150 + 10) / (12 + 10)) < 3
    result = solved()
    assert [band.name for band in result.request.bands] == ["range 1", "range 2"]
    assert result.request.title == "Invented"
    assert "cover" in dict(result.request.extra)
    assert "fewer than 2 bands cannot do" in result.proof.searched
    (candidate,) = result.candidates
    margin = result.request.limits.margin
    for band in candidate.bands:
        low, high, tuned_low, tuned_high = (
            float(str(band.extra[key])) for key in ("low_hz", "high_hz", "tuned_low_hz", "tuned_high_hz")
        )
        assert tuned_low <= low * (1 - margin) * (1 + 1e-9)
        assert tuned_high >= high * (1 + margin) * (1 - 1e-9)


def test_one_band_is_made_where_one_does() -> None:
    """No band is split without need."""
    result = solved(cover={"from": "3 MHz", "to": "6 MHz"})
    assert len(result.request.bands) == 1 and result.candidates


def test_a_further_band_is_tried_where_the_fewest_have_no_plan() -> None:
    """Just within reach of the element, but no inductor of the E12 series sits there: the text says what was tried."""
    result = solved(cover={"from": "3.3 MHz", "to": "8.3 MHz"})
    assert "bands cannot do" not in result.proof.searched  # by the element alone one would do
    assert len(result.request.bands) == 2 and result.candidates
    assert "1 of equal frequency ratio had no plan, other edges were not tried" in result.proof.searched


def test_a_search_that_is_stopped_says_so() -> None:
    """Nothing is claimed of bands that were not tried."""
    stopped = partpick.solve(request(), partpick.load_catalogue(), top=1, monitor=Quiet(time_limit=0.0))
    assert not stopped.candidates
    assert (stopped.proof.status, stopped.proof.stopped_by) == ("unknown", "time limit")


@pytest.mark.parametrize("ratio", [1.3, 2.0, 5.0, 40.0])
@pytest.mark.parametrize("reached", [1.2, 1.9, 3.3])
def test_the_least_number_of_bands_is_the_first_whose_equal_ratio_is_within_reach(ratio: float, reached: float) -> None:
    """Counted up plainly, the margin added at both ends of every band."""
    margin = 0.03
    plain = next(n for n in range(1, 99) if ratio ** (1 / n) * (1 + margin) / (1 - margin) <= reached)
    assert least_bands(ratio, reached, margin) == plain


def test_a_margin_as_wide_as_the_element_leaves_no_band() -> None:
    """However many bands: each would have to reach its own margin."""
    assert least_bands(2.0, 1.05, 0.03) is None


def test_a_span_beyond_twelve_bands_says_so() -> None:
    """With the ratio that one band reaches, and that every band would need."""
    tiny = {"kind": "variable capacitor", "low": "50 pF", "high": "60 pF"}
    result = solved(tuning=tiny)
    assert not result.candidates and result.proof.status == "infeasible"
    assert result.ruled_out_by is not None and result.ruled_out_by.limit == "tuning"
    assert f"{MOST_BANDS} bands" in result.ruled_out_by.text and "larger element" in result.ruled_out_by.text


def test_a_limit_that_no_band_meets_is_named_for_the_band() -> None:
    """The element would do, the coils do not: after twelve bands the reason is that of one of them."""
    result = solved(limits={"price": 0.01})
    assert not result.candidates
    assert result.ruled_out_by is not None and "up to 12 bands tried" in result.ruled_out_by.text
    assert len(result.request.bands) == MOST_BANDS


def test_a_plan_with_cover_runs_from_the_command_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The contract's [cover] in a file; the result shows the bands made."""
    monkeypatch.chdir(tmp_path)
    Path("p.toml").write_text(
        '[cover]\nfrom = "3 MHz"\nto = "9 MHz"\n'
        '[tuning]\nkind = "variable capacitor"\nlow = "12 pF"\nhigh = "150 pF"\n[coil]\nforms = ["bought"]\n',
        encoding="utf-8",
    )
    done = run("bands", "p.toml", "--top", 1, "--json", "-", "--dial", "d.csv")
    assert done.code == 0, done.err
    result = read_json(done.out)
    assert result["request"]["cover"] == {"from": 3e6, "to": 9e6}
    edges = [(band["from"], band["to"]) for band in result["request"]["bands"]]
    assert edges[0][1] == pytest.approx(math.sqrt(3e6 * 9e6))
    assert len(result["candidates"][0]["bands"]) == 2
    assert Path("d.csv").read_text(encoding="utf-8").count("range 2") >= 21


# ---------------------------------------------------------------- a swept band that the element cannot tune


def beyond(**tables: Any) -> Result:
    whole = {"tuning": AIR, "coil": {"forms": ["bought"]}, **tables}
    return partpick.solve(request_from_tables(whole, "pair"), partpick.load_catalogue(), top=1)


def test_a_band_wider_than_the_element_can_tune_says_what_would_do() -> None:
    """Issue, "Nothing fits": ratio, strays, what it gives, what the band needs, and three ways out."""
    result = beyond(band=[{"from": "3 MHz", "to": "9 MHz"}], stray={"capacitance": "22 pF"})
    ruled = result.ruled_out_by
    assert ruled is not None and ruled.limit == "tuning"
    assert ruled.needed == pytest.approx(3 * 1.03 / 0.97)
    for said in ("capacitance ratio 12 ", "22 pF of strays", "less strays, two bands, or a larger element"):
        assert said in ruled.text
    told = float(ruled.text.split("at most ")[1].split(" ")[0])
    most = math.sqrt((150 + 22) / (12 + 22))
    assert 0.99 * most < told <= most  # every coil adds some self-capacitance


def test_the_bound_is_no_closer_than_what_can_be_built() -> None:
    """Just inside the bound a coil made to measure tunes the band: the element is not blamed for a near miss."""
    reached = math.sqrt((150 + 10 + 2) / (12 + 10 + 2))
    low = 3e6
    high = low * reached * 0.97 / 1.03 * 0.9999
    inductance = 1 / ((2 * math.pi * low * 0.97) ** 2 * (150 + 10 + 2) * 1e-12)
    tables = {
        "tuning": AIR,
        "coil": {"measured": f"{inductance * 1e6 * 1.00001:.9f} µH", "self_capacitance": "2 pF"},
        "stray": {"capacitance": "10 pF", "share": "none"},
    }
    inside = request_from_tables({**tables, "band": [{"name": "a", "from": low, "to": high}]}, "bands")
    assert partpick.solve(inside, partpick.load_catalogue(), top=1).candidates
    wider = replace(inside, bands=(replace(inside.bands[0], high=high * 1.0005),))
    ruled = partpick.solve(wider, partpick.load_catalogue(), top=1).ruled_out_by
    assert ruled is not None and ruled.limit == "tuning"


def test_an_excess_that_cannot_be_met_says_the_least_that_can() -> None:
    """A limit of the plan, not of the element: the first limit named is the one that rules it out."""
    result = beyond(band=[{"from": "3.5 MHz", "to": "4 MHz"}], limits={"excess": "0.001 %"})
    ruled = result.ruled_out_by
    assert ruled is not None and ruled.limit == "excess"
    assert isinstance(ruled.needed, float) and ruled.needed > 1e-5
    free = beyond(band=[{"from": "3.5 MHz", "to": "4 MHz"}], limits={"excess": f"{100.1 * ruled.needed} %"})
    assert free.candidates
