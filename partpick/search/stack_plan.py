"""One stacked plan out of a graph: equal stacks are settled by content, lowest frequency first."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

from partpick.search.choose import Choice, Key, column_content
from partpick.search.figures import Columns
from partpick.search.problem import NEVER, PLENTY, Ints, Problem
from partpick.search.stack_graph import StackGraph

Content = tuple[object, ...]


@dataclass(frozen=True)
class StackedChoice(Choice):
    """A choice of one stack a coil; `columns` name what is in circuit at each band."""

    added: tuple[tuple[int, ...], ...] = ()  # (B, any) parts across the coil that each band adds, by content


def inside_shared_limits(problem: Problem, choice: Choice) -> bool:
    """Whether a plan keeps to stock and to the limits on parts, values and price."""
    assert isinstance(choice, StackedChoice)
    used: Counter[int] = Counter(part for own in choice.added for part in own)
    used.update(padder for columns in choice.columns if (padder := columns.series_padder(0)) is not None)
    if any(count > problem.part_stock[part] for part, count in used.items() if problem.part_stock[part] < PLENTY):
        return False
    if used.total() > problem.parts_limit or len({problem.part_value[p] for p in used}) > problem.values_limit:
        return False
    if problem.price_limit >= NEVER:
        return True
    own = sum(int(problem.coil_price[coil]) for coil in choice.coils)
    return own + sum(int(problem.part_price[part]) * count for part, count in used.items()) <= problem.price_limit


def named_stack(
    problem: Problem, graph: StackGraph, place: int, figures: tuple[int, ...], order: tuple[str, ...]
) -> StackedChoice:
    """Return the one choice of a plan from what is alive in a graph after all steps of the order.

    Parameters
    ----------
    problem : Problem
        The whole problem.
    graph : StackGraph
        Cut down to the first plans.
    place : int
        Which plan of the graph. [-]
    figures : tuple of int
        Its figures in the order, effort as three. [-]
    order : tuple of str
        Their names.
    """
    path = _Path(problem, graph, place)
    taken = path.first()
    columns, added = {}, {}
    for layer, (edge, parts, own) in zip(graph.layers, taken, strict=True):
        band = graph.mounts.steps[layer.number].band
        columns[band], added[band] = path.column(layer.number, edge, parts), own
    key: list[int | tuple[object, ...]] = []
    values = iter(figures)
    for name in order:
        key.append(tuple(next(values) for _ in range(3)) if name == "effort" else next(values))
    rising = np.argsort(problem.frequency, kind="stable").tolist()
    coils = tuple(sorted(int(coil) for coil in graph.mounts.coils[place]))
    ranks = tuple(sorted(int(problem.coil_rank[coil]) for coil in coils))
    key.append((ranks, tuple(path.content(columns[band], added[band]) for band in rising)))
    bands = range(problem.bands)
    made: Key = tuple(key)
    return StackedChoice(made, coils, tuple(columns[b] for b in bands), tuple(added[b] for b in bands))


class _Path:
    """The edges of one plan of a graph that are still alive."""

    def __init__(self, problem: Problem, graph: StackGraph, place: int) -> None:
        self.problem = problem
        self.graph = graph
        self.place = place
        self.edges: list[Ints] = []
        for layer in graph.layers:
            self.edges.append(np.flatnonzero(layer.alive & (layer.row[layer.head] == place)))

    def first(self) -> list[tuple[int, list[int], tuple[int, ...]]]:
        """Return for each layer its edge, what is then across the coil, and what the band adds, by content."""
        steps = self.graph.mounts.steps
        by_frequency = sorted(range(len(steps)), key=lambda n: (self.problem.frequency[steps[n].band], steps[n].band))
        if by_frequency == list(range(len(steps)))[::-1]:  # each edge is on some path, so from the end suffices
            for number in by_frequency:
                self._back(number)
                self._keep_first(number)
        else:
            for number in by_frequency:
                self._drop_dead_ends()
                self._keep_first(number)
            self._drop_dead_ends()
        taken: list[tuple[int, list[int], tuple[int, ...]]] = []
        across: list[int] = []
        for number, step in enumerate(steps):
            edge = int(self.edges[number][0])
            own = self._own(number, edge)
            across = self._sorted([*([] if step.fresh else across), *own])
            taken.append((edge, across, own))
        return taken

    def _keep_first(self, number: int) -> None:
        """Keep to the edges of one layer that come first."""
        edges = self.edges[number].tolist()
        if len(edges) == 1:
            return
        ways: dict[Content, list[int]] = {}
        for edge in edges:
            ways.setdefault(self._edge_content(number, edge), []).append(edge)
        self.edges[number] = np.array(ways[min(ways)], dtype=np.int64)

    def _drop_dead_ends(self) -> None:
        layers = self.graph.layers
        for number in range(1, len(layers)):
            reached = np.zeros(len(layers[number - 1].row), dtype=np.bool_)
            reached[layers[number - 1].head[self.edges[number - 1]]] = True
            edges = self.edges[number]
            self.edges[number] = edges[reached[layers[number].tail[edges]]]
        for number in range(len(layers) - 2, -1, -1):
            self._back(number)

    def _back(self, number: int) -> None:
        """Keep to the edges of one layer that the next one goes on from."""
        if number + 1 == len(self.edges):
            return
        layer, following = self.graph.layers[number], self.graph.layers[number + 1]
        wanted = np.zeros(len(layer.row), dtype=np.bool_)
        wanted[following.tail[self.edges[number + 1]]] = True
        edges = self.edges[number]
        self.edges[number] = edges[wanted[layer.head[edges]]]

    def _sorted(self, parts: list[int]) -> list[int]:
        return sorted(parts, key=lambda part: int(self.problem.part_rank[part]))

    def _own(self, number: int, edge: int) -> tuple[int, ...]:
        return tuple(self._sorted([int(part) for part in self.graph.layers[number].added[edge] if part >= 0]))

    def _edge_content(self, number: int, edge: int) -> Content:
        layer = self.graph.layers[number]
        spot = int(layer.spot[edge])
        padder, place = int(layer.spots.padder[spot]), int(layer.spots.place[spot])
        return self._content(self._own(number, edge), padder, place)

    def _content(self, own: tuple[int, ...], padder: int, place: int) -> Content:
        """Return what orders equal additions: values, the series padder, grades, coil and tap."""
        p, places = self.problem, self.graph.mounts.places
        used = [*own, *([padder] if padder >= 0 else [])]
        values: tuple[Fraction, ...] = tuple(sorted(p.part_value[part] for part in used))
        in_series = int(p.part_rank[padder]) if padder >= 0 else -1
        ranks = tuple(int(p.part_rank[part]) for part in used)
        return values, (0, in_series), ranks, int(p.coil_rank[places.coil[place]]), int(places.tap[place])

    def column(self, number: int, edge: int, across: list[int]) -> Columns:
        """Return the column of what is in circuit at a layer, coil and tap of the whole problem."""
        layer, mounts = self.graph.layers[number], self.graph.mounts
        spot = int(layer.spot[edge])
        place = layer.spots.place[spot : spot + 1]
        parts = np.array([across], dtype=np.int64).reshape(1, len(across))
        columns, _ = mounts.columns(number, place, parts, layer.spots.padder[spot : spot + 1])
        return replace(columns, coil=mounts.places.coil[place], tap=mounts.places.tap[place])

    def content(self, columns: Columns, own: tuple[int, ...]) -> Content:
        """Return the content of what a band adds, with the coil and tap that it is on."""
        padder = columns.series_padder(0)
        used = [*own, *([padder] if padder is not None else [])]
        parts = np.array([used], dtype=np.int64).reshape(1, len(used))
        return column_content(self.problem, replace(columns, parts=parts), 0)
