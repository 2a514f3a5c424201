"""How a receiver tracks: the lines of the table, and the error curve of the best candidate as CSV or JSON."""

from __future__ import annotations

import csv
import io
import json
from typing import TYPE_CHECKING, Any

import partpick
from partpick.errors import RequestError
from partpick.quantities import format_quantity
from partpick.receiver import is_receiver
from partpick.report import html
from partpick.report.chart_file import cell, check_chart_name, ending
from partpick.report.text import clean, columns, cut, signed_shift, wrapped
from partpick.request import Request
from partpick.result import Candidate, Result

if TYPE_CHECKING:
    from partpick.tracking_figures import TrackingCurve

TRACKING_FORMAT = 1
LONGEST_NAME = 14
HEAD = ("band", "off by at most", "at", "limit", "not rounded", "rounding costs")
NOT_ROUNDED = "not rounded: oscillator coil, padder and parallel capacitor of any value"
COLUMNS = ("band", "signal_hz", "section_f", "wanted_hz", "tuned_hz", "error_hz")


def check_tracking(path: str | None, request: Request) -> None:
    """Refuse a curve that cannot be drawn, before anything is solved.

    Raises
    ------
    RequestError
        The plan is no receiver, or the name says neither CSV nor JSON.
    """
    if path is None:
        return
    check_chart_name("--tracking", path)
    if not is_receiver(request):
        raise RequestError("--tracking: nothing has to track; a plan with [receiver] is wanted")


def tracking_text(result: Result, path: str = "-") -> str:
    """Return the curve as the name of its file asks for: JSON for .json, else CSV."""
    return tracking_json(result) if ending(path) == ".json" else tracking_csv(result)


def tracking_csv(result: Result) -> str:
    """Return the curve as CSV (RFC 4180), one row a frequency; the header alone where nothing fits."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\r\n")
    writer.writerow(COLUMNS)
    for curve in _curves(result):
        name = cell(curve.band)
        for row in zip(curve.signal, curve.section, curve.wanted, curve.tuned, curve.error, strict=True):
            writer.writerow((name, *(format(value, ".9g") for value in row)))
    return text.getvalue()


def tracking_json(result: Result) -> str:
    """Return the curve as JSON, indented, with a final newline."""
    entries = {}
    if result.candidates:
        told = result.candidates[0].extra["tracking"]
        assert isinstance(told, list)
        entries = {entry["band"]: entry for entry in told}
    bands = [
        {
            **entries[curve.band],
            "points": [
                dict(zip(COLUMNS[1:], map(float, row), strict=True))
                for row in zip(curve.signal, curve.section, curve.wanted, curve.tuned, curve.error, strict=True)
            ],
        }
        for curve in _curves(result)
    ]
    entry = {"partpick_tracking": TRACKING_FORMAT, "version": partpick.__version__, "bands": bands}
    return json.dumps(entry, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def tracking_lines(candidate: Candidate) -> list[str]:
    """Return how a candidate tracks, a line a band; nothing where it is no receiver."""
    entries = candidate.extra.get("tracking")
    if not isinstance(entries, list):
        return []
    rows = [[cut(clean(row[0]), LONGEST_NAME), *row[1:]] for row in _rows(entries)]
    lines = wrapped(f"Tracking, {_side(entries)}:")
    lines += ["  " + line for line in columns([list(HEAD), *rows], left=(0,))]
    return lines + wrapped(f"({NOT_ROUNDED})", 0, 1)


def tracking_table(candidate: Candidate) -> str:
    """Return the same as a table of a build sheet; nothing where it is no receiver."""
    entries = candidate.extra.get("tracking")
    if not isinstance(entries, list):
        return ""
    head = [name[0].upper() + name[1:] for name in HEAD]
    side = _side(entries)
    return (
        html.paragraph(f"{side[0].upper()}{side[1:]}.")
        + html.table(head, _rows(entries), figures=range(1, len(head)))
        + html.paragraph(f"{NOT_ROUNDED[0].upper()}{NOT_ROUNDED[1:]}.", class_="soft")
    )


def _side(entries: list[dict[str, Any]]) -> str:
    distance = format_quantity(entries[0]["intermediate_hz"], "Hz", 6)
    return f"the oscillator {distance} {entries[0]['side']} the signal"


def _rows(entries: list[dict[str, Any]]) -> list[list[str]]:
    rows = []
    for entry in entries:
        shown_hz = [_hertz(entry[key]) for key in ("worst_error_hz", "worst_at_hz", "limit_hz", "unrounded_error_hz")]
        rows.append([entry["band"], *shown_hz, signed_shift(entry["rounding_cost_hz"])])
    return rows


def worst_tracking(candidate: Candidate) -> str:
    """Return the worst tracking error of a candidate in words, "" where it is no receiver."""
    worst = candidate.extra.get("worst_tracking_hz")
    return _hertz(worst) if isinstance(worst, float) else ""


def _hertz(value: float) -> str:
    return format_quantity(value, "Hz", 3 if value < 1e5 else 4)


def _curves(result: Result) -> tuple[TrackingCurve, ...]:
    from partpick.tracking_figures import tracking_curves  # imported where a receiver is planned

    return tracking_curves(result.request, result.candidates[0]) if result.candidates else ()
