"""The whole run on one page: request and catalogue in, result out."""

from __future__ import annotations

from dataclasses import replace

from partpick.assessment import assess, recheck
from partpick.audit import audit
from partpick.built.outlook import outlook, with_outlook
from partpick.candidates import LIMIT_ROUNDING, Coils, coil_figures, realisable_coils
from partpick.catalogue import select_capacitors
from partpick.coupling_figures import check_coupling, with_coupling
from partpick.errors import RequestError
from partpick.layouts import check_layout, design_of, search_layout
from partpick.matching import check_loads, with_loads
from partpick.objective import build_problem, tolerance_floor
from partpick.oscillating import check_oscillator, with_oscillator
from partpick.parts import Capacitor, Catalogue
from partpick.progress import Monitor, Quiet, Unsettled
from partpick.ratings import drive_of
from partpick.receiver import is_receiver, of_one_section, with_oscillators
from partpick.request import LEAST_WOUND, Band, Request, Trimmer
from partpick.result import Candidate, CoilFigures, Proof, Result, Stage
from partpick.search.bands import Found, pieces_of_bound
from partpick.search.choose import ORDERS, Choice
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem
from partpick.tapping import column_source
from partpick.trimming import problem_with_trimmers, trimmers_on_offer, with_chosen

LOW_FREQUENCY = 1e3  # Hz
TOO_SMALL = "its leads decide: no coil for a tank"
# of the further tables of a plan
PLANNED_TABLES = ("temperature", "spread", "drive", "receiver", "oscillator", "coupling")


def solve(request: Request, catalogue: Catalogue, *, top: int = 10, monitor: Monitor | None = None) -> Result:
    """Return the ranked choices for a request, the front, and how far both are proven.

    Parameters
    ----------
    request : Request
        What is asked for, from `load_plan` or built by hand.
    catalogue : Catalogue
        The parts in use, from `load_catalogue`.
    top : int
        How many candidates. [-]
    monitor : Monitor, optional
        Hears of progress and says when to stop; by default nobody does.

    Raises
    ------
    RequestError
        The request asks for something that this version does not plan.
    InternalError
        The result does not hold against the request or its own figures; nothing is shown of it.
    """
    return audit(_solved(request, catalogue, top, monitor or Quiet()), catalogue)


def _solved(request: Request, catalogue: Catalogue, top: int, monitor: Monitor) -> Result:
    """Return the result of a request, with a word on why where nothing fits."""
    if dict(request.extra).get("cover"):
        from partpick.cover import cover, with_bands  # few plans ask for it: imported where used

        _refuse_unplanned(with_bands(request, 1))
        return cover(request, catalogue, lambda made: _planned(made, catalogue, top, monitor), _again, monitor)
    if dict(request.extra).get("steps"):
        from partpick.ladder import plan_ladder  # likewise

        return plan_ladder(request, catalogue, top, monitor)
    _refuse_unplanned(request)
    if is_receiver(request):
        request = of_one_section(request)
    result = _planned(request, catalogue, top, monitor)
    if result.candidates or result.proof.stopped_by is not None:
        return result
    from partpick.nothing_fits import explain  # likewise

    nearest, ruled_out = explain(request, catalogue, _again, monitor)
    return replace(result, nearest_miss=nearest, ruled_out_by=ruled_out)


def with_front(result: Result, catalogue: Catalogue, pair: str, monitor: Monitor) -> Result:
    """Return a result with the front of two more criteria, one of `fronts.PAIRS`.

    Raises
    ------
    RequestError
        The request is one whose limits are not lowered one by one: a receiver, or a span to cover.
    """
    from partpick.fronts import front_of  # few ask for it: imported where used

    if is_receiver(result.request) or {"cover", "steps"} & set(dict(result.request.extra)):
        raise RequestError("--front: not planned with [receiver], [cover] or [steps]")
    if not result.candidates:
        return result
    return replace(result, fronts=(*result.fronts, front_of(result.request, catalogue, pair, _again, monitor)))


