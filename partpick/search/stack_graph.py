"""All stacks of some coils as one layered graph, and the stages of the order on it.

A layer is a band, from the highest frequency down; a node is what is in circuit there; an edge is
what the band adds. Circuits that every later band sees alike are one node (`StackNodes`). A figure of
a band belongs to a node, a sum over the pieces to the edges, so that each step of the order is a
shortest path (a sum) or a path whose largest node is least (a worst value), coil by coil; edges that
no such path uses are dropped, and the next step goes on with the rest.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.search.choose import ORDERS, SUMS
from partpick.search.circuits import Circuits
from partpick.search.problem import NEVER, Bools, Ints

ROWS = 20_000  # circuits whose figures are worked out at one time
WORST = tuple(name for name in ORDERS["error"] if name not in SUMS and name != "effort")
_FAR = np.int64(1) << 60


@dataclass(eq=False)
class Layer:
    """The nodes of one band, (n,), and the edges that end in them, (e,)."""

    band: int
    coil: Ints  # (n,) place of the coil among those of the graph
    parts: NDArray[np.int16]  # (n, w) one circuit of each node, -1 where there are fewer
    tail: NDArray[np.int32]  # (e,) node of the layer before
    head: NDArray[np.int32]  # (e,)
    added: NDArray[np.int16]  # (e, k) parts, -1 where there are fewer
    alive: Bools = field(init=False)  # (e,)
    figures: dict[str, Ints] = field(init=False)  # (n,) each, once `StackGraph.describe` was called
    sums: dict[str, Ints] = field(init=False)  # (e,) each, likewise

    def __post_init__(self) -> None:
        """Start with every edge."""
        self.alive = np.ones(len(self.tail), dtype=np.bool_)


    def copy(self) -> Layer:
        """Return a layer that may be cut without changing this one."""
        return Layer(self.band, self.coil, self.parts, self.tail, self.head, self.added)

    def only(self, nodes: slice) -> Layer:
        """Return the layer with some of its nodes and the edges that end in those."""
        number = np.full(len(self.coil), -1, dtype=np.int32)
        number[nodes] = np.arange(len(self.coil[nodes]))
        kept = number[self.head] >= 0
        head = number[self.head[kept]]
        return Layer(self.band, self.coil[nodes], self.parts[nodes], self.tail[kept], head, self.added[kept])


class StackGraph:
    """Layers of some coils; what lies on no path is dropped from the start."""

    def __init__(self, coils: Ints, layers: list[Layer]) -> None:
        self.coils = coils
        self.layers = layers
        self.drop_dead_ends()
        self._compress()

    def _compress(self) -> None:
        number = np.arange(len(self.coils))
        for layer in self.layers:
            live = layer.alive
            used = np.zeros(len(layer.coil), dtype=np.bool_)
            used[layer.head[live]] = True
            layer.tail = number[layer.tail[live]].astype(np.int32)
            number = np.cumsum(used) - 1
            layer.head = number[layer.head[live]].astype(np.int32)
            layer.coil, layer.parts, layer.added = layer.coil[used], layer.parts[used], layer.added[live]
            layer.alive = np.ones(len(layer.tail), dtype=np.bool_)

    def describe(self, circuits: Circuits) -> None:
        """Work out the figures by which the paths are ordered."""
        for layer in self.layers:
            blocks = []
            for start in range(0, max(1, len(layer.coil)), ROWS):
                coil = self.coils[layer.coil[start : start + ROWS]]
                parts = layer.parts[start : start + ROWS]
                columns, _ = circuits.columns(coil, np.full(len(coil), layer.band), parts)
                blocks.append([getattr(columns, name) for name in WORST])
            layer.figures = {name: np.concatenate(b) for name, b in zip(WORST, zip(*blocks, strict=True), strict=True)}
            added = layer.added
            layer.sums = {
                "pieces": (added >= 0).sum(axis=1),
                "commonness": circuits.commonness(added),
                "price": circuits.price(added),
            }

    def solved(self) -> Bools:
        """Return whether each coil has a path, (m,)."""
        found = np.zeros(len(self.coils), dtype=np.bool_)
        last = self.layers[-1]
        found[last.coil[last.head[last.alive]]] = True
        return found

    def drop_dead_ends(self) -> None:
        """Drop the edges that no path from the first to the last layer uses."""
        reached = np.ones(len(self.coils), dtype=np.bool_)
        for layer in self.layers:
            layer.alive &= reached[layer.tail]
            reached = np.zeros(len(layer.coil), dtype=np.bool_)
            reached[layer.head[layer.alive]] = True
        for layer in self.layers[::-1]:
            layer.alive &= reached[layer.head]
            before = self._size_before(layer)
            reached = np.zeros(before, dtype=np.bool_)
            reached[layer.tail[layer.alive]] = True

    def least_sum(self, name: str, own: Ints) -> Ints:
        """Return the least sum of an edge figure for each coil, (m,), and keep to the paths that have it.

        A sum of NEVER or more is NEVER, and all such paths stay.

        Parameters
        ----------
        name : str
            Which figure.
        own : (m,) array
            What each coil itself adds to the sum. [-]
        """
        forward = self._forward_sums(name)
        best = self._least_of_coils(forward[-1])
        unknown = (best < _FAR) & (best + own >= NEVER)
        back = np.zeros(len(self.layers[-1].coil), dtype=np.int64)
        for place in range(len(self.layers) - 1, -1, -1):
            layer = self.layers[place]
            weight = layer.sums[name]
            through = forward[place][layer.tail] + weight + back[layer.head]
            coil = layer.coil[layer.head]
            live = layer.alive
            back_new = np.full(self._size_before(layer), _FAR, dtype=np.int64)
            np.minimum.at(back_new, layer.tail[live], (weight + back[layer.head])[live])
            layer.alive = live & ((through == best[coil]) | unknown[coil])
            back = back_new
        return np.minimum(best + own, NEVER)

    def _forward_sums(self, name: str) -> list[Ints]:
        """Return the least sum up to each node, before the first layer and after each."""
        sums = [np.zeros(len(self.coils), dtype=np.int64)]
        for layer in self.layers:
            live = layer.alive
            least = np.full(len(layer.coil), _FAR, dtype=np.int64)
            np.minimum.at(least, layer.head[live], (sums[-1][layer.tail] + layer.sums[name])[live])
            sums.append(least)
        return sums

    def least_worst(self, name: str) -> Ints:
        """Return the least worst node figure for each coil, (m,), and keep to the paths up to it."""
        best = self._least_of_coils(self.worst_on_the_way(name))
        for layer in self.layers:
            inside = layer.figures[name] <= best[layer.coil]
            layer.alive &= inside[layer.head]
        self.drop_dead_ends()
        return best

    def worst_on_the_way(self, name: str) -> Ints:
        """Return the least worst figure of a path to each node of the last layer."""
        worst = np.zeros(len(self.coils), dtype=np.int64)
        for layer in self.layers:
            live = layer.alive
            least = np.full(len(layer.coil), _FAR, dtype=np.int64)
            np.minimum.at(least, layer.head[live], worst[layer.tail[live]])
            worst = np.where(least < _FAR, np.maximum(least, layer.figures[name]), _FAR)
        return worst

    def _least_of_coils(self, of_nodes: Ints) -> Ints:
        best = np.full(len(self.coils), _FAR, dtype=np.int64)
        np.minimum.at(best, self.layers[-1].coil, of_nodes)
        return best

    def _size_before(self, layer: Layer) -> int:
        place = next(i for i, other in enumerate(self.layers) if other is layer)
        return len(self.layers[place - 1].coil) if place else len(self.coils)
