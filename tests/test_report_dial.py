"""The dial chart: settings against frequency by the law of the element, its slope and how straight it is."""

from __future__ import annotations

import csv
import io
import json
import math
import re
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from workbench import run

import partpick
from partpick.planfile import request_from_tables
from partpick.report.dial import STEPS, Dial, dial_of, dials
from partpick.report.pictures import pictures
from partpick.request import Tuning
from partpick.result import BandFigures, Candidate, Result

LOW, HIGH = 20e-12, 180e-12  # F, of the element
INDUCTANCE = 2e-6  # H
AIR = {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"}
JUNCTION = {
    "kind": "varactor", "zero_bias": "500 pF", "potential": "0.7 V", "grading": 0.7, "from": "0 V", "to": "9 V",
    "count": 2, "connection": "back to back", "series": "1 nF",
}  # fmt: skip


@cache
def solved(kind: str = "variable capacitor", by: str = "error") -> Result:
    tables = {
        "band": [{"from": "7 MHz", "to": "7.6 MHz"}],
        "tuning": JUNCTION if kind == "varactor" else AIR,
        "coil": {"measured": "2.2 µH", "self_capacitance": "2 pF"},
        "limits": {"parts_per_band": 2},
    }
    return partpick.solve(request_from_tables(tables, "pair", by=by), partpick.load_catalogue(), top=1)


def resonance(capacitance: float | np.ndarray[Any, Any]) -> Any:
    return 1 / (2 * math.pi * np.sqrt(INDUCTANCE * np.asarray(capacitance)))


def bare_dial(law: str, across: float = 0.0) -> Dial:
    """Return the dial of one coil with the element and a fixed capacitance across it."""
    candidate = solved().candidates[0]
    low, high = float(resonance(HIGH + across)), float(resonance(LOW + across))
    extra: dict[str, object] = {
        "low_hz": low * 1.1, "high_hz": high / 1.1, "tuned_low_hz": low, "tuned_high_hz": high,
        "tuning_low_f": LOW, "tuning_high_f": HIGH, "inductance_low_h": INDUCTANCE,
        "capacitance_low_f": HIGH + across, "capacitance_high_f": LOW + across,
        "series_padder_f": None, "parallel_padder_f": None,
    }  # fmt: skip
    figures: BandFigures = replace(candidate.bands[0], inductance=INDUCTANCE, extra=extra)
    tuning = Tuning(kind="variable capacitor", keys=(("low", LOW), ("high", HIGH), ("sections", 1), ("law", law)))
    return dial_of(tuning, candidate, figures)


def test_plates_for_straight_frequency_give_a_straight_dial() -> None:
    """With nothing else in circuit; the slope is the same everywhere."""
    dial = bare_dial("straight-line frequency")
    span = dial.points[-1].frequency - dial.points[0].frequency
    assert dial.straightness < 1e-9
    assert [p.rate for p in dial.points] == pytest.approx([-span / 180] * len(dial.points), rel=1e-6)


def test_plates_for_straight_wavelength_give_equal_steps_of_wavelength() -> None:
    """1/f in proportion to the rotation, by the meaning of the law."""
    points = bare_dial("straight-line wavelength").points
    first, last = 1 / points[0].frequency, 1 / points[-1].frequency
    for p in points:
        assert 1 / p.frequency == pytest.approx(last + (first - last) * p.setting / 180, rel=1e-9)


def test_plates_for_straight_capacitance_give_equal_steps_of_capacitance() -> None:
    """And a dial that is crowded at the high end: its largest departure by plain search over the rotation."""
    across = 40e-12
    dial = bare_dial("straight-line capacitance", across)
    for p in dial.points:
        assert p.frequency == pytest.approx(float(resonance(LOW + (HIGH - LOW) * p.setting / 180 + across)), rel=1e-9)
    turned = np.linspace(0, 180, 5001)
    frequency = resonance(LOW + (HIGH - LOW) * turned / 180 + across)
    straight = frequency[0] + (frequency[-1] - frequency[0]) * turned / 180
    worst = np.max(np.abs(frequency - straight)) / (frequency[0] - frequency[-1])
    assert worst > 0.1
    assert dial.straightness == pytest.approx(worst, rel=1e-4)
    assert abs(dial.points[0].rate) < abs(dial.points[-1].rate)


def test_the_rate_is_the_slope_of_frequency_against_rotation() -> None:
    """Straight capacitance: df/dtheta = -f (dC/dtheta)/(2 C), the derivative of the resonance."""
    across = 40e-12
    for p in bare_dial("straight-line capacitance", across).points:
        slope = -p.frequency * (HIGH - LOW) / 180 / (2 * (p.element + across))
        assert p.rate == pytest.approx(slope, rel=1e-4)


@pytest.mark.parametrize(("kind", "low", "high"), [("variable capacitor", 180, 0), ("varactor", 0, 9)])
def test_the_chart_runs_from_one_tuned_end_to_the_other(kind: str, low: float, high: float) -> None:
    """Plates in or least bias at the low end; 21 points in equal steps and both ends asked for."""
    result = solved(kind)
    (dial,) = dials(result)
    extra = result.candidates[0].bands[0].extra
    assert dial.points[0].frequency == pytest.approx(extra["tuned_low_hz"], rel=1e-12)
    assert dial.points[-1].frequency == pytest.approx(extra["tuned_high_hz"], rel=1e-12)
    assert dial.points[0].setting == pytest.approx(low, abs=1e-5)
    assert dial.points[-1].setting == pytest.approx(high, abs=1e-5)
    assert [p.frequency for p in dial.points if p.point == "wanted end"] == [7e6, 7.6e6]
    steps = np.array([p.frequency for p in dial.points if p.point != "wanted end"])
    assert len(steps) == STEPS + 1
    assert np.diff(steps) == pytest.approx([(steps[-1] - steps[0]) / STEPS] * STEPS, rel=1e-6)


def forward(result: Result, element: float) -> float:
    """Return the frequency at which the first candidate resonates, capacitors without their own inductance. [Hz]"""
    candidate: Candidate = result.candidates[0]
    (band,) = candidate.bands
    value = {line.reference: line.value for line in candidate.parts}
    across, padder = band.capacitors, math.inf
    if band.extra["series_padder_f"] is not None:
        across, padder = across[:-1], value[band.capacitors[-1]] or math.nan
    total = 1 / (1 / element + 1 / padder) + band.stray + band.self_capacitance
    total += sum(value[name] or math.nan for name in across)
    return 1 / (2 * math.pi * math.sqrt(2.2e-6 * total))


def test_a_series_padder_is_reckoned_with() -> None:
    """Forward from the rotation, every part by hand; their own inductance of nanohenries makes the 0.1 %."""
    result = solved()
    assert result.candidates[0].bands[0].extra["series_padder_f"] is not None
    (dial,) = dials(result)
    for p in dial.points:
        element = 12e-12 + (150e-12 - 12e-12) * p.setting / 180
        assert p.frequency == pytest.approx(forward(result, element), rel=2e-3)


def test_a_varactor_is_told_in_volts_by_its_junction_law() -> None:
    """Forward from the bias: C0/(1 + V/phi)^g, two pairs in opposition, 1 nF behind them."""
    result = solved("varactor")
    (dial,) = dials(result)
    assert dial.unit == "V"
    for p in dial.points:
        junction = 500e-12 / (1 + p.setting / 0.7) ** 0.7
        element = 1 / (1 / (2 * junction / 2) + 1 / 1e-9)
        assert p.element == pytest.approx(element, rel=1e-6)
        assert p.frequency == pytest.approx(forward(result, element), rel=2e-3)
        assert p.rate > 0


# ---------------------------------------------------------------- from outside

PAIR = ("pair", "7MHz..7.6MHz", "--measured", "2.2uH", "--tuning", "variable capacitor:12pF..150pF", "--top", 1)


def test_csv_and_json_say_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """One by the name .csv or -, the other by .json."""
    monkeypatch.chdir(tmp_path)
    done = run(*PAIR, "--dial", "-")
    rows = list(csv.DictReader(io.StringIO(done.out)))
    assert run(*PAIR, "--dial", "d.json").code == 0
    (band,) = json.loads(Path("d.json").read_text(encoding="utf-8"))["bands"]
    assert len(rows) == len(band["points"]) == STEPS + 3
    for row, point in zip(rows, band["points"], strict=True):
        assert float(row["frequency_hz"]) == pytest.approx(point["frequency_hz"], rel=1e-8)
        assert float(row["setting"]) == pytest.approx(point["setting"], rel=1e-8)
        assert (row["unit"], row["point"]) == (band["unit"], point["point"])


def test_a_chart_that_cannot_be_drawn_is_refused_before_the_search(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """No range, or a name that says neither CSV nor JSON: one line, nothing written."""
    monkeypatch.chdir(tmp_path)
    for arguments, said in (
        (("pair", "7.1MHz", "--dial", "d.csv"), "range"),
        ((*PAIR, "--dial", "d.txt"), ".csv or .json"),
    ):
        done = run(*arguments)
        assert done.code == 2 and done.out == ""
        assert said in done.err and done.err.count("\n") == 1
    assert not list(tmp_path.iterdir())


def test_nothing_fits_leaves_a_chart_without_points(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Still a file that can be read: the header alone."""
    monkeypatch.chdir(tmp_path)
    done = run(*PAIR, "--excess", "0.01 %", "--dial", "-")
    assert done.code == 1
    assert done.out.startswith("band,") and done.out.count("\n") == 1


def test_the_sheet_draws_what_the_chart_says() -> None:
    """One curve a band, drawn through the points of the chart: its scale is theirs."""
    pytest.importorskip("matplotlib")
    result = solved()
    drawn = {picture.title: picture.drawing or "" for picture in pictures(result, result.candidates[0])}
    curve = drawn["Tuning: frequency against setting"]
    (dial,) = dials(result)
    line = re.findall(r'<path d="([^"]*)"[^>]*style="fill: none; stroke: #2f7ed8', curve)[0]  # the legend has another
    x, y = np.array([[float(n) for n in pair.split()] for pair in re.findall(r"[\d.]+ [\d.]+", line)]).T
    settings = np.array([point.setting for point in dial.points])
    frequencies = np.array([point.frequency for point in dial.points])
    assert len(x) >= 0.8 * len(settings), "points may fall together, no more"
    x, y = x[np.argsort(x)], y[np.argsort(x)]
    drawn_law = np.interp(np.linspace(0, 1, 9), (x - x.min()) / np.ptp(x), (y.max() - y) / np.ptp(y))
    order = np.argsort(settings)
    share = (settings[order] - settings.min()) / np.ptp(settings)
    law = np.interp(np.linspace(0, 1, 9), share, (frequencies[order] - frequencies.min()) / np.ptp(frequencies))
    assert drawn_law == pytest.approx(law, abs=0.01)
