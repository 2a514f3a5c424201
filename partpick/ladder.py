"""[steps]: the fewest capacitors with relays that tune one coil over a span in equal frequency steps."""

from __future__ import annotations

import heapq
import math
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from partpick.assessment import assess
from partpick.candidates import Coils, coil_figures, realisable_coils
from partpick.catalogue import select_capacitors
from partpick.circuit import Design, Network
from partpick.errors import InternalError, RequestError
from partpick.ladder_figures import ladder_keys
from partpick.objective import effort, enough_q, reactance_class, tolerance_floor
from partpick.parts import Capacitor, Catalogue
from partpick.preferred import commonness
from partpick.progress import Monitor
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import Candidate, Proof, Result, RuledOut, Stage
from partpick.search.figures import quality_class, stray_class
from partpick.search.ladder import Coil, Ladders, Set, Span, least_pieces
from partpick.search.networks import PARALLEL
from partpick.search.problem import PLENTY, Floats, Ints

MOST_STEPS = 256
MOST_CAPACITORS = 12  # where the plan states no limit
MOST_NODES = 200_000  # part sets looked at; then the rest is left, and the result says so
NEVER = 10**12
ORDER = ("pieces", "q_class", "stray_class", "reactance_class", "effort", "commonness", "error_rank", "price")

Key = tuple[object, ...]


@dataclass(frozen=True)
class Steps:
    """The span in equal steps, as many as it takes for none to be coarser than asked."""

    low: float  # Hz
    high: float  # Hz
    count: int

    @property
    def step(self) -> float:
        """One step. [Hz]"""
        return (self.high - self.low) / self.count

    @property
    def positions(self) -> tuple[float, ...]:
        """Every wanted frequency, rising. [Hz]"""
        return (*(self.low + place * self.step for place in range(self.count)), self.high)


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
            f"steps.step: {format_quantity(step, 'Hz')} makes {count} steps of the span; at most {MOST_STEPS} are planned"
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
    field = _Field(ends, steps, realisable_coils(ends, catalogue), capacitors)
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


