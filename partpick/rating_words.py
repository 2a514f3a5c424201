"""What the ratings of a plan's parts would have to be under its drive, or the drive for these parts."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from partpick.ratings import drive_of, uses
from partpick.request import Request
from partpick.result import Candidate
from partpick.stressed import stressed_parts
from partpick.units import format_quantity

MOST_TOLD = 3  # parts


def rating_words(request: Request, candidate: Candidate) -> str:
    """Return which ratings a plan that is over them would need, and what drive its parts would bear.

    Parameters
    ----------
    request : Request
        With a drive and the limit on stress in force.
    candidate : Candidate
        Found without that limit.
    """
    over = [(ratio, words) for band, part in stressed_parts(candidate) if (ratio := _over(request, part)) > 1.0
            for words in (f"{part['reference']} at {band} {_wanted(request, part)}",)]  # fmt: skip
    if not over:
        return "this plan would do"
    over.sort(key=lambda pair: -pair[0])
    told = "; ".join(words for _, words in over[:MOST_TOLD])
    more = "" if len(over) <= MOST_TOLD else f"; and {len(over) - MOST_TOLD} more"
    return f"ratings that would do: {told}{more}{_drive_words(request, over[0][0])}"


def _over(request: Request, part: Mapping[str, Any]) -> float:
    """Return the larger use of a part's ratings over what may be used of them. [-]"""
    voltage, current = uses(request)
    return max((part["voltage_use"] or 0.0) / voltage, (part["current_use"] or 0.0) / current)


def _wanted(request: Request, part: Mapping[str, Any]) -> str:
    wanted = []
    for use, limit, rating, unit in zip(
        (part["voltage_use"], part["current_use"]),
        uses(request),
        (part["voltage_rating_v"], part["current_rating_a"]),
        ("V", "A"),
        strict=True,
    ):
        if use is not None and use > limit:
            had = format_quantity(rating, unit, 3)
            wanted.append(f"{format_quantity(use * rating / limit, unit, 3)} (it has {had})")
    return " and ".join(wanted)


def _drive_words(request: Request, ratio: float) -> str:
    drive = drive_of(request)
    if drive is None or drive.bias:
        return ""
    most = next(
        (f"{format_quantity(amount / ratio**power, unit, 3)} of drive")
        for amount, power, unit in ((drive.power, 2, "W"), (drive.voltage, 1, "V"), (drive.current, 1, "A"))
        if amount is not None
    )
    return f"; or at most {most}, with these parts"
