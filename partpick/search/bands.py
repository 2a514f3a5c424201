"""Bands with their own capacitors: the best plans over all coils, first by bound, then exactly.

Coils (or pairs of them) are taken in the order of a lower bound on their place; each is settled
exactly; the search ends when the last plan wanted ranks before the next bound. Nothing left out can
then rank before anything shown.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from heapq import merge

import numpy as np

from partpick.progress import Monitor
from partpick.search.bounds import BELOW_PIECES, IMPOSSIBLE, Bounds, packed_key
from partpick.search.choose import ORDERS, Choice, Key, Stopped
from partpick.search.columns import ColumnSource
from partpick.search.contacts import least_contacts
from partpick.search.evaluate import Evaluator
from partpick.search.figures import fine_error, whole_excess
from partpick.search.pairs import PairBounds
from partpick.search.problem import Problem
from partpick.search.sets import SetBounds
from partpick.search.taps import TappedSource

_LAST = np.iinfo(np.int64).max


@dataclass
class Found:
    """What a search brought home."""

    choices: list[Choice] = field(default_factory=list)  # best first, one a set of supports
    front: list[Choice] = field(default_factory=list)  # fewest pieces first
    stopped_by: str | None = None
    settled: bool = False  # the choices are certain, whatever became of the front
    next_bound: int = _LAST  # packed, of the first plan not settled


class Ranking:
    """The best choice of each set of supports, and when enough of them are certain."""

    def __init__(self, problem: Problem, wanted: int, all_windings: bool) -> None:
        self.problem = problem
        self.wanted = wanted
        self.all_windings = all_windings
        self.best: dict[tuple[int, ...], tuple[int, Choice]] = {}
        self.first: Choice | None = None  # of all
        self.by = problem.by

    def group(self, coils: tuple[int, ...]) -> tuple[int, ...]:
        """Return the row that a set of coils belongs to."""
        if self.all_windings:
            return tuple(sorted(coils))
        return tuple(sorted(int(self.problem.support[coil]) for coil in coils))

    def worth_it(self, coils: tuple[int, ...], bound: int) -> bool:
        """Whether these coils might still improve their row."""
        known = self.best.get(self.group(coils))
        return known is None or bound <= known[0]

    def to_beat(self, coils: tuple[int, ...]) -> Key | None:
        """Return the key behind which a choice of these coils is of no interest, None while all are."""
        keys = sorted(choice.key for _, choice in self.best.values())
        last = [keys[self.wanted - 1]] if len(keys) >= self.wanted else []
        known = self.best.get(self.group(coils))
        return min([*last, *([known[1].key] if known is not None else [])], default=None)

    def add(self, choice: Choice) -> None:
        """Keep a choice if it is the first of its row."""
        packed = packed_key(choice, self.problem)
        group = self.group(choice.coils)
        known = self.best.get(group)
        if known is None or choice.key < known[1].key:
            self.best[group] = (packed, choice)
        if self.first is None or choice.key < self.first.key:
            self.first = choice

    def settled(self, bound: int) -> bool:
        """Whether the wanted rows all rank before anything with this bound or a later one."""
        if len(self.best) < self.wanted:
            return False
        return sorted(packed for packed, _ in self.best.values())[self.wanted - 1] < bound

    def rows(self) -> list[Choice]:
        """Return the rows wanted, best first."""
        return sorted((choice for _, choice in self.best.values()), key=lambda c: c.key)[: self.wanted]


def search_bands(
    problem: Problem,
    source: ColumnSource,
    *,
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first `wanted` plans in the order of the request, and the front of error against pieces.

    Where every band is swept the front is that of the worst excess.

    Parameters
    ----------
    problem : Problem
        The arrays of the request.
    source : ColumnSource
        Its columns.
    wanted : int
        How many rows. [-]
    all_windings : bool
        One row a winding instead of one a former, core or bought inductor. [-]
    monitor : Monitor
        Hears of progress, says when to stop.
    front : bool
        Whether the front is wanted too. [-]
    """
    found = Found()
    if isinstance(source, TappedSource):
        source.monitor = monitor
    try:
        bounds = Bounds(problem, source)
    except Stopped as stop:  # not even the bounds are known
        return Found(stopped_by=stop.reason, next_bound=0)
    evaluator = Evaluator(problem, source, monitor, bounds.leading, bounds.fewest)
    ranking = Ranking(problem, wanted, all_windings)
    together = _coils_together(problem, bounds, monitor)
    try:
        for bound, coils in _in_order(problem, bounds, together):
            found.next_bound = bound
            if ranking.settled(bound):
                break
            reason = monitor.stopped()
            if reason is not None:
                raise Stopped(reason)
            monitor.report("the best plans", *so_far(ranking, bound))
            if coils and ranking.worth_it(coils, bound):
                choice = evaluator.best(coils, problem.by, ranking.to_beat(coils))
                if choice is not None:
                    ranking.add(choice)
        found.settled = True
    except Stopped as stop:
        found.stopped_by = stop.reason
    found.choices = ranking.rows()
    if front and found.choices and found.settled:
        _add_front(problem, bounds, together, evaluator, found, monitor)
    if not all(sets.complete for sets in together):
        _own_up(problem, bounds, found, monitor.stopped())
    return found


def so_far(ranking: Ranking, bound: int) -> tuple[str | None, str | None]:
    """Return the best plan so far and what no plan still open can undercut, in words; None where unknown."""
    least = pieces_of_bound(bound, ranking.by)
    no_better = None if least is None else f"{least} pieces"
    if ranking.first is None:
        return None, no_better
    pieces = ranking.first.key[ORDERS[ranking.by].index("pieces")]
    what = "excess" if ranking.problem.led_by_excess else "error"
    return f"{pieces} pieces, {what} {100 * leading_figure(ranking.problem, ranking.first):.2g} %", no_better