class _Field:
    """Coils and values of one request with what is known of each before any set is."""

    def __init__(self, request: Request, steps: Steps, coils: Coils, capacitors: tuple[Capacitor, ...]) -> None:
        self.request, self.steps, self.coils, self.capacitors = request, steps, coils, capacitors
        limits = request.limits
        self.most = MOST_CAPACITORS if limits.parts is None else min(limits.parts, MOST_CAPACITORS)
        self.most_relays = self.most if limits.contacts is None else min(limits.contacts, self.most)
        self.choices = _choices(capacitors, steps.high, request.units)
        values = sorted(self.choices)
        self.span = Span(
            low=steps.low,
            high=steps.high,
            step=steps.step,
            values=np.array([float(exact) for exact, _ in values]),
            series_inductance=np.array([leads for _, leads in values]),
            stock=np.array([len(self.choices[value]) for value in values], dtype=np.int64),
        )
        self.options = [self.choices[value] for value in values]
        self.common = commonness(self.span.values).astype(np.int64) if values else np.zeros(0, np.int64)
        self.floor = max(tolerance_floor(coils, capacitors, None), steps.step / 2 / steps.low)
        self.strays = coils.self_capacitance + request.stray.capacitance
        self.rows = np.flatnonzero(coils.in_play.all(axis=1))
        self.share = math.inf if request.stray.share is None else request.stray.share
        self.classes = self._classes()
        inductance, strays = coils.inductance[self.rows], self.strays[self.rows]
        open_room = 1.0 / ((2 * np.pi * (steps.high - self.span.half)) ** 2 * inductance[:, 2])
        self.least_base = np.where(strays > self.share * open_room * (1 + 1e-9), 1, 0).astype(np.int64)
        self.least = least_pieces(self.span, inductance, strays, self.most, self.least_base)

    def _classes(self) -> Ints:
        """Return of each coil in play classes of Q, strays, reactance, then effort as three, none above the truth."""
        coils, rows, bands = self.coils, self.rows, self.request.bands
        total = 1.0 / ((2 * np.pi * coils.frequency) ** 2 * coils.inductance[rows])
        own = [[_loss(part, float(f)) for part in self.capacitors] for f in coils.frequency]
        least = np.array([np.nanmin(each, initial=math.inf) for each in own])
        least = np.where(np.isfinite(least), least, 0.0)  # unknown of each of them: the class is worse anyway
        network = np.maximum(1.0 - self.strays[rows][:, None] / total - 3 * self.steps.step / self.steps.low, 0.0)
        loss = 1.0 / coils.q[rows] + network * least * (1 - 1e-6)
        enough = np.array([enough_q(band.highest, band.q) for band in bands])
        q = np.max([quality_class(loss[:, i], enough[i]) for i in range(len(bands))], axis=0)
        largest = 1.0 / ((2 * np.pi * (self.steps.high - self.span.half)) ** 2 * coils.inductance[rows, 2])
        strays = stray_class(self.strays[rows] / largest * (1 - 1e-4))
        omega = 2 * np.pi * coils.frequency
        reactance = np.max(
            [reactance_class(omega[i] * coils.inductance[rows, i], float(coils.frequency[i])) for i in (0, 2)], axis=0
        )
        return np.concatenate([np.stack([q, strays, reactance], axis=1), effort(coils)[rows]], axis=1)

    def coil(self, place: int) -> Coil:
        """Return one coil in play for the search."""
        row = self.rows[place]
        low, middle, high = (float(x) for x in self.coils.inductance[row])
        return Coil(self.span, (low, middle, high), float(self.strays[row]))

    def bound(self, place: int, pieces: int) -> Key:
        """Return figures that no ladder of a coil with so many capacitors ranks before."""
        q, strays, reactance, *work = (int(x) for x in self.classes[place])
        return (pieces + 1, q, strays, reactance, tuple(work))

    def parts_of(self, ladder: Set) -> tuple[int, ...]:
        """Return the parts of a ladder: of equal values the parts of least loss first."""
        used: dict[int, int] = {}
        parts = []
        for value in ladder.members:
            parts.append(self.options[value][used.get(value, 0)])
            used[value] = used.get(value, 0) + 1
        return tuple(parts)

    def key(self, place: int, ladder: Set) -> Key | None:
        """Return the figures of a ladder in order, None where a limit rules it out."""
        coil, row = self.coil(place), int(self.rows[place])
        rungs, wanted = coil.rungs(ladder.base, ladder.switched), np.array(self.steps.positions)
        nearest = np.abs(rungs[None, :] - wanted[:, None]).argmin(axis=1)
        error = float((np.abs(rungs[nearest] - wanted) / wanted).max())
        closed = np.concatenate(
            [
                np.ones((len(wanted), len(ladder.base))),
                (nearest[:, None] >> np.arange(len(ladder.switched))) & 1,
            ],
            axis=1,
        )
        if not (closed.any(axis=0)).all():
            return None  # a relay that no position closes
        parts = [self.capacitors[i] for i in self.parts_of(ladder)]
        total = self.strays[row] + np.array([coil.room(f) for f in rungs[nearest]])
        share = (self.strays[row] / total)[closed.any(axis=1)].max(initial=0.0)
        if share > self.share * (1 + 1e-9):
            return None
        q = self._quality(row, parts, closed, total, wanted)
        if q is None:
            return None
        strays = int(stray_class(np.array([(self.strays[row] / total).max()]))[0])
        _, _, reactance, *work = (int(x) for x in self.classes[place])
        prices = [part.unit_price for part in parts]
        own = float(self.coils.price[row])
        known = all(price is not None for price in prices) and math.isfinite(own)
        price = round(sum(p for p in prices if p is not None) * 100 + own * 100) if known else NEVER
        exact = tuple(part.exact for part in parts)
        return (
            len(parts) + 1, q, strays, reactance, tuple(work), int(self.common[list(ladder.members)].sum()),
            round(error * 1e9), price, int(self.coils.rank[row]), exact, tuple(part.label for part in parts),
        )  # fmt: skip

    def _quality(
        self, row: int, parts: list[Capacitor], closed: Floats, total: Floats, wanted: Floats
    ) -> int | None:
        """Return the class of the worst position's Q, None where the limit on Q rules it out."""
        values = np.array([part.value for part in parts])
        own = 1.0 / self.coils.q[row]
        coil_loss = np.interp(wanted, self.coils.frequency, own)
        loss = np.array([[_loss(part, float(f)) for part in parts] for f in wanted]).reshape(len(wanted), len(parts))
        loss = coil_loss + np.where(closed > 0, closed * values * loss, 0.0).sum(axis=1) / total
        limit = self.request.limits.q
        if limit is not None and not bool((1.0 / loss >= limit).all()):
            return None
        enough = np.array([enough_q(float(f), limit) for f in wanted])
        return int(quality_class(loss, enough).max())


