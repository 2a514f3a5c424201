"""Every set of capacitors of which each band can switch in a subset that puts it on frequency.

Bands are taken from the highest frequency down. A set so far that can serve a band, on any coil of the
plan or a section of one, goes on as it is; one that cannot grows by every multiset that, with some subset
of it, falls into the band's interval. All limits hold for a subset where they hold for the whole (fewer
parts, values, pieces of one kind, a lower price), so every set that serves all bands contains one that is
found here.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from partpick.progress import Monitor
from partpick.search.choose import Stopped
from partpick.search.circuits import Circuits, distinct
from partpick.search.grades import Grades
from partpick.search.problem import NEVER, PLENTY, Bools, Floats, Ints, Problem
from partpick.search.set_mounts import SetMounts
from partpick.search.sum_tables import SumTables, TooManyError

CHUNK = 1 << 19  # subset sums at one time
ANSWER = 2_000_000  # multisets added at one time
LARGEST_SET = 20  # whose subsets are still written out
WORK_LIMIT = 400_000_000  # subset sums of one request


@dataclass(frozen=True, eq=False)
class Letters:
    """What a set is made of: species where grades do not matter to the limits, else parts."""

    parts: tuple[tuple[int, ...], ...]  # the parts that a letter may stand for
    acting: Floats  # (B, n) F
    stock: Ints  # (n,)
    price: Ints  # (n,) least, hundredths
    value: Ints  # (n,) which written value

    @staticmethod
    def of(problem: Problem, circuits: Circuits, price_limit: int) -> Letters:
        """Return the letters of a problem; parts whose price is unknown or above the limit are left out."""
        grades = Grades(problem)
        groups: list[tuple[int, ...]] = []
        by_part = problem.by_grade
        by_part = by_part or problem.price_limit < NEVER  # the grade decides whether a set is inside it
        for options in problem.options:
            useful = tuple(p for p in grades.useful(options) if problem.part_price[p] <= price_limit)
            if price_limit < NEVER:
                useful = tuple(p for p in useful if problem.part_price[p] < NEVER)
            groups += [(part,) for part in useful] if by_part else [useful] if useful else []
        first = [group[0] for group in groups]
        values = sorted({problem.part_value[part] for part in first})
        return Letters(
            parts=tuple(groups),
            acting=circuits.acting[:, first],
            stock=np.array([min(int(problem.part_stock[list(g)].sum()), PLENTY) for g in groups], dtype=np.int64),
            price=np.array([problem.part_price[list(g)].min() for g in groups], dtype=np.int64),
            value=np.array([values.index(problem.part_value[part]) for part in first], dtype=np.int64),
        )


@dataclass(frozen=True, eq=False)
class Sets:
    """Some sets of equal size: the plan of each (m,), letters (m, k) sorted in each row."""

    row: Ints
    letters: Ints

    def take(self, chosen: Ints | Bools | slice) -> Sets:
        """Return the rows chosen by a mask, an index array or a slice."""
        return Sets(self.row[chosen], self.letters[chosen])

    def __len__(self) -> int:
        return len(self.row)


class SetSearch:
    """Complete enumeration of the sets of a problem, depth first in blocks."""

    def __init__(self, problem: Problem, highest: Floats, letters: Letters, monitor: Monitor) -> None:
        """Take the largest sum of use at each band, (B,), and what sets are made of."""
        self.problem = problem
        self.letters = letters
        self.monitor = monitor
        self.order = np.argsort(-problem.frequency, kind="stable")
        self.work = 0
        self.sums = SumTables(letters.acting, highest[None, :], ANSWER)
        self._exact = problem.by_grade
        self.single_parts = all(len(group) == 1 for group in letters.parts)
        acting = np.where(np.isfinite(letters.acting), letters.acting, 0.0)
        self._largest = acting.max(axis=0, initial=0.0)
        # what a sum at one band can come to at another, where each capacitor acts by its series inductance
        grows = np.divide(self._largest, acting, out=np.ones_like(acting), where=acting > 0)
        self._gain = grows.max(axis=1, initial=1.0)
        self.first_part = np.array([group[0] for group in letters.parts], dtype=np.int64)

    def sets(self, mounts: SetMounts, most: int, price: Ints) -> Iterator[Sets]:
        """Yield sets of at most `most` capacitors that serve every band, repeats possible.

        Every such set contains one that is yielded. The mounts may be narrowed meanwhile.

        Parameters
        ----------
        mounts : SetMounts
            The plans, and the intervals of what their capacitors may be put across.
        most : int
            The most capacitors. [-]
        price : (m,) array
            The most that a set of each plan may cost, NEVER: no limit. [hundredths]
        """
        rows = np.flatnonzero(price >= 0)
        widest = mounts.widest
        stack: list[tuple[int, Sets]] = [(0, Sets(rows, np.empty((len(rows), 0), dtype=np.int64)))]
        while stack:
            depth, sets = stack.pop()
            reason = self.monitor.stopped()
            if reason is not None:
                raise Stopped(reason)
            if depth == len(self.order):
                yield sets
                continue
            if sets.letters.shape[1] > LARGEST_SET:
                raise Stopped("work limit")
            most_rows = max(1, (CHUNK >> sets.letters.shape[1]) // widest)
            if len(sets) > most_rows:
                stack.append((depth, sets.take(slice(most_rows, None))))
                sets = sets.take(slice(0, most_rows))
            self.work += len(sets) << sets.letters.shape[1]
            if self.work > WORK_LIMIT:
                raise Stopped("work limit")
            for grown in self._next(sets, depth, most, mounts, price):
                if len(grown):
                    stack.append((depth + 1, grown))

    def _next(self, sets: Sets, depth: int, most: int, mounts: SetMounts, price: Ints) -> list[Sets]:
        """Return the sets that serve one band more, largest first."""
        band = int(self.order[depth])
        size = sets.letters.shape[1]
        sums = self.subset_sums(sets.letters, band)
        served = self._served(sets, sums, band, mounts)
        grown = [sets.take(served)]
        short = np.flatnonzero(~served)
        if len(short) and size < most:
            rest, sums = sets.take(short), sums[short]
            spare = most - size - self._needed(rest, depth, mounts)
            for added in range(1, int(spare.max(initial=0)) + 1):
                some = np.flatnonzero(spare >= added)
                grown += self._grow(rest.take(some), sums[some], added, band, mounts, price)
        return grown[::-1]

    def subset_sums(self, letters: Ints, band: int) -> Floats:
        """Return the capacitance of every subset of each set, (m, 2^k); bit i of the column is slot i. [F]"""
        acting = self.letters.acting[band]
        sums = np.zeros((len(letters), 1))
        for column in letters.T:
            sums = np.concatenate([sums, sums + acting[column][:, None]], axis=1)
        return sums

    def masked(self, letters: Ints, mask: Ints) -> Ints:
        """Return the letters switched in by each mask, -1 elsewhere. [-]"""
        bits = (mask[:, None] >> np.arange(letters.shape[1])[None, :]) & 1
        return np.where(bits == 1, letters, -1)

    def _served(self, sets: Sets, sums: Floats, band: int, mounts: SetMounts) -> Bools:
        """Whether some subset of each set serves a band on some mount, (m,)."""
        mount, which = mounts.at(band, sets.row)
        inside = sums[which] if not mounts.single or len(which) < len(sums) else sums
        inside = (inside >= mounts.low[mount, band][:, None]) & (inside <= mounts.high[mount, band][:, None])
        inside[:, 0] = mounts.bare[mount, band]
        served = np.zeros(len(sets), dtype=np.bool_)
        if not self._exact:
            served[which[inside.any(axis=1)]] = True
            return served
        pair, mask = np.nonzero(inside)
        letters = self.masked(sets.letters[which[pair]], mask)
        keep = self._admissible(mounts, mount[pair], band, letters)
        served[which[pair[keep]]] = True
        return served

    def _admissible(self, mounts: SetMounts, mount: Ints, band: int, letters: Ints) -> Bools:
        """Whether rows of single-part letters are inside the limits on Q and drift at a band."""
        parts = np.where(letters >= 0, self.first_part[letters], -1)
        _, keep = mounts.places.circuits.columns(mounts.place[mount], np.full(len(mount), band), parts)
        return keep

    def least_pieces(self, least: Floats, most: Floats) -> Ints:
        """Return a number of capacitors below which no set serves every band, (m,).

        Parameters
        ----------
        least, most : (m, B) arrays
            What is wanted at each band lies between these; `least` up to 0 where none will do. [F]
        """
        nothing = np.zeros(len(least))
        return self._forced(nothing, nothing, self.order, least, most)

    def _needed(self, sets: Sets, depth: int, mounts: SetMounts) -> Ints:
        """Return the least number of capacitors that the bands after this one add, (m,)."""
        band = int(self.order[depth])
        total = self._largest[sets.letters].sum(axis=1)
        least, most = mounts.least[sets.row], mounts.most[sets.row]
        reach = np.maximum(most[:, band], 0.0) * self._gain[band]
        return self._forced(total + reach, reach, self.order[depth + 1 :], least, most)

    def _forced(self, total: Floats, reach: Floats, later: Ints, least: Floats, most: Floats) -> Ints:
        """Count the bands that need more than `total`, which rises by at most the interval's end each time.

        To add as late as possible adds most, so no other sequence needs fewer.
        """
        forced = np.zeros(len(total), dtype=np.int64)
        for band in later:
            reach = np.maximum(reach, most[:, band] * self._gain[band])
            short = least[:, band] > total * (1 + 1e-12)
            forced += short
            total = np.where(short, total + reach, total)
        return forced

    def _grow(
        self, sets: Sets, sums: Floats, added: int, band: int, mounts: SetMounts, price: Ints
    ) -> Iterator[Sets]:
        """Yield the sets grown by `added` letters so that some subset with all of those serves the band."""
        mount, which = mounts.at(band, sets.row)
        low, high = mounts.low[mount, band][:, None], mounts.high[mount, band][:, None]
        pair, mask = np.nonzero((high - sums[which] >= added * self.sums.smallest(band) * (1 - 1e-12)) & (low <= high))
        rest = sums[which[pair], mask]
        try:
            new, found = self.sums.inside(band, added, low[pair, 0] - rest, high[pair, 0] - rest)
        except TooManyError:
            if len(sets) == 1:
                raise Stopped("work limit") from None
            half = len(sets) // 2
            for part in (slice(0, half), slice(half, None)):
                yield from self._grow(sets.take(part), sums[part], added, band, mounts, price)
            return
        self.work += len(found)
        pair, mask = pair[found], mask[found]
        own = which[pair]
        if self._exact:
            letters = np.concatenate([self.masked(sets.letters[own], mask), new], axis=1)
            keep = self._admissible(mounts, mount[pair], band, letters)
            own, new = own[keep], new[keep]
        grown = Sets(sets.row[own], np.sort(np.concatenate([sets.letters[own], new], axis=1), axis=1))
        first, _ = distinct(grown.row, grown.letters, len(self.letters.stock))
        yield self._inside_shared_limits(grown.take(first), price)

    def _inside_shared_limits(self, sets: Sets, price: Ints) -> Sets:
        """Drop the sets beyond stock, number of values or price; each set that contains them is beyond too."""
        letters, problem = self.letters, self.problem
        scarce = letters.stock[sets.letters] < sets.letters.shape[1]
        if scarce.any():
            equal = sets.letters[:, :, None] == sets.letters[:, None, :]
            sets = sets.take((equal.sum(axis=2) <= letters.stock[sets.letters]).all(axis=1))
        if problem.values_limit < sets.letters.shape[1]:
            values = np.sort(letters.value[sets.letters], axis=1)
            sets = sets.take((np.diff(values, axis=1) != 0).sum(axis=1) + 1 <= problem.values_limit)
        limit = price[sets.row]
        if (limit < NEVER).any():
            cost = letters.price[sets.letters].sum(axis=1)
            sets = sets.take((limit >= NEVER) | (cost <= limit))
        return sets
