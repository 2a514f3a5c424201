"""Which multisets of some values add up to a capacitance inside an interval, band by band."""

from __future__ import annotations

from math import comb

import numpy as np

from partpick.search.problem import Bools, Floats, Ints

LARGEST = 1_000_000  # rows of a stored table


class TooManyError(Exception):
    """An answer would not fit into memory; ask for less at a time."""


class SumTables:
    """Sums of one, two and three values, sorted; more values one by one on top of those."""

    def __init__(self, acting: Floats, most: Floats, answer: int) -> None:
        """Take the values at each band, (B, n) F, the largest sum of use, (J, B) F, and the most rows of an answer."""
        self.answer = answer
        self.acting = acting
        finite = np.isfinite(acting)
        self.alike = bool((acting == acting[:1]).all())
        reach = np.where(np.isfinite(most), most, 0.0).max(axis=0, initial=0.0)
        if self.alike:
            reach = np.full(len(reach), reach.max(initial=0.0))
        self.valid = [np.flatnonzero(f & (a <= r)) for f, a, r in zip(finite, acting, reach, strict=True)]
        self._tables: dict[int, list[tuple[Floats, Ints]]] = {}

    def smallest(self, band: int) -> float:
        """Return the smallest value of use at a band; inf where there is none. [F]"""
        return float(self.acting[band][self.valid[band]].min(initial=np.inf))

    def _stored(self, band: int) -> list[tuple[Floats, Ints]]:
        """Return the sorted sums of 0, 1, ... values at a band with the letters of each, (m, k)."""
        key = 0 if self.alike else band
        if key not in self._tables:
            valid = self.valid[band]
            sums, letters = np.zeros(1), np.empty((1, 0), dtype=np.int64)
            self._tables[key] = [(sums, letters)]
            for count in range(1, 4):
                if count > 1 and comb(len(valid) + count - 1, count) > LARGEST:
                    break
                letters = valid[_multisets(len(valid), count)]
                sums = self.acting[band][letters].sum(axis=1)
                order = np.argsort(sums, kind="stable")
                self._tables[key].append((sums[order], letters[order]))
        return self._tables[key]

    def inside(
        self, band: int, added: int, low: Floats, high: Floats, answer: int | None = None
    ) -> tuple[Ints, Ints]:
        """Return the multisets of `added` values inside each closed interval, and the interval of each.

        Parameters
        ----------
        band, added : int
            Band, and how many values. [-]
        low, high : (m,) arrays
            Ends of the intervals. [F]
        answer : int, optional
            The most rows, where it is not that of the table. [-]

        Returns
        -------
        letters : (r, added) array
            Indices of the values, in no order. [-]
        which : (r,) array
            Index of the interval. [-]

        Raises
        ------
        TooManyError
            There are more than `answer`.
        """
        stored, valid = self._stored(band), self.valid[band]
        answer = self.answer if answer is None else answer
        if not len(valid):
            return np.empty((0, added), dtype=np.int64), np.empty(0, dtype=np.int64)
        if added < len(stored):
            sums, letters = stored[added]
            first = np.searchsorted(sums, low, side="left")
            times = np.maximum(np.searchsorted(sums, high, side="right") - first, 0)
            if int(times.sum()) > answer:
                raise TooManyError
            which = np.repeat(np.arange(len(first)), times)
            start = first - (np.cumsum(times) - times)
            return letters[np.arange(len(which)) + start[which]], which
        values = self.acting[band][valid]
        if len(low) * len(values) > answer:
            raise TooManyError
        # the largest value first: the others are no larger, and each is at least the smallest
        slack = 1e-12 * values[None, :]
        rest_low, rest_high = low[:, None] - values - slack, high[:, None] - values + slack
        smallest = (added - 1) * float(values.min())
        open_ = (rest_high >= smallest) & (rest_low <= (added - 1) * values[None, :] * (1 + 1e-12))
        query, largest = np.nonzero(open_)
        letters, which = self.inside(
            band, added - 1, rest_low[query, largest], rest_high[query, largest], answer
        )
        head = valid[largest[which]]
        keep = self._no_larger(band, letters, head)
        letters, head, query = letters[keep], head[keep], query[which[keep]]
        return np.concatenate([letters, head[:, None]], axis=1), query

    def stored(self, band: int) -> list[Floats]:
        """Return the sorted sums of 0, 1, ... values at a band, as far as they are stored. [F]"""
        return [sums for sums, _ in self._stored(band) if len(sums)]

    def complete(self, band: int, added: int) -> bool:
        """Whether the sums of up to `added` values are all stored."""
        return added < len(self._stored(band))

    def any_inside(self, band: int, added: int, low: Floats, high: Floats) -> Bools:
        """Whether some multiset of `added` values may add up to each closed interval, (m,).

        True without a look where the sums are not stored.
        """
        stored = self._stored(band)
        if not len(self.valid[band]):
            return np.zeros(len(low), dtype=np.bool_)
        if added >= len(stored):
            return np.asarray(high >= low)
        sums = stored[added][0]
        return np.asarray(np.searchsorted(sums, low, side="left") < np.searchsorted(sums, high, side="right"))

    def _no_larger(self, band: int, letters: Ints, head: Ints) -> Bools:
        """Whether every letter comes before `head` by value, equal values by index: one spelling each."""
        place = np.empty(self.acting.shape[1], dtype=np.int64)
        place[np.argsort(self.acting[band], kind="stable")] = np.arange(self.acting.shape[1])
        return np.asarray((place[letters] <= place[head][:, None]).all(axis=1))


def _multisets(count: int, parts: int) -> Ints:
    """Return every ascending choice of `parts` out of `count` with repetition, (m, parts)."""
    chosen = np.arange(count)[:, None]
    for _ in range(parts - 1):
        last = chosen[:, -1]
        row = np.repeat(np.arange(len(chosen)), count - last)
        start = np.concatenate([[0], np.cumsum(count - last)[:-1]])
        added = last[row] + np.arange(len(row)) - start[row]
        chosen = np.concatenate([chosen[row], added[:, None]], axis=1)
    return chosen
