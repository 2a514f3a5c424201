"""Bands that may use a tap of their coil: the columns of every tap, under the coil they belong to.

A tapped section acts as a coil of its own at its band: other inductance, loss and self-capacitance, the
same former and wire. Its figures come as rows of a second problem, made for a few coils at a time.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from partpick.progress import Monitor, Quiet
from partpick.search.choose import Stopped
from partpick.search.columns import ColumnSource
from partpick.search.figures import Columns
from partpick.search.problem import Bools, Floats, Ints, Problem

_BLOCK = 200_000  # sections figured at a time


@dataclass(frozen=True, eq=False)
class Sections:
    """The tapped sections of some coils, (v,) each: coil, turns, and the figures that differ from the coil's."""

    coil: Ints
    turns: Ints
    row: Ints  # of the problem: the coil of as many turns, whose inductance and loss the section has
    self_capacitance: Floats  # F across the section, the idle turns included
    further_loss: Floats  # (v, B) 1/Q, what the idle turns lose beyond the loss of `row`
    further_loss_low: Floats  # (v, B) at the lower end of swept bands
    in_play: Bools  # (v, B)


SectionMaker = Callable[[Ints], Sections]


class TappedSource(ColumnSource):
    """Columns of whole coils and of every tapped section."""

    def __init__(self, problem: Problem, sections: SectionMaker, counts: Ints) -> None:
        super().__init__(problem)
        self.sections = sections
        self.counts = counts  # (J,) sections of each coil
        self.monitor: Monitor = Quiet()  # whoever searches puts its own here: millions of sections take a while
        self._of_coil = lru_cache(maxsize=256)(self._one_coil)

    def with_problem(self, problem: Problem) -> TappedSource:
        """Return the columns of the same coils and sections under other rules."""
        made = TappedSource(problem, self.sections, self.counts)
        made.monitor = self.monitor
        return made

    def least_errors(self, parts: int) -> Floats:
        """Return the least size of error over the whole coil and its sections, (J, B). [-]"""
        best = super().least_errors(parts)
        for sections, source in self._blocks():
            np.minimum.at(best, sections.coil, source.least_errors(parts))
        return best

    def least_excesses(self, parts: int) -> Floats:
        """Return a lower bound of the excess over the whole coil and its sections, (J, B). [-]"""
        best = super().least_excesses(parts)
        if self.problem.swept.any():
            for sections, source in self._blocks():
                np.minimum.at(best, sections.coil, source.least_excesses(parts))
        return best

    def least_classes(self) -> tuple[Ints, Ints, Ints]:
        """Return the least Q, stray and reactance class over the whole coil and its sections, (J, B) each. [-]"""
        best = super().least_classes()
        for sections, source in self._blocks():
            for whole, section in zip(best, source.least_classes(), strict=True):
                np.minimum.at(whole, sections.coil, section)
        return best

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return every column of the whole coil and of each of its sections."""
        blocks = [super().columns(coil, band, parts, lead)]
        if self.counts[coil]:
            sections, source, reach = self._of_coil(coil)
            for row in np.flatnonzero(np.isfinite(reach[parts][:, band])):
                columns = source.columns(int(row), band, parts, lead)
                if len(columns):
                    whole = np.zeros(len(columns), dtype=np.int64)
                    turns = int(sections.turns[row])
                    blocks.append(replace(columns, coil=whole + coil, tap=whole + turns))
        return Columns.join(blocks)

    def _one_coil(self, coil: int) -> tuple[Sections, ColumnSource, list[Floats]]:
        sections = self.sections(np.array([coil]))
        source = self.sharing_tables(self._sections_alone(sections))
        return sections, source, [source.least_errors(parts) for parts in range(self.problem.most_parts + 1)]

    def _blocks(self) -> Iterator[tuple[Sections, ColumnSource]]:
        """Yield the sections of all coils, some coils at a time."""
        coils = np.flatnonzero(self.counts)
        if not len(coils):
            return
        block = np.cumsum(self.counts[coils]) // _BLOCK
        for piece in np.split(coils, np.flatnonzero(np.diff(block)) + 1):
            reason = self.monitor.stopped()
            if reason is not None:
                raise Stopped(reason)
            sections = self.sections(piece)
            yield sections, self.sharing_tables(self._sections_alone(sections))

    def _sections_alone(self, sections: Sections) -> Problem:
        """Return the problem whose coils are the sections."""
        return section_problem(self.problem, sections)


def section_problem(problem: Problem, sections: Sections) -> Problem:
    """Return the problem whose coils are the sections."""
    own, row = sections.coil, sections.row
    return replace(
        problem,
        wanted=problem.wanted[row],
        self_capacitance=sections.self_capacitance,
        in_play=sections.in_play,
        coil_loss=problem.coil_loss[row] + sections.further_loss,
        reactance_class=problem.reactance_class[row],
        inductance_low=problem.inductance_low[row],
        coil_loss_low=problem.coil_loss_low[row] + sections.further_loss_low,
        coil_tempco=problem.coil_tempco[row],
        coil_tempco_spread=problem.coil_tempco_spread[own],
        coil_spread=problem.coil_spread[own],
        coil_adjust=problem.coil_adjust[own],
        drive=None if problem.drive is None else problem.drive.of_coils(own),
        effort=problem.effort[own],
        coil_price=problem.coil_price[own],
        support=problem.support[own],
        coil_rank=problem.coil_rank[own],
    )
