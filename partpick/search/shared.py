"""The layout `shared`: one set of capacitors, of which each band switches in any subset."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from partpick.progress import Monitor
from partpick.search.attempts import SMALLEST_ERROR, Attempt, search_layout
from partpick.search.bands import Found
from partpick.search.choose import Choice
from partpick.search.columns import ColumnSource
from partpick.search.places import PlaceMaker
from partpick.search.problem import NEVER, Floats, Ints, Problem
from partpick.search.set_figures import SetFigures, SharedChoice
from partpick.search.set_mounts import SetMounts
from partpick.search.set_rows import CoilReach, omitted_bound, sets_of_coils
from partpick.search.shared_sets import Letters, Sets, SetSearch

__all__ = ["SharedChoice", "search_shared"]

FINEST = 1000  # fine error below which all are equal
FRONT_STEP = 1e-9


def search_shared(
    problem: Problem,
    source: ColumnSource | None = None,
    *,
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first `wanted` plans with one shared set, and the front of error against pieces.

    Parameters
    ----------
    problem : Problem
        Fixed bands; `parts_limit` is the most that the set may hold.
    source : ColumnSource, optional
        Knows the sections of coils where bands may use a tap.
    wanted : int
        How many rows. [-]
    all_windings : bool
        One row a winding instead of one a former, core or bought inductor. [-]
    monitor : Monitor
        Hears of progress, says when to stop.
    front : bool
        Whether the front is wanted too. [-]

    Raises
    ------
    ValueError
        No size of the set is stated, a band is swept, or series networks are asked for.
    """
    if problem.parts_limit >= NEVER:
        raise ValueError("a shared set needs a limit on parts")
    if problem.swept.any() or problem.connect_any:
        raise ValueError("a shared set is planned for fixed bands and parallel capacitors")
    engine = SharedEngine(problem, source, monitor)
    return search_layout(engine, wanted=wanted, all_windings=all_windings, monitor=monitor, front=front)