def _loss(part: Capacitor, frequency: float) -> float:
    known = part.q is not None and (part.q_below is None or frequency <= part.q_below)
    return 1.0 / part.q if known and part.q else math.nan


def _choices(
    capacitors: tuple[Capacitor, ...], frequency: float, units: int
) -> dict[tuple[Fraction, float], list[int]]:
    """Return for each value, and inductance in series, its pieces: least loss first, then price and content."""

    def preferred(index: int) -> tuple[object, ...]:
        part = capacitors[index]
        loss = _loss(part, frequency)
        price = math.inf if part.unit_price is None else part.unit_price
        return (math.inf if math.isnan(loss) else loss, price, part.grade, part.tolerance, part.label)

    found: dict[tuple[Fraction, float], list[int]] = {}
    for index in sorted(range(len(capacitors)), key=preferred):
        part = capacitors[index]
        pieces = PLENTY if part.quantity is None else part.quantity // units
        if pieces > 0:
            own = found.setdefault((part.exact, part.series_inductance or 0.0), [])
            own += [index] * min(pieces, MOST_CAPACITORS - len(own))
    return found


def _first_rows(field: _Field, top: int, monitor: Monitor) -> tuple[list[_Row], Proof]:
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
        ranked = sorted(row.key for row in rows.values())  # type: ignore[type-var]
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
    bound_pieces = None if stopped is None or not queue else Stage(objective="pieces", value=None, bound=int(str(queue[0][0][0])))
    stages = () if bound_pieces is None else (bound_pieces,)
    return best, Proof(status=status, searched=_searched(field), stopped_by=stopped, stages=stages)


def _best_of_coil(
    field: _Field, place: int, pieces: int, monitor: Monitor, most: int, to_beat: _Row | None = None
) -> tuple[_Row | None, int]:
    """Return the first ladder of one coil with so many capacitors, and how many part sets were looked at.

    `to_beat` is returned where none ranks before it.
    """
    least = field.bound(place, pieces)
    best = [] if to_beat is None else [to_beat]

    def worth(part: Set) -> bool:
        if not best or best[0].key[:5] != least:
            return True
        return int(field.common[list(part.members)].sum()) <= int(str(best[0].key[5]))

    search = Ladders(field.coil(place), lambda: search.nodes >= most or monitor.stopped() is not None)
    for ladder in search.of(pieces, int(field.least_base[place]), field.most_relays, worth):
        key = field.key(place, ladder)
        if key is not None and (not best or key < best[0].key):
            best[:] = [_Row(key, place, ladder)]
    return (best[0] if best else None), search.nodes


# ---------------------------------------------------------------- what is told


def _searched(field: _Field) -> str:
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


def _nothing(field: _Field) -> RuledOut:
    if not len(field.rows):
        text = "no coil of the stock is inside the limits on coils over the whole span"
        return RuledOut(limit="coil", needed=None, text=text)
    least = int(field.least.min())
    if least > field.most:
        needs = math.ceil(math.log2(field.steps.count))
        text = (
            f"no coil has a ladder of {field.steps.count} steps with up to {field.most} capacitors; that many steps need "
            f"{needs} relays at least, more where the span is wide, and a value that makes one step: other values, "
            "coarser steps or more parts"
        )
        return RuledOut(limit="parts", needed=None, text=text)
    text = (
        f"no set of up to {field.most} capacitors is a ladder without a gap above "
        f"{format_quantity(field.steps.step, 'Hz', 5)} inside the limits on strays, Q, stock and contacts"
    )
    return RuledOut(limit="steps", needed=None, text=text)


def _candidate(field: _Field, told: Request, catalogue: Catalogue, row: _Row, rank: int) -> Candidate:
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


def _coil_at_positions(field: _Field, told: Request, catalogue: Catalogue, coil: int) -> tuple[Coils, int]:
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
