"""All stacks of some plans as one layered graph, and the stages of the order on it.

A layer is a step: a band of one stack, from the highest target down, stack after stack. A node is what
is in circuit there; an edge is what the band adds, and the mount (`mounts.py`) that it is then on.
Circuits that every later band sees alike are one node (`StackNodes`). A figure of a band belongs to a
circuit on its mount, a sum over the pieces to the edges, so that each step of the order is a shortest
path (a sum) or a path whose largest figure is least (a worst value), plan by plan; edges that no such
path uses are dropped, and the next step goes on with the rest.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.search.choose import ORDERS, SUMS
from partpick.search.circuits import Circuits
from partpick.search.mounts import Mounts
from partpick.search.problem import NEVER, Bools, Ints

ROWS = 20_000  # circuits whose figures are worked out at one time
WORST = tuple(name for name in ORDERS["error"] if name not in SUMS and name != "effort")
FAR = np.int64(1) << 60
Shorts = NDArray[np.int16]


@dataclass(frozen=True, eq=False)
class Spots:
    """Circuits on their mounts, (s,): what the figures of a band belong to."""

    place: Ints
    parts: Shorts  # (s, w) across the coil, -1 where there are fewer
    padder: Ints  # in series with the tuning element, -1: none

    def take(self, chosen: Ints | Bools) -> Spots:
        """Return the spots chosen by a mask or an index array."""
        return Spots(self.place[chosen], self.parts[chosen], self.padder[chosen])

    def __len__(self) -> int:
        return len(self.place)


@dataclass(eq=False)
class Layer:
    """The nodes of one step, (n,), the edges that end in them, (e,), and the spots that edges pass, (s,)."""

    number: int  # of the step
    row: Ints  # (n,) place of the plan among those of the graph
    pieces: Ints  # (n,) fewest capacitors that lead there
    tail: NDArray[np.int32]  # (e,) node of the layer before
    head: NDArray[np.int32]  # (e,)
    spot: NDArray[np.int32]  # (e,)
    added: Shorts  # (e, k) parts across the coil, -1 where there are fewer
    spots: Spots
    alive: Bools = field(init=False)  # (e,)
    figures: dict[str, Ints] = field(init=False)  # (s,) each, once `StackGraph.describe` was called
    sums: dict[str, Ints] = field(init=False)  # (e,) each, likewise

    def __post_init__(self) -> None:
        """Start with every edge."""
        self.alive = np.ones(len(self.tail), dtype=np.bool_)

    def copy(self) -> Layer:
        """Return a layer that may be cut without changing this one."""
        return Layer(self.number, self.row, self.pieces, self.tail, self.head, self.spot, self.added, self.spots)

    def only(self, nodes: slice) -> Layer:
        """Return the layer with some of its nodes and the edges that end in those."""
        number = np.full(len(self.row), -1, dtype=np.int32)
        number[nodes] = np.arange(len(self.row[nodes]))
        kept = number[self.head] >= 0
        head = number[self.head[kept]]
        return Layer(
            self.number,
            self.row[nodes],
            self.pieces[nodes],
            self.tail[kept],
            head,
            self.spot[kept],
            self.added[kept],
            self.spots,
        )


class StackGraph:
    """Layers of some plans; what lies on no path is dropped from the start."""

    def __init__(self, mounts: Mounts, layers: list[Layer]) -> None:
        self.mounts = mounts
        self.rows = len(mounts)
        self.layers = layers
        self.drop_dead_ends()
        self._compress()

    def _compress(self) -> None:
        number = np.arange(self.rows)
        for layer in self.layers:
            live = layer.alive
            used = np.zeros(len(layer.row), dtype=np.bool_)
            used[layer.head[live]] = True
            passed = np.zeros(len(layer.spots), dtype=np.bool_)
            passed[layer.spot[live]] = True
            layer.tail = number[layer.tail[live]].astype(np.int32)
            number = np.cumsum(used) - 1
            layer.head = number[layer.head[live]].astype(np.int32)
            layer.spot = (np.cumsum(passed) - 1)[layer.spot[live]].astype(np.int32)
            layer.row, layer.pieces, layer.added = layer.row[used], layer.pieces[used], layer.added[live]
            layer.spots = layer.spots.take(passed)
            layer.alive = np.ones(len(layer.tail), dtype=np.bool_)

    def describe(self, circuits: Circuits) -> None:
        """Work out the figures by which the paths are ordered."""
        for layer in self.layers:
            blocks = []
            for start in range(0, max(1, len(layer.spots)), ROWS):
                some = slice(start, start + ROWS)
                spots = layer.spots
                columns, _ = self.mounts.columns(
                    layer.number, spots.place[some], spots.parts[some], spots.padder[some]
                )
                blocks.append([getattr(columns, name) for name in WORST])
            layer.figures = {name: np.concatenate(b) for name, b in zip(WORST, zip(*blocks, strict=True), strict=True)}
            added, padder = layer.added, layer.spots.padder[layer.spot]
            if (padder >= 0).any():
                added = np.concatenate([added, padder[:, None].astype(np.int16)], axis=1)
            layer.sums = {
                "pieces": (added >= 0).sum(axis=1),
                "commonness": circuits.commonness(added),
                "price": circuits.price(added),
            }

    def solved(self) -> Bools:
        """Return whether each plan has a path, (m,)."""
        found = np.zeros(self.rows, dtype=np.bool_)
        last = self.layers[-1]
        found[last.row[last.head[last.alive]]] = True
        return found

    def drop_dead_ends(self) -> None:
        """Drop the edges that no path from the first to the last layer uses."""
        reached = np.ones(self.rows, dtype=np.bool_)
        for layer in self.layers:
            layer.alive &= reached[layer.tail]
            reached = np.zeros(len(layer.row), dtype=np.bool_)
            reached[layer.head[layer.alive]] = True
        for layer in self.layers[::-1]:
            layer.alive &= reached[layer.head]
            before = self._size_before(layer)
            reached = np.zeros(before, dtype=np.bool_)
            reached[layer.tail[layer.alive]] = True

    def least_sum(self, name: str, own: Ints) -> Ints:
        """Return the least sum of an edge figure for each plan, (m,), and keep to the paths that have it.

        A sum of NEVER or more is NEVER, and all such paths stay.

        Parameters
        ----------
        name : str
            Which figure.
        own : (m,) array
            What each plan's coils add to the sum. [-]
        """
        forward = self._forward_sums(name)
        best = self._least_of_rows(forward[-1])
        unknown = (best < FAR) & (best + own >= NEVER)
        back = np.zeros(len(self.layers[-1].row), dtype=np.int64)
        for place in range(len(self.layers) - 1, -1, -1):
            layer = self.layers[place]
            weight = layer.sums[name]
            through = forward[place][layer.tail] + weight + back[layer.head]
            row = layer.row[layer.head]
            live = layer.alive
            back_new = np.full(self._size_before(layer), FAR, dtype=np.int64)
            np.minimum.at(back_new, layer.tail[live], (weight + back[layer.head])[live])
            layer.alive = live & ((through == best[row]) | unknown[row])
            back = back_new
        return np.minimum(best + own, NEVER)

    def _forward_sums(self, name: str) -> list[Ints]:
        """Return the least sum up to each node, before the first layer and after each."""
        sums = [np.zeros(self.rows, dtype=np.int64)]
        for layer in self.layers:
            live = layer.alive
            least = np.full(len(layer.row), FAR, dtype=np.int64)
            np.minimum.at(least, layer.head[live], (sums[-1][layer.tail] + layer.sums[name])[live])
            sums.append(least)
        return sums

    def least_worst(self, name: str) -> Ints:
        """Return the least worst figure of a path of each plan, (m,), and keep to the paths up to it."""
        best = self._least_of_rows(self.worst_on_the_way(name))
        for layer in self.layers:
            layer.alive &= layer.figures[name][layer.spot] <= best[layer.row[layer.head]]
        self.drop_dead_ends()
        return best

    def worst_on_the_way(self, name: str) -> Ints:
        """Return the least worst figure of a path to each node of the last layer."""
        worst = np.zeros(self.rows, dtype=np.int64)
        for layer in self.layers:
            live = layer.alive
            through = np.maximum(worst[layer.tail], layer.figures[name][layer.spot])
            least = np.full(len(layer.row), FAR, dtype=np.int64)
            np.minimum.at(least, layer.head[live], through[live])
            worst = least
        return worst

    def _least_of_rows(self, of_nodes: Ints) -> Ints:
        best = np.full(self.rows, FAR, dtype=np.int64)
        np.minimum.at(best, self.layers[-1].row, of_nodes)
        return best

    def _size_before(self, layer: Layer) -> int:
        place = next(i for i, other in enumerate(self.layers) if other is layer)
        return len(self.layers[place - 1].row) if place else self.rows
