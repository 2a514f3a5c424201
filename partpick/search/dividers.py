"""Tables of networks with a capacitive divider; the shapes are those of `divided.py`.

Where networks of one number of parts are too many for a table they are looked up as one part more on the table
of those with one less.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import NDArray

from partpick.search.divided import CLAPPED, DIVIDED, OWN_PARTS, Device, divided_values
from partpick.search.networks import LARGEST_TABLE, Floats, Rows, Stream, Table, network_tables, series_rest


class _Beside(Stream):
    """Networks with a divider and one part more in parallel, never stored."""

    def __init__(self, values: Floats, inner: Table | Stream, own: int) -> None:
        super().__init__(values, inner, connect_any=False)
        self._own = own

    def _joined(self, index: int, a: float, rows: Rows, in_series: bool) -> Rows:
        if rows.species.shape[1] > self._own:
            rows = rows.take(rows.species[:, -1] <= index)  # one spelling: ascending species
        own = np.full((len(rows.value), 1), index, dtype=np.int16)
        return Rows(a + rows.value, np.concatenate([rows.species, own], axis=1), rows.shape)


class _Behind(Stream):
    """Dividers behind one part in series, never stored."""

    def __init__(self, values: Floats, dividers: Table) -> None:
        super().__init__(values, dividers, connect_any=False)

    def inside(self, low: float, high: float) -> Rows:
        """Return the networks in the closed interval [low, high]."""
        blocks = []
        for index, a in enumerate(self.single):
            lower, upper = self._inner_interval(a, low, high, True)
            rows = self._joined(index, a, self.inner.inside(lower, upper), True)
            blocks.append(rows.take((rows.value >= low) & (rows.value <= high)))
        return Rows.join(blocks, self.parts)

    def _joins(self, a: float, wanted: Floats) -> Iterator[tuple[Callable[[Floats], Floats], Floats]]:
        yield (lambda inner: a * inner / (a + inner)), series_rest(a, wanted)

    def _inner_intervals(self, low: Floats, high: Floats) -> Iterator[tuple[Floats, Floats]]:
        for a in self.single:
            yield series_rest(a, low * (1 - 1e-12)), series_rest(a, high * (1 + 1e-12))

    def _joined(self, index: int, a: float, rows: Rows, in_series: bool) -> Rows:
        own = np.full((len(rows.value), 1), index, dtype=np.int16)
        value = a * rows.value / (a + rows.value)
        shape = np.full(len(value), CLAPPED, np.int8)
        return Rows(value, np.concatenate([own, rows.species], axis=1), shape)


def divider_rows(values: Floats, device: Device) -> Rows:
    """Return every divider of an oscillator of two parts, (n^2,): output first, control second."""
    count = np.arange(len(values), dtype=np.int16)
    species = np.stack([np.repeat(count, len(count)), np.tile(count, len(count))], axis=1)
    value = divided_values(values[species], DIVIDED, device)
    return Rows(value, species, np.full(len(value), DIVIDED, np.int8))


def divided_tables(values: Floats, most: int, shape: int, device: Device) -> list[Table | Stream]:
    """Return the tables of 0, 1, ... `most` parts, a divider among them; empty where it has no room.

    Parameters
    ----------
    values : (n,) array
        Capacitance of each species. [F]
    most : int
        Most parts in one network. [-]
    shape : int
        DIVIDED, CLAPPED or LOADED. [-]
    device : tuple
        Capacitance of the device at output and control; of LOADED see `divided.py`. [F]
    """
    own, count = OWN_PARTS[shape], len(values)
    tables: list[Table | Stream] = [_empty(parts) for parts in range(min(own, most + 1))]
    for parts in range(own, most + 1):
        size = count**own
        for beside in range(parts - own):
            size = size * (count + beside) // (beside + 1)
        if size <= LARGEST_TABLE or parts == 2:
            tables.append(_table(values, parts, shape, device))
        elif parts == own:
            tables.append(_Behind(values, Table(divider_rows(values, device))))
        else:
            tables.append(_Beside(values, tables[-1], own))
    return tables


def _empty(parts: int) -> Table:
    return Table(Rows(np.empty(0), np.empty((0, parts), np.int16), np.empty(0, np.int8)))


def _table(values: Floats, parts: int, shape: int, device: Device) -> Table:
    own = OWN_PARTS[shape]
    every = np.arange(len(values), dtype=np.int16)
    heads = np.stack([grid.ravel() for grid in np.meshgrid(*[every] * own, indexing="ij")], axis=1)
    tails = network_tables(values, parts - own, connect_any=False)[parts - own].inside(-np.inf, np.inf).species
    species: NDArray[np.int16] = np.concatenate(
        [np.repeat(heads, len(tails), axis=0), np.tile(tails, (len(heads), 1))], axis=1
    )
    value = divided_values(values[species], shape, device)
    return Table(Rows(value, species, np.full(len(value), shape, np.int8)), device)
