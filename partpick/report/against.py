"""What changed against an earlier result file: which parts to swap, band by band."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from partpick.errors import RequestError
from partpick.report.result_json import PPM, RESULT_FORMAT, result_entry
from partpick.report.text import clean, signed_percent, wrapped
from partpick.result import Result

Entry = Mapping[str, Any]


def read_result(path: str) -> Entry:
    """Return the best candidate of a result file.

    Raises
    ------
    RequestError
        The file cannot be read, is no result file, or holds no candidate.
    """
    try:
        with open(path, encoding="utf-8") as file:
            entry = json.load(file)
    except OSError as error:
        raise RequestError(f"--against {path}: {error.strerror or 'cannot be read'}") from None
    except (ValueError, RecursionError):
        raise RequestError(f"--against {path}: is no JSON file") from None
    if not isinstance(entry, Mapping) or entry.get("partpick_result") != RESULT_FORMAT:
        raise RequestError(f"--against {path}: is no result file; one that --json wrote is wanted")
    try:
        best: Entry = entry["candidates"][0]
        _bands(best)  # every key that is read later
    except (AttributeError, IndexError, KeyError, TypeError, ValueError):
        raise RequestError(f"--against {path}: holds no candidate to compare with") from None
    return best


def changes(result: Result, before: Entry) -> str:
    """Return what to swap to get from an earlier best candidate to this one, with a final newline."""
    if not result.candidates:
        return "Nothing to compare: no candidate was found.\n"
    old, new = _bands(before), _bands(result_entry(result)["candidates"][0])  # type: ignore[index]
    lines = ["Against the earlier result:"]
    for name, band in new.items():
        lines += wrapped(f"{clean(name)}: {_band_change(old.get(name), band)}", 2, 2)
    for name in old:
        if name not in new:
            lines += wrapped(f"{clean(name)}: no longer in the plan", 2, 2)
    return "\n".join(lines) + "\n"


class _Band:
    """One band in words: its coil, its capacitors with grades, its error."""

    def __init__(self, band: Entry, coils: Mapping[str, str], parts: Mapping[str, str]) -> None:
        error = band.get("error_ppm")
        self.coil = coils[band["coil"]]
        self.capacitors = Counter(parts[reference] for reference in band["capacitors"])
        self.error = None if error is None else float(error) / PPM


def _bands(candidate: Entry) -> dict[str, _Band]:
    coils = {str(coil["reference"]): str(coil["label"]) for coil in candidate["coils"]}
    parts = {str(part["reference"]): str(part["description"]) for part in candidate["parts"]}
    return {str(band["name"]): _Band(band, coils, parts) for band in candidate["bands"]}


def _band_change(old: _Band | None, new: _Band) -> str:
    if old is None:
        return "new in the plan"
    told = []
    if old.coil != new.coil:
        told.append(f"{old.coil} gives way to {new.coil}")
    out, into = old.capacitors - new.capacitors, new.capacitors - old.capacitors
    if out or into:
        told.append(_swap(_words(out.elements()), _words(into.elements())))
    if not told:
        told.append("the same parts")
    if old.error is not None and new.error is not None:
        told.append(f"error {signed_percent(new.error)} after {signed_percent(old.error)}")
    return "; ".join(told)


def _swap(out: Sequence[str], into: Sequence[str]) -> str:
    if not out:
        return f"add {' and '.join(into)}"
    if not into:
        return f"take out {' and '.join(out)}"
    return f"swap {' and '.join(out)} for {' and '.join(into)}"


def _words(parts: Iterable[str]) -> list[str]:
    return sorted(parts)
