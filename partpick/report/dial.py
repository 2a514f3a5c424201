"""The dial chart of the best candidate: where the tuning element stands at each frequency, CSV or JSON.

A variable capacitor is told in degrees of rotation (0: plates out, 180: plates in), a varactor in volts of
reverse bias, a sliding core in millimetres that it is pushed in, a moving contact in turns in use, a variometer
in degrees between the axes (0: aiding). What is not tuned is taken as the candidate has it at both ends of a
band and as straight lines against frequency between them.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

import partpick
from partpick.errors import RequestError
from partpick.physics.resonance import effective_capacitance
from partpick.physics.varactor import bias_for, junction_for_network
from partpick.physics.variable_capacitor import rotation_for
from partpick.report.chart_file import cell, check_chart_name, ending
from partpick.report.dial_moved import inductance_at, positions, setting_for, single_valued
from partpick.request import Request, Tuning
from partpick.result import BandFigures, Candidate, Result
from partpick.tuning import SETTING_UNITS, element_ends

Floats = NDArray[np.float64]

DIAL_FORMAT = 1
STEPS = 20  # equal steps of frequency between the tuned ends
FINE_STEPS = 400  # for the straightness
SLOPE_STEP = 1e-5  # of the tuned span, to either side
COLUMNS = (
    "band",
    "frequency_hz",
    "setting",
    "unit",
    "hz_per_unit",
    "element_f",
    "point",
    "straightness",
    "element_h",
)
BETWEEN = "inductance, padders and strays: straight lines against frequency between the tuned ends"
BETWEEN_MOVED = (
    "capacitances but the coil's own: straight lines against frequency between the tuned ends; inductance and the "
    "coil's own capacitance by setting: a table with a smooth curve through it, within 0.05 % of the frequency"
)


@dataclass(frozen=True, kw_only=True)
class DialPoint:
    """One line of the chart."""

    frequency: float  # Hz
    setting: float  # degree, V, mm or turns
    rate: float  # Hz per degree, volt, mm or turn, signed
    element: float  # F, the tuning element alone; H where it moves the inductance
    point: str  # "tuned end", "wanted end", "step"


@dataclass(frozen=True, kw_only=True)
class Dial:
    """The chart of one swept band."""

    band: str
    unit: str
    straightness: float  # largest departure from a straight dial, fraction of the tuned span
    moved: bool  # whether the inductance is tuned
    points: tuple[DialPoint, ...]  # rising frequency


def check_dial(path: str | None, request: Request) -> None:
    """Refuse a chart that cannot be drawn, before anything is solved.

    Raises
    ------
    RequestError
        No band is swept, the tuning element has no chart, or the name says neither CSV nor JSON.
    """
    if path is None:
        return
    check_chart_name("--dial", path)
    if not any(band.swept for band in request.bands) and "cover" not in dict(request.extra):
        raise RequestError("--dial: no band has a range, so no dial is turned; a band with from and to is wanted")


def dial_text(result: Result, path: str = "-") -> str:
    """Return the chart as the name of its file asks for: JSON for .json, else CSV."""
    return dial_json(result) if ending(path) == ".json" else dial_csv(result)


def dial_csv(result: Result) -> str:
    """Return the chart as CSV (RFC 4180), one row a point; the header alone where nothing fits."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\r\n")
    writer.writerow(COLUMNS)
    for dial in dials(result):
        for p in dial.points:
            name = cell(dial.band)
            row = (p.frequency, p.setting, p.rate, p.element, dial.straightness)
            frequency, setting, rate, element, straightness = (format(value, ".9g") for value in row)
            farad, henry = ("", element) if dial.moved else (element, "")
            writer.writerow((name, frequency, setting, dial.unit, rate, farad, p.point, straightness, henry))
    return text.getvalue()


