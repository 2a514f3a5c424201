"""The best way to switch each shared set, and the first set of each coil in the order of the request.

A set fixes pieces, commonness and price; each band then takes the subset that ranks best, worst
figures first, so a set's place in the order does not depend on any other set.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np

from partpick.search.choose import ORDERS, SUMS, Choice, column_content
from partpick.search.circuits import Circuits
from partpick.search.figures import Columns
from partpick.search.grades import Grades
from partpick.search.networks import PARALLEL, Rows
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.set_mounts import SetMounts
from partpick.search.shared_sets import Sets, SetSearch

BLOCK = 1 << 18  # subset sums at one time


@dataclass(frozen=True)
class SharedChoice(Choice):
    """A choice of one set for all bands; `columns` name what is in circuit at each band."""

    members: tuple[int, ...] = ()  # parts of the set, by content
    closed: tuple[tuple[int, ...], ...] = ()  # (B, any) places in `members` that each band switches in


@dataclass(frozen=True, eq=False)
class _Ways:
    """Admissible subsets of some sets, each on its mount, set by set and band by band."""

    owner: Ints  # (m,) index of the set
    band: Ints  # (m,)
    mask: Ints  # (m,) bit i: slot i is in circuit
    columns: Columns  # coil and tap of the whole problem

    def take(self, chosen: Ints | Bools) -> _Ways:
        return _Ways(self.owner[chosen], self.band[chosen], self.mask[chosen], self.columns.take(chosen))


class SetFigures:
    """Places sets in the order of the request."""

    def __init__(self, problem: Problem, circuits: Circuits, search: SetSearch) -> None:
        self.problem = problem
        self.circuits = circuits
        self.search = search
        self.grades = Grades(problem)
        self.species = np.full(len(search.letters.parts), -1, dtype=np.int64)
        for species, options in enumerate(problem.options):
            for letter, group in enumerate(search.letters.parts):
                if group[0] in options:
                    self.species[letter] = species

    def best(
        self,
        found: Iterable[Sets],
        mounts: SetMounts,
        by: str,
        narrow: Callable[[int, float], None] | None = None,
    ) -> dict[int, SharedChoice]:
        """Return the first choice of each plan among all sets found, each of them served by its mounts.

        Parameters
        ----------
        found : iterable of Sets
            The sets.
        mounts : SetMounts
            The plans.
        by : str
            Which order.
        narrow : callable, optional
            Told of a plan and the largest error of interest whenever its first choice so far changes; to
            be given where all sets found have the same number of pieces and that leads the order.
        """
        order = ORDERS[by]
        kept: dict[int, tuple[tuple[int, ...], list[Ints]]] = {}
        for sets in self._blocks(found, mounts.widest):
            parts, row = self._graded(sets, mounts)
            if not len(row):
                continue
            keys, alive = self._keys(row, parts, mounts, order)
            for place in _first_of_each(row, keys, alive):
                key, j = tuple(int(k) for k in keys[place]), int(row[place])
                if j not in kept or key < kept[j][0]:
                    kept[j] = (key, [])
                    if narrow is not None:
                        narrow(j, (key[order.index("error_class")] + 0.5) * 1e-9)
                if key == kept[j][0]:
                    kept[j][1].append(parts[place])
        return {
            j: min((self._choice(j, parts, mounts, order) for parts in ties), key=lambda c: c.key)
            for j, (_, ties) in kept.items()
        }

    def least_errors(self, sets: Sets, mounts: SetMounts) -> Ints:
        """Return the least worst error of each set as the whole number of the order, NEVER where it has none."""
        parts, row = self._graded(sets, mounts, expand=False)
        keys, alive = self._keys(row, parts, mounts, ("fine_error",))
        return np.where(alive, keys[:, 0], NEVER)

    def _blocks(self, found: Iterable[Sets], widest: int) -> Iterable[Sets]:
        for sets in found:
            size = max(1, min(4096, (BLOCK >> sets.letters.shape[1]) // widest))
            for start in range(0, len(sets), size):
                yield sets.take(slice(start, start + size))

    def _graded(self, sets: Sets, mounts: SetMounts, expand: bool = True) -> tuple[Ints, Ints]:
        """Return the parts of each set in each choice of grades inside stock and price, and its plan."""
        search, problem = self.search, self.problem
        if search.single_parts or not expand:
            return search.first_part[sets.letters].reshape(sets.letters.shape), sets.row
        shape = np.full(len(sets), PARALLEL, np.int8)
        rows = Rows(np.zeros(len(sets)), self.species[sets.letters].astype(np.int16), shape)
        origin, parts = self.grades.expand(rows)
        row = sets.row[origin]
        if problem.price_limit < NEVER:
            inside = self.circuits.price(parts) + self._coils(mounts, row, problem.coil_price) <= problem.price_limit
            parts, row = parts[inside], row[inside]
        return parts, row

    @staticmethod
    def _coils(mounts: SetMounts, row: Ints, figure: Ints) -> Ints:
        """Return a figure summed over the coils of some plans, (m, ...). [-]"""
        coils = mounts.coils[row]
        used = (coils >= 0).reshape(*coils.shape, *[1] * (figure.ndim - 1))
        return np.where(used, figure[coils], 0).sum(axis=1)

    def _ways(self, row: Ints, parts: Ints, mounts: SetMounts) -> _Ways:
        blocks = []
        slots = np.arange(parts.shape[1])[None, :]
        sums = self._subset_sums(parts, 0)
        places = mounts.places
        for band in range(self.problem.bands):
            if band > 0 and not self.search.sums.alike:
                sums = self._subset_sums(parts, band)
            mount, which = mounts.at(band, row)
            low, high = mounts.low[mount, band][:, None], mounts.high[mount, band][:, None]
            inside = (sums[which] >= low) & (sums[which] <= high)
            inside[:, 0] = mounts.bare[mount, band]
            pair, mask = np.nonzero(inside)
            owner, place = which[pair], mounts.place[mount[pair]]
            taken = np.where((mask[:, None] >> slots) & 1 == 1, parts[owner], -1)
            where = np.full(len(owner), band)
            columns, keep = places.circuits.columns(place, where, taken)
            columns = replace(columns, coil=places.coil[place], tap=places.tap[place])
            blocks.append(_Ways(owner, where, mask, columns).take(keep))
        ways = _Ways(
            np.concatenate([w.owner for w in blocks]),
            np.concatenate([w.band for w in blocks]),
            np.concatenate([w.mask for w in blocks]),
            Columns.join([w.columns for w in blocks]),
        )
        return ways.take(np.lexsort((ways.band, ways.owner)))

    def _subset_sums(self, parts: Ints, band: int) -> Floats:
        acting = self.circuits.acting[band]
        sums = np.zeros((len(parts), 1))
        for column in parts.T:
            sums = np.concatenate([sums, sums + acting[column][:, None]], axis=1)
        return sums

    def _keys(self, row: Ints, parts: Ints, mounts: SetMounts, order: tuple[str, ...]) -> tuple[Ints, Bools]:
        """Return each set's figures in the order, (m, steps), effort as three; and whether all bands are served."""
        keys, alive, _ = self._staged(self._ways(row, parts, mounts), row, parts, mounts, order)
        return keys, alive

    def _staged(
        self, ways: _Ways, row: Ints, parts: Ints, mounts: SetMounts, order: tuple[str, ...]
    ) -> tuple[Ints, Bools, _Ways]:
        """Return figures, whether all bands are served, and the ways left, one step of the order after the other."""
        bands = self.problem.bands
        served = np.zeros((len(row), bands), dtype=np.bool_)
        served[ways.owner, ways.band] = True
        alive = np.asarray(served.all(axis=1))
        ways = ways.take(alive[ways.owner])
        keys = []
        for name in order:
            if name == "effort":
                keys += list(self._coils(mounts, row, self.problem.effort).T)
            elif name in SUMS:
                keys.append(self._sum(row, parts, mounts, name))
            else:
                worst, ways = _least_worst(ways, getattr(ways.columns, name), len(row), bands)
                keys.append(worst)
        return np.stack(keys, axis=1), alive, ways

    def _sum(self, row: Ints, parts: Ints, mounts: SetMounts, name: str) -> Ints:
        if name == "pieces":
            return parts.shape[1] + (mounts.coils[row] >= 0).sum(axis=1)
        if name == "commonness":
            return self.circuits.commonness(parts)
        return np.minimum(self.circuits.price(parts) + self._coils(mounts, row, self.problem.coil_price), NEVER)

    def _choice(self, row: int, parts: Ints, mounts: SetMounts, order: tuple[str, ...]) -> SharedChoice:
        """Return the one choice of a set: equal subsets are settled by content."""
        parts = parts[np.argsort(self.problem.part_rank[parts], kind="stable")]
        rows = np.array([row])
        ways = self._ways(rows, parts[None, :], mounts)
        keys, _, left = self._staged(ways, rows, parts[None, :], mounts, order)
        return self._first_by_content(row, parts, mounts, keys[0], left, order)

    def _first_by_content(
        self, row: int, parts: Ints, mounts: SetMounts, figures: Ints, ways: _Ways, order: tuple[str, ...]
    ) -> SharedChoice:
        problem = self.problem
        columns, closed = [], []
        for band in range(problem.bands):
            own = ways.take(ways.band == band)
            first = min(
                range(len(own.mask)), key=lambda r: (column_content(problem, own.columns, r), int(own.mask[r]))
            )
            columns.append(own.columns.take(np.array([first])))
            closed.append(tuple(i for i in range(len(parts)) if int(own.mask[first]) >> i & 1))
        values = iter(figures.tolist())
        key: list[int | tuple[object, ...]] = []
        for name in order:
            key.append(tuple(next(values) for _ in range(3)) if name == "effort" else next(values))
        members = tuple(int(part) for part in parts)
        coils = tuple(sorted(int(coil) for coil in mounts.coils[row] if coil >= 0))
        key.append(self._content(coils, members, tuple(columns)))
        return SharedChoice(tuple(key), coils, tuple(columns), members, tuple(closed))

    def _content(
        self, coils: tuple[int, ...], members: tuple[int, ...], columns: tuple[Columns, ...]
    ) -> tuple[object, ...]:
        """Return the last step of the order: the coils, the set, then each band's subset by frequency."""
        problem = self.problem
        values = tuple(sorted(problem.part_value[part] for part in members))
        ranks = tuple(int(problem.part_rank[part]) for part in members)
        by_frequency = np.argsort(problem.frequency, kind="stable")
        used = tuple(column_content(problem, columns[band], 0) for band in by_frequency)
        return tuple(sorted(int(problem.coil_rank[coil]) for coil in coils)), values, ranks, used


