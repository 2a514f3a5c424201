"""What each part contributes, band by band: shift for one per cent, largest shift, share of spread, drift."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from partpick.quantities import format_percent
from partpick.report.text import clean, columns, cut, figure, signed_shift
from partpick.result import Candidate

HEAD = ("band", "part", "within", "1 % more", "at most", "spread", "ppm/K")
LONGEST_NAME = 11
LONGEST_PART = 16
LEAST_SHARE = 0.005  # of the spread, below which a part is left out unless it drifts
LEAST_DRIFT = 0.5e-6  # 1/K, likewise


def sensitivity_rows(candidate: Candidate) -> list[list[str]]:
    """Return the rows under `HEAD`, bands in plan order, what contributes next to nothing left out."""
    rows = []
    for entry in _entries(candidate):
        share, drift = _number(entry, "share_of_variance"), _number(entry, "drift_per_k")
        if (share or 0.0) < LEAST_SHARE and abs(drift or 0.0) < LEAST_DRIFT:
            continue
        tolerance = _number(entry, "tolerance")
        rows.append([
            cut(clean(str(entry["band"])), LONGEST_NAME),
            cut(_part(entry), LONGEST_PART),
            "" if tolerance is None else f"\u00b1{format_percent(tolerance, 2)}",
            _shift(entry, "hertz_per_percent"),
            _shift(entry, "largest_shift_hz").lstrip("+"),
            "" if share is None else format_percent(share, 2),
            "" if drift is None else f"{figure(round(drift * 1e6, 2) + 0.0, 2)}",
        ])  # fmt: skip
    return rows


def sensitivity_table(candidate: Candidate) -> list[str]:
    """Return the table as lines of text; none where nothing is known of the spread."""
    rows = sensitivity_rows(candidate)
    if not rows:
        return []
    head = "What each part contributes (shifts, share of the spread, drift):"
    return [head, *(f"  {line}" for line in columns([list(HEAD), *rows], (0, 1)))]


def _entries(candidate: Candidate) -> list[Mapping[str, Any]]:
    given = candidate.extra.get("sensitivity")
    return list(given) if isinstance(given, list) else []


def _part(entry: Mapping[str, Any]) -> str:
    """Return the reference of a part; strays are known by their kind, the band stands beside it."""
    return clean(str(entry["kind" if entry["kind"] in ("wiring", "self-capacitance") else "reference"]))


def _number(entry: Mapping[str, Any], key: str) -> float | None:
    value = entry.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _shift(entry: Mapping[str, Any], key: str) -> str:
    value = _number(entry, key)
    return "" if value is None else signed_shift(value)
