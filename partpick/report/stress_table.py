"""What the stated drive does to the first candidate, as lines of text, and the cautions that go with it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from partpick.quantities import format_quantity
from partpick.report.bands_table import LONGEST_NAME
from partpick.report.text import clean, columns, cut, quantity, wrapped
from partpick.result import BandFigures, Candidate

HEAD = ("band", "part", "load", "peak", "rms", "heat", "rise", "rating")
FIGURES = (3, 4, 5, 6)  # columns of HEAD that hold figures
MOST_RISE = 300.0  # K
GUESS = "Rise is an estimate of how much warmer than still air a part gets, within a factor of two (common practice)."


def stress_lines(candidate: Candidate) -> list[str]:
    """Return voltage, current and heat of each part at each band, and every caution; nothing without a drive."""
    if "cautions" not in candidate.extra:
        return []
    rows = [[cut(clean(row[0]), LONGEST_NAME), *row[1:]] for row in stress_rows(candidate)]
    swept = ", at the worse end of a range" if any("low_hz" in band.extra for band in candidate.bands) else ""
    lines = [*wrapped(f"At the stated drive, volts peak and amperes rms{swept}; with the load off it is worse:")]
    left = tuple(place for place in range(len(HEAD)) if place not in FIGURES)
    lines += [f"  {line}" for line in columns([list(HEAD), *rows], left=left)] if rows else []
    if any(row[HEAD.index("rise")] not in ("?", "") for row in rows):
        lines += wrapped(GUESS)
    device = candidate.extra.get("device_peak_v")
    if isinstance(device, (int, float)):
        lines += wrapped(f"The device sees about {format_quantity(device, 'V', 3)} peak.")
    for caution in cautions(candidate):
        lines += wrapped(f"Caution: {caution}", 0, 2)
    return lines


def stress_rows(candidate: Candidate) -> list[list[str]]:
    """Return the cells of HEAD: two rows a part and band, load on and off; one where both are alike."""
    rows = []
    for band in candidate.bands:
        for part in _parts(band):
            verdict = str(part["verdict"])
            if part["kind"] == "coil" and part["current_rating_a"] is None:
                verdict = "-"  # no coil that is wound has a rating
            off = _row(band, part, "off", "load_off_", "load_off_", verdict)
            on = _row(band, part, "on", "", "loaded_", verdict)
            if on[3:] == off[3:]:
                rows.append([*on[:2], "on/off", *on[3:]])
            else:
                rows += [[*on[:-1], ""], ["", "", *off[2:]]]
        rows += _contact_rows(band)
    return rows


def _row(band: BandFigures, part: Mapping[str, Any], load: str, state: str, heat: str, verdict: str) -> list[str]:
    rise = part[f"temperature_rise_{state}k"]
    return [
        band.name,
        str(part["reference"]),
        load,
        quantity(part[f"voltage_{state}peak_v"], "V"),
        quantity(part[f"current_{state}rms_a"], "A"),
        quantity(part[f"dissipation_{heat}w"], "W", 2),
        "?" if rise is None else rise_words(rise),
        verdict,
    ]


def rise_words(rise: float) -> str:
    """Return a temperature rise as an estimate: no fractions of a kelvin, and no figure where all burns."""
    return "<1 K" if rise < 0.5 else f">{MOST_RISE:.0f} K" if rise > MOST_RISE else f"{rise:.0f} K"


def _contact_rows(band: BandFigures) -> list[list[str]]:
    stress = band.extra.get("stress")
    if not isinstance(stress, Mapping):
        return []
    peak = quantity(stress["contact_open_peak_v"], "V")
    return [
        [band.name, str(one["contact"]), "off", peak, quantity(one["load_off_rms_a"], "A"), "", "", "-"]
        for one in stress["contacts"]
    ]


def cautions(candidate: Candidate) -> list[str]:
    """Return the cautions that a candidate's drive has triggered."""
    found = candidate.extra.get("cautions")
    return [str(caution) for caution in found] if isinstance(found, Sequence) else []


def _parts(band: BandFigures) -> Sequence[Mapping[str, Any]]:
    stress = band.extra.get("stress")
    return stress["parts"] if isinstance(stress, Mapping) else ()
