"""Capacitances reachable with k parts, as sorted tables.

A network is a shape and the species (distinct capacitances) in it:

======== ============ ==================================
shape    written      species order
======== ============ ==================================
PARALLEL a | b | c    ascending
SERIES   a + b + c    ascending
SHUNTED  a | (b + c)  a, then b <= c
CHAINED  a + (b | c)  a, then b <= c
======== ============ ==================================

Up to `LARGEST_TABLE` networks a table is built and sorted; beyond, the networks of k parts are
looked up as one part more on the table of k - 1, so that memory stays small.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.search.divided import NO_DEVICE, OWN_PARTS, Device, divided_values

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

PARALLEL, SERIES, SHUNTED, CHAINED = range(4)
LARGEST_TABLE = 3_000_000


@dataclass(frozen=True, eq=False)
class Rows:
    """Some networks of k parts: capacitance (m,) in farad, species (m, k), shape (m,)."""

    value: Floats
    species: NDArray[np.int16]
    shape: NDArray[np.int8]

    def take(self, chosen: NDArray[np.generic] | slice) -> Rows:
        """Return the rows chosen by a mask, an index array or a slice."""
        return Rows(self.value[chosen], self.species[chosen], self.shape[chosen])

    @staticmethod
    def join(blocks: list[Rows], parts: int) -> Rows:
        """Return the rows of several blocks of networks of `parts` parts."""
        if not blocks:
            return Rows(np.empty(0), np.empty((0, parts), np.int16), np.empty(0, np.int8))
        return Rows(
            np.concatenate([b.value for b in blocks]),
            np.concatenate([b.species for b in blocks]),
            np.concatenate([b.shape for b in blocks]),
        )


class Table:
    """All networks of k parts, sorted by capacitance."""

    def __init__(self, rows: Rows, device: Device = NO_DEVICE) -> None:
        self._rows = rows
        self._device = device  # across the halves of a divider
        self._order = np.argsort(rows.value)  # equal capacitances in any order: content tells them apart later
        self.value = rows.value[self._order]
        self.parts = rows.species.shape[1]

    def acting_as(self, values: Floats) -> Floats:
        """Return every network's capacitance with other capacitances of the species, in the order of `value`. [F]"""
        return network_values(values[self._rows.species], self._rows.shape, self._device)[self._order]

    def any_inside(self, low: Floats, high: Floats) -> NDArray[np.bool_]:
        """Whether some network lies in each closed interval [low, high]."""
        if len(self.value) == 0:
            return np.zeros(low.shape, dtype=np.bool_)
        first = np.searchsorted(self.value, low, side="left")
        inside = first < len(self.value)
        return np.asarray(inside & (self.value[np.where(inside, first, 0)] <= high))

    def neighbours(self, wanted: Floats) -> tuple[Floats, Floats]:
        """Return the capacitances next at or below, and next above, each wanted one; -inf, inf at the ends."""
        padded = np.concatenate([[-np.inf], self.value, [np.inf]])
        place = np.searchsorted(self.value, wanted, side="right")
        return padded[place], padded[place + 1]

    def inside(self, low: float, high: float) -> Rows:
        """Return the networks in the closed interval [low, high]."""
        first = int(np.searchsorted(self.value, low, side="left"))
        last = int(np.searchsorted(self.value, high, side="right"))
        return self._rows.take(self._order[first : max(first, last)])

    def inside_each(self, low: Floats, high: Floats) -> tuple[Rows, Ints]:
        """Return the networks in each of several closed intervals, end to end, and whose they are."""
        first = np.searchsorted(self.value, low, side="left")
        times = np.maximum(np.searchsorted(self.value, high, side="right") - first, 0)
        which = np.repeat(np.arange(len(first)), times)
        start = first - (np.cumsum(times) - times)
        return self._rows.take(self._order[np.arange(len(which)) + start[which]]), which


