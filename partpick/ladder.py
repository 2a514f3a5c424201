"""[steps]: the fewest capacitors with relays that tune one coil over a span in equal frequency steps."""

from __future__ import annotations

import heapq
import math
from dataclasses import dataclass, replace

import numpy as np

from partpick.assessment import assess
from partpick.candidates import Coils, coil_figures, realisable_coils
from partpick.catalogue import select_capacitors
from partpick.circuit import Design, Network
from partpick.errors import InternalError, RequestError
from partpick.ladder_field import Key, LadderField, Steps
from partpick.ladder_figures import ladder_keys
from partpick.parts import Catalogue
from partpick.progress import Monitor
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import Candidate, Proof, Result, RuledOut, Stage
from partpick.search.ladder import Ladders, Set
from partpick.search.networks import PARALLEL

MOST_STEPS = 256
MOST_NODES = 200_000  # part sets looked at; then the rest is left, and the result says so
ORDER = ("pieces", "q_class", "stray_class", "reactance_class", "effort", "commonness", "error_rank", "price")


def steps_of(request: Request) -> Steps | None:
    """Return the steps that a request asks for, None where it states its bands.

    Raises
    ------
    RequestError
        There are more than can be told one by one.
    """
    table = dict(dict(request.extra).get("steps", ()))
    if not table:
        return None
    low, high, step = (float(str(table[name])) for name in ("from", "to", "step"))
    count = max(1, math.ceil((high - low) / step - 1e-9))
    if count > MOST_STEPS:
        raise RequestError(
            f"steps.step: {format_quantity(step, 'Hz')} makes {count} steps of the span; at most {MOST_STEPS} are "
            "planned"
        )
    return Steps(low, high, count)


def with_positions(request: Request, frequencies: tuple[float, ...]) -> Request:
    """Return the request with one band for each frequency, and no limit on the error but the step."""
    bands = tuple(
        Band(
            name=f"step {place}",
            at=frequency,
            stray=request.stray.capacitance,
            q=request.limits.q,
            forms=request.coil.forms,
            load=request.load,
        )
        for place, frequency in enumerate(frequencies)
    )
    return replace(request, bands=bands, switching="shared", limits=replace(request.limits, error=None))


def check_ladder(request: Request) -> None:
    """Refuse what is not planned with [steps].

    Raises
    ------
    RequestError
        Names the first key that does not go with it.
    """
    limits = request.limits
    refused = {
        "trimmer": request.trimmer is not None,
        "tuning": request.tuning is not None,
        "coil.taps": request.coil.taps,
        "limits.inductors": limits.inductors > 1,
        "limits.error": limits.error_stated,
        "limits.values": limits.values is not None,
        "limits.price": limits.price is not None,
        "limits.drift": limits.drift is not None,
        "limits.excess": limits.excess is not None,
        "limits.alignable": limits.alignable is not None,
        'capacitors.connect = "any"': request.capacitors.connect == "any",
        "stray.inductance": request.stray.inductance > 0,
        'switching = "stacked"': request.switching == "stacked",
        f"--by {request.by}": request.by != "build",
        **{f"[{name}]": True for name, _ in request.extra if name != "steps"},
    }
    for key, is_set in refused.items():
        if is_set:
            why = "half a step is its limit on the error" if key == "limits.error" else "leave it out"
            raise RequestError(f"{key}: is not planned together with [steps]; {why}")


# ---------------------------------------------------------------- the search over coils


def plan_ladder(request: Request, catalogue: Catalogue, top: int, monitor: Monitor) -> Result:
    """Return the ladders of fewest capacitors, one row a former, core or bought inductor.

    Parameters
    ----------
    request : Request
        With [steps], without bands.
    catalogue : Catalogue
        The parts in use.
    top : int
        How many candidates. [-]
    monitor : Monitor
        Hears of progress and says when to stop.

    Returns
    -------
    result : Result
        Its request has one band for each position.
    """
    check_ladder(request)
    steps = steps_of(request)
    assert steps is not None
    monitor.report("every coil that the stock can wind")
    ends = with_positions(request, (steps.low, (steps.low + steps.high) / 2, steps.high))
    capacitors = select_capacitors(catalogue, request.capacitors, False)
    if any((part.series_inductance or 0.0) < 0 for part in capacitors):
        raise InternalError("internal error: a capacitor has less than no inductance in series")
    field = LadderField(ends, steps, realisable_coils(ends, catalogue), capacitors)
    rows, proof = _first_rows(field, top, monitor)
    told = with_positions(request, steps.positions)
    candidates = tuple(_candidate(field, told, catalogue, row, rank) for rank, row in enumerate(rows, 1))
    reason = _nothing(field) if proof.status == "infeasible" else None
    if candidates:
        proof = replace(proof, stages=_stages(candidates[0], proof))
    return Result(
        request=told, floor=field.floor, proof=proof, candidates=candidates, front=(), ruled_out_by=reason
    )


