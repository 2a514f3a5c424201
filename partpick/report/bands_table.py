"""The bands of one candidate as lines of text: the figures, then the parts in circuit."""

from __future__ import annotations

import re
from collections.abc import Sequence

from partpick.quantities import format_percent, format_quantity
from partpick.report.text import (
    clean,
    columns,
    cut,
    figure,
    quantity,
    signed_percent,
    signed_shift,
    slope,
    wrapped,
)
from partpick.result import BandFigures, Candidate, PartLine

LONGEST_NAME = 14
_INDENT = 2
_FIXED_HEAD = ["band", "target", "error", "off by", "Q", "\u03a9", "per pF", "strays"]
_SWEPT_HEAD = ["band", "wanted", "tunes", "excess", "Q", "\u03a9"]


def bands_in_full(candidate: Candidate) -> list[str]:
    """Return the figures of every band in plan order, fixed bands before swept ones."""
    fixed = [band for band in candidate.bands if band.target is not None]
    swept = [band for band in candidate.bands if band.target is None]
    lines = _block(candidate, fixed, _FIXED_HEAD, [_fixed_row(band) for band in fixed], left=(0,))
    return lines + _block(candidate, swept, _SWEPT_HEAD, [_swept_row(band) for band in swept], left=(0, 1, 2))


def share_of_strays(band: BandFigures) -> float | None:
    """Return wiring and self-capacitance as a fraction of all capacitance in circuit."""
    if band.capacitance is None or band.capacitance <= 0:
        return None
    return (band.stray + band.self_capacitance) / band.capacitance


def worst_q(candidate: Candidate) -> float | None:
    """Return the least unloaded Q of all bands; None where one is unknown."""
    figures = [band.q for band in candidate.bands]
    known = [q for q in figures if q is not None]
    return min(known) if known and len(known) == len(figures) else None


def swept_range(low: float | None, high: float | None) -> str:
    """Return a range of frequency, such as "7 MHz..7.3 MHz"."""
    return f"{quantity(low, 'Hz', 4)}..{quantity(high, 'Hz', 4)}"


def with_labels(connection: str, parts: Sequence[PartLine], keep: bool = False) -> str:
    """Return a connection such as "C1 | (C2 + C3)" in values; `keep` leaves the references before them."""
    labels = {part.reference: f"{part.reference} {part.label}" if keep else part.label for part in parts}
    return re.sub(r"[A-Z]+[0-9]*", lambda found: labels.get(found[0], found[0]), connection)


def _block(
    candidate: Candidate,
    bands: list[BandFigures],
    head: list[str],
    rows: list[list[str]],
    left: tuple[int, ...],
) -> list[str]:
    if not bands:
        return []
    blank = " " * _INDENT
    figures = columns([head, *rows], left)
    lines = [blank + figures[0]]
    for band, line in zip(bands, figures[1:], strict=True):
        lines.append(blank + line)
        lines += wrapped(_in_circuit(band, candidate), 2 * _INDENT, _INDENT)
    return lines


def _fixed_row(band: BandFigures) -> list[str]:
    off = None if band.error is None or band.target is None else band.error * band.target
    share = share_of_strays(band)
    return [
        cut(clean(band.name), LONGEST_NAME),
        quantity(band.target, "Hz", 6),
        signed_percent(band.error),
        signed_shift(off),
        figure(band.q),
        figure(band.reactance),
        slope(band.hertz_per_farad),
        "?" if share is None else format_percent(share, 2),
    ]


def _swept_row(band: BandFigures) -> list[str]:
    excess = _number(band, "excess")
    return [
        cut(clean(band.name), LONGEST_NAME),
        swept_range(_number(band, "low_hz"), _number(band, "high_hz")),
        swept_range(_number(band, "tuned_low_hz"), _number(band, "tuned_high_hz")),
        "?" if excess is None else format_percent(excess),
        figure(band.q),
        figure(band.reactance),
    ]


def _number(band: BandFigures, key: str) -> float | None:
    value = band.extra.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _in_circuit(band: BandFigures, candidate: Candidate) -> str:
    """Return coil, capacitors and what else belongs to the band, in words."""
    tap = f" (tap at turn {band.tap_turns})" if band.tap_turns is not None else ""
    network = with_labels(band.connection, candidate.parts, keep=True) or "no capacitor"
    told = [f"{band.coil}{tap}: {network}"]
    if band.capacitance is not None:
        told.append(f"{quantity(band.capacitance, 'F', 4)} in circuit with strays")
    if band.trimmer is not None:
        told.append(f"trimmer about {quantity(band.trimmer, 'F')}")
    if band.contacts:
        told.append(f"contacts {', '.join(band.contacts)}")
    if band.bandwidth is not None:
        told.append(f"bandwidth {format_quantity(band.bandwidth, 'Hz')}")
    if band.drift is not None:
        spread = "" if band.drift_spread is None else f" \u00b1{figure(band.drift_spread * 1e6, 2)}"
        told.append(f"drift {figure(band.drift * 1e6, 2, '+')}{spread} ppm/K")
    return "; ".join(told)