def _own_up(problem: Problem, bounds: Bounds, found: Found, reason: str | None) -> None:
    """Say that some sets of coils were not looked at, and how few pieces any of them could need."""
    found.settled = False
    found.stopped_by = found.stopped_by or reason or "work limit"
    least = int(bounds.fewest.min(axis=0).sum()) + 1
    found.next_bound = min(found.next_bound, least << BELOW_PIECES)


def _coils_together(problem: Problem, bounds: Bounds, monitor: Monitor) -> list[PairBounds | SetBounds]:
    """Return the pairs and larger sets of coils that may share the bands."""
    most = min(problem.inductors, problem.bands)
    if least_contacts(problem, bounds.fewest.min(axis=0, initial=IMPOSSIBLE), 2) > problem.contacts_limit:
        most = 1
    pairs: list[PairBounds | SetBounds] = [PairBounds(problem, bounds, monitor)] if most >= 2 else []
    return pairs + [SetBounds(problem, bounds, size, monitor) for size in range(3, most + 1)]


def _in_order(
    problem: Problem, bounds: Bounds, together: list[PairBounds | SetBounds]
) -> Iterator[tuple[int, tuple[int, ...]]]:
    """Yield single coils and sets of coils by rising bound."""
    single = bounds.alone(problem.by)
    order = np.argsort(single, kind="stable")
    singles = ((int(single[j]), (int(j),)) for j in order if single[j] < _LAST)
    return merge(singles, *(sets.in_order() for sets in together), key=_bound_of)


def _bound_of(entry: tuple[float, tuple[int, ...]]) -> float:
    return entry[0]


def _add_front(
    problem: Problem,
    bounds: Bounds,
    together: list[PairBounds | SetBounds],
    evaluator: Evaluator,
    found: Found,
    monitor: Monitor,
) -> None:
    """Add the least worst error for each number of pieces, where it falls by more than 1e-9."""
    try:
        for choice in _front(problem, bounds, together, evaluator, monitor):
            found.front.append(choice)
    except Stopped as stop:
        found.stopped_by = stop.reason


def _front(
    problem: Problem,
    bounds: Bounds,
    together: list[PairBounds | SetBounds],
    evaluator: Evaluator,
    monitor: Monitor,
) -> Iterator[Choice]:
    last = np.inf
    cap = 1 + problem.bands * problem.least_parts
    most = problem.inductors + problem.bands * problem.most_parts
    most = min(most, problem.inductors + problem.parts_limit)
    least = _least_possible(bounds, problem)
    while cap <= most and last > least + 1e-9:
        monitor.report(f"the least error with {cap} pieces")
        choice = _least_error(problem, bounds, together, evaluator, cap, monitor, last - 1e-9)
        if choice is not None:
            error = leading_figure(problem, choice)
            if error < last - 1e-9:
                last = error
                yield choice
        cap += 1


def _least_possible(bounds: Bounds, problem: Problem) -> float:
    """Return a worst error or excess below which no choice can get, however many pieces it has. [-]"""
    least = bounds.least_leading
    if not len(least):
        return np.inf
    return float(least.min(axis=0).max() if problem.inductors >= 2 else least.max(axis=1).min())


def _least_error(
    problem: Problem,
    bounds: Bounds,
    together: list[PairBounds | SetBounds],
    evaluator: Evaluator,
    cap: int,
    monitor: Monitor,
    below: float,
) -> Choice | None:
    """Return the choice of least worst error with at most `cap` pieces, if that is below `below`."""
    best: Choice | None = None
    for error, coils in _by_error(bounds, together, cap, below):
        reason = monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        choice = evaluator.least_error(coils, cap)
        if choice is not None and (best is None or choice.key < best.key):
            best = choice
        # Equal errors stay in the order in which they come: the front promises the least error alone.
        if best is not None and best.key[evaluator.leading_place] <= _fine(problem, error) + 2:  # type: ignore[operator]
            break
    return best


def _fine(problem: Problem, leading: float) -> int:
    """Return the whole number that leads the order for an error or an excess, less a step for rounding."""
    figure = np.array([leading])
    return int((whole_excess(figure, 1e-12) if problem.led_by_excess else fine_error(figure))[0]) - 1


def _by_error(
    bounds: Bounds, together: list[PairBounds | SetBounds], cap: int, below: float
) -> Iterator[tuple[float, tuple[int, ...]]]:
    """Yield coils and sets of coils by rising least error (or excess) with at most `cap` pieces."""
    alone = bounds.staircase(cap - 1)
    order = np.argsort(alone, kind="stable")
    singles = ((float(alone[j]), (int(j),)) for j in order[: np.count_nonzero(alone < below)])
    sets = (group.by_error(cap - group.size, below) for group in together)
    return merge(singles, *sets, key=_bound_of)


def pieces_of_bound(bound: int, by: str) -> int | None:
    """Return the number of pieces that a packed bound of `build` states, None for other orders. [-]"""
    return bound >> BELOW_PIECES if by == "build" and bound != _LAST else None


def leading_figure(problem: Problem, choice: Choice) -> float:
    """Return the worst error of a choice, or its worst excess where every band is swept. [-]"""
    if problem.led_by_excess:
        return max(float(columns.excess[0]) for columns in choice.columns)
    return max(abs(float(columns.error[0])) for columns in choice.columns)
