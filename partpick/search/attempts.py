"""The best plans of a layout in which bands share capacitors: coils by bound, each with growing effort.

An engine settles a block of coils at one *attempt*: at most so many capacitors, so large an error, so
high a price. Attempts of a coil grow in the sequence of the order, so that the first that succeeds
holds its best plan; a coil whose attempt failed goes back with the bound that the failure proves.
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
from partpick.search.figures import coarse_error, fine_error, quality_class, stray_class
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem

_LAST = np.iinfo(np.int64).max
SMALLEST_ERROR = 1e-7  # first error tried where the error leads
LARGEST_ERROR = 0.5  # beyond it the limits alone
BLOCK = 256  # coils tried at one time; twice as many after each failure
LARGEST_BLOCK = {"build": 512, "error": 8192, "price": 512}


class Attempt(NamedTuple):
    """How far one trial goes."""

    pieces: int  # capacitors at most
    error: float  # inf: up to the limits
    price: Ints  # (J,) hundredths at most, coil included; NEVER: also unknown prices


class Engine(Protocol):
    """One layout: what each coil needs at least, and trials."""

    problem: Problem
    least_pieces: Ints  # (J,) capacitors, IMPOSSIBLE where nothing serves
    most_pieces: int
    least_error: Floats  # (J,)
    error_step: float  # factor from one error tried to the next
    unproven: list[Choice]  # what a stopped trial had found
    front_first: bool  # by error: the front, fewest pieces first, before the ranking

    def attempt(self, coils: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choices in the order `by`, and all coils that have one inside the attempt.

        Choices that rank behind `wanted` other rows of the same trial may be left out.

        Raises
        ------
        Stopped
            The monitor or the work limit ended it.
        """

    def front(self, coils: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least worst error for each number of pieces, fewest pieces first."""


class _Steps:
    """Where each coil is in its sequence of attempts."""

    def __init__(self, engine: Engine) -> None:
        self.engine, self.problem = engine, engine.problem
        coils = self.problem.coils
        self.error_step = np.zeros(coils, dtype=np.int64)
        self.pieces = engine.least_pieces.copy()
        self.priced = np.full(coils, self.problem.by == "price")
        self.price_step = np.zeros(coils, dtype=np.int64)
        prices = self.problem.part_price[self.problem.part_price < NEVER]
        self.cheapest = int(prices.min()) if len(prices) else 0
        self.dearest = int(prices.max()) if len(prices) else 0
        if not len(prices):  # only plans without capacitors have a price
            self.dearest = 0
        self.priced &= self.problem.coil_price < NEVER
        self.errors = self._error_steps()
        if self.problem.by == "error":
            start = np.searchsorted(self.errors, np.minimum(engine.least_error, self.errors[-1]))
            self.error_step = np.minimum(start, len(self.errors) - 1).astype(np.int64)
        self._tail = self._coil_figures()

    def _error_steps(self) -> Floats:
        problem = self.problem
        limit = float(problem.error_limit.max(initial=0.0))
        first = SMALLEST_ERROR if problem.by == "error" else problem.floor
        steps = [first]
        while steps[-1] < min(limit, LARGEST_ERROR):
            steps.append(steps[-1] * (self.engine.error_step if problem.by == "error" else 2.0))
        return np.array([*steps[:-1], np.inf])

    def _coil_figures(self) -> dict[str, Ints]:
        """Return what no plan of a coil can undercut, (J,) each."""
        p = self.problem
        error = np.minimum(p.error_limit, 0.999)[None, :]
        most = p.wanted / (1 - error) ** 2
        strays = p.self_capacitance[:, None] + p.stray[None, :]
        figures = {
            "q_class": quality_class(p.coil_loss, p.q_enough[None, :]).max(axis=1),
            "stray_class": stray_class(strays / most).max(axis=1),
            "reactance_class": p.reactance_class.max(axis=1),
        }
        return figures | dict(zip(("forms", "wires", "volume"), p.effort.T, strict=True))

    def bounds(self, coils: Ints) -> Ints:
        """Return the packed bound of some coils at their present attempts, (m,)."""
        p, by = self.problem, self.problem.by
        before = np.where(self.error_step[coils] > 0, self.errors[self.error_step[coils] - 1], 0.0)
        least = self.engine.least_error[coils]
        error = np.maximum(before, np.where(np.isfinite(least), least, 0.0)) * (1 - 1e-9)  # rounding
        figures = {name: figure[coils] for name, figure in self._tail.items()}
        figures["pieces"] = np.minimum(self.pieces[coils], IMPOSSIBLE) + 1
        figures["error_class"] = coarse_error(error, p.floor)
        figures["fine_error"] = fine_error(error) - 1
        if by == "price":
            priced = self.priced[coils]
            first = p.coil_price[coils] + self.engine.least_pieces[coils] * self.cheapest
            known = np.where(self.price_step[coils] > 0, self.price_caps(coils, before=True) + 1, first)
            figures["price"] = np.where(priced, np.minimum(known, NEVER), NEVER)
            at_best = coarse_error(np.zeros(len(coils)), p.floor)
            figures["error_class"] = np.where(priced, at_best, figures["error_class"])
        packed = pack(figures, packed_fields(p, by))
        return np.where(self.engine.least_pieces[coils] >= IMPOSSIBLE, _LAST, packed)

    def price_caps(self, coils: Ints, *, before: bool = False) -> Ints:
        """Return the most that plans may cost at the coils' present attempts, or at those before. [hundredths]"""
        step = self.price_step[coils] - (1 if before else 0)
        least = self.engine.least_pieces[coils] * self.cheapest
        most = self._most_cost()
        grown = np.minimum(np.rint(np.maximum(least, 1) * 1.2 ** np.minimum(step, 150)), most).astype(np.int64)
        return self.problem.coil_price[coils] + grown

    def _most_cost(self) -> int:
        return self.engine.most_pieces * self.dearest

    def kind(self, coils: Ints) -> Ints:
        """Return a number that is equal for coils which can be tried together, (m,)."""
        pieces = self.pieces[coils] if self.problem.by != "error" else np.zeros(len(coils), dtype=np.int64)
        kind = (pieces * 1000 + self.error_step[coils]) * 2
        return np.where(self.priced[coils], -1 - self.price_step[coils], kind)

    def attempt(self, coils: Ints) -> Attempt:
        """Return the attempt that some coils of one kind are at."""
        most, price = self.engine.most_pieces, np.full(self.problem.coils, self.problem.price_limit)
        if self.priced[coils[0]]:
            price[coils] = np.minimum(price[coils], self.price_caps(coils))
            return Attempt(most, np.inf, price)
        pieces = most if self.problem.by == "error" else int(self.pieces[coils[0]])
        return Attempt(pieces, float(self.errors[self.error_step[coils[0]]]), price)

    def advance(self, coils: Ints) -> Ints:
        """Go to the next attempt of coils that failed; return those that have one."""
        priced = self.priced[coils]
        dear = coils[priced]
        last = self.price_caps(dear) >= self.problem.coil_price[dear] + self._most_cost()
        self.price_step[dear[~last]] += 1
        self.priced[dear[last]] = False
        plain = coils[~priced]
        self.error_step[plain] += 1
        over = plain[self.error_step[plain] >= len(self.errors)]
        if self.problem.by == "error":
            return np.setdiff1d(coils, over)
        self.error_step[over] = 0
        self.pieces[over] += 1
        return np.setdiff1d(coils, over[self.pieces[over] > self.engine.most_pieces])


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
    usable = (engine.least_pieces <= engine.most_pieces) & (problem.support_stock[problem.support] >= 1)
    coils = np.flatnonzero(usable)
    first = problem.by == "error" and engine.front_first

    def keep(choice: Choice) -> None:
        found.front.append(choice)
        ranking.add(choice)

    try:
        if first:
            engine.front(coils, keep)
        _rank(engine, coils, ranking, found, monitor)
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
            engine.front(coils, found.front.append)
        except Stopped as stop:
            found.stopped_by = stop.reason
    return found


def _rank(engine: Engine, coils: Ints, ranking: Ranking, found: Found, monitor: Monitor) -> None:
    steps, size = _Steps(engine), BLOCK
    bound = np.full(engine.problem.coils, _LAST, dtype=np.int64)
    bound[coils] = steps.bounds(coils)
    while True:
        order = coils[np.argsort(bound[coils], kind="stable")]
        if not len(order) or bound[order[0]] == _LAST:
            return
        found.next_bound = int(bound[order[0]])
        if ranking.settled(found.next_bound):
            return
        reason = monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        monitor.report("the best plans", *so_far(ranking, found.next_bound))
        block = _together(steps, order[:size])
        worth = np.array([ranking.worth_it((int(j),), int(bound[j])) for j in block], dtype=np.bool_)
        tried = block[worth]
        solved = np.empty(0, dtype=np.int64)
        if len(tried):
            made, solved = engine.attempt(tried, steps.attempt(tried), ranking.by)
            for choice in made.values():
                ranking.add(choice)
        size = BLOCK if len(solved) else min(2 * size, LARGEST_BLOCK[ranking.by])
        again = steps.advance(np.setdiff1d(tried, solved))
        bound[again] = steps.bounds(again)
        coils = np.concatenate([np.setdiff1d(coils, block), again])


def _together(steps: _Steps, head: Ints) -> Ints:
    """Return the first coils that share an attempt."""
    alike = steps.kind(head) == steps.kind(head[:1])
    return head[: int(np.argmin(alike))] if not alike.all() else head


def worth_naming(
    problem: Problem, coils: Ints, keys: Ints, inside: Bools, wanted: int, all_windings: bool
) -> list[int]:
    """Return the rows that may be among the first `wanted`, one a support unless `all_windings`; ties stay.

    Parameters
    ----------
    problem : Problem
        Knows the supports.
    coils, keys, inside : (m,), (m, steps) and (m,) arrays
        The coil of each row, its figures in the order, and whether it counts. [-]
    wanted : int
        How many rows. [-]
    all_windings : bool
        Each coil is a row of its own. [-]
    """
    rows = np.flatnonzero(inside)
    if not len(rows):
        return []
    order = rows[np.lexsort(keys[rows].T[::-1])]
    leaders: dict[int, int] = {}
    named: list[int] = []
    for row in order.tolist():
        group = int(coils[row]) if all_windings else int(problem.support[coils[row]])
        leader = leaders.get(group)
        if leader is None and len(leaders) >= wanted and (keys[row] != keys[named[-1]]).any():
            break
        leaders.setdefault(group, row)
        if leader is None or (keys[row] == keys[leader]).all():
            named.append(row)
    return named


def least_grid_error(problem: Problem, acting: Floats) -> Floats:
    """Return an error that no sum of the values can undercut at every band of a coil, (J,).

    Sums are multiples of the values' common divisor; 0 where the values act differently at the bands.
    """
    nothing = np.zeros(problem.coils)
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
    return np.asarray(best.max(axis=1))