@dataclass(frozen=True)
class _Row:
    """One coil with its ladder: figures in order, then what settles ties."""

    key: Key
    coil: int
    ladder: Set


def _first_rows(field: LadderField, top: int, monitor: Monitor) -> tuple[list[_Row], Proof]:
    """Return the first rows, and how far they are proven: coils by what no ladder of theirs ranks before."""
    queue = [
        (field.bound(place, int(least)), int(field.coils.rank[row]), place, int(least))
        for place, (row, least) in enumerate(zip(field.rows, field.least, strict=True))
        if least <= field.most
    ]
    heapq.heapify(queue)
    rows: dict[int, _Row] = {}  # of each former, or coil
    nodes, stopped = 0, None
    while queue and stopped is None:
        bound, rank, place, pieces = heapq.heappop(queue)
        ranked = sorted(row.key for row in rows.values())
        if len(ranked) >= top and ranked[top - 1] < bound:
            break
        group = int(field.coils.support[field.rows[place]]) if not field.request.all_windings else place
        if group in rows and rows[group].key < bound:
            continue
        monitor.report(
            f"ladders of {pieces} capacitors, coil {len(rows) + 1} of {top}", None if not rows else f"{len(rows)} found"
        )
        found, used = _best_of_coil(field, place, pieces, monitor, MOST_NODES - nodes, rows.get(group))
        nodes += used
        if found is not None and (group not in rows or found.key < rows[group].key):
            rows[group] = found
        if found is None and pieces < field.most:
            heapq.heappush(queue, (field.bound(place, pieces + 1), rank, place, pieces + 1))
        stopped = monitor.stopped() or ("work limit" if nodes >= MOST_NODES else None)
        if stopped is not None:
            heapq.heappush(queue, (bound, rank, place, pieces))
    best = sorted(rows.values(), key=lambda row: row.key)[:top]
    status = ("optimal" if best else "infeasible") if stopped is None else ("feasible" if best else "unknown")
    open_bound = stopped is not None and queue
    stages = (Stage(objective="pieces", value=None, bound=int(str(queue[0][0][0]))),) if open_bound else ()
    return best, Proof(status=status, searched=_searched(field), stopped_by=stopped, stages=stages)


def _best_of_coil(
    field: LadderField, place: int, pieces: int, monitor: Monitor, most: int, to_beat: _Row | None = None
) -> tuple[_Row | None, int]:
    """Return the first ladder of one coil with so many capacitors, and how many part sets were looked at.

    `to_beat` is returned where none ranks before it. Sets of common values are looked at first: commonness is the
    first figure in which the ladders of one coil differ as a rule.
    """
    least, best = field.bound(place, pieces), to_beat
    done, most_common, cut = -1, 0, True

    def worth(part: Set) -> bool:
        nonlocal cut
        common = int(field.common[list(part.members)].sum()) <= most_common
        cut |= not common
        return common

    search = Ladders(field.coil(place), lambda: search.nodes >= most or monitor.stopped() is not None)
    while cut and not search.stop():
        if best is not None and best.key[:5] == least and int(str(best.key[5])) <= done:
            break  # what is left has less common values
        cut = False
        for ladder in search.of(pieces, int(field.least_base[place]), field.most_relays, worth):
            key = field.key(place, ladder)
            if key is not None and (best is None or key < best.key):
                best = _Row(key, place, ladder)
        done = most_common
        most_common += 1 + most_common // 3
    return best, search.nodes


# ---------------------------------------------------------------- what is told


def _searched(field: LadderField) -> str:
    return (
        f"every one of {field.coils.considered} coils with every set of up to {field.most} capacitors, at most 2 of "
        f"them always in circuit and the others each with a relay, that has no gap above "
        f"{format_quantity(field.steps.step, 'Hz', 5)} from all relays open downwards, for nominal values; errors up "
        "to half a step are equal to the order"
    )


