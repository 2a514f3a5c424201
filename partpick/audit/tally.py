"""What a candidate says of itself as a whole: counts, price, worst figures, which part serves which band."""

from __future__ import annotations

import math
from collections.abc import Iterator

from partpick.request import Request
from partpick.result import Candidate

AGREE = 1e-9


def tally_faults(candidate: Candidate, request: Request) -> Iterator[str]:
    """Yield what does not add up over bands and parts."""
    if [band.name for band in candidate.bands] != [band.name for band in request.bands]:
        yield "its bands are not those of the plan, in their order"
    capacitors = [line for line in candidate.parts if line.kind == "capacitor"]
    coils = [line for line in candidate.parts if line.kind == "coil"]
    counts = (
        ("capacitors", candidate.part_count, len(capacitors)),
        ("coils", candidate.inductor_count, len(coils)),
        ("pieces", candidate.piece_count, len(capacitors) + len(coils)),
        ("different values", candidate.value_count, len({line.value for line in capacitors})),
    )
    for what, told, found in counts:
        if told != found:
            yield f"{told} {what} are told, {found} are listed"
    yield from _prices(candidate)
    yield from _worst(candidate)
    yield from _uses(candidate)


def _prices(candidate: Candidate) -> Iterator[str]:
    prices = [line.unit_price for line in candidate.parts]
    known = [price for price in prices if price is not None]
    total = math.fsum(known) if len(known) == len(prices) else None
    if (total is None) != (candidate.price is None):
        yield f"its price is {candidate.price}, its parts cost {total}"
    elif total is not None and candidate.price is not None and abs(total - candidate.price) > AGREE * max(1.0, total):
        yield f"its price is {candidate.price:.9g}, its parts cost {total:.9g}"


def _worst(candidate: Candidate) -> Iterator[str]:
    errors = [abs(band.error) for band in candidate.bands if band.error is not None]
    excesses = [e for band in candidate.bands if isinstance(e := band.extra.get("excess"), float)]
    for what, told, found in (
        ("error", candidate.worst_error, errors),
        ("excess", candidate.worst_excess, excesses),
    ):
        worst = max(found) if found else None
        if told != worst:
            yield f"the worst {what} is told as {told}, that of its bands is {worst}"


def _uses(candidate: Candidate) -> Iterator[str]:
    """A part serves the bands that name it, and no other."""
    named: dict[str, list[str]] = {}
    for band in candidate.bands:
        for reference in (*band.capacitors, band.coil):
            named.setdefault(reference, []).append(band.name)
    for line in candidate.parts:
        if line.kind in ("capacitor", "coil") and sorted(line.bands) != sorted(named.pop(line.reference, [])):
            yield f"{line.reference} is listed for {', '.join(line.bands)}, other bands name it"
    for reference in named:
        yield f"{reference} is in circuit but not among the parts"