class Stream:
    """All networks of k parts as one part `a` joined to the table of k - 1, never stored."""

    def __init__(self, values: Floats, inner: Table | Stream, connect_any: bool) -> None:
        self.single = values
        self.inner = inner
        self.connect_any = connect_any
        self.parts: int = inner.parts + 1
        self.deep = isinstance(inner, Stream)  # every look-up is a look-up of look-ups

    def any_inside(self, low: Floats, high: Floats) -> NDArray[np.bool_]:
        """Whether some network lies in each closed interval [low, high]."""
        found = np.zeros(low.shape, dtype=np.bool_)
        for below, above in self._inner_intervals(low, high):
            rest = np.flatnonzero(~found)
            found[rest] = self.inner.any_inside(below[rest], above[rest])
        return found

    def neighbours(self, wanted: Floats) -> tuple[Floats, Floats]:
        """Return the capacitances next at or below, and next above, each wanted one."""
        flat = np.ravel(wanted)
        below, above = np.full(flat.shape, -np.inf), np.full(flat.shape, np.inf)
        for a in self.single:
            for join, part in self._joins(a, flat):
                low, high = self.inner.neighbours(part)
                for inner in (low, high):
                    ok = np.isfinite(inner)
                    whole = join(inner[ok])
                    short = whole <= flat[ok]
                    below[ok] = np.maximum(below[ok], np.where(short, whole, -np.inf))
                    above[ok] = np.minimum(above[ok], np.where(short, np.inf, whole))
        return below.reshape(wanted.shape), above.reshape(wanted.shape)

    def inside(self, low: float, high: float) -> Rows:
        """Return the networks in the closed interval [low, high]."""
        blocks = []
        for index, a in enumerate(self.single):
            for in_series in (False, True) if self.connect_any else (False,):
                lower, upper = self._inner_interval(a, low, high, in_series)
                rows = self._joined(index, a, self.inner.inside(lower, upper), in_series)
                blocks.append(rows.take((rows.value >= low) & (rows.value <= high)))
        return Rows.join(blocks, self.parts)

    def inside_each(self, low: Floats, high: Floats) -> tuple[Rows, Ints]:
        """Return the networks in each of several closed intervals, end to end, and whose they are."""
        blocks = [self.inside(a, b) for a, b in zip(low.tolist(), high.tolist(), strict=True)]
        sizes = [len(block.value) for block in blocks]
        return Rows.join(blocks, self.parts), np.repeat(np.arange(len(blocks)), sizes)

    def _joins(self, a: float, wanted: Floats) -> Iterator[tuple[Callable[[Floats], Floats], Floats]]:
        yield (lambda inner: a + inner), wanted - a
        if self.connect_any:
            yield (lambda inner: a * inner / (a + inner)), series_rest(a, wanted)

    def _inner_intervals(self, low: Floats, high: Floats) -> Iterator[tuple[Floats, Floats]]:
        for a in self.single:
            slack = 1e-12 * np.maximum(np.where(np.isfinite(high), np.abs(high), 0.0), a)
            yield low - a - slack, high - a + slack
            if self.connect_any:
                yield series_rest(a, low), series_rest(a, high)

    @staticmethod
    def _inner_interval(a: float, low: float, high: float, in_series: bool) -> tuple[float, float]:
        ends = [abs(end) for end in (low, high) if np.isfinite(end)]
        slack = 1e-12 * max([a, *ends])  # rounding; exact test follows
        if not in_series:
            return low - a - slack, high - a + slack
        lower, upper = series_rest(a, np.array([low - slack, high + slack]))
        return float(lower), float(upper)

    def _joined(self, index: int, a: float, rows: Rows, in_series: bool) -> Rows:
        last = rows.species[:, -1]
        plain = rows.shape == (SERIES if in_series else PARALLEL)
        if rows.species.shape[1] == 1:
            plain[:] = True
        keep = ~plain | (last <= index)  # one spelling of each network: ascending species
        rows = rows.take(keep)
        plain = plain[keep]
        value = a * rows.value / (a + rows.value) if in_series else a + rows.value
        own = np.full((len(value), 1), index, dtype=np.int16)
        ascending = np.concatenate([rows.species, own], axis=1)
        mixed = np.concatenate([own, rows.species], axis=1)
        species = np.where(plain[:, None], ascending, mixed)
        shape = np.where(plain, SERIES if in_series else PARALLEL, CHAINED if in_series else SHUNTED)
        return Rows(value, species, shape.astype(np.int8))


def series_rest(a: float, wanted: Floats) -> Floats:
    """Return what in series with `a` gives each wanted capacitance; inf where `a` is too small."""
    usual = (wanted < a) & np.isfinite(wanted)
    rest = a * np.where(usual, wanted, 0.0) / np.where(usual, a - wanted, 1.0)
    return np.where(usual, rest, np.where(wanted < a, -a, np.inf))


