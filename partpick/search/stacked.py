"""The layout `stacked`: each band adds capacitors to those in circuit at the next higher one."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from partpick.progress import Monitor
from partpick.search.attempts import SMALLEST_ERROR, Attempt, least_grid_error, search_layout, worth_naming
from partpick.search.bands import Found
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.choose import ORDERS, SUMS, Choice, Stopped, column_content
from partpick.search.circuits import Circuits, Windows
from partpick.search.columns import ColumnSource
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.stack_graph import StackGraph
from partpick.search.stack_nodes import StackNodes

FRONT_STEP = 1e-9
FRONT_WORK = 100_000_000  # places for capacitors in the graphs for the front


@dataclass(frozen=True)
class StackedChoice(Choice):
    """A choice of one stack; `columns` name what is in circuit at each band."""

    added: tuple[tuple[int, ...], ...] = ()  # (B, any) parts that each band adds, by content


def search_stacked(
    problem: Problem,
    source: ColumnSource | None = None,
    *,
    wanted: int,
    all_windings: bool,
    monitor: Monitor,
    front: bool = True,
) -> Found:
    """Return the first `wanted` stacked plans, and the front of error against pieces.

    Parameters
    ----------
    problem : Problem
        Fixed bands, one coil; `most_parts` is the most that a band may add.
    source : ColumnSource, optional
        Not used: what is in circuit is no network of one band.
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
        A band is swept, several coils or series networks are asked for.
    """
    if problem.swept.any() or problem.inductors > 1 or problem.connect_any:
        raise ValueError("a stack is planned for fixed bands, one coil and parallel capacitors")
    engine = StackedEngine(problem, monitor, wanted, all_windings)
    return search_layout(engine, wanted=wanted, all_windings=all_windings, monitor=monitor, front=front)


class StackedEngine:
    """Trials of stacks with more capacitors, larger errors or a higher price."""

    def __init__(self, problem: Problem, monitor: Monitor, wanted: int, all_windings: bool) -> None:
        self.problem = problem
        self.monitor = monitor
        self.unproven: list[Choice] = []
        self.front_first = False
        self.wanted, self.all_windings = wanted, all_windings
        self.circuits = Circuits(problem)
        self.nodes = StackNodes(problem, self.circuits, monitor)
        every = problem.bands * problem.most_parts
        self.most_pieces = min(every, problem.parts_limit)
        self._parts_limit_binds = self.most_pieces < every
        every_coil = np.arange(problem.coils)
        least = self.nodes.least_rest(self._windows(every_coil, np.inf))[:, 0]
        self.least_pieces = np.minimum(least, IMPOSSIBLE)
        self.least_error = np.maximum(least_grid_error(problem, self.circuits.acting), self._least_error_at_top())
        # paths multiply band by band, so the more bands, the finer the steps
        self.error_step = float(2.0 ** min(1.0, 4.0 / problem.bands))
        prices = problem.part_price[problem.part_price < NEVER]
        self._cheapest = int(prices.min()) if len(prices) else NEVER

    def attempt(self, coils: Ints, attempt: Attempt, by: str) -> tuple[dict[int, Choice], Ints]:
        """Return the first choice of each coil inside the attempt; see `attempts.Engine`."""
        best: dict[int, tuple[tuple[int, ...], Choice | None]] = {}
        budget = self._budget(attempt)
        count = self._parts_limit_binds and by != "build"
        windows = self._windows(coils, attempt.error)
        for graph in self._kept(self._graphs(coils, windows, budget, attempt.price, count), best):
            keys, inside = self._settle(graph, ORDERS[by], attempt.price)
            worth = worth_naming(self.problem, coils, keys, inside, self.wanted, self.all_windings)
            for place in np.flatnonzero(inside).tolist():
                figures, coil = tuple(keys[place].tolist()), int(coils[place])
                known = best.get(coil)
                if known is not None and known[0] < figures:
                    continue
                named = self._named(graph, place, keys[place], ORDERS[by]) if place in worth else None
                best[coil] = figures, _first(named, known[1]) if known and known[0] == figures else named
                if by == "error":
                    self._narrow(windows, coils, place, figures[0])
        made = {coil: choice for coil, (_, choice) in best.items() if choice is not None}
        return made, np.array(sorted(best), dtype=np.int64)

    def _kept(
        self, graphs: Iterator[StackGraph], best: dict[int, tuple[tuple[int, ...], Choice | None]]
    ) -> Iterator[StackGraph]:
        """Hand on graphs; where a stop ends them, leave what was found so far in `unproven`."""
        try:
            yield from graphs
        except Stopped:
            self.unproven = [choice for _, choice in best.values() if choice is not None]
            raise

    def _narrow(self, windows: Windows, coils: Ints, place: int, fine: int) -> None:
        """Leave out what is worse than a stack already found."""
        row = np.array([place])
        rows = self.circuits.windows(np.array([(fine + 0.5) * 1e-12]), coils[row])
        for side, new in zip(windows, rows, strict=True):
            for end, value in zip(side, new, strict=True):
                end[row] = value

    def front(self, coils: Ints, emit: Callable[[Choice], None]) -> None:
        """Hand over the least worst error for each number of pieces; see `attempts.Engine`.

        Larger and larger errors are tried with fewer and fewer capacitors: what has more than the
        least number found at a smaller error cannot be on the front again.
        """
        corners: list[tuple[int, int, list[int]]] = []  # capacitors, fine error, coils that reach it
        budget = self.most_pieces
        least = float(self.least_error[coils].min(initial=np.inf))
        error = max(SMALLEST_ERROR, least * (1 + 1e-9))
        fewest = int(self.least_pieces[coils].min(initial=IMPOSSIBLE))
        top = float(self.problem.error_limit.max())
        self.nodes.allow(FRONT_WORK)
        stopped: Stopped | None = None
        while budget >= fewest and stopped is None:
            error = error if error < min(0.5, top) else np.inf
            self.monitor.report(f"the least error with {budget + 1} pieces or fewer")
            try:
                reached = self._least_by_pieces(coils, error, budget)
            except Stopped as stop:
                stopped = stop
                break
            corners += [(pieces, fine, who) for pieces, (fine, who) in sorted(reached.items())]
            budget = min([budget, *(pieces - 1 for pieces in reached)])
            if error == np.inf:
                break
            error *= self.error_step
        self.nodes.allow(FRONT_WORK)
        self._emit_front(corners, emit)  # those with most pieces are certain even after a stop
        if stopped is not None:
            raise stopped

    def _least_by_pieces(self, coils: Ints, error: float, budget: int) -> dict[int, tuple[int, list[int]]]:
        """Return the least fine error of any coil for each number of capacitors, and who reaches it."""
        p = self.problem
        near = coils[(self.least_error[coils] <= error) & (self.least_pieces[coils] <= budget)]
        price = np.full(p.coils, p.price_limit)
        reached: dict[int, tuple[int, list[int]]] = {}
        for graph in self._graphs(near, self._windows(near, error), np.full(p.coils, budget), price, True):
            worst = graph.worst_on_the_way("fine_error")
            last = graph.layers[-1]
            for node in np.flatnonzero(worst < NEVER):
                pieces, fine = int((last.parts[node] >= 0).sum()), int(worst[node])
                coil = int(graph.coils[last.coil[node]])
                known = reached.get(pieces)
                if known is None or fine < known[0]:
                    reached[pieces] = (fine, [coil])
                elif fine == known[0] and coil not in known[1]:
                    known[1].append(coil)
        return reached

    def _emit_front(
        self, corners: list[tuple[int, int, list[int]]], emit: Callable[[Choice], None]
    ) -> None:
        last = np.inf
        for pieces, fine, who in sorted(corners):
            if fine * 1e-12 >= last - FRONT_STEP + 1e-12:
                continue
            best = self._at_error(np.array(who), fine, pieces)
            error = max(abs(float(columns.error[0])) for columns in best.columns)
            if error < last - FRONT_STEP:
                last = error
                emit(best)

    def _at_error(self, coils: Ints, fine: int, pieces: int) -> Choice:
        """Return the first choice by error of some coils that reach an error with so many capacitors."""
        p = self.problem
        price, budget = np.full(p.coils, p.price_limit), np.full(p.coils, pieces)
        named: list[Choice] = []
        windows = self._windows(coils, (fine + 0.5) * 1e-12)
        for graph in self._graphs(coils, windows, budget, price, True):
            keys, inside = self._settle(graph, ORDERS["error"], price)
            for place in worth_naming(p, graph.coils, keys, inside, 1, True):
                named.append(self._named(graph, place, keys[place], ORDERS["error"]))
        return min(named, key=lambda choice: choice.key)

    def _least_error_at_top(self) -> Floats:
        """Return the least error of each coil at the highest band, whose capacitors stand alone, (J,)."""
        p, band = self.problem, int(self.nodes.order[0])
        fixed = p.fixed_capacitance()[:, band]
        if p.lead_inductance > 0:
            return np.zeros(p.coils)
        best = np.full(p.coils, np.inf)
        for sums in self.nodes.sums.stored(band)[: p.most_parts + 1]:
            place = np.searchsorted(sums, p.wanted[:, band] - fixed)
            for side in (np.maximum(place - 1, 0), np.minimum(place, len(sums) - 1)):
                total = np.maximum(fixed + sums[side], 1e-30)
                best = np.minimum(best, np.abs(np.sqrt(p.wanted[:, band] / total) - 1.0))
        return best if self.nodes.sums.complete(band, p.most_parts) else np.zeros(p.coils)

    def _budget(self, attempt: Attempt) -> Ints:
        budget = np.full(self.problem.coils, attempt.pieces, dtype=np.int64)
        if 0 < self._cheapest < NEVER:
            afford = (attempt.price - self.problem.coil_price) // self._cheapest
            budget = np.where(attempt.price < NEVER, np.minimum(budget, afford), budget)
        return budget

    def _graphs(
        self,
        coils: Ints,
        windows: Windows,
        budget: Ints,
        price: Ints,
        count_pieces: bool,
    ) -> Iterator[StackGraph]:
        """Yield graphs with figures that together hold every stack of the coils."""
        if self.nodes.scarce:  # most coils fall out without a look at the shared limits
            solved = np.zeros(len(coils), dtype=np.bool_)
            for graph in self.nodes.graphs(coils, windows, budget, price, count_pieces=count_pieces):
                solved |= graph.solved()
            if not solved.any():
                return
            windows[0][0][~solved] = windows[1][0][~solved] = np.inf
        scarce = self.nodes.scarce
        for graph in self.nodes.graphs(coils, windows, budget, price, shared=scarce, count_pieces=count_pieces):
            if graph.solved().any():
                graph.describe(self.circuits)
                yield graph

    def _windows(self, coils: Ints, error: float) -> Windows:
        return self.circuits.windows(np.full(len(coils), error), coils)

    def _settle(self, graph: StackGraph, order: tuple[str, ...], price: Ints) -> tuple[Ints, Bools]:
        """Return the figures in the order of every coil, (m, steps), and which have a stack inside the price."""
        p, coils = self.problem, graph.coils
        inside = graph.solved()
        figures: list[Ints] = []
        for name in order:
            if name == "effort":
                figures += list(p.effort[coils].T)
            elif name in SUMS:
                own = p.coil_price[coils] if name == "price" else np.full(len(coils), int(name == "pieces"))
                least = graph.least_sum(name, own)
                if name == "price":
                    inside = inside & ((price[coils] >= NEVER) | (least <= price[coils]))
                figures.append(least)
            else:
                figures.append(graph.least_worst(name))
        return np.stack(figures, axis=1), inside

    def _named(self, graph: StackGraph, place: int, figures: Ints, order: tuple[str, ...]) -> StackedChoice:
        """Return the one choice of a coil: equal stacks are settled by content, lowest frequency first."""
        p, coil = self.problem, int(graph.coils[place])
        added = self._first_by_content(graph, place)
        in_circuit: list[int] = []
        columns, own = {}, {}
        where = np.array([coil])
        for layer, new in zip(graph.layers, added, strict=True):
            in_circuit = sorted([*in_circuit, *new], key=lambda part: int(p.part_rank[part]))
            band = np.array([layer.band])
            row = np.array([in_circuit], dtype=np.int64).reshape(1, len(in_circuit))
            columns[layer.band], _ = self.circuits.columns(where, band, row)
            own[layer.band] = new
        key: list[int | tuple[object, ...]] = []
        values = iter(int(figure) for figure in figures)
        for name in order:
            key.append(tuple(next(values) for _ in range(3)) if name == "effort" else next(values))
        rising = tuple(self._content(coil, own[int(band)]) for band in np.argsort(p.frequency, kind="stable"))
        key.append(((int(p.coil_rank[coil]),), rising))
        bands = range(p.bands)
        return StackedChoice(
            tuple(key), (coil,), tuple(columns[band] for band in bands), tuple(own[band] for band in bands)
        )

    def _by_content(self, parts: tuple[int, ...]) -> tuple[list[Fraction], list[int]]:
        p = self.problem
        return sorted(p.part_value[part] for part in parts), [int(p.part_rank[part]) for part in parts]

    def _content(self, coil: int, parts: tuple[int, ...]) -> tuple[object, ...]:
        row = np.array([parts], dtype=np.int64).reshape(1, len(parts))
        columns, _ = self.circuits.columns(np.array([coil]), np.array([0]), row)
        return column_content(self.problem, columns, 0)

    def _first_by_content(self, graph: StackGraph, place: int) -> list[tuple[int, ...]]:
        """Return what each layer adds on the path that comes first by content."""
        p = self.problem
        nodes = np.flatnonzero(graph.layers[-1].coil == place)
        kept: list[tuple[int, ...]] = []
        for layer in graph.layers[::-1]:
            edges = np.flatnonzero(layer.alive & np.isin(layer.head, nodes))
            ways: dict[tuple[int, ...], list[int]] = {}
            for edge in edges:
                parts = [int(part) for part in layer.added[edge] if part >= 0]
                ways.setdefault(tuple(sorted(parts, key=lambda part: int(p.part_rank[part]))), []).append(int(edge))
            first = min(ways, key=self._by_content)
            nodes = np.unique(layer.tail[ways[first]])
            kept.append(first)
        return kept[::-1]


def _first(one: Choice | None, other: Choice | None) -> Choice | None:
    """Return the choice that comes first by content, of those that are known."""
    known = [choice for choice in (one, other) if choice is not None]
    return min(known, key=lambda choice: choice.key) if known else None
