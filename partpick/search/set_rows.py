"""Which coils a plan with a shared set may have: each alone, and several while their number allows it."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from math import perm
from typing import Any

import numpy as np

from partpick.search.attempts import grid_errors
from partpick.search.bounds import BELOW_PIECES, IMPOSSIBLE
from partpick.search.figures import quality_class, stray_class
from partpick.search.places import PlaceMaker
from partpick.search.plan_rows import LAST, PlanRows
from partpick.search.problem import Bools, Floats, Ints, Problem

MOST_ROWS = 200_000


class CoilReach:
    """What each coil can do at each band on any of its places, (J, B) each."""

    def __init__(self, problem: Problem, maker: PlaceMaker) -> None:
        shape = problem.wanted.shape
        self.problem = problem
        self.least, self.most = np.full(shape, np.inf), np.full(shape, -np.inf)
        self.least_error = np.zeros(shape)
        self.q_class, self.stray_class, self.reactance_class = (np.zeros(shape, dtype=np.int64) for _ in range(3))
        for places in maker.blocks():
            own, first, rows = places.problem, places.start[:-1], places.asked
            none, some = places.circuits.limits
            bare, inside = (none[0] <= 0) & (none[1] >= 0), some[0] <= some[1]
            low = np.where(inside, some[0], np.inf)
            low = np.where(bare, np.minimum(low, 0.0), low)
            high = np.where(inside, some[1], np.where(bare, 0.0, -np.inf))
            error = np.minimum(problem.error_limit, 0.999)[None, :]
            strays = own.self_capacitance[:, None] + problem.stray[None, :]
            share = stray_class(strays / (own.wanted / (1 - error) ** 2))
            quality = quality_class(own.coil_loss, problem.q_enough[None, :])
            self.least[rows] = np.minimum.reduceat(low, first, axis=0)
            self.most[rows] = np.maximum.reduceat(high, first, axis=0)
            self.least_error[rows] = np.minimum.reduceat(grid_errors(own, places.circuits.acting), first, axis=0)
            self.q_class[rows] = np.minimum.reduceat(quality, first, axis=0)
            self.stray_class[rows] = np.minimum.reduceat(share, first, axis=0)
            self.reactance_class[rows] = np.minimum.reduceat(own.reactance_class, first, axis=0)

    @property
    def serves(self) -> Bools:
        """Whether each coil has a place for each band at all."""
        return np.asarray(self.least <= self.most)

    def highest(self) -> Floats:
        """Return the largest sum of use at each band, (B,). [F]"""
        return np.maximum(np.where(np.isfinite(self.most), self.most, 0.0).max(axis=0, initial=0.0), 0.0)

    def intervals(self, rows: SetRows) -> tuple[Floats, Floats]:
        """Return what lies around all that some coils want at each band, (R, B) each. [F]"""
        return self._over(rows, self.least, np.inf, np.minimum), self._over(rows, self.most, -np.inf, np.maximum)

    def _over(self, rows: SetRows, figure: Any, none: float, best: np.ufunc) -> Any:
        """Return the best figure of any coil that a row has for each band, (R, B)."""
        kept = np.full((len(rows.coils), self.problem.bands), none, dtype=figure.dtype)
        for slot in range(rows.coils.shape[1]):
            allowed = rows.allowed(slot, self.problem)
            kept = best(kept, np.where(allowed, figure[rows.coils[:, slot]], none))
        return kept

    def bounded(self, rows: SetRows, least_pieces: Ints, omitted: int) -> PlanRows:
        """Return rows of some coils with their bounds."""
        least, most = self.intervals(rows)
        pieces = np.where((least <= most).all(axis=1), np.minimum(least_pieces, IMPOSSIBLE), IMPOSSIBLE)
        tables = self.q_class, self.stray_class, self.reactance_class
        q, strays, reactance = (self._over(rows, table, 99, np.minimum).max(axis=1) for table in tables)
        error = self._over(rows, self.least_error, np.inf, np.minimum).max(axis=1)
        pattern = np.zeros(len(rows.coils), dtype=np.int64)
        return PlanRows(self.problem, rows.coils, pattern, pieces, error, q, strays, reactance, omitted)


@dataclass(frozen=True, eq=False)
class SetRows:
    """Coils that share the bands, each of them used, so that no way of sharing stands in two rows.

    From the highest band down the coils come in one after the other: a band at which one comes in is
    served by it, a band before that by those that came before.
    """

    coils: Ints  # (R, most), -1 where there are fewer
    first: Ints  # (R, most) at which band from the highest down each comes in

    def allowed(self, slot: int, problem: Problem) -> Bools:
        """Return which bands a coil of each row may serve, (R, B)."""
        falling = np.argsort(-problem.frequency, kind="stable")
        place = np.empty(problem.bands, dtype=np.int64)
        place[falling] = np.arange(problem.bands)
        own = self.first[:, slot, None]
        others = np.zeros((len(self.coils), problem.bands), dtype=np.bool_)
        for other in range(self.coils.shape[1]):
            if other != slot:
                others |= (self.first[:, other, None] == place) & (self.coils[:, other, None] >= 0)
        return np.asarray((self.coils[:, slot, None] >= 0) & (place >= own) & ~others)

    def take(self, rows: Ints) -> SetRows:
        """Return some of the rows."""
        return SetRows(self.coils[rows], self.first[rows])


def sets_of_coils(reach: CoilReach) -> tuple[SetRows, bool]:
    """Return all coils that may share the bands, in every way, and whether none was left out."""
    p = reach.problem
    most = max(1, min(p.inductors, p.bands))
    useful = np.flatnonzero(reach.serves.any(axis=1))
    coils, firsts, complete = [np.arange(p.coils)[:, None]], [np.zeros((p.coils, 1), dtype=np.int64)], True
    for size in range(2, most + 1):
        ways = np.array([(0, *some) for some in itertools.combinations(range(1, p.bands), size - 1)])
        count = len(useful)
        while perm(count, size) * len(ways) > MOST_ROWS:
            count -= 1
        chosen = useful
        if count < len(useful):
            chosen, complete = _promising(reach, useful, count), False
        every = list(itertools.permutations(chosen.tolist(), size))
        table = np.array(every, dtype=np.int64).reshape(len(every), size)
        table = table[np.all(reach.serves[table].any(axis=1), axis=1)]
        coils.append(np.repeat(table, len(ways), axis=0))
        firsts.append(np.tile(ways, (len(table), 1)))
    pads = [((0, 0), (0, most - table.shape[1])) for table in coils]
    rows = SetRows(
        np.concatenate([np.pad(table, pad, constant_values=-1) for table, pad in zip(coils, pads, strict=True)]),
        np.concatenate([np.pad(table, pad) for table, pad in zip(firsts, pads, strict=True)]),
    )
    return rows, complete


def _promising(reach: CoilReach, useful: Ints, count: int) -> Ints:
    """Return the coils that are best for each band, in turn, until there are enough."""
    effort = reach.problem.effort[useful]
    orders = []
    for band in range(reach.problem.bands):
        figures = reach.q_class[useful, band], reach.stray_class[useful, band], reach.reactance_class[useful, band]
        unserved = ~reach.serves[useful, band]
        orders.append(useful[np.lexsort((*effort.T[::-1], *figures, reach.least_error[useful, band], unserved))])
    chosen = list(dict.fromkeys(int(coil) for row in np.array(orders).T for coil in row))[:count]
    return np.sort(np.array(chosen, dtype=np.int64))


def omitted_bound(problem: Problem, least_pieces: int, complete: bool) -> int:
    """Return the packed bound of the sets of coils left out: two coils and the least capacitors of any set."""
    if complete:
        return int(LAST)
    return (2 + least_pieces) << BELOW_PIECES if problem.by == "build" else 0
