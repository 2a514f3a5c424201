"""What the tolerances of a candidate's parts leave on each band's frequency, before anything is set on the bench."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from partpick.report.connection import Connection, Parallel, Part, parse_connection
from partpick.request import Request
from partpick.result import BandFigures, Candidate


@dataclass(frozen=True)
class Spread:
    """How far the frequency of one band may lie from its nominal, as a fraction either way."""

    usual: float  # standard uncertainty
    worst: float  # every part at its end


def spread_of(request: Request, candidate: Candidate, band: BandFigures) -> Spread | None:
    """Return the spread of one fixed band; None for a swept one, or where a tolerance is unknown.

    A tolerance is taken as uniform, of standard uncertainty tolerance / sqrt(3) (JCGM 100:2008, 4.3.7), the
    parts as independent; f goes with 1/sqrt(LC), so that each counts by half its share.
    """
    if band.capacitance is None:
        return None
    parts = {part.reference: part for part in candidate.parts}
    coil = parts.get(band.coil)
    tolerances: list[float | None] = [coil.tolerance if coil else None]
    tolerances.append((band.stray + band.self_capacitance) / band.capacitance * request.stray.tolerance)
    tree = parse_connection(band.connection)
    if tree is not None and band.network is not None:
        values = {reference: part.value or 0.0 for reference, part in parts.items()}
        for reference, weight in shares(tree, values).items():
            own = parts[reference].tolerance
            tolerances.append(None if own is None else weight * band.network / band.capacitance * own)
    known = [tolerance / 2 for tolerance in tolerances if tolerance is not None]
    if len(known) < len(tolerances):
        return None
    return Spread(usual=math.hypot(*known) / math.sqrt(3), worst=math.fsum(known))


def shares(tree: Connection, values: Mapping[str, float]) -> dict[str, float]:
    """Return d ln(network) / d ln(part) of each part, by its reference. [-]"""
    if isinstance(tree, Part):
        return {tree.reference: 1.0}
    whole = _acting(tree, values)
    found: dict[str, float] = {}
    for branch in tree.branches:
        own = _acting(branch, values)
        weight = own / whole if isinstance(tree, Parallel) else whole / own
        for reference, inner in shares(branch, values).items():
            found[reference] = found.get(reference, 0.0) + weight * inner
    return found


def _acting(tree: Connection, values: Mapping[str, float]) -> float:
    if isinstance(tree, Part):
        return values[tree.reference]
    own = [_acting(branch, values) for branch in tree.branches]
    return math.fsum(own) if isinstance(tree, Parallel) else 1 / math.fsum(1 / value for value in own)