def dial_json(result: Result) -> str:
    """Return the chart as JSON, indented, with a final newline."""
    bands = [
        {
            "name": dial.band,
            "unit": dial.unit,
            "straightness": dial.straightness,
            "points": [
                {
                    "frequency_hz": p.frequency,
                    "setting": p.setting,
                    "hz_per_unit": p.rate,
                    "element_f": None if dial.moved else p.element,
                    "element_h": p.element if dial.moved else None,
                    "point": p.point,
                }
                for p in dial.points
            ],
        }
        for dial in dials(result)
    ]
    tuning = result.request.tuning
    between = BETWEEN_MOVED if tuning is not None and tuning.moves_inductance else BETWEEN
    entry = {"partpick_dial": DIAL_FORMAT, "version": partpick.__version__, "between_the_ends": between, "bands": bands}
    return json.dumps(entry, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def dials(result: Result) -> Iterator[Dial]:
    """Return the chart of each swept band of the best candidate, in plan order; none where nothing fits."""
    if not result.candidates or result.request.tuning is None:
        return
    first = result.candidates[0]
    for figures in first.bands:
        if "tuned_low_hz" in figures.extra:
            yield dial_of(result.request.tuning, first, figures)


def dial_of(tuning: Tuning, candidate: Candidate, figures: BandFigures) -> Dial:
    """Return the chart of one swept band.

    Parameters
    ----------
    tuning : Tuning
        The element.
    candidate : Candidate
        Whose part list holds the series padder of the band.
    figures : BandFigures
        Of the band; its `extra` has the tuned ends and what is in circuit there.

    Returns
    -------
    dial : Dial
        21 points in equal steps of frequency from one tuned end to the other, and both ends asked for; of a
        contact that steps from turn to turn one point a turn. The tuning rate is the slope there. Straightness
        compares with a scale that is straight from one tuned end to the other, at the same setting.
    """
    if tuning.moves_inductance:
        table = positions(candidate, figures)
        stepped = tuning.kind == "moving contact" and tuning.get("continuous") is not True
        if stepped or not single_valued(table[0], table[2]):
            return _stepped(tuning, figures, *table)
        element, setting = inductance_at(table[0], table[2]), setting_for(table[1], table[2])
    else:
        element, setting = _element_at(candidate, figures), _law(tuning)
    ends = [_number(figures, key) for key in ("tuned_low_hz", "tuned_high_hz")]
    wanted = [f for key in ("low_hz", "high_hz") if ends[0] <= (f := _number(figures, key)) <= ends[1]]  # a receiver's
    # oscillator may be off by its tracking error, so that an end of its range is beyond those of the element
    steps = np.linspace(ends[0], ends[1], STEPS + 1)
    frequency = np.unique(np.concatenate([steps, wanted]))
    near = SLOPE_STEP * (ends[1] - ends[0])
    below, above = np.maximum(frequency - near, ends[0]), np.minimum(frequency + near, ends[1])
    rate = (above - below) / (setting(element(above)) - setting(element(below)))
    points = tuple(
        DialPoint(
            frequency=float(f),
            setting=float(s),
            rate=float(r),
            element=float(c),
            point="tuned end" if f in ends else "wanted end" if f in wanted else "step",
        )
        for f, s, r, c in zip(frequency, setting(element(frequency)), rate, element(frequency), strict=True)
    )
    fine = np.linspace(ends[0], ends[1], FINE_STEPS + 1)
    turned = setting(element(fine))
    share = (turned - turned[0]) / (turned[-1] - turned[0])
    straightness = float(np.max(np.abs((fine - ends[0]) / (ends[1] - ends[0]) - share)))
    return Dial(
        band=figures.name,
        unit=SETTING_UNITS[tuning.kind],
        straightness=straightness,
        moved=tuning.moves_inductance,
        points=points,
    )


def _stepped(tuning: Tuning, figures: BandFigures, frequency: Floats, turns: Floats, inductance: Floats) -> Dial:
    """Return the chart of an element by its places, one point each; the rate is that to its neighbours."""
    rate = np.gradient(frequency, turns)
    along = (turns - turns[0]) / (turns[-1] - turns[0])
    tuned = (frequency - frequency[0]) / (frequency[-1] - frequency[0])
    ends = (turns[0], turns[-1])
    return Dial(
        band=figures.name,
        unit=SETTING_UNITS[tuning.kind],
        straightness=float(np.max(np.abs(tuned - along))),
        moved=True,
        points=tuple(
            DialPoint(
                frequency=float(f),
                setting=float(turn),
                rate=float(slope),
                element=float(own),
                point="tuned end" if turn in ends else "step",
            )
            for f, turn, slope, own in zip(frequency, turns, rate, inductance, strict=True)
        ),
    )


def _element_at(candidate: Candidate, figures: BandFigures) -> Callable[[Floats], Floats]:
    """Return the capacitance that the tuning element must have, as a function of frequency. [F]"""
    tuned = np.array([_number(figures, key) for key in ("tuned_low_hz", "tuned_high_hz")])
    asked = np.array([_number(figures, key) for key in ("low_hz", "high_hz")])
    own = np.array([_number(figures, key) for key in ("tuning_high_f", "tuning_low_f")])  # as the tuned ends
    inductance = np.array([_number(figures, "inductance_low_h"), figures.inductance])
    total = np.array([_number(figures, key) for key in ("capacitance_low_f", "capacitance_high_f")])
    padder = np.full(2, np.inf)
    if figures.extra["series_padder_f"] is not None:
        part = next(line for line in candidate.parts if line.reference == figures.capacitors[-1])
        padder = effective_capacitance(_number(figures, "series_padder_f"), part.series_inductance or 0.0, asked)
    others = total - own / (1.0 + own / padder)

    def between(ends: Floats, frequency: Floats) -> Floats:
        return np.asarray(np.interp(frequency, tuned, ends))

    def element(frequency: Floats) -> Floats:
        wanted = 1.0 / ((2 * np.pi * frequency) ** 2 * between(inductance, frequency))
        behind = wanted - between(others, frequency)
        found = behind / (1.0 - behind / between(padder, frequency)) if math.isfinite(padder[0]) else behind
        return np.asarray(np.clip(found, own[1], own[0]))  # rounding at the ends

    return element


def _law(tuning: Tuning) -> Callable[[Floats], Floats]:
    """Return the setting of a tuning element as a function of its capacitance. [degree or V]"""
    if tuning.kind == "variable capacitor":
        ends = element_ends(tuning)
        law = str(tuning.get("law"))
        # The ends are of all sections together: the law has the same shape for one. Plates are taken as cut
        # for the section alone, with nothing across it.
        return lambda capacitance: np.asarray(rotation_for(capacitance, ends.low, ends.high, law))
    keys = {name: value for name, value in tuning.keys if isinstance(value, (int, float))}
    back_to_back = tuning.get("connection") == "back to back"

    def bias(capacitance: Floats) -> Floats:
        junction = junction_for_network(capacitance, keys.get("count", 1), back_to_back, keys.get("series", np.inf))
        at_most = np.minimum(junction, keys["zero_bias"])  # rounding where the bias begins at 0 V
        return np.asarray(bias_for(at_most, keys["zero_bias"], keys["potential"], keys["grading"]))

    return bias


def _number(figures: BandFigures, key: str) -> float:
    value = figures.extra[key]
    assert isinstance(value, float)
    return value