def _planned(request: Request, catalogue: Catalogue, top: int, monitor: Monitor) -> Result:
    """Return the result of one search, without a word on why nothing fits."""
    monitor.report("every coil that the stock can wind")
    request = with_oscillators(request) if is_receiver(request) else request
    coils, capacitors, problem, source = _prepared(request, catalogue)
    found = search_layout(request, problem, source, wanted=top, monitor=monitor)
    pool, trimmers = _refit_pool(request, catalogue), trimmers_on_offer(request, catalogue)
    return _result(request, coils, capacitors, problem, found, pool, trimmers)


def _again(request: Request, catalogue: Catalogue, monitor: Monitor) -> Candidate | None:
    """Return the first candidate of a request with other limits; None where nothing fits."""
    request = with_oscillators(request) if is_receiver(request) else request
    coils, capacitors, problem, source = _prepared(request, catalogue)
    found = search_layout(request, problem, source, wanted=1, monitor=monitor, front=False)
    least_is_asked = request.by != "build"
    if found.stopped_by is not None and (not found.choices or (least_is_asked and not found.settled)):
        raise Unsettled  # the least so far is not the least
    if not found.choices:
        return None
    first = found.choices[0]
    chosen = with_chosen(request, trimmers_on_offer(request, catalogue), first)
    return _candidate(chosen, coils, capacitors, first)


def _prepared(request: Request, catalogue: Catalogue) -> tuple[Coils, tuple[Capacitor, ...], Problem, ColumnSource]:
    """Return what every search of a request starts from."""
    coils = realisable_coils(request, catalogue)
    capacitors = select_capacitors(catalogue, request.capacitors, request.limits.drift is not None)
    floor = tolerance_floor(coils, capacitors, request.limits.error)
    problem = with_loads(request, coils, build_problem(request, coils, capacitors, floor))
    problem = with_oscillator(request, coils, problem)
    source = column_source(request, coils, problem)
    return coils, capacitors, *problem_with_trimmers(request, problem, source, trimmers_on_offer(request, catalogue))


def windings(
    request: Request, catalogue: Catalogue, *, inductance: float | None = None, at: float | None = None
) -> tuple[CoilFigures, ...]:
    """Return every coil that the stock can wind or buy, nearest to `inductance` first where one is given.

    Parameters
    ----------
    request : Request
        Its coil rules say which forms and proportions are in play.
    catalogue : Catalogue
        The parts in use.
    inductance : float, optional
        Wanted inductance. [H]
    at : float, optional
        Frequency at which inductance, Q and series resistance are taken; low frequency otherwise. [Hz]
    """
    request = replace(request, coil=replace(request.coil, least_wound=0.0))  # listed all the same, and told apart
    if at is None:  # any low frequency will do: only low-frequency inductances are told
        request = replace(request, bands=(Band(name="", at=LOW_FREQUENCY),))
    coils = realisable_coils(request, catalogue)
    chosen = coils.listed(inductance, low_frequency=at is None)
    figures = []
    for coil in chosen:
        figure = coil_figures(coils, int(coil), 0)
        if at is None:
            figure = replace(figure, inductance=figure.inductance_dc or figure.inductance)
        else:
            figure = replace(figure, extra={**figure.extra, **coils.at_band(int(coil), 0)})
        if figure.turns and figure.inductance < LEAST_WOUND * (1 - LIMIT_ROUNDING):
            figure = replace(figure, extra={**figure.extra, "note": TOO_SMALL})
        figures.append(figure)
    return tuple(figures)


