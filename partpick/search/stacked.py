"""The layout `stacked`: each band adds capacitors to those in circuit at the next higher one."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from partpick.progress import Monitor
from partpick.search.attempts import SMALLEST_ERROR, Attempt, search_layout, worth_naming
from partpick.search.bands import Found
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.chains import Chains
from partpick.search.choose import ORDERS, SUMS, Choice, Stopped
from partpick.search.columns import ColumnSource
from partpick.search.mounts import MountMaker, Mounts, steps_of
from partpick.search.places import PlaceMaker
from partpick.search.problem import NEVER, Bools, Ints, Problem
from partpick.search.stack_graph import FAR, StackGraph
from partpick.search.stack_nodes import StackNodes
from partpick.search.stack_plan import StackedChoice, inside_shared_limits, named_stack
from partpick.search.stack_reach import StackReach

__all__ = ["StackedChoice", "search_stacked"]

FRONT_STEP = 1e-9
FRONT_WORK = 100_000_000  # places for capacitors in the graphs for the front
TOGETHER = 16  # rows settled under the shared limits at one time

Figures = tuple[int, ...]


def search_stacked(
    problem: Problem,
    source: ColumnSource | None = None,
    *,
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first `wanted` stacked plans, and the front of error (or excess) against pieces.

    Parameters
    ----------
    problem : Problem
        `most_parts` is the most that a band may add, a series padder counted in.
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
        Series networks are asked for.
    """
    if problem.connect_any:
        raise ValueError("a stack is planned for parallel capacitors")
    engine = StackedEngine(problem, source, monitor, wanted, all_windings)
    return search_layout(engine, wanted=wanted, all_windings=all_windings, monitor=monitor, front=front)