def _least_worst(ways: _Ways, figure: Ints, sets: int, bands: int) -> tuple[Ints, _Ways]:
    """Return the worst over bands of the least figure of each set, NEVER for none, and the ways up to it."""
    worst = np.full(sets, NEVER, dtype=np.int64)
    if not len(figure):
        return worst, ways
    group = ways.owner * bands + ways.band
    first = np.flatnonzero(np.diff(group, prepend=-1) != 0)
    least = np.minimum.reduceat(figure, first)
    owner = ways.owner[first]
    start = np.flatnonzero(np.diff(owner, prepend=-1) != 0)
    worst[owner[start]] = np.maximum.reduceat(least, start)
    return worst, ways.take(figure <= worst[ways.owner])


def _first_of_each(row: Ints, keys: Ints, alive: Bools) -> list[int]:
    """Return the sets that come first for their plan, all of those that tie."""
    rows = np.flatnonzero(alive)
    if not len(rows):
        return []
    order = rows[np.lexsort((*keys[rows].T[::-1], row[rows]))]
    new = np.concatenate([[True], row[order[1:]] != row[order[:-1]]])
    leader = order[np.flatnonzero(new)[np.cumsum(new) - 1]]
    return [int(place) for place in order[(keys[order] == keys[leader]).all(axis=1)]]
