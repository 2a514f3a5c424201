"""[cover]: the fewest bands in which a tuning element covers a span, their edges, and the plan for them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from partpick.candidates import realisable_coils
from partpick.nothing_fits import Again, explain
from partpick.parts import Catalogue
from partpick.progress import Monitor, Unsettled
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import Proof, Result, RuledOut
from partpick.tuning_range import least_bands, reach

MOST_BANDS = 12

Plan = Callable[[Request], Result]


def span_of(request: Request) -> tuple[float, float] | None:
    """Return the span that a request wants covered, None where it states its bands. [Hz]"""
    table = dict(dict(request.extra).get("cover", ()))
    if not table:
        return None
    low, high = table["from"], table["to"]
    assert isinstance(low, float) and isinstance(high, float)
    return low, high


def with_bands(request: Request, count: int) -> Request:
    """Return the request for `count` bands of equal frequency ratio that together are its span.

    Bands abut where they are asked for; each is covered with the margin beyond both edges, so tuned ranges
    overlap. Equal ratios make the widest band as narrow as it can be. Unless the plan states
    `limits.inductors`, every band may have a coil of its own.
    """
    span = span_of(request)
    assert span is not None
    low, high = span
    edges = [low * (high / low) ** (place / count) for place in range(count)] + [high]
    bands = tuple(
        Band(
            name=f"range {place + 1}",
            low=edges[place],
            high=edges[place + 1],
            trimmer=request.trimmer,
            stray=request.stray.capacitance,
            q=request.limits.q,
            forms=request.coil.forms,
            load=request.load,
        )
        for place in range(count)
    )
    limits = request.limits
    if not limits.inductors_stated:
        tuning = request.tuning
        most = tuning.sections if tuning is not None and tuning.moves_inductance else count
        limits = replace(limits, inductors=max(limits.inductors, min(count, most)))
    extra = tuple((name, values) for name, values in request.extra if name != "cover")
    return replace(request, bands=bands, limits=limits, extra=extra)


def cover(request: Request, catalogue: Catalogue, plan: Plan, again: Again, monitor: Monitor) -> Result:
    """Return the plan of the fewest bands that cover the span of a request.

    Parameters
    ----------
    request : Request
        With [cover] and a tuning element, without bands.
    catalogue : Catalogue
        The parts in use.
    plan : callable
        Solves a request with bands; says nothing of why nothing fits.
    again : callable
        Returns the first candidate of a request, None where nothing fits.
    monitor : Monitor
        Hears of progress and says when to stop.

    Returns
    -------
    result : Result
        Its request has the bands made, and [cover] as asked for. `proof.searched` says why fewer do not do.
    """
    whole = with_bands(request, 1)
    far = reach(whole, realisable_coils(whole, catalogue), 0)
    band, margin = whole.bands[0], whole.limits.margin
    ratio = band.highest / band.lowest
    least = None if far is None else least_bands(ratio, far.frequency_ratio, margin)
    if far is None or least is None or least > MOST_BANDS:
        reached = 1.0 if far is None else far.frequency_ratio
        return _nothing(request, with_bands(request, MOST_BANDS), _too_small(ratio, reached, margin, least), "")
    bound = "" if least == 1 else _bound_words(ratio, far.frequency_ratio, far.strays, margin, least)
    for count in range(least, MOST_BANDS + 1):
        trial = with_bands(request, count)
        result = _of_bands(trial, catalogue, plan, again, monitor)
        stopped = monitor.stopped() if result is None else result.proof.stopped_by
        said = bound + _tried_words(least, count)
        if result is not None and (result.candidates or stopped is not None):
            proof = replace(result.proof, searched=f"{said}{result.proof.searched}")
            return replace(result, request=_told(request, trial), proof=proof)
        if stopped is not None:
            proof = Proof(status="unknown", searched=said.rstrip("; "), stopped_by=stopped)
            return Result(request=_told(request, trial), floor=_FLOOR, proof=proof, candidates=(), front=())
    reason = _reason(trial, catalogue, again, monitor)
    return _nothing(request, trial, reason, bound)


_FLOOR = 1e-3  # least tolerance floor, where no search has told one


def _of_bands(trial: Request, catalogue: Catalogue, plan: Plan, again: Again, monitor: Monitor) -> Result | None:
    """Return the plan of given bands; None as soon as one of them can have no tank even by itself."""
    if _first_alone(trial, catalogue, again, monitor) is not None:
        return None
    return None if monitor.stopped() is not None else plan(trial)


def _first_alone(trial: Request, catalogue: Catalogue, again: Again, monitor: Monitor) -> Band | None:
    for band in reversed(trial.bands):  # strays weigh most in the highest
        if monitor.stopped() is not None:
            return None
        monitor.report(f"whether {_range_words(band)}, one of {len(trial.bands)}, can be tuned")
        try:
            if again(_alone(trial, band), catalogue, monitor) is None:
                return band
        except Unsettled:
            continue
    return None


def _alone(trial: Request, band: Band) -> Request:
    return replace(trial, bands=(band,), limits=replace(trial.limits, inductors=1))


def _reason(trial: Request, catalogue: Catalogue, again: Again, monitor: Monitor) -> RuledOut:
    """Return why not even the most bands have a plan: what rules out the first that has none by itself."""
    band = _first_alone(trial, catalogue, again, monitor)
    if band is None:
        text = f"each of {len(trial.bands)} bands can be tuned by itself, but not all within the limits of the plan"
        return RuledOut(limit="cover", needed=None, text=text)
    _, ruled_out = explain(_alone(trial, band), catalogue, again, monitor)
    if ruled_out is None:
        return RuledOut(limit="cover", needed=None, text=f"no tank tunes {_range_words(band)}")
    text = f"up to {len(trial.bands)} bands tried; of {_range_words(band)}: {ruled_out.text}"
    return replace(ruled_out, text=text)


def _nothing(request: Request, trial: Request, reason: RuledOut, bound: str) -> Result:
    proof = Proof(status="infeasible", searched=f"{bound}up to {MOST_BANDS} bands of equal frequency ratio")
    return Result(
        request=_told(request, trial), floor=_FLOOR, proof=proof, candidates=(), front=(), ruled_out_by=reason
    )


def _told(request: Request, trial: Request) -> Request:
    """Return the request of the bands made, [cover] as asked for."""
    return replace(trial, extra=request.extra)


def _too_small(ratio: float, reached: float, margin: float, least: int | None) -> RuledOut:
    needed = ratio ** (1 / MOST_BANDS) * (1 + margin) / (1 - margin)
    many = "no number of bands does" if least is None else f"it takes {least} bands, more than {MOST_BANDS}"
    text = (
        f"the tuning element gives at most {reached:.4g} in frequency with the least strays; {MOST_BANDS} bands "
        f"need {needed:.4g} each, the margin at both ends included, and {many}: less strays or a larger element"
    )
    return RuledOut(limit="tuning", needed=needed, text=text)


def _bound_words(ratio: float, reached: float, strays: float, margin: float, least: int) -> str:
    net = reached * (1 - margin) / (1 + margin)
    return (
        f"fewer than {least} bands cannot do, wherever their edges: the element with "
        f"{format_quantity(strays, 'F', digits=2)} of strays gives at most {reached:.4g} in frequency, {net:.4g} "
        f"within the margins, and the span is {ratio:.4g}; "
    )


def _tried_words(least: int, count: int) -> str:
    if count == least:
        return ""
    tried = str(least) if count == least + 1 else f"{least} to {count - 1}"
    return f"{tried} of equal frequency ratio had no plan, other edges were not tried; "


def _range_words(band: Band) -> str:
    return f"{format_quantity(band.lowest, 'Hz', digits=4)} to {format_quantity(band.highest, 'Hz', digits=4)}"
