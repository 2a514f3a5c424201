"""Networks in parallel of only those parts that bear a coil's least carrier, so that no others need be looked at."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from partpick.search.networks import Stream, Table, network_tables
from partpick.search.problem import Bools, Ints, Problem
from partpick.search.ratings import least_carrier, part_limits

_SLACK = 1e-9  # of a bound, for rounding
_LEVELS = 8  # of carriers; more would make more tables than they save

Cache = dict[tuple[int, int], tuple[list[Table | Stream], Ints]]


class BearingTables:
    """Tables of networks by what carrier their parts bear; each part in parallel has the tank's whole voltage."""

    def __init__(self, problem: Problem, valid: list[Ints], cache: Cache) -> None:
        self.problem = problem
        self.valid = valid
        self._cache = cache
        self.carrier = least_carrier(problem) * (1 - _SLACK)
        self._of_part = [part_limits(problem, band) for band in range(problem.bands)]
        self._of_species = [
            np.array([limits[list(problem.options[s])].max(initial=0.0) for s in own.tolist()])
            for limits, own in zip(self._of_part, valid, strict=True)
        ]

    def of(self, coil: int, band: int) -> tuple[list[Table | Stream], Ints, Bools]:
        """Return the tables for one coil, the species that they speak of, and which parts bear its carrier, (P,)."""
        carrier = self.carrier[coil, band]
        tables, valid = self._tables(band, int(self._level(band, np.array([carrier]))[0]))
        return tables, valid, self._of_part[band] >= carrier

    def by_level(self, band: int, rows: Ints) -> Iterator[tuple[Ints, list[Table | Stream]]]:
        """Yield coils with the tables of the parts that may serve them."""
        levels = self._level(band, self.carrier[rows, band])
        for level in np.unique(levels).tolist():
            yield rows[levels == level], self._tables(band, level)[0]

    def _level(self, band: int, carrier: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> Ints:
        """Return how many species at least do not bear each carrier, in coarse steps. [-]"""
        step = max(1, len(self.valid[band]) // _LEVELS)
        below = np.searchsorted(np.sort(self._of_species[band]), carrier, side="left")
        return np.asarray(below // step * step, dtype=np.int64)

    def _tables(self, band: int, level: int) -> tuple[list[Table | Stream], Ints]:
        if (band, level) not in self._cache:
            limits, p = self._of_species[band], self.problem
            valid = self.valid[band]
            if level:
                least = np.sort(limits)[level] if level < len(limits) else np.inf
                valid = valid[limits >= least]
            most = p.most_parts if len(valid) else 0
            self._cache[band, level] = network_tables(p.species[band][valid], most, False), valid
        return self._cache[band, level]
