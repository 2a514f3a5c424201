"""The switching layouts: which search plans each, and how its choice becomes a design."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from partpick.circuit import Design, Network
from partpick.errors import RequestError
from partpick.progress import Monitor
from partpick.request import Request
from partpick.search.bands import Found, search_bands
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.networks import PARALLEL
from partpick.search.problem import Problem

Search = Callable[..., Found]
FIXED_ONLY = ("stacked", "shared")  # planned for fixed bands on one coil, capacitors in parallel


def check_layout(request: Request) -> None:
    """Refuse what a layout is not planned with.

    Raises
    ------
    RequestError
        Swept bands, several coils, taps, or series networks with a stacked or shared layout.
    """
    if request.switching not in FIXED_ONLY:
        return
    unplanned = (
        (any(band.swept for band in request.bands), "bands with from/to"),
        (request.limits.inductors > 1, "limits.inductors above 1"),
        (request.coil.taps, "coil.taps = true"),
        (request.limits.alignable is not None, "limits.alignable"),
        (request.capacitors.connect == "any", 'capacitors.connect = "any"'),
    )
    for asked, what in unplanned:
        if asked:
            raise RequestError(
                f'switching = "{request.switching}": {what} is read and understood, but this version plans it only '
                'with switching = "separate"'
            )


def search_layout(
    request: Request,
    problem: Problem,
    source: ColumnSource,
    *,
    wanted: int,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first `wanted` plans of the request's layout, and the front."""
    search: Search = search_bands
    if request.switching == "stacked":
        from partpick.search.stacked import search_stacked as search
    elif request.switching == "shared":
        from partpick.search.shared import search_shared as search
    return search(
        problem, source, wanted=wanted, all_windings=request.all_windings, monitor=monitor, front=front
    )


def design_of(request: Request, choice: Choice) -> Design:
    """Return a choice as a design: coils, networks, taps, and the capacitors that bands share."""
    coils = tuple(int(columns.coil[0]) for columns in choice.columns)
    if request.switching == "separate":
        networks = tuple(
            Network(parts=columns.network_parts(0), shape=int(columns.shape[0]), series=columns.series_padder(0))
            for columns in choice.columns
        )
        taps = tuple(int(columns.tap[0]) or None for columns in choice.columns)
        return Design(coils=coils, networks=networks, taps=taps)
    members, closed = _stack(request, choice) if request.switching == "stacked" else _set(choice)
    networks = tuple(Network(parts=tuple(members[place] for place in own), shape=PARALLEL) for own in closed)
    return Design(coils=coils, networks=networks, members=members, closed=closed)


def _stack(request: Request, choice: Choice) -> tuple[tuple[int, ...], tuple[tuple[int, ...], ...]]:
    """Return the capacitors from the highest band down, and those in circuit at each band."""
    from partpick.search.stacked import StackedChoice

    assert isinstance(choice, StackedChoice)
    falling = np.argsort([-band.highest for band in request.bands], kind="stable")
    members: list[int] = []
    closed: dict[int, tuple[int, ...]] = {}
    for band in falling.tolist():
        members += choice.added[band]
        closed[band] = tuple(range(len(members)))
    return tuple(members), tuple(closed[band] for band in range(len(request.bands)))


def _set(choice: Choice) -> tuple[tuple[int, ...], tuple[tuple[int, ...], ...]]:
    from partpick.search.set_figures import SharedChoice

    assert isinstance(choice, SharedChoice)
    return choice.members, choice.closed
