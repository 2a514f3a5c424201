"""Which coils serve one band alone: such a coil's own adjustment is free for that band.

A coil that serves several bands is set once, and the rule for it is `Problem.coil_ends`. Which coil serves how
many bands is settled by trying: for each set of bands that adjustable coils may have to themselves, the columns
are restricted to it, and the best of all these choices is the best choice.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator

from partpick.search.columns import ColumnMaker
from partpick.search.figures import Columns


class _Served:
    """Columns where some coils have one band each to themselves and the others serve the rest."""

    def __init__(self, alone: ColumnMaker, shared: ColumnMaker, own: dict[int, int]) -> None:
        self.problem = alone.problem
        self._alone, self._shared = alone, shared
        self._coil_of = own  # by band

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return the columns of a coil at a band, none where another coil serves it or the coil another band."""
        if self._coil_of.get(band) == coil:
            return self._alone.columns(coil, band, parts, lead)
        if band in self._coil_of or coil in self._coil_of.values():
            return Columns.empty(self.problem.most_parts)
        return self._shared.columns(coil, band, parts, lead)

    def for_shared_coils(self) -> ColumnMaker | None:
        """Return nothing: this is settled here."""
        return None


def ways_to_serve(source: ColumnMaker, coils: tuple[int, ...]) -> Iterator[ColumnMaker]:
    """Yield columns that together hold every choice of these coils, each used at least once.

    The source's own columns, where the adjustment of the coils makes no difference or each has one band.
    """
    shared = source.for_shared_coils()
    if shared is None:
        yield source
        return
    bands_in_all = source.problem.bands
    adjustable = [coil for coil in coils if source.problem.coil_adjust[coil] > 0]
    if not adjustable or len(coils) == bands_in_all:
        yield source
        return
    for count in range(len(adjustable) + 1):
        if count == len(coils):
            break  # fewer coils than bands: some coil serves several
        for alone in itertools.combinations(adjustable, count):
            for bands in itertools.permutations(range(bands_in_all), count):
                own = dict(zip(bands, alone, strict=True))
                yield _Served(source, shared, own) if own else shared