def _refuse_unplanned(request: Request) -> None:
    """Say plainly what is read but not planned yet."""
    check_layout(request)
    check_oscillator(request)
    check_loads(request)
    check_coupling(request)
    switching = dict(dict(request.extra).get("drive", ())).get("class") == "E"
    if switching and any(band.load is not None for band in request.bands):
        raise RequestError(
            'drive.class = "E" with [load]: the network of a switching stage does not resonate at the carrier, so that '
            'no tank is planned for it; state "A", "B" or "C", or leave [load] out'
        )
    for name, _ in request.extra:
        if name not in PLANNED_TABLES:
            raise RequestError(f"the table [{name}]: read and understood, but this version does not plan it yet")
    if is_receiver(request) and drive_of(request) is not None and request.limits.stress is not None:
        raise RequestError(
            "limits.stress: this version does not keep the circuits of a [receiver] to ratings under [drive]; "
            'state stress = "none", and what is over a rating is flagged'
        )


def _refit_pool(request: Request, catalogue: Catalogue) -> tuple[Capacitor, ...]:
    """Return the capacitors that a refit from a measured drift may choose from: every grade."""
    if dict(dict(request.extra).get("temperature", ())).get("measured_drift") is None:
        return ()
    return select_capacitors(catalogue, replace(request.capacitors, grades=None), True)


def _result(
    request: Request,
    coils: Coils,
    capacitors: tuple[Capacitor, ...],
    problem: Problem,
    found: Found,
    pool: tuple[Capacitor, ...],
    trimmers: tuple[Trimmer, ...],
) -> Result:
    ranked = [
        _candidate(with_chosen(request, trimmers, choice), coils, capacitors, choice, first=place == 0, pool=pool)
        for place, choice in enumerate(found.choices)
    ]
    contents = [choice.key[-1] for choice in found.choices]
    on_front = {choice.key[-1] for choice in found.front}
    candidates = tuple(
        replace(candidate, rank=place, on_front=choice.key[-1] in on_front, order=_order(request, problem, choice))
        for place, (candidate, choice) in enumerate(zip(ranked, found.choices, strict=True), 1)
    )
    front = tuple(
        candidates[contents.index(choice.key[-1])]
        if choice.key[-1] in contents
        else replace(
            _candidate(with_chosen(request, trimmers, choice), coils, capacitors, choice, pool=pool), on_front=True
        )
        for choice in found.front
    )
    return Result(
        request=request,
        floor=problem.floor,
        proof=_proof(request, coils, problem, found, candidates, front),
        candidates=candidates,
        front=front,
    )


def _orders(request: Request) -> dict[str, tuple[str, ...]]:
    """Return the steps of each order."""
    if not is_receiver(request):
        return ORDERS
    from partpick.search import tracking  # few plans ask for it: imported where used

    return tracking.ORDERS


def _order(request: Request, problem: Problem, choice: Choice) -> tuple[tuple[str, object], ...]:
    """Return the steps of the order by name with a choice's figures, all but the last, which is its content."""
    orders = _orders(request)
    return tuple(zip(orders[problem.by], choice.key, strict=False))


def _error_bound(found: Found, first: Candidate, front: tuple[Candidate, ...]) -> float | None:
    """Return an error below which no plan of as few pieces gets: from the front, None where it did not get so far.

    Errors inside the floor are equal to the order, so that the first plan may be above it.
    """
    if found.stopped_by is not None or first.worst_error is None:
        return None
    least = [c.worst_error for c in front if c.worst_error is not None and c.piece_count <= first.piece_count]
    return min([first.worst_error, *least])


def _candidate(
    request: Request,
    coils: Coils,
    capacitors: tuple[Capacitor, ...],
    choice: Choice,
    *,
    first: bool = False,
    pool: tuple[Capacitor, ...] = (),
) -> Candidate:
    design = design_of(request, choice)
    candidate = assess(request, coils, capacitors, design)
    worst_error = max(abs(float(columns.error[0])) for columns in choice.columns)
    worst_excess = max(float(columns.excess[0]) for columns in choice.columns)
    recheck(candidate, worst_error, worst_excess)
    if is_receiver(request):
        from partpick.search.tracking import FINE  # likewise
        from partpick.tracking_figures import with_tracking

        shares = dict(zip(_orders(request)[request.by], choice.key, strict=False))["fine_tracking"]
        candidate = with_tracking(request, candidate, FINE * float(str(shares)))
    candidate = with_coupling(request, capacitors, candidate)
    looked_at = with_outlook(candidate, outlook(request, coils, capacitors, design, candidate, first=first, pool=pool))
    if not dict(request.extra).get("drive"):
        return looked_at
    from partpick.stress import recheck_ratings, with_stress  # likewise

    stressed = with_stress(request, looked_at)
    recheck_ratings(request, stressed)
    return stressed