def _stages(first: Candidate, proof: Proof) -> tuple[Stage, ...]:
    pieces = first.piece_count
    bound = pieces if proof.stopped_by is None else next((s.bound for s in proof.stages), None)
    bound = None if bound is None else min(bound, pieces)
    return (
        Stage(objective="pieces", value=pieces, bound=bound),
        Stage(objective="worst_error", value=first.worst_error, bound=None),
    )


def _nothing(field: LadderField) -> RuledOut:
    if not len(field.rows):
        text = "no coil of the stock is inside the limits on coils over the whole span"
        return RuledOut(limit="coil", needed=None, text=text)
    finest, by = _finest(field)
    if finest > field.steps.step:
        text = (
            f"the smallest capacitor, {format_quantity(by, 'F')}, moves the upper end by "
            f"{format_quantity(finest, 'Hz', 3)} at least with every coil in play: a smaller capacitor, a coil of less "
            "inductance or coarser steps"
        )
        return RuledOut(limit="step", needed=finest, text=text)
    least = int(field.least.min())
    if least > field.most:
        needs = math.ceil(math.log2(field.steps.count))
        text = (
            f"no coil has a ladder of {field.steps.count} steps with up to {field.most} capacitors; that many steps "
            f"need {needs} relays at least, more where the span is wide, and a value that makes one step: other "
            "values, coarser steps or more parts"
        )
        return RuledOut(limit="parts", needed=None, text=text)
    text = (
        f"no set of up to {field.most} capacitors is a ladder without a gap above "
        f"{format_quantity(field.steps.step, 'Hz', 5)} inside the limits on strays, Q, stock and contacts"
    )
    return RuledOut(limit="steps", needed=None, text=text)


def _finest(field: LadderField) -> tuple[float, float]:
    """Return by how little the smallest capacitor moves the upper end with any coil in play, and its value. [Hz, F]"""
    smallest = float(field.span.values.min(initial=math.inf))
    inductance = float(field.coils.inductance[field.rows, 2].min())
    total = 1.0 / ((2 * math.pi * field.steps.high) ** 2 * inductance)
    return field.steps.high * (1.0 - 1.0 / math.sqrt(1.0 + smallest / total)), smallest


def _candidate(field: LadderField, told: Request, catalogue: Catalogue, row: _Row, rank: int) -> Candidate:
    """Return every figure of one row, the coil evaluated at each position by itself."""
    coils, coil = _coil_at_positions(field, told, catalogue, int(field.rows[row.coil]))
    parts, base = field.parts_of(row.ladder), len(row.ladder.base)
    rungs = field.coil(row.coil).rungs(row.ladder.base, row.ladder.switched)
    wanted = np.array(field.steps.positions)
    nearest = np.abs(rungs[None, :] - wanted[:, None]).argmin(axis=1)
    closed = tuple(
        (*range(base), *(base + i for i in range(len(parts) - base) if int(mask) >> i & 1)) for mask in nearest
    )
    networks = tuple(Network(parts=tuple(parts[place] for place in own), shape=PARALLEL) for own in closed)
    design = Design(coils=(coil,) * len(wanted), networks=networks, members=parts, closed=closed)
    candidate = assess(told, coils, field.capacitors, design)
    order = tuple(zip(ORDER, row.key, strict=False))
    keys = ladder_keys(candidate, base, rungs, field.steps.step, (field.steps.low, field.steps.high))
    return replace(candidate, rank=rank, order=order, extra={**candidate.extra, **keys})


def _coil_at_positions(field: LadderField, told: Request, catalogue: Catalogue, coil: int) -> tuple[Coils, int]:
    """Return the coil at every position, among the few that its former, core or wire has part in."""
    figure = coil_figures(field.coils, coil, 0)
    name = field.coils.supports[int(field.coils.support[coil])].name
    own = replace(
        catalogue,
        formers=tuple(part for part in catalogue.formers if part.name == name),
        cores=tuple(part for part in catalogue.cores if part.name == name),
        wires=tuple(part for part in catalogue.wires if part.name == figure.wire),
        inductors=catalogue.inductors if figure.wire is None else (),
    )
    coils = realisable_coils(told, own)
    for place in range(len(coils)):
        other = coil_figures(coils, place, 0)
        if (other.form, other.label, other.turns) == (figure.form, figure.label, figure.turns):
            return coils, place
    raise InternalError(f"internal error: {figure.label} is lost between two looks at it; please report this plan")
