"""Receivers of several bands: every band by itself, then the plans put together in order.

Every figure of the order is a sum over the bands, so that a plan that takes a later pair in one band comes
later itself. The first plans then come from the first pairs of each band. Where a limit of the whole plan
refuses such a plan, what is left is no longer certain, and the result says so.
"""

from __future__ import annotations

from heapq import heappop, heappush

from partpick.progress import Monitor
from partpick.search.bands import Found
from partpick.search.choose import Choice, inside_shared_limits
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem
from partpick.search.tracking import BandFound, Pair, ReceiverBand, coils_in_stock, search_band

_MOST_TRIED = 20_000  # plans


def search_receivers(
    problem: Problem,
    source: ColumnSource,
    *,
    bands: tuple[ReceiverBand, ...],
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first plans of a receiver, and the front of tracking error against pieces.

    Parameters
    ----------
    problem : Problem
        The arrays of the request: signal circuit and oscillator of each band are bands of their own.
    source : ColumnSource
        Its columns.
    bands : tuple of ReceiverBand
        Which are whose.
    wanted : int
        How many rows. [-]
    all_windings : bool
        One row a pair of windings instead of one a pair of formers, cores or bought inductors. [-]
    monitor : Monitor
        Hears of progress, says when to stop.
    front : bool
        Whether the front is wanted too. [-]
    """
    parts: list[BandFound] = []
    for band in bands:
        own = search_band(
            problem, source, band, wanted=wanted, all_windings=all_windings, monitor=monitor, front=front
        )
        parts.append(own)
        if own.stopped_by is None and not own.rows:
            return Found(settled=True)  # this band alone rules every plan out
    found = Found(settled=all(own.settled for own in parts))
    found.stopped_by = next((own.stopped_by for own in parts if own.stopped_by is not None), None)
    _combine(problem, parts, wanted, found)
    if front:
        found.front = _front(problem, bands, parts)
    return found


def _combine(problem: Problem, parts: list[BandFound], wanted: int, found: Found) -> None:
    """Add the first plans; own up where a limit of the whole plan refused one."""
    if not all(own.rows for own in parts):
        return
    start = (0,) * len(parts)
    waiting = [(_place(parts, start), start)]
    seen = {start}
    while waiting and len(found.choices) < wanted and len(seen) < _MOST_TRIED:
        _, taken = heappop(waiting)
        pairs = [own.rows[place] for own, place in zip(parts, taken, strict=True)]
        choice = _plan(problem, pairs)
        if choice is not None:
            found.choices.append(choice)
        else:
            found.settled = False
            found.stopped_by = found.stopped_by or "work limit"
        for band, own in enumerate(parts):
            following = (*taken[:band], taken[band] + 1, *taken[band + 1 :])
            if following[band] < len(own.rows) and following not in seen:
                seen.add(following)
                heappush(waiting, (_place(parts, following), following))


def _place(parts: list[BandFound], taken: tuple[int, ...]) -> tuple[object, ...]:
    pairs = [own.rows[place] for own, place in zip(parts, taken, strict=True)]
    return _key(pairs)


def _key(pairs: list[Pair]) -> tuple[object, ...]:
    figures = tuple(sum(steps) for steps in zip(*(pair.key for pair in pairs), strict=True))
    return (*figures, tuple(pair.content for pair in pairs))


def _plan(problem: Problem, pairs: list[Pair]) -> Choice | None:
    """Return pairs as a plan, None where they cannot be built side by side."""
    coils = tuple(coil for pair in pairs for coil in pair.coils)
    columns = tuple(column for pair in pairs for column in pair.columns)
    choice = Choice(_key(pairs), coils, columns)  # type: ignore[arg-type]
    apart = len(set(coils)) == len(coils)
    return choice if apart and inside_shared_limits(problem, choice) and coils_in_stock(problem, coils) else None


def _front(problem: Problem, bands: tuple[ReceiverBand, ...], parts: list[BandFound]) -> list[Choice]:
    """Return the least worst error, as a share of each band's limit, for each number of pieces."""
    if not all(own.front for own in parts):
        return []
    at = [0] * len(parts)
    front: list[Choice] = []
    last = float("inf")
    while True:
        pairs = [own.front[place] for own, place in zip(parts, at, strict=True)]
        shares = [pair.error / band.limit for pair, band in zip(pairs, bands, strict=True)]
        worst = shares.index(max(shares))
        choice = _plan(problem, pairs)
        if choice is not None and shares[worst] < last - 1e-9:
            front.append(choice)
            last = shares[worst]
        if at[worst] + 1 >= len(parts[worst].front):
            return front
        at[worst] += 1
