"""What a stack on each coil needs at least: capacitors from one band to the next, errors, classes.

Everything here is a bound over the coil's places and, for swept bands, over all series padders; what is
between two neighbouring bands of a stack is told for each pair of bands, so that a stack on any of the
bands is bounded by adding up.
"""

from __future__ import annotations

import numpy as np

from partpick.search.attempts import grid_errors
from partpick.search.bounds import IMPOSSIBLE
from partpick.search.figures import quality_class, stray_class
from partpick.search.mounts import MountMaker, falling_bands
from partpick.search.places import Places
from partpick.search.problem import Floats, Ints, Problem
from partpick.search.sum_tables import SumTables
from partpick.search.swept_circuits import SweptCircuits

Interval = tuple[Floats, Floats]

PLENTY_OF_FARAD = 1.0


class StackReach:
    """Bounds of every coil, (J, ...) each."""

    def __init__(self, problem: Problem, maker: MountMaker) -> None:
        self.problem = problem
        self.maker = maker
        self.falling = falling_bands(problem)
        shape = problem.wanted.shape
        self.q_class, self.stray_class, self.reactance_class = (np.zeros(shape, dtype=np.int64) for _ in range(3))
        self.least_error = np.zeros(shape)  # whatever the sum of the capacitors
        self.least_alone = np.zeros(shape)  # the band's own capacitors alone in circuit
        self.sums = SumTables(problem.species, self._highest()[None, :], 1 << 17)
        self.needs: dict[tuple[int, int], Ints] = {}  # (band before or -1, band): capacitors added at least
        for places in maker.places.blocks():
            self._add(places)

    def _highest(self) -> Floats:
        """Return the largest sum of use at each band of any coil, more than enough where there are sections. [F]"""
        if self.maker.places.tapped is not None:
            return np.full(self.problem.bands, PLENTY_OF_FARAD)
        highest = np.zeros(self.problem.bands)
        places = next(self.maker.places.blocks())
        for band in range(self.problem.bands):
            _, (_, high) = self._intervals(places, band)
            highest[band] = max(highest[band], float(high[np.isfinite(high)].max(initial=0.0)))
        return highest

    def _intervals(self, places: Places, band: int) -> tuple[Interval, Interval]:
        """Return the intervals of each place at a band, over all padders, without and with capacitors."""
        if not self.problem.swept[band]:
            none, some = places.circuits.limits
            return (none[0][:, band], none[1][:, band]), (some[0][:, band], some[1][:, band])
        swept = SweptCircuits(places.problem, places.circuits)
        every = np.arange(len(places))
        free = np.full(len(places), np.inf)
        low, high = np.full(len(places), np.inf), np.full(len(places), -np.inf)
        bare: Interval = low.copy(), high.copy()
        for padder in [-1, *swept.padders(band, self.maker.padders).tolist()]:
            least, most, bare_low = swept.windows(band, every, np.full(len(places), padder), free)
            if padder < 0:
                bare = np.where(most >= 0, bare_low, np.inf), np.where(most >= bare_low, most, -np.inf)
            inside = (least <= most) & (most >= 0)
            low = np.where(inside, np.minimum(low, least), low)
            high = np.where(inside, np.maximum(high, most), high)
        return bare, (low, high)

    def _add(self, places: Places) -> None:
        """Fill in the bounds of the coils of one block."""
        p, own = self.problem, places.problem
        first = places.start[:-1]
        rows = places.asked
        loss = np.where(p.swept[None, :], np.maximum(own.coil_loss, own.coil_loss_low), own.coil_loss)
        error = np.minimum(p.error_limit, 0.999)[None, :]
        most = np.where(p.swept[None, :], own.most_at_high_end, own.wanted / (1 - error) ** 2)
        strays = own.self_capacitance[:, None] + p.stray[None, :]
        least = grid_errors(own, places.circuits.acting)
        self.least_error[rows] = np.minimum.reduceat(least, first, axis=0)
        self.q_class[rows] = np.minimum.reduceat(quality_class(loss, p.q_enough[None, :]), first, axis=0)
        self.stray_class[rows] = np.minimum.reduceat(stray_class(strays / most), first, axis=0)
        self.reactance_class[rows] = np.minimum.reduceat(own.reactance_class, first, axis=0)
        hulls = []
        intervals = [self._intervals(places, band) for band in range(p.bands)]
        for none, some in intervals:
            bare = (none[0] <= 0) & (none[1] >= 0)
            low = np.where(bare, np.minimum(some[0], 0.0), some[0])
            high = np.where(bare, np.maximum(some[1], 0.0), some[1])
            hulls.append((np.minimum.reduceat(low, first), np.maximum.reduceat(high, first)))
        which = np.repeat(np.arange(len(rows)), np.diff(places.start))
        pairs = zip(self.falling, self.falling[1:], strict=False)
        if p.inductors > 1:
            pairs = ((one, two) for at, one in enumerate(self.falling) for two in self.falling[at + 1 :])  # type: ignore[assignment]
        starts = self.falling if p.inductors > 1 else self.falling[:1]
        nothing = np.zeros(len(rows)), np.zeros(len(rows))
        for before, band, reach in [
            *((-1, band, nothing) for band in starts),
            *((one, two, self._at_next(hulls[one], one, two)) for one, two in pairs),
        ]:
            none, some = intervals[band]
            fewest = self._fewest(band, before, some, (reach[0][which], reach[1][which]))
            if before < 0:
                fewest[(none[0] <= 0) & (none[1] >= 0)] = 0
            table = self.needs.setdefault((before, band), np.full(p.coils, IMPOSSIBLE, dtype=np.int64))
            table[rows] = np.minimum.reduceat(fewest, first)
        for band in starts:
            if not p.swept[band]:
                self.least_alone[rows, band] = np.minimum.reduceat(self._alone(places, band), first)

    def _fewest(self, band: int, before: int, some: Interval, reach: Interval) -> Ints:
        """Return the fewest capacitors that bring each place from what was in circuit into its interval."""
        p = self.problem
        low, high = some
        fewest = np.full(len(low), IMPOSSIBLE, dtype=np.int64)
        left = np.flatnonzero(low <= high)
        if p.swept[band]:  # a series padder may be all
            fewest[left] = 1 if p.most_parts else IMPOSSIBLE
            return fewest
        for added in range(1, p.most_parts + 1):
            inside = self.sums.any_inside(band, added, low[left] - reach[1][left], high[left] - reach[0][left])
            fewest[left[inside]] = added
            left = left[~inside]
        return fewest

    def _at_next(self, hull: Interval, band: int, following: int) -> Interval:
        """Return the interval of a band as its parts act at the next one. [F]"""
        here, there = self.problem.species[band], self.problem.species[following]
        both = np.isfinite(here) & np.isfinite(there)
        ratio = there[both] / here[both]
        least, most = float(ratio.min(initial=1.0)), float(ratio.max(initial=1.0))
        low, high = hull
        return np.maximum(low, 0.0) * least * (1 - 1e-12), np.maximum(high, 0.0) * most * (1 + 1e-12)

    def _alone(self, places: Places, band: int) -> Floats:
        """Return the least error of each place where the band's own capacitors stand alone, (p,)."""
        p, own = self.problem, places.problem
        if p.lead_inductance > 0 or not self.sums.complete(band, p.most_parts):
            return np.zeros(len(places))
        fixed = own.fixed_capacitance()[:, band]
        best = np.full(len(places), np.inf)
        for sums in self.sums.stored(band)[: p.most_parts + 1]:
            place = np.searchsorted(sums, own.wanted[:, band] - fixed)
            for side in (np.maximum(place - 1, 0), np.minimum(place, len(sums) - 1)):
                total = np.maximum(fixed + sums[side], 1e-30)
                best = np.minimum(best, np.abs(np.sqrt(own.wanted[:, band] / total) - 1.0))
        return best

    def least_pieces(self, bands: tuple[int, ...]) -> Ints:
        """Return the fewest capacitors of a stack on some bands for each coil, (J,); IMPOSSIBLE and more: none."""
        own = [band for band in self.falling if band in bands]
        before = [-1, *own[:-1]]
        return np.asarray(sum(self.needs[pair] for pair in zip(before, own, strict=True)))

    def worst_error(self, bands: tuple[int, ...]) -> Floats:
        """Return an error that no stack on some bands gets below, (J,)."""
        own = [band for band in self.falling if band in bands]
        return np.maximum(self.least_error[:, own].max(axis=1), self.least_alone[:, own[0]])

    def least_of_any(self) -> Ints:
        """Return the fewest capacitors that a band adds to any band above it, on any coil, (B,)."""
        least = np.full(self.problem.bands, IMPOSSIBLE, dtype=np.int64)
        for (_, band), table in self.needs.items():
            least[band] = min(least[band], int(table.min(initial=IMPOSSIBLE)))
        return least