def _multisets(count: int, parts: int) -> NDArray[np.int16]:
    """Return every ascending choice of `parts` out of `count` with repetition, (m, parts)."""
    chosen = np.arange(count, dtype=np.int16)[:, None]
    for _ in range(parts - 1):
        last = chosen[:, -1].astype(np.int64)
        times = count - last
        start = np.repeat(last - np.concatenate([[0], np.cumsum(times)[:-1]]), times)
        added = (np.arange(int(times.sum())) + start).astype(np.int16)
        chosen = np.concatenate([np.repeat(chosen, times, axis=0), added[:, None]], axis=1)
    return chosen


def _multiset_count(count: int, parts: int) -> int:
    total = 1
    for step in range(parts):
        total = total * (count + step) // (step + 1)
    return total


def _shaped(values: Floats, species: NDArray[np.int16], shape: int) -> Rows:
    value = _value_of(values[species], shape)
    return Rows(value, species, np.full(len(value), shape, np.int8))


def _value_of(part: Floats, shape: int) -> Floats:
    """Return the capacitance of networks of one shape, (m,), from that of their parts, (m, k). [F]"""
    if shape == PARALLEL:
        value = part[:, 0].copy()
        for column in range(1, part.shape[1]):
            value += part[:, column]
        return value
    if shape == SERIES:
        return np.asarray(1.0 / np.sum(1.0 / part, axis=1))
    if shape == SHUNTED:
        return np.asarray(part[:, 0] + part[:, 1] * part[:, 2] / (part[:, 1] + part[:, 2]))
    pair = part[:, 1] + part[:, 2]
    return np.asarray(part[:, 0] * pair / (part[:, 0] + pair))


def network_values(part: Floats, shape: NDArray[np.int8], device: Device = NO_DEVICE) -> Floats:
    """Return the capacitance of networks of known shapes, (m,), from that of their parts, (m, k). [F]"""
    value = np.zeros(len(part))
    if part.shape[1] == 0:
        return value
    for kind in (PARALLEL, SERIES, SHUNTED, CHAINED):
        rows = np.flatnonzero(shape == kind)
        if len(rows):
            value[rows] = _value_of(part[rows], kind)
    for kind in OWN_PARTS:
        rows = np.flatnonzero(shape == kind)
        if len(rows):
            value[rows] = divided_values(part[rows], kind, device)
    return value


def _all_networks(values: Floats, parts: int, connect_any: bool) -> Rows:
    sets = _multisets(len(values), parts)
    blocks = [_shaped(values, sets, PARALLEL)]
    if connect_any and parts > 1:
        blocks.append(_shaped(values, sets, SERIES))
    if connect_any and parts == 3:
        pairs = _multisets(len(values), 2)
        first = np.repeat(np.arange(len(values), dtype=np.int16), len(pairs))[:, None]
        mixed = np.concatenate([first, np.tile(pairs, (len(values), 1))], axis=1)
        blocks += [_shaped(values, mixed, SHUNTED), _shaped(values, mixed, CHAINED)]
    return Rows.join(blocks, parts)


def network_tables(values: Floats, most: int, connect_any: bool) -> list[Table | Stream]:
    """Return the tables of 0, 1, ... `most` parts over the species `values`.

    Parameters
    ----------
    values : (n,) array
        Capacitance of each species, any order, all above zero. [F]
    most : int
        Most parts in one network; at most 3 with `connect_any`. [-]
    connect_any : bool
        Series and mixed networks too. [-]

    Returns
    -------
    tables : list
        One table for each number of parts, 0 first (its one network is 0 F).
    """
    if connect_any and most > 3:
        raise ValueError("series and mixed networks are built of at most 3 parts")
    tables: list[Table | Stream] = [
        Table(Rows(np.zeros(1), np.empty((1, 0), np.int16), np.zeros(1, np.int8)))
    ]
    for parts in range(1, most + 1):
        size = _multiset_count(len(values), parts)
        if connect_any:
            size = 2 * size + (2 * len(values) * _multiset_count(len(values), 2) if parts == 3 else 0)
        inner = tables[-1]
        if size <= LARGEST_TABLE or parts == 1:
            tables.append(Table(_all_networks(values, parts, connect_any)))
        else:
            tables.append(Stream(values, inner, connect_any))
    return tables
