"""The switching layouts: which search plans each, and how its choice becomes a design."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

from partpick.circuit import Design, Network
from partpick.errors import RequestError
from partpick.oscillating import oscillator_keys
from partpick.progress import Monitor
from partpick.receiver import is_receiver, receiver_bands
from partpick.request import Request
from partpick.search.bands import Found, search_bands
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.networks import PARALLEL
from partpick.search.problem import Problem

Search = Callable[..., Found]
JOINT = ("stacked", "shared")  # layouts in which a capacitor serves several bands


def check_layout(request: Request) -> None:
    """Refuse what a layout is not planned with.

    Raises
    ------
    RequestError
        Series networks with a stacked or shared layout, swept bands with a shared one, or a share of
        builds that can be aligned.
    """
    layout = request.switching
    if layout not in JOINT:
        return
    if request.capacitors.connect == "any":
        raise RequestError(
            f'capacitors.connect = "any" with switching = "{layout}": what a switch adds there lies across the '
            'capacitors already in circuit, in parallel; write connect = "parallel", or switching = "separate"'
        )
    if layout == "shared" and any(band.swept for band in request.bands):
        raise RequestError('switching = "shared": a range goes with switching "separate" or "stacked" only')
    tuning = request.tuning
    if tuning is not None and tuning.moves_inductance and any(band.swept for band in request.bands):
        raise RequestError(
            f'switching = "{layout}": a {tuning.kind} is planned only with switching = "separate", where every band '
            "has its own capacitors"
        )
    if request.limits.alignable is not None:
        raise RequestError(
            f'switching = "{layout}": limits.alignable is read and understood, but this version plans it only with '
            'switching = "separate"'
        )
    if _contacts_unplanned(request):
        raise RequestError(
            f'switching = "{layout}": limits.contacts is planned for one coil without taps and bands with at only, or '
            'with switching = "separate"'
        )


def _contacts_unplanned(request: Request) -> bool:
    """Whether the number of contacts depends on more than the layout."""
    varies = request.limits.inductors > 1 or request.coil.taps or any(band.swept for band in request.bands)
    return request.limits.contacts is not None and varies


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
    if is_receiver(request):
        from partpick.search.receivers import search_receivers

        search = partial(search_receivers, bands=receiver_bands(request))
    elif request.switching == "stacked":
        from partpick.search.stacked import search_stacked as search
    elif request.switching == "shared":
        from partpick.search.shared import search_shared as search
    return search(
        problem, source, wanted=wanted, all_windings=request.all_windings, monitor=monitor, front=front
    )


def design_of(request: Request, choice: Choice) -> Design:
    """Return a choice as a design: coils, networks, taps, and the capacitors that bands share."""
    coils = tuple(int(columns.coil[0]) for columns in choice.columns)
    taps = tuple(int(columns.tap[0]) or None for columns in choice.columns)
    if request.switching == "separate":
        networks = tuple(
            Network(parts=columns.network_parts(0), shape=int(columns.shape[0]), series=columns.series_padder(0))
            for columns in choice.columns
        )
        keys = oscillator_keys(request)
        if keys is not None and keys["circuit"] == "hartley":
            return Design(coils=coils, networks=networks, common=taps)
        return Design(coils=coils, networks=networks, taps=taps)
    if request.switching == "stacked":
        return _stacks(request, choice, coils, taps)
    members, closed = _set(choice)
    networks = tuple(Network(parts=tuple(members[place] for place in own), shape=PARALLEL) for own in closed)
    return Design(coils=coils, networks=networks, taps=taps, members=members, closed=closed)


def _stacks(
    request: Request, choice: Choice, coils: tuple[int, ...], taps: tuple[int | None, ...]
) -> Design:
    """Return stack after stack, that of the lowest band first, each from its highest band down.

    A series padder is in circuit at its own band alone and comes last there.
    """
    from partpick.search.stack_plan import StackedChoice

    assert isinstance(choice, StackedChoice)
    members: list[int] = []
    closed: dict[int, tuple[int, ...]] = {}
    networks: dict[int, Network] = {}
    rising = rising_bands(request)
    for coil in dict.fromkeys(coils[band] for band in rising):
        across: list[int] = []
        for band in (band for band in reversed(rising) if coils[band] == coil):
            own, padder = choice.added[band], choice.columns[band].series_padder(0)
            across += range(len(members), len(members) + len(own))
            members += own
            closed[band] = tuple(across)
            if padder is not None:
                closed[band] = (*across, len(members))
                members.append(padder)
            networks[band] = Network(parts=tuple(members[i] for i in across), shape=PARALLEL, series=padder)
    every = range(len(request.bands))
    return Design(
        coils=coils,
        networks=tuple(networks[band] for band in every),
        taps=taps,
        members=tuple(members),
        closed=tuple(closed[band] for band in every),
    )


def rising_bands(request: Request) -> list[int]:
    """Return the bands by target, swept bands by their lower end, the lowest first: a stack from its foot up."""
    bands = request.bands
    return sorted(range(len(bands)), key=lambda i: (bands[i].lowest, bands[i].highest, -i))


def _set(choice: Choice) -> tuple[tuple[int, ...], tuple[tuple[int, ...], ...]]:
    from partpick.search.set_figures import SharedChoice

    assert isinstance(choice, SharedChoice)
    return choice.members, choice.closed
