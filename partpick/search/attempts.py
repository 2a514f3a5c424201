"""The best plans of a layout in which bands share capacitors: rows by bound, each with growing effort.

A row is a coil, or some coils and which bands each serves (`plan_rows.py`). An engine settles a block of
rows at one *attempt*: at most so many capacitors, so large an error, so high a price. Attempts of a row
grow in the sequence of the order, so that the first that succeeds holds its best plan; a row whose
attempt failed goes back with the bound that the failure proves.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple, Protocol

import numpy as np

from partpick.progress import Monitor
from partpick.search.bands import Found, Ranking, so_far
from partpick.search.bounds import IMPOSSIBLE, pack, packed_fields
from partpick.search.choose import Choice, Stopped
from partpick.search.figures import coarse_error
from partpick.search.plan_rows import LAST, MOST_PATTERNS, PlanRows
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem

SMALLEST_ERROR = 1e-7  # first error tried where the error leads
LEAST_EXCESS = 1e-3  # first excess tried where pieces lead and every band is swept
LARGEST_ERROR = 0.5  # beyond it the limits alone
BLOCK = 256  # rows tried at one time; twice as many after each failure
LOOK_AHEAD = 16  # blocks in which rows of one kind are looked for
LARGEST_BLOCK = {"build": 2048, "error": 8192, "price": 512}


class Attempt(NamedTuple):
    """How far one trial goes."""

    pieces: int  # capacitors at most
    lead: float  # error, or excess where every band is swept; inf: up to the limits
    price: Ints  # (m,) of each row tried: hundredths at most, coils included; NEVER: also unknown prices


class Engine(Protocol):
    """One layout: its rows, what each needs at least, and trials."""

    problem: Problem
    rows: PlanRows
    most_pieces: int
    error_step: float  # factor from one error tried to the next
    most_rows: int  # worth trying at one time
    unproven: list[Choice]  # what a stopped trial had found
    front_first: bool  # by error: the front, fewest pieces first, before the ranking

    def attempt(self, rows: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choices in the order `by`, and all rows that have one inside the attempt.

        Choices that rank behind `wanted` other rows of the same trial may be left out.

        Raises
        ------
        Stopped
            The monitor or the work limit ended it.
        """

    def front(self, rows: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least worst error for each number of pieces, fewest pieces first."""


class _Steps:
    """Where each row is in its sequence of attempts."""

    def __init__(self, engine: Engine) -> None:
        self.engine, self.problem, self.rows = engine, engine.problem, engine.rows
        count = len(self.rows)
        self.error_step = np.zeros(count, dtype=np.int64)
        self.pieces = self.rows.least_pieces.copy()
        self.priced = np.full(count, self.problem.by == "price")
        self.price_step = np.zeros(count, dtype=np.int64)
        prices = self.problem.part_price[self.problem.part_price < NEVER]
        self.cheapest = int(prices.min()) if len(prices) else 0
        self.dearest = int(prices.max()) if len(prices) else 0
        if not len(prices):  # only plans without capacitors have a price
            self.dearest = 0
        self.priced &= self.rows.price < NEVER
        self.errors = self._error_steps()
        if self.problem.by == "error":
            start = np.searchsorted(self.errors, np.minimum(self.rows.least_error, self.errors[-1]))
            self.error_step = np.minimum(start, len(self.errors) - 1).astype(np.int64)

    def _error_steps(self) -> Floats:
        problem = self.problem
        if problem.led_by_excess:
            limit, first = problem.excess_limit, LEAST_EXCESS
        else:
            limit, first = float(problem.error_limit[~problem.swept].max(initial=0.0)), problem.floor
        if problem.by == "error":
            first = SMALLEST_ERROR
        steps = [first]
        while steps[-1] < min(limit, LARGEST_ERROR):
            steps.append(steps[-1] * (self.engine.error_step if problem.by == "error" else 2.0))
        return np.array([*steps[:-1], np.inf])

    def bounds(self, rows: Ints) -> Ints:
        """Return the packed bound of some rows at their present attempts, (m,)."""
        p, by, own = self.problem, self.problem.by, self.rows
        before = np.where(self.error_step[rows] > 0, self.errors[self.error_step[rows] - 1], 0.0)
        least = own.least_error[rows]
        lead = np.maximum(before, np.where(np.isfinite(least), least, 0.0)) * (1 - 1e-9)  # rounding
        figures = own.figures(rows, lead)
        figures["pieces"] = np.minimum(self.pieces[rows], IMPOSSIBLE) + own.size[rows]
        if by == "price":
            priced = self.priced[rows]
            first = own.price[rows] + own.least_pieces[rows] * self.cheapest
            known = np.where(self.price_step[rows] > 0, self.price_caps(rows, before=True) + 1, first)
            figures["price"] = np.where(priced, np.minimum(known, NEVER), NEVER)
            at_best = coarse_error(np.zeros(len(rows)), p.floor)
            figures["error_class"] = np.where(priced, at_best, figures["error_class"])
            figures["coarse_excess"] = np.where(priced, 0, figures["coarse_excess"])
        packed = pack(figures, packed_fields(p, by))
        return np.where(own.least_pieces[rows] >= IMPOSSIBLE, LAST, packed)

    def price_caps(self, rows: Ints, *, before: bool = False) -> Ints:
        """Return the most that plans may cost at the rows' present attempts, or at those before. [hundredths]"""
        step = self.price_step[rows] - (1 if before else 0)
        least = self.rows.least_pieces[rows] * self.cheapest
        most = self._most_cost()
        grown = np.minimum(np.rint(np.maximum(least, 1) * 1.2 ** np.minimum(step, 150)), most).astype(np.int64)
        return self.rows.price[rows] + grown

    def _most_cost(self) -> int:
        return self.engine.most_pieces * self.dearest

    def kind(self, rows: Ints) -> Ints:
        """Return a number that is equal for rows which can be tried together, (m,)."""
        pieces = self.pieces[rows] if self.problem.by != "error" else np.zeros(len(rows), dtype=np.int64)
        kind = (pieces * 1000 + self.error_step[rows]) * 2
        return np.where(self.priced[rows], -1 - self.price_step[rows], kind) * MOST_PATTERNS + self.rows.pattern[rows]

    def attempt(self, rows: Ints) -> Attempt:
        """Return the attempt that some rows of one kind are at."""
        most, price = self.engine.most_pieces, np.full(len(rows), self.problem.price_limit)
        if self.priced[rows[0]]:
            return Attempt(most, np.inf, np.minimum(price, self.price_caps(rows)))
        pieces = most if self.problem.by == "error" else int(self.pieces[rows[0]])
        return Attempt(pieces, float(self.errors[self.error_step[rows[0]]]), price)

    def advance(self, rows: Ints) -> Ints:
        """Go to the next attempt of rows that failed; return those that have one."""
        priced = self.priced[rows]
        dear = rows[priced]
        last = self.price_caps(dear) >= self.rows.price[dear] + self._most_cost()
        self.price_step[dear[~last]] += 1
        self.priced[dear[last]] = False
        plain = rows[~priced]
        self.error_step[plain] += 1
        over = plain[self.error_step[plain] >= len(self.errors)]
        if self.problem.by == "error":
            return np.setdiff1d(rows, over)
        self.error_step[over] = 0
        self.pieces[over] += 1
        return np.setdiff1d(rows, over[self.pieces[over] > self.engine.most_pieces])


def search_layout(
    engine: Engine, *, wanted: int, all_windings: bool, monitor: Monitor, front: bool
) -> Found:
    """Return the first `wanted` plans of an engine in the order of the request, and its front.

    Parameters
    ----------
    engine : Engine
        The layout.
    wanted : int
        How many rows. [-]
    all_windings : bool
        One row a winding instead of one a former, core or bought inductor. [-]
    monitor : Monitor
        Hears of progress, says when to stop.
    front : bool
        Whether the front is wanted too. [-]
    """
    problem = engine.problem
    found = Found()
    ranking = Ranking(problem, wanted, all_windings)
    usable = (engine.rows.least_pieces <= engine.most_pieces) & engine.rows.supports_in_stock()
    rows = np.flatnonzero(usable)
    first = problem.by == "error" and engine.front_first

    def keep(choice: Choice) -> None:
        found.front.append(choice)
        ranking.add(choice)

    try:
        if first:
            engine.front(rows, keep)
        _rank(engine, rows, ranking, found, monitor)
        found.settled = True
    except Stopped as stop:
        found.stopped_by = stop.reason
        for choice in engine.unproven:
            ranking.add(choice)
    found.choices = ranking.rows()
    if not front:
        found.front.clear()
    elif not first and found.choices and found.settled:
        try:
            engine.front(rows, found.front.append)
        except Stopped as stop:
            found.stopped_by = stop.reason
    if front and engine.rows.omitted != LAST:  # what is in no row may lie on the front
        found.stopped_by = found.stopped_by or "work limit"
    return found


def _rank(engine: Engine, rows: Ints, ranking: Ranking, found: Found, monitor: Monitor) -> None:
    steps, first = _Steps(engine), min(BLOCK, engine.most_rows)
    size = first
    bound = np.full(len(engine.rows), LAST, dtype=np.int64)
    bound[rows] = steps.bounds(rows)
    omitted = engine.rows.omitted
    open_ = np.zeros(len(engine.rows), dtype=np.bool_)
    open_[rows] = True
    while True:
        order = _first_by_bound(bound, engine.rows.pattern, np.flatnonzero(open_), LOOK_AHEAD * size)
        following = int(bound[order[0]]) if len(order) else LAST
        found.next_bound = min(following, omitted)
        if found.next_bound == LAST or ranking.settled(found.next_bound):
            return
        if following == LAST or (following > omitted and len(ranking.best) >= ranking.wanted):
            raise Stopped("work limit")
        reason = monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        monitor.report("the best plans", *so_far(ranking, found.next_bound))
        block = _together(steps, order)[:size]
        coils = engine.rows.coils_of
        worth = np.array([ranking.worth_it(coils(int(row)), int(bound[row])) for row in block], dtype=np.bool_)
        tried = block[worth]
        solved = np.empty(0, dtype=np.int64)
        if len(tried):
            made, solved = engine.attempt(tried, steps.attempt(tried), ranking.by)
            for choice in made.values():
                ranking.add(choice)
        size = first if len(solved) else min(2 * size, LARGEST_BLOCK[ranking.by], engine.most_rows)
        again = steps.advance(np.setdiff1d(tried, solved))
        bound[again] = steps.bounds(again)
        open_[block] = False
        open_[again] = True


def _first_by_bound(bound: Ints, pattern: Ints, rows: Ints, count: int) -> Ints:
    """Return the first rows by bound, then by pattern: `count` of them, and those that tie with the last."""
    if len(rows) > 4 * count:
        own = bound[rows]
        rows = rows[own <= np.partition(own, count - 1)[count - 1]]
    return rows[np.lexsort((pattern[rows], bound[rows]))]


def _together(steps: _Steps, head: Ints) -> Ints:
    """Return the rows that share the attempt of the first; where bands are shared out, from further on too."""
    alike = steps.kind(head) == steps.kind(head[:1])
    if steps.rows.coils.shape[1] > 1:
        return head[alike]
    return head[: int(np.argmin(alike))] if not alike.all() else head


def worth_naming(keys: Ints, inside: Bools, group: Ints, wanted: int) -> list[int]:
    """Return the rows that may be among the first `wanted`, one a group; ties stay.

    Parameters
    ----------
    keys, inside : (m, steps) and (m,) arrays
        The figures of each row in the order, and whether it counts. [-]
    group : (m,) array
        Rows of one number share a place among the results. [-]
    wanted : int
        How many groups. [-]
    """
    rows = np.flatnonzero(inside)
    if not len(rows):
        return []
    order = rows[np.lexsort(keys[rows].T[::-1])]
    leaders: dict[int, int] = {}
    named: list[int] = []
    for row in order.tolist():
        leader = leaders.get(int(group[row]))
        if leader is None and len(leaders) >= wanted and (keys[row] != keys[named[-1]]).any():
            break
        leaders.setdefault(int(group[row]), row)
        if leader is None or (keys[row] == keys[leader]).all():
            named.append(row)
    return named


def grid_errors(problem: Problem, acting: Floats) -> Floats:
    """Return an error that no sum of the values can undercut, (J, B); 0 for swept bands.

    Sums are multiples of the values' common divisor; 0 where the values act differently at the bands.
    """
    nothing = np.zeros(problem.wanted.shape)
    exact = np.array([float(value) for value in problem.part_value])
    used = np.isfinite(acting).all(axis=0)
    if problem.lead_inductance > 0 or not used.any() or not used.all():
        return nothing
    if not np.allclose(acting, exact[None, :], rtol=1e-13, atol=0.0):
        return nothing
    scale = math.lcm(*(value.denominator for value in problem.part_value))
    unit = math.gcd(*(int(value * scale) for value in problem.part_value)) / scale
    fixed = problem.fixed_capacitance()
    below = np.maximum(np.floor((problem.wanted - fixed) / unit * (1 + 1e-12)), 0.0)
    best = np.full(problem.wanted.shape, np.inf)
    for count in (below, below + 1):
        total = np.maximum(fixed + count * unit, 1e-30)
        best = np.minimum(best, np.abs(np.sqrt(problem.wanted / total) - 1.0))
    return np.where(problem.swept[None, :], 0.0, best)
