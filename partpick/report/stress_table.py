"""What the stated drive does to the first candidate, as lines of text, and the cautions that go with it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from partpick.quantities import format_quantity
from partpick.report.bands_table import LONGEST_NAME
from partpick.report.text import clean, columns, cut, quantity, wrapped
from partpick.result import BandFigures, Candidate

HEAD = ("band", "part", "peak", "rms", "load off", "", "heat", "rating")


def stress_lines(candidate: Candidate) -> list[str]:
    """Return voltage, current and heat of each part at each band, and every caution; nothing without a drive."""
    if "cautions" not in candidate.extra:
        return []
    rows = [[cut(clean(row[0]), LONGEST_NAME), *row[1:]] for row in stress_rows(candidate)]
    lines = [*wrapped("At the stated drive, volts peak and amperes rms; with the load off it is worse:")]
    lines += [f"  {line}" for line in columns([list(HEAD), *rows], left=(0, 1, 7))] if rows else []
    device = candidate.extra.get("device_peak_v")
    if isinstance(device, (int, float)):
        lines += wrapped(f"The device sees about {format_quantity(device, 'V', 3)} peak.")
    for caution in cautions(candidate):
        lines += wrapped(f"Caution: {caution}", 0, 2)
    return lines


def stress_rows(candidate: Candidate) -> list[list[str]]:
    """Return one row a part and band: band, part, volts and amperes loaded, both with the load off, heat, rating."""
    rows = []
    for band in candidate.bands:
        for part in _parts(band):
            rows.append([
                band.name,
                str(part["reference"]),
                quantity(part["voltage_peak_v"], "V"),
                quantity(part["current_rms_a"], "A"),
                quantity(part["voltage_load_off_peak_v"], "V"),
                quantity(part["current_load_off_rms_a"], "A"),
                quantity(part["dissipation_w"], "W", 2),
                str(part["verdict"]),
            ])  # fmt: skip
    return rows


def cautions(candidate: Candidate) -> list[str]:
    """Return the cautions that a candidate's drive has triggered."""
    found = candidate.extra.get("cautions")
    return [str(caution) for caution in found] if isinstance(found, Sequence) else []


def _parts(band: BandFigures) -> Sequence[Mapping[str, Any]]:
    stress = band.extra.get("stress")
    return stress["parts"] if isinstance(stress, Mapping) else ()
