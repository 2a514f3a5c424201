"""Fronts over two criteria beside that of error against pieces: what fewer values or pieces cost.

Each point is a search of its own, proven as any other: the least of one criterion under a limit on the other,
which is lowered until nothing fits. So the front is complete for its two criteria; of several plans that are
equal in both it shows one.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from partpick.parts import Catalogue
from partpick.progress import Monitor, Unsettled
from partpick.request import Request
from partpick.result import Candidate, Front

# the criterion that is limited, the one that is least, and the order that minimises it
PAIRS = {
    "values,error": ("values", "error", "error"),
    "values,pieces": ("values", "pieces", "build"),
    "values,price": ("values", "price", "price"),
    "pieces,price": ("pieces", "price", "price"),
}
SAME = {"error": 1e-9, "pieces": 0.0, "price": 0.005}  # differences that do not count


def front_of(request: Request, catalogue: Catalogue, pair: str, again: object, monitor: Monitor) -> Front:
    """Return the front of two criteria, the limited one falling from its largest figure of interest.

    Parameters
    ----------
    request : Request
        With all its limits.
    catalogue : Catalogue
        The parts in use.
    pair : str
        One of `PAIRS`.
    again : callable
        Returns the first candidate of a request, None where nothing fits; raises `Unsettled`.
    monitor : Monitor
        Hears of progress and says when to stop.
    """
    assert callable(again)
    limited, least, by = PAIRS[pair]
    found: list[Candidate] = []
    most: int | None = None
    try:
        while most is None or most >= 0:
            under = "" if most is None else f" with at most {most} {limited}"
            monitor.report(f"the least {least}{under}")
            trials = [again(made, catalogue, monitor) for made in _limited(replace(request, by=by), limited, most)]
            priced = [each for each in trials if each is not None and _figure(each, least) is not None]
            if not priced:
                break
            best = min(priced, key=lambda each: (_figure(each, least), _figure(each, limited)))
            if found and _not_worse(best, found[-1], least):
                found.pop()  # as good with fewer
            found.append(best)
            most = _whole(best, limited) - 1
    except Unsettled:
        return Front(criteria=(limited, least), candidates=tuple(found), complete=False)
    return Front(criteria=(limited, least), candidates=tuple(found), complete=True)


def _limited(request: Request, name: str, most: int | None) -> Iterator[Request]:
    """Yield requests that together allow every plan of at most `most` pieces or different values."""
    limits = request.limits
    if most is None:
        yield request
    elif name == "values":
        values = most if limits.values is None else min(most, limits.values)
        yield replace(request, limits=replace(limits, values=values))
    else:
        for coils in range(1, min(limits.inductors, len(request.bands), most) + 1):
            parts = most - coils if limits.parts is None else min(most - coils, limits.parts)
            yield replace(request, limits=replace(limits, inductors=coils, parts=parts))


def _figure(candidate: Candidate, name: str) -> float | None:
    figures = {
        "error": candidate.worst_error if candidate.worst_error is not None else candidate.worst_excess,
        "pieces": candidate.piece_count,
        "values": candidate.value_count,
        "price": candidate.price,
    }
    return figures[name]


def _whole(candidate: Candidate, name: str) -> int:
    return candidate.value_count if name == "values" else candidate.piece_count


def _not_worse(candidate: Candidate, before: Candidate, name: str) -> bool:
    new, old = _figure(candidate, name), _figure(before, name)
    return new is not None and old is not None and new <= old + SAME[name]
