"""A series of units: what it takes in all, and spares for the rejects that are to be expected."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from partpick.result import Candidate, PartLine

LEAST_YIELD = 0.5  # below it an adjustment or closer parts are the plan, not spares


@dataclass(frozen=True, kw_only=True)
class Needed:
    """Equal pieces of all units together."""

    references: tuple[str, ...]
    kind: str
    description: str
    per_unit: int
    needed: int  # for all units
    spares: int | None  # for the expected rejects; None: the yield is unknown or too low
    stock: int | None  # pieces there are; None: as many as wanted
    price: float | None  # of all, spares included


@dataclass(frozen=True, kw_only=True)
class Series:
    """What a number of units takes."""

    units: int
    share_right: float | None  # of units, aligned where there is something to adjust
    sets: int | None  # units to build so that as many as wanted are expected to be right
    pieces: tuple[Needed, ...]
    price: float | None


def series(candidate: Candidate, units: int, share_right: float | None, stock: Mapping[str, int | None]) -> Series:
    """Return the pieces for a series of units.

    Parameters
    ----------
    candidate : Candidate
        One unit.
    units : int
        How many are wanted. [-]
    share_right : float, optional
        Share of units that come right; None: nobody can say, and no spares are counted. [-]
    stock : mapping of str to int or None
        Pieces there are of each reference; None: as many as wanted.

    Notes
    -----
    Rejects are counted as whole sets: `units` right ones are expected of units/share_right.
    """
    sets = None
    if share_right is not None and share_right >= LEAST_YIELD:
        sets = math.ceil(units / share_right - 1e-9)
    alike: dict[tuple[str, str, float | None], list[PartLine]] = {}
    for part in candidate.parts:
        alike.setdefault((part.kind, part.description, part.unit_price), []).append(part)
    pieces = tuple(_needed(parts, units, sets, stock) for parts in alike.values())
    prices = [piece.price for piece in pieces]
    return Series(
        units=units,
        share_right=share_right,
        sets=sets,
        pieces=pieces,
        price=None if any(price is None for price in prices) else math.fsum(p for p in prices if p is not None),
    )


def _needed(parts: list[PartLine], units: int, sets: int | None, stock: Mapping[str, int | None]) -> Needed:
    first, per_unit = parts[0], len(parts)
    spares = None if sets is None else per_unit * (sets - units)
    count = per_unit * units + (spares or 0)
    return Needed(
        references=tuple(part.reference for part in parts),
        kind=first.kind,
        description=first.description,
        per_unit=per_unit,
        needed=per_unit * units,
        spares=spares,
        stock=stock.get(first.reference),
        price=None if first.unit_price is None else first.unit_price * count,
    )
