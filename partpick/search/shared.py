"""The layout `shared`: one set of capacitors, of which each band switches in any subset."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from partpick.progress import Monitor
from partpick.search.attempts import SMALLEST_ERROR, Attempt, least_grid_error, search_layout
from partpick.search.bands import Found
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.choose import Choice
from partpick.search.circuits import Circuits, Windows
from partpick.search.columns import ColumnSource
from partpick.search.problem import NEVER, Floats, Ints, Problem
from partpick.search.set_figures import SetFigures, SharedChoice
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
        Fixed bands, one coil; `parts_limit` is the most that the set may hold.
    source : ColumnSource, optional
        Not used: a set is no network of one band.
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
        No size of the set is stated, a band is swept, or several coils are asked for.
    """
    if problem.parts_limit >= NEVER:
        raise ValueError("a shared set needs a limit on parts")
    if problem.swept.any() or problem.inductors > 1 or problem.connect_any:
        raise ValueError("a shared set is planned for fixed bands, one coil and parallel capacitors")
    engine = SharedEngine(problem, monitor)
    return search_layout(engine, wanted=wanted, all_windings=all_windings, monitor=monitor, front=front)


class SharedEngine:
    """Trials of sets of growing size."""

    def __init__(self, problem: Problem, monitor: Monitor) -> None:
        self.problem = problem
        self.monitor = monitor
        self.unproven: list[Choice] = []
        self.circuits = Circuits(problem)
        self.most_pieces = problem.parts_limit
        limits = self.circuits.windows(np.full(problem.coils, np.inf))
        self._all = self._tools(problem.price_limit)
        self._priced: tuple[SetSearch, SetFigures] | None = None
        self.least_pieces = self._all[0].least_pieces(limits)
        open_ = [(low <= high) for low, high in limits]
        self.least_pieces[~(open_[0] | open_[1]).all(axis=1)] = IMPOSSIBLE
        self.least_error = least_grid_error(problem, self.circuits.acting)
        self.error_step = 2.0
        self.front_first = True  # small sets are soon proven, and show something where large ones are not
        self._limits = limits

    def attempt(self, coils: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choice of each coil inside the attempt; see `attempts.Engine`."""
        if by == "error":
            error = np.full(self.problem.coils, attempt.error)
            fine = self._least_errors(coils, attempt.pieces, error)
            return _with_coils(self._at_errors(coils, attempt.pieces, fine))
        search, figures = self._all
        if (attempt.price[coils] < NEVER).all() and self.problem.price_limit >= NEVER:
            search, figures = self._priced = self._priced or self._tools(NEVER - 1)
        windows = self._windows(coils, np.full(self.problem.coils, attempt.error))
        found = search.sets(coils, attempt.pieces, windows, self._left_for_set(attempt.price))
        # sets of one size that holds no smaller one: none is lost where the windows narrow meanwhile
        alike = by == "build" or (by == "price" and (attempt.price[coils] >= NEVER).all())

        def narrow(coil: int, error: float) -> None:
            row = np.array([coil])
            _refill(windows, self.circuits.windows(np.array([error]), row), row)

        made = figures.best(found, windows, by, narrow if alike else None)
        if by == "price":  # a set of many equal values may cost more than the cheapest grade says
            made = {j: c for j, c in made.items() if attempt.price[j] >= NEVER or c.key[0] <= int(attempt.price[j])}  # type: ignore[operator]
        return _with_coils(made)

    def front(self, coils: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least worst error for each size of the set; see `attempts.Engine`."""
        last = np.inf
        least = float(self.least_error[coils].min(initial=np.inf))
        for size in range(int(self.least_pieces[coils].min(initial=0)), self.most_pieces + 1):
            if last <= least + FRONT_STEP:
                return
            self.monitor.report(f"the least error with {size + 1} pieces")
            fine = self._least_of_all(coils, size, last - FRONT_STEP, least)
            if fine is None:
                continue
            choices = self._at_errors(coils, size, np.full(self.problem.coils, fine))
            best = min(choices.values(), key=lambda choice: choice.key)
            error = max(abs(float(columns.error[0])) for columns in best.columns)
            if error < last - FRONT_STEP:
                last = error
                emit(best)

    def _tools(self, price_limit: int) -> tuple[SetSearch, SetFigures]:
        letters = Letters.of(self.problem, self.circuits, price_limit)
        search = SetSearch(self.problem, self.circuits, letters, self.monitor)
        return search, SetFigures(self.problem, self.circuits, search)

    def _left_for_set(self, price: Ints) -> Ints:
        return np.where(price < NEVER, price - self.problem.coil_price, NEVER)

    def _price(self) -> Ints:
        return self._left_for_set(np.full(self.problem.coils, self.problem.price_limit))

    def _windows(self, coils: Ints, error: Floats) -> Windows:
        """Return intervals of all coils of which those of `coils` are filled in."""
        windows = tuple((low.copy(), high.copy()) for low, high in self._limits)
        _refill(windows, self.circuits.windows(error[coils], coils), coils)  # type: ignore[arg-type]
        return windows  # type: ignore[return-value]

    def _least_of_all(self, coils: Ints, size: int, below: float, least: float) -> int | None:
        """Return the least fine error of any coil with at most `size` capacitors, if it is at most `below`."""
        error = max(SMALLEST_ERROR, least * (1 + 1e-9))
        while True:
            error = min(error, below) if error < 0.5 else below
            near = coils[self.least_error[coils] <= error]
            fine = self._least_errors(near, size, np.full(self.problem.coils, error), together=True)
            best = int(fine[near].min(initial=NEVER))
            if best < NEVER:
                return best
            if error >= below:
                return None
            error *= 2.0

    def _least_errors(self, coils: Ints, most: int, error: Floats, together: bool = False) -> Ints:
        """Return the least fine error of each coil with at most `most` capacitors, (J,); NEVER for none.

        Parameters
        ----------
        coils : (m,) array
            Which coils. [-]
        most : int
            The most capacitors. [-]
        error : (J,) array
            Largest error of interest. [fraction of f]
        together : bool
            Only the least of all coils is of interest. [-]
        """
        best = np.full(self.problem.coils, NEVER, dtype=np.int64)
        for size in range(int(self.least_pieces[coils].min(initial=0)), most + 1):
            active = coils[self.least_pieces[coils] <= size]
            while len(active):
                active = active[best[active] > FINEST]
                windows = self._windows(active, error)
                if not self._improve(active, size, error, windows, best, together):
                    break
        return best

    def _improve(
        self, active: Ints, size: int, error: Floats, windows: Windows, best: Ints, together: bool
    ) -> bool:
        """Lower `best` and `error` by one complete search at those errors; whether anything was lowered."""
        search, figures = self._all
        lowered = False
        for sets in _small(search.sets(active, size, windows, self._price())):
            fine = figures.least_errors(sets, windows)
            better = np.flatnonzero(fine < best[sets.coil])
            if not len(better):
                continue
            lowered = True
            if together:
                best[active] = fine[better].min()
                changed = active
            else:
                np.minimum.at(best, sets.coil[better], fine[better])
                changed = np.unique(sets.coil[better])
            error[changed] = np.maximum(best[changed] - 1, FINEST) * 1e-12
            _refill(windows, self.circuits.windows(error[changed], changed), changed)
        return lowered

    def _at_errors(self, coils: Ints, most: int, fine: Ints) -> dict[int, SharedChoice]:
        """Return the first choice by error of each coil, given its least fine error."""
        search, figures = self._all
        found: dict[int, SharedChoice] = {}
        error = (np.minimum(fine, NEVER) + 0.5) * 1e-12  # rounding
        left = coils[fine[coils] < NEVER]
        for size in range(int(self.least_pieces[coils].min(initial=0)), most + 1):
            if not len(left):
                break
            windows = self._windows(left, error)
            made = figures.best(search.sets(left, size, windows, self._price()), windows, "error")
            found |= {j: choice for j, choice in made.items() if choice.key[0] <= int(fine[j])}  # type: ignore[operator]
            left = left[~np.isin(left, list(found))]
        return found


def _with_coils(made: dict[int, SharedChoice]) -> tuple[dict[int, Choice], Ints]:
    return dict(made), np.array(sorted(made), dtype=np.int64)


def _refill(windows: Windows, rows: Windows, coils: Ints) -> None:
    for (low, high), (new_low, new_high) in zip(windows, rows, strict=True):
        low[coils], high[coils] = new_low, new_high


def _small(found: Iterator[Sets]) -> Iterator[Sets]:
    """Split blocks so that a better error soon narrows the search."""
    for sets in found:
        size = max(1, (1 << 16) >> sets.letters.shape[1])
        for start in range(0, len(sets), size):
            yield sets.take(slice(start, start + size))
