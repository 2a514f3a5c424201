"""Charts that need no library: the error of each band with its tolerance, and error against pieces."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from partpick.quantities import format_percent
from partpick.report.text import cut, plural, signed_percent
from partpick.report.tracking import worst_tracking
from partpick.report.vector import box, circle, line, svg, words
from partpick.result import BandFigures, Candidate, Result

WIDTH = 340.0
ROW = 44.0
EDGE = 14.0
LONGEST_NAME = 26


@dataclass(frozen=True)
class Spread:
    """Where the error of a band falls in built units with nothing adjusted, as signed fractions of the target."""

    low: float  # one unit in twenty is below
    high: float  # one unit in twenty is above
    least: float
    most: float

    @property
    def reach(self) -> float:
        """The largest error by size."""
        return max(abs(self.least), abs(self.most))


def spread_of(band: BandFigures) -> Spread | None:
    """Return the spread that assessment has put into a band's figures; None where there is none."""
    given = band.extra.get("spread")
    if not isinstance(given, Mapping):
        return None
    ends = [given.get(key) for key in ("error_5_percent", "error_95_percent", "error_least", "error_most")]
    known = [float(end) for end in ends if isinstance(end, (int, float))]
    return Spread(*known) if len(known) == len(ends) else None


def error_bars(result: Result, candidate: Candidate) -> str:
    """Return the error of each fixed band with what tolerances add, before alignment; nothing without one."""
    bands = [band for band in candidate.bands if band.error is not None]
    spreads = [spread_of(band) for band in bands]
    if not bands:
        return ""
    limit = result.request.limits.error
    reach = max([_reach(band, spread) for band, spread in zip(bands, spreads, strict=True)] + [limit or 0.0, 1e-6])
    scale = (WIDTH / 2 - EDGE) / (1.1 * reach)
    foot = 10 + ROW * len(bands)
    lines = []
    if limit is not None:
        lines.append(box(WIDTH / 2 - limit * scale, 6, 2 * limit * scale, foot - 6, "allowed"))
    lines.append(line(WIDTH / 2, 6, WIDTH / 2, foot, "faint"))
    for place, (band, spread) in enumerate(zip(bands, spreads, strict=True)):
        lines += _row(band, spread, 10 + ROW * place, scale)
    lines += _scale(reach, scale, foot)
    return svg(WIDTH, foot + 22, lines, "Error of each band with the spread of its parts")


def _reach(band: BandFigures, spread: Spread | None) -> float:
    return max(abs(band.error or 0.0), spread.reach if spread else 0.0)


def _row(band: BandFigures, spread: Spread | None, top: float, scale: float) -> list[str]:
    assert band.error is not None
    x, y = WIDTH / 2 + band.error * scale, top + 30
    lines = [
        words(EDGE, top + 14, cut(band.name, LONGEST_NAME), "strong"),
        words(WIDTH - EDGE, top + 14, signed_percent(band.error), "", "end"),
    ]
    if spread:
        low, high, least, most = (
            WIDTH / 2 + end * scale for end in (spread.low, spread.high, spread.least, spread.most)
        )
        lines += [line(least, y, most, y), *(line(end, y - 4, end, y + 4) for end in (least, most))]
        lines += [line(low, y, high, y, "thick")]
    return [*lines, circle(x, y, 4, "dot")]


def _scale(reach: float, scale: float, foot: float) -> list[str]:
    step = 10 ** math.floor(math.log10(reach))
    step = next(wider for wider in (5 * step, 2 * step, step) if wider <= reach)
    lines = [line(EDGE, foot, WIDTH - EDGE, foot, "faint")]
    for place in (-1, 0, 1):
        x = WIDTH / 2 + place * step * scale
        lines += [line(x, foot, x, foot + 4, "faint")]
        signed = "0" if place == 0 else ("\u2212", "+")[place > 0] + format_percent(step, 2)
        lines += [words(x, foot + 17, signed, "", "middle")]
    return lines


def least(candidates: Sequence[Candidate]) -> str:
    """Return what is least at each step of a front: the error, else the tracking error or the excess."""
    first = candidates[0]
    if worst_tracking(first):
        return "tracking error"
    return "excess" if first.worst_error is None else "error"


def _led_by(candidate: Candidate) -> tuple[float | None, str]:
    """Return the figure that leads a step of a front, and how it is written."""
    if told := worst_tracking(candidate):
        return float(str(candidate.extra["worst_tracking_hz"])), told
    value = candidate.worst_excess if candidate.worst_error is None else candidate.worst_error
    return value, "" if value is None else signed_percent(value).lstrip("+")


def front(candidates: Sequence[Candidate]) -> str:
    """Return what `least` names against pieces as a bar a step; nothing without a choice."""
    steps = [(c.piece_count, *_led_by(c)) for c in candidates]
    known = [(pieces, value, told) for pieces, value, told in steps if value is not None]
    if len(known) < 2:
        return ""
    # bars of length by decades: the second piece may buy a factor of a hundred
    logs = [math.log10(max(value, 1e-9)) for _, value, _ in known]
    low, high = min(logs) - 0.5, max(logs)
    lines = []
    for place, ((pieces, _, told), size) in enumerate(zip(known, logs, strict=True)):
        y = 8.0 + 26 * place
        length = (WIDTH - 190) * (size - low) / (high - low)
        lines.append(words(EDGE, y + 13, plural(pieces, "piece")))
        lines.append(box(EDGE + 76, y + 2, length, 14, "bar"))
        lines.append(words(EDGE + 84 + length, y + 13, told))
    title = f"Least {least(candidates)} for the number of pieces, a decade a step"
    return svg(WIDTH, 12 + 26 * len(known), lines, title)