def _searched(request: Request, coils: Coils, problem: Problem) -> str:
    """Return in words what was exhausted."""
    searched = f"every one of {coils.considered} coils"
    if is_receiver(request):
        return (
            f"for each band {searched} for the signal with every other for the oscillator, each with up to "
            f"{problem.most_parts} capacitors, for nominal values"
        )
    if problem.inductors > 1 and problem.bands > 1:
        searched += f", alone and up to {problem.inductors} together"
    if request.coil.taps:
        searched += ", whole and at every tap"
    if request.switching == "shared":
        return f"{searched} with every shared set of up to {problem.parts_limit} capacitors, for nominal values"
    if request.switching == "stacked":
        return f"{searched} with every stack of up to {problem.most_parts} capacitors a band, for nominal values"
    least, most = problem.least_parts, problem.most_parts
    return f"{searched} with every network of {least} to {most} capacitors a band, for nominal values"


def _proof(
    request: Request,
    coils: Coils,
    problem: Problem,
    found: Found,
    candidates: tuple[Candidate, ...],
    front: tuple[Candidate, ...],
) -> Proof:
    if found.stopped_by is None:
        status = "optimal" if candidates else "infeasible"
    else:
        status = "feasible" if candidates else "unknown"
    stages: list[Stage] = []
    if candidates:
        stages = _stages(problem, found, candidates[0], front)
    searched = _searched(request, coils, problem)
    return Proof(status=status, searched=searched, stages=tuple(stages), stopped_by=found.stopped_by)


def _tracking_stage(problem: Problem, found: Found, first: Candidate, front: tuple[Candidate, ...]) -> Stage:
    """Return the worst tracking error and, of one band, the least that as few pieces can have. [Hz]

    Errors closer than a step of the order are equal to it, so that the first plan may be above the least.
    """
    worst = float(str(first.extra["worst_tracking_hz"]))
    pieces = first.piece_count if problem.by == "build" else max(c.piece_count for c in (first, *front))
    least = [float(str(c.extra["worst_tracking_hz"])) for c in front if c.piece_count <= pieces]
    proven = found.stopped_by is None and problem.bands == 2 and front
    return Stage(objective="worst_tracking", value=worst, bound=min([worst, *least]) if proven else None)


def _stages(problem: Problem, found: Found, first: Candidate, front: tuple[Candidate, ...]) -> list[Stage]:
    """Value and bound of each objective in the order's sequence; a bound is proven, or null."""
    proven = found.stopped_by is None or found.settled
    pieces = first.piece_count
    bound = pieces if proven else pieces_of_bound(found.next_bound, problem.by)
    bound = None if bound is None else min(bound, pieces)
    error = first.worst_error or 0.0
    stages = [Stage(objective="pieces", value=pieces, bound=bound)]
    if first.worst_error is not None:
        stages.append(Stage(objective="worst_error", value=error, bound=_error_bound(found, first, front)))
    if "worst_tracking_hz" in first.extra:
        stages.append(_tracking_stage(problem, found, first, front))
    elif first.worst_excess is not None:
        excess = first.worst_excess
        stages.append(Stage(objective="worst_excess", value=excess, bound=excess if proven else None))
    if problem.by == "error":
        stages = [*stages[1:], stages[0]]
    if problem.by == "price":
        stages.insert(0, Stage(objective="price", value=first.price, bound=first.price if proven else None))
    return stages
