"""Bands that take one of several trimmers: the columns of every trimmer, each band choosing for itself.

With a given trimmer a band is as any other, so each trimmer has a source of columns of its own; they differ in
nothing but what the trimmer brings, and a bound is the least over all of them.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from partpick.search.columns import ColumnMaker, ColumnSource
from partpick.search.figures import Columns
from partpick.search.problem import NEVER, Bools, Floats, Ints

Merge = Callable[[Floats, Floats], Floats]


class TrimmerSource(ColumnSource):
    """Columns with every trimmer; the first source also makes those of bands that choose none."""

    def __init__(self, sources: Sequence[ColumnMaker], choosing: Bools, price: Ints) -> None:
        self.sources = sources
        self.choosing = choosing  # (B,)
        self.price = price  # (T,) hundredths
        self.problem = sources[0].problem

    def for_shared_coils(self) -> ColumnMaker | None:
        """Return the same for coils that serve several bands; None where that makes no difference."""
        shared = [source.for_shared_coils() for source in self.sources]
        known = [source for source in shared if source is not None]
        return TrimmerSource(known, self.choosing, self.price) if known else None

    def least_errors(self, parts: int) -> Floats:
        """Return the least size of error over all trimmers, (J, B). [-]"""
        return self._least([source.least_errors(parts) for source in self._whole()])

    def least_excesses(self, parts: int) -> Floats:
        """Return a lower bound of the excess over all trimmers, (J, B). [-]"""
        return self._least([source.least_excesses(parts) for source in self._whole()])

    def least_classes(self) -> tuple[Ints, Ints, Ints]:
        """Return the least Q, stray and reactance class over all trimmers, (J, B) each. [-]"""
        each = [source.least_classes() for source in self._whole()]
        first, second, third = (np.minimum.reduce(figure) for figure in zip(*each, strict=True))
        return first, second, third

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return every column with each of the trimmers."""
        if not self.choosing[band]:
            return self.sources[0].columns(coil, band, parts, lead)
        blocks = []
        for place, source in enumerate(self.sources):
            columns = source.columns(coil, band, parts, lead)
            if len(columns):
                price = np.minimum(columns.price + self.price[place], NEVER)
                blocks.append(replace(columns, price=price, trimmer=np.full(len(columns), place)))
        return Columns.join(blocks) if blocks else Columns.empty(self.problem.most_parts)

    def _whole(self) -> list[ColumnSource]:
        return [source for source in self.sources if isinstance(source, ColumnSource)]

    def _least(self, each: list[Floats]) -> Floats:
        least = each[0].copy()
        for other in each[1:]:
            least[:, self.choosing] = np.minimum(least[:, self.choosing], other[:, self.choosing])
        return least
