"""What a shared set of capacitors may be put across at each band: any coil of the plan, or a section of it."""

from __future__ import annotations

import numpy as np

from partpick.search.places import PlaceMaker, spread
from partpick.search.problem import Bools, Floats, Ints


class SetMounts:
    """The places of some plans and the interval of each at each band, within an error of each plan."""

    def __init__(self, maker: PlaceMaker, coils: Ints, allowed: Bools, lead: Floats) -> None:
        """Take the plans and their largest error of interest.

        Parameters
        ----------
        maker : PlaceMaker
            Makes the places of coils.
        coils : (m, n) array
            The coils of each plan, -1 where there are fewer. [-]
        allowed : (m, n, B) array
            Which bands each of them may serve.
        lead : (m,) array
            Largest error of interest. [fraction of f]
        """
        self.coils = coils
        row, column = np.nonzero(coils >= 0)
        self.places = maker.of(coils[row, column])
        place, which = self.places.of(coils[row, column])
        self.place, self.row = place, row[which]
        self._allowed = allowed[row[which], column[which]]
        self.coil = self.places.coil[place]  # (n,) of the whole problem
        self.start = np.searchsorted(self.row, np.arange(len(coils) + 1))
        shape = (len(place), maker.problem.bands)
        self.low, self.high = np.empty(shape), np.empty(shape)
        self.bare: Bools = np.empty(shape, dtype=np.bool_)
        self.least, self.most = np.empty((len(coils), shape[1])), np.empty((len(coils), shape[1]))
        self.single = len(place) == len(coils)
        self.narrow(np.arange(len(coils)), lead)

    def __len__(self) -> int:
        return len(self.coils)

    def narrow(self, rows: Ints, lead: Floats) -> None:
        """Set the largest error of interest of some plans."""
        if not len(rows):
            return
        member, which = spread(self.start[rows], self.start[rows + 1])
        none, some = self.places.circuits.windows(lead[which], self.place[member])
        allowed = self._allowed[member]
        self.low[member], self.high[member] = np.where(allowed, some[0], np.inf), np.where(allowed, some[1], -np.inf)
        self.bare[member] = (none[0] <= 0) & (none[1] >= 0) & allowed
        low = np.where(self.bare[member], np.minimum(some[0], 0.0), self.low[member])
        first = np.searchsorted(which, np.arange(len(rows)))
        self.least[rows] = np.minimum.reduceat(low, first, axis=0)
        high = np.where(self.low[member] <= self.high[member], self.high[member], -np.inf)
        self.most[rows] = np.maximum.reduceat(high, first, axis=0)

    def at(self, band: int, rows: Ints) -> tuple[Ints, Ints]:
        """Return the usable mounts of each row at a band, and the position of the row: row by row."""
        if self.single:
            usable = self.bare[rows, band] | (self.low[rows, band] <= self.high[rows, band])
            which = np.flatnonzero(usable)
            return rows[which], which
        mount, which = spread(self.start[rows], self.start[rows + 1])
        usable = self.bare[mount, band] | (self.low[mount, band] <= self.high[mount, band])
        return mount[usable], which[usable]

    @property
    def widest(self) -> int:
        """The most mounts that a plan has at a band."""
        if self.single:
            return 1
        usable = self.bare | (self.low <= self.high)
        count = np.add.reduceat(usable.astype(np.int64), self.start[:-1], axis=0) if len(self) else np.ones((1, 1))
        return int(max(1, count.max()))