class SharedEngine:
    """Trials of sets of growing size."""

    def __init__(self, problem: Problem, source: ColumnSource | None, monitor: Monitor) -> None:
        self.problem = problem
        self.monitor = monitor
        self.unproven: list[Choice] = []
        self.places = PlaceMaker(problem, source)
        self.circuits = self.places.circuits
        self.most_pieces = problem.parts_limit
        reach = CoilReach(problem, self.places)
        self._highest = reach.highest()
        self._all = self._tools(problem.price_limit)
        self._priced: tuple[SetSearch, SetFigures] | None = None
        self._ways, complete = sets_of_coils(reach)
        least = self._all[0].least_pieces(*reach.intervals(self._ways))
        self.rows = reach.bounded(self._ways, least, int(omitted_bound(problem, int(least.min(initial=0)), complete)))
        self.most_rows = self.places.rows_at_once(self.rows.coils.shape[1])
        self.error_step = 2.0
        self.front_first = True  # small sets are soon proven, and show something where large ones are not

    def attempt(self, rows: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choice of each row inside the attempt; see `attempts.Engine`."""
        if by == "error":
            fine = self._least_errors(rows, attempt.pieces, np.full(len(self.rows), attempt.lead))
            return _with_rows(self._at_errors(rows, attempt.pieces, fine))
        search, figures = self._all
        if (attempt.price < NEVER).all() and self.problem.price_limit >= NEVER:
            search, figures = self._priced = self._priced or self._tools(NEVER - 1)
        mounts = self._mounts(rows, np.full(len(rows), attempt.lead))
        found = search.sets(mounts, attempt.pieces, self._left_for_set(rows, attempt.price))
        # sets of one size that holds no smaller one: none is lost where the mounts narrow meanwhile
        alike = by == "build" or (by == "price" and (attempt.price >= NEVER).all())

        def narrow(row: int, error: float) -> None:
            mounts.narrow(np.array([row]), np.array([error]))

        made = figures.best(found, mounts, by, narrow if alike else None)
        if by == "price":  # a set of many equal values may cost more than the cheapest grade says
            price = attempt.price
            made = {j: c for j, c in made.items() if price[j] >= NEVER or c.key[0] <= int(price[j])}  # type: ignore[operator]
        return _with_rows({int(rows[place]): choice for place, choice in made.items()})

    def front(self, rows: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least worst error for each number of pieces; see `attempts.Engine`."""
        last, own = np.inf, self.rows
        least = float(own.least_error[rows].min(initial=np.inf))
        fewest = int((own.least_pieces + own.size)[rows].min(initial=0))
        for pieces in range(fewest, self.most_pieces + int(own.size[rows].max(initial=1)) + 1):
            if last <= least + FRONT_STEP:
                return
            self.monitor.report(f"the least error with {pieces} pieces")
            reached = self._least_of_all(rows, pieces, last - FRONT_STEP, least)
            if reached is None:
                continue
            fine, who = reached
            choices = self._at_errors(who, pieces, np.full(len(own), fine), counting_coils=True)
            best = min(choices.values(), key=lambda choice: choice.key)
            error = max(abs(float(columns.error[0])) for columns in best.columns)
            if error < last - FRONT_STEP:
                last = error
                emit(best)

    def _tools(self, price_limit: int) -> tuple[SetSearch, SetFigures]:
        letters = Letters.of(self.problem, self.circuits, price_limit)
        search = SetSearch(self.problem, self._highest, letters, self.monitor)
        return search, SetFigures(self.problem, self.circuits, search)

    def _left_for_set(self, rows: Ints, price: Ints | int) -> Ints:
        return np.where(np.asarray(price) < NEVER, price - self.rows.price[rows], NEVER)

    def _mounts(self, rows: Ints, error: Floats) -> SetMounts:
        own = self._ways.take(rows)
        widest = int(self.rows.size[rows].max(initial=1))
        allowed = np.stack([own.allowed(slot, self.problem) for slot in range(widest)], axis=1)
        return SetMounts(self.places, own.coils[:, :widest], allowed, error)

    def _least_of_all(self, rows: Ints, pieces: int, below: float, least: float) -> tuple[int, Ints] | None:
        """Return the least fine error of any row with at most so many pieces, if at most `below`, and who to ask."""
        own = self.rows
        error = max(SMALLEST_ERROR, least * (1 + 1e-9))
        while True:
            error = min(error, below) if error < 0.5 else below
            near = rows[(own.least_error[rows] <= error) & ((own.least_pieces + own.size)[rows] <= pieces)]
            best = NEVER
            for size in np.unique(own.size[near]).tolist():
                some = near[own.size[near] == size]
                start = np.full(len(own), min(error, (best - 0.5) * 1e-12))
                fine = self._least_errors(some, pieces - size, start, together=True)
                best = min(best, int(fine[some].min(initial=NEVER)))
            if best < NEVER:
                return best, near
            if error >= below:
                return None
            error *= 2.0

    def _least_errors(self, rows: Ints, most: int, error: Floats, together: bool = False) -> Ints:
        """Return the least fine error of each row with at most `most` capacitors, (R,); NEVER for none.

        Parameters
        ----------
        rows : (m,) array
            Which rows. [-]
        most : int
            The most capacitors. [-]
        error : (R,) array
            Largest error of interest. [fraction of f]
        together : bool
            Only the least of all rows is of interest. [-]
        """
        best = np.full(len(self.rows), NEVER, dtype=np.int64)
        for size in range(int(self.rows.least_pieces[rows].min(initial=0)), min(most, self.most_pieces) + 1):
            active = rows[self.rows.least_pieces[rows] <= size]
            for start in range(0, len(active), self.most_rows):
                some = active[start : start + self.most_rows]
                if together:
                    best[some] = best[active].min()
                    error[some] = error[active].min()
                while len(some):
                    some = some[best[some] > FINEST]
                    if not len(some) or not self._improve(some, size, error, best, together):
                        break
        return best

    def _improve(self, active: Ints, size: int, error: Floats, best: Ints, together: bool) -> bool:
        """Lower `best` and `error` by one complete search at those errors; whether anything was lowered."""
        search, figures = self._all
        mounts = self._mounts(active, error[active])
        every = np.arange(len(active))
        lowered = False
        price = self._left_for_set(active, self.problem.price_limit)
        for sets in _small(search.sets(mounts, size, price)):
            fine = figures.least_errors(sets, mounts)
            better = np.flatnonzero(fine < best[active[sets.row]])
            if not len(better):
                continue
            lowered = True
            if together:
                best[active] = fine[better].min()
                changed = every
            else:
                np.minimum.at(best, active[sets.row[better]], fine[better])
                changed = np.unique(sets.row[better])
            error[active[changed]] = np.maximum(best[active[changed]] - 1, FINEST) * 1e-12
            mounts.narrow(changed, error[active[changed]])
        return lowered

    def _at_errors(
        self, rows: Ints, most: int, fine: Ints, *, counting_coils: bool = False
    ) -> dict[int, SharedChoice]:
        """Return the first choice by error of each row, given its least fine error.

        `most` counts capacitors, or all pieces with `counting_coils`.
        """
        search, figures = self._all
        found: dict[int, SharedChoice] = {}
        error = (np.minimum(fine, NEVER) + 0.5) * 1e-12  # rounding
        left = rows[fine[rows] < NEVER]
        coils = self.rows.size if counting_coils else np.zeros(len(self.rows), dtype=np.int64)
        for size in range(int(self.rows.least_pieces[rows].min(initial=0)), min(most, self.most_pieces) + 1):
            now = left[size + coils[left] <= most]
            if not len(now):
                break
            mounts = self._mounts(now, error[now])
            price = self._left_for_set(now, self.problem.price_limit)
            made = figures.best(search.sets(mounts, size, price), mounts, "error")
            own = {int(now[place]): choice for place, choice in made.items()}
            found |= {j: choice for j, choice in own.items() if choice.key[0] <= int(fine[j])}  # type: ignore[operator]
            left = left[~np.isin(left, list(found))]
        return found


def _with_rows(made: dict[int, SharedChoice]) -> tuple[dict[int, Choice], Ints]:
    return dict(made), np.array(sorted(made), dtype=np.int64)


def _small(found: Iterator[Sets]) -> Iterator[Sets]:
    """Split blocks so that a better error soon narrows the search."""
    for sets in found:
        size = max(1, (1 << 16) >> sets.letters.shape[1])
        for start in range(0, len(sets), size):
            yield sets.take(slice(start, start + size))