class StackedEngine:
    """Trials of stacks with more capacitors, larger errors or a higher price."""

    def __init__(
        self, problem: Problem, source: ColumnSource | None, monitor: Monitor, wanted: int, all_windings: bool
    ) -> None:
        self.problem = problem
        self.monitor = monitor
        self.unproven: list[Choice] = []
        self.front_first = False
        self.wanted = wanted
        places = PlaceMaker(problem, source)
        self.circuits = places.circuits
        self.maker = MountMaker(problem, places)
        reach = StackReach(problem, self.maker)
        self.nodes = StackNodes(problem, self.circuits, reach.sums, monitor)
        every = problem.bands * problem.most_parts
        self.most_pieces = min(every, problem.parts_limit)
        self._parts_limit_binds = self.most_pieces < every
        chains = Chains(problem, reach, self.most_pieces)
        self.rows, self._patterns = chains.rows, chains.patterns
        self.most_rows = places.rows_at_once(self.rows.coils.shape[1])
        self._group = self.rows.groups(all_windings)
        # paths multiply band by band, so the more bands, the finer the steps
        self.error_step = float(2.0 ** min(1.0, 4.0 / problem.bands))
        self._lead = "fine_excess" if problem.led_by_excess else "fine_error"
        prices = problem.part_price[problem.part_price < NEVER]
        self._cheapest = int(prices.min()) if len(prices) else NEVER

    def attempt(self, rows: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choice of each row inside the attempt; see `attempts.Engine`."""
        trial = _Trial(rows, self._budget(rows, attempt), attempt, by)
        mounts = self._mounts(rows, attempt.lead)
        if self.nodes.scarce:
            self._settle_under_shared_limits(trial, mounts)
        else:
            self._settle_all(trial, mounts, shared=False)
        made = {int(rows[place]): choice for place, (_, choice) in trial.best.items() if choice is not None}
        return made, np.sort(rows[list(trial.best)])

    def _settle_all(self, trial: _Trial, mounts: Mounts, *, shared: bool) -> None:
        """Find the first choice of each row of a trial; without the shared limits where `shared` is false."""
        count = self._parts_limit_binds and trial.by != "build"
        order = ORDERS[trial.by]
        graphs = self.nodes.graphs(mounts, trial.budget, trial.attempt.price, shared=shared, count_pieces=count)
        for graph in self._kept(graphs, trial):
            if not graph.solved().any():
                continue
            graph.describe(self.circuits)
            keys, inside = self._settle(graph, order, trial)
            worth = set(worth_naming(keys, inside, self._group[trial.rows], self.wanted))
            for place in np.flatnonzero(inside).tolist():
                figures = tuple(keys[place].tolist())
                known = trial.best.get(place)
                if known is not None and known[0] < figures:
                    continue
                named = self._named(graph, place, figures, order) if place in worth else None
                trial.best[place] = figures, _first(named, known[1]) if known and known[0] == figures else named
                if trial.by == "error":
                    mounts.narrow(place, (figures[order.index(self._lead)] + 0.5) * 1e-12)

    def _settle_under_shared_limits(self, trial: _Trial, mounts: Mounts) -> None:
        """Find first choices without the shared limits, then with them those that these rule out.

        A row is not worth a closer look once `wanted` others rank before what it has without them.
        """
        free = trial.again(trial.rows)
        self._settle_all(free, mounts, shared=False)
        ranked = sorted(free.best, key=lambda place: free.best[place][0])
        found: dict[int, Figures] = {}
        group = self._group[trial.rows]
        while ranked:
            if len(found) >= self.wanted and sorted(found.values())[self.wanted - 1] < free.best[ranked[0]][0]:
                break
            some, ranked = ranked[:TOGETHER], ranked[TOGETHER:]
            for place in some:
                figures, choice = free.best[place]
                if choice is not None and inside_shared_limits(self.problem, choice):
                    trial.best[place] = figures, choice
            rest = np.array([place for place in some if place not in trial.best], dtype=np.int64)
            if len(rest):
                closer = trial.again(trial.rows[rest], rest)
                try:
                    self._settle_all(closer, self._mounts(closer.rows, trial.attempt.lead), shared=True)
                finally:
                    trial.best |= {int(rest[place]): known for place, known in closer.best.items()}
            for place in some:
                if place in trial.best:
                    key = int(group[place])
                    found[key] = min(found.get(key, trial.best[place][0]), trial.best[place][0])
        for place in ranked:  # behind the rows wanted, whatever the shared limits say
            trial.best[place] = free.best[place][0], None

    def _kept(self, graphs: Iterator[StackGraph], trial: _Trial) -> Iterator[StackGraph]:
        """Hand on graphs; where a stop ends them, leave what was found so far in `unproven`."""
        try:
            yield from graphs
        except Stopped:
            known = [choice for _, choice in trial.best.values() if choice is not None]
            self.unproven += [choice for choice in known if inside_shared_limits(self.problem, choice)]
            raise

    def front(self, rows: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least leading figure for each number of pieces; see `attempts.Engine`.

        Larger and larger errors are tried with fewer and fewer capacitors: what has more than the
        least number found at a smaller error cannot be on the front again.
        """
        corners: list[tuple[int, int, list[int]]] = []  # pieces, leading figure, rows that reach it
        own = self.rows
        budget = self.most_pieces + int(own.size.max(initial=1))
        least = float(own.least_error[rows].min(initial=np.inf))
        lead = max(SMALLEST_ERROR, least * (1 + 1e-9))
        fewest = int((own.least_pieces + own.size)[rows].min(initial=IMPOSSIBLE))
        p = self.problem
        top = p.excess_limit if p.led_by_excess else float(p.error_limit[~p.swept].max())
        self.nodes.allow(FRONT_WORK)
        stopped: Stopped | None = None
        while budget >= fewest and stopped is None:
            lead = lead if lead < min(0.5, top) else np.inf
            self.monitor.report(f"the least error with {budget} pieces or fewer")
            try:
                reached = self._least_by_pieces(rows, lead, budget)
            except Stopped as stop:
                stopped = stop
                break
            corners += [(pieces, fine, who) for pieces, (fine, who) in sorted(reached.items())]
            budget = min([budget, *(pieces - 1 for pieces in reached)])
            if lead == np.inf:
                break
            lead *= self.error_step
        self.nodes.allow(FRONT_WORK)
        self._emit_front(corners, emit)  # those with most pieces are certain even after a stop
        if stopped is not None:
            raise stopped

    def _alike(self, rows: Ints) -> Iterator[Ints]:
        """Yield rows of one pattern, some at a time."""
        order = rows[np.argsort(self.rows.pattern[rows], kind="stable")]
        for own in np.split(order, np.flatnonzero(np.diff(self.rows.pattern[order])) + 1):
            yield from (own[start : start + self.most_rows] for start in range(0, len(own), self.most_rows))

    def _least_by_pieces(self, rows: Ints, lead: float, budget: int) -> dict[int, tuple[int, list[int]]]:
        """Return the least leading figure of any row for each number of pieces, and who reaches it."""
        own = self.rows
        near = rows[(own.least_error[rows] <= lead) & ((own.least_pieces + own.size)[rows] <= budget)]
        reached: dict[int, tuple[int, list[int]]] = {}
        for some in self._alike(near):
            price = np.full(len(some), self.problem.price_limit)
            left = np.minimum(budget - own.size[some], self.most_pieces)
            mounts = self._mounts(some, lead)
            for graph in self._all_graphs(mounts, left, price):
                worst = graph.worst_on_the_way(self._lead)
                last = graph.layers[-1]
                for node in np.flatnonzero(worst < FAR):
                    row = int(some[last.row[node]])
                    pieces, fine = int(last.pieces[node] + own.size[row]), int(worst[node])
                    known = reached.get(pieces)
                    if known is None or fine < known[0]:
                        reached[pieces] = (fine, [row])
                    elif fine == known[0] and row not in known[1]:
                        known[1].append(row)
        return reached

    def _all_graphs(self, mounts: Mounts, budget: Ints, price: Ints) -> Iterator[StackGraph]:
        """Yield graphs, with figures, of every stack by number of pieces under all limits."""
        if self.nodes.scarce:  # most rows fall out without a look at the shared limits
            solved = np.zeros(len(mounts), dtype=np.bool_)
            for graph in self.nodes.graphs(mounts, budget, price, count_pieces=True):
                solved |= graph.solved()
            budget = np.where(solved, budget, -1)
        for graph in self.nodes.graphs(mounts, budget, price, shared=self.nodes.scarce, count_pieces=True):
            if graph.solved().any():
                graph.describe(self.circuits)
                yield graph

    def _emit_front(
        self, corners: list[tuple[int, int, list[int]]], emit: Callable[[Choice], None]
    ) -> None:
        last = np.inf
        for pieces, fine, who in sorted(corners):
            if fine * 1e-12 >= last - FRONT_STEP + 1e-12:
                continue
            best = self._at_lead(np.array(who), fine, pieces)
            name = "excess" if self.problem.led_by_excess else "error"
            lead = max(abs(float(getattr(columns, name)[0])) for columns in best.columns)
            if lead < last - FRONT_STEP:
                last = lead
                emit(best)

    def _at_lead(self, rows: Ints, fine: int, pieces: int) -> Choice:
        """Return the first choice by error of some rows that reach a leading figure with so many pieces."""
        named: list[Choice] = []
        for some in self._alike(rows):
            price, budget = np.full(len(some), self.problem.price_limit), pieces - self.rows.size[some]
            trial = _Trial(some, budget, Attempt(pieces, np.inf, price), "error")
            for graph in self._all_graphs(self._mounts(some, (fine + 0.5) * 1e-12), budget, price):
                keys, inside = self._settle(graph, ORDERS["error"], trial)
                for place in worth_naming(keys, inside, np.arange(len(some)), 1):
                    named.append(self._named(graph, place, tuple(keys[place].tolist()), ORDERS["error"]))
        return min(named, key=lambda choice: choice.key)

    def _budget(self, rows: Ints, attempt: Attempt) -> Ints:
        budget = np.full(len(rows), attempt.pieces, dtype=np.int64)
        if 0 < self._cheapest < NEVER:
            afford = (attempt.price - self.rows.price[rows]) // self._cheapest
            budget = np.where(attempt.price < NEVER, np.minimum(budget, afford), budget)
        return budget

    def _mounts(self, rows: Ints, lead: float) -> Mounts:
        """Return the mounts of rows of one pattern within a leading figure."""
        pattern = self._patterns[int(self.rows.pattern[rows[0]])] if len(rows) else self._patterns[0]
        coils = self.rows.coils[rows, : max(pattern) + 1]
        return self.maker.mounts(coils, steps_of(self.problem, pattern), np.full(len(rows), lead))

    def _settle(self, graph: StackGraph, order: tuple[str, ...], trial: _Trial) -> tuple[Ints, Bools]:
        """Return the figures in the order of every row, (m, steps), and which have a stack inside the price."""
        own, rows, price = self.rows, trial.rows, trial.attempt.price
        inside = graph.solved()
        figures: list[Ints] = []
        for name in order:
            if name == "effort":
                figures += list(own.effort[rows].T)
            elif name in SUMS:
                coils = {"price": own.price[rows], "pieces": own.size[rows]}
                least = graph.least_sum(name, coils.get(name, np.zeros(len(rows), dtype=np.int64)))
                if name == order[0] == "price":  # where it comes last, a dearer first choice may hide another
                    inside = inside & ((price >= NEVER) | (least <= price))
                figures.append(least)
            else:
                figures.append(graph.least_worst(name))
        return np.stack(figures, axis=1), inside

    def _named(self, graph: StackGraph, place: int, figures: Figures, order: tuple[str, ...]) -> StackedChoice:
        return named_stack(self.problem, graph, place, figures, order)


class _Trial:
    """Rows that are tried together, and the first choice of each so far by its place among them."""

    def __init__(self, rows: Ints, budget: Ints, attempt: Attempt, by: str) -> None:
        self.rows, self.budget, self.attempt, self.by = rows, budget, attempt, by
        self.best: dict[int, tuple[Figures, Choice | None]] = {}

    def again(self, rows: Ints, places: Ints | None = None) -> _Trial:
        """Return the trial of all its rows, or of those at some places, with nothing found."""
        if places is None:
            return _Trial(rows, self.budget, self.attempt, self.by)
        attempt = self.attempt._replace(price=self.attempt.price[places])
        return _Trial(rows, self.budget[places], attempt, self.by)


def _first(one: Choice | None, other: Choice | None) -> Choice | None:
    """Return the choice that comes first by content, of those that are known."""
    known = [choice for choice in (one, other) if choice is not None]
    return min(known, key=lambda choice: choice.key) if known else None
