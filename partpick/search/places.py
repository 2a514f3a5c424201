"""Where the capacitors of a band may go: across a whole coil, or across one of its tapped sections.

A place acts as a coil of its own: other inductance, loss and self-capacitance. The places of some coils
are the rows of a second problem, made for as many coils as are looked at together.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from partpick.search.circuits import Circuits
from partpick.search.columns import ColumnSource
from partpick.search.problem import Bools, Ints, Problem
from partpick.search.taps import Sections, TappedSource, section_problem

_ROOM = 600_000  # places times bands figured at a time


@dataclass(frozen=True, eq=False)
class Places:
    """The places of some coils, (p,) each, those of a coil one after the other."""

    problem: Problem  # whose coils are the places
    circuits: Circuits
    coil: Ints  # of the whole problem
    tap: Ints  # turns of the section, 0: the whole coil
    start: Ints  # (c + 1,) first place of each coil that was asked for
    asked: Ints  # (c,) the coils, rising

    def of(self, coils: Ints) -> tuple[Ints, Ints]:
        """Return the place of each choice, and which of the coils it belongs to: coil by coil.

        Parameters
        ----------
        coils : (m,) array
            Coils, repeats allowed, all among those asked for. [-]
        """
        which = np.searchsorted(self.asked, coils)
        return spread(self.start[which], self.start[which + 1])

    def __len__(self) -> int:
        return len(self.coil)


def spread(first: Ints, after: Ints) -> tuple[Ints, Ints]:
    """Return every whole number of some ranges, and the range it comes from, range by range."""
    times = after - first
    which = np.repeat(np.arange(len(times)), times)
    offset = np.arange(len(which)) - np.repeat(np.cumsum(times) - times, times)
    return first[which] + offset, which


class PlaceMaker:
    """Makes the places of some coils."""

    def __init__(self, problem: Problem, source: ColumnSource | None) -> None:
        self.problem = problem
        self.tapped = source if isinstance(source, TappedSource) and source.counts.any() else None
        every = np.arange(problem.coils)
        self.circuits = Circuits(problem)
        self._whole = Places(
            problem, self.circuits, every, np.zeros_like(every), np.arange(problem.coils + 1), every
        )

    def of(self, coils: Ints) -> Places:
        """Return the places of some coils, repeats allowed."""
        if self.tapped is None:
            return self._whole
        asked = np.unique(coils)
        sections = self._whole_and_sections(asked)
        problem = section_problem(self.problem, sections)
        start = np.searchsorted(sections.coil, np.append(asked, self.problem.coils))
        return Places(problem, Circuits(problem), sections.coil, sections.turns, start, asked)

    def rows_at_once(self, coils: int) -> int:
        """Return how many plans of so many coils each are worth looking at together. [-]"""
        if self.tapped is None:
            return max(1, 4 * _ROOM // (self.problem.bands * coils))
        each = 1 + int(self.tapped.counts.mean())
        return max(16, _ROOM // (self.problem.bands * coils * each))

    def blocks(self) -> Iterator[Places]:
        """Yield the places of every coil, some coils at a time."""
        if self.tapped is None:
            yield self._whole
            return
        block = np.cumsum(self.tapped.counts + 1) // max(1, _ROOM // self.problem.bands)
        for coils in np.split(np.arange(self.problem.coils), np.flatnonzero(np.diff(block)) + 1):
            if len(coils):
                yield self.of(coils)

    def _whole_and_sections(self, coils: Ints) -> Sections:
        assert self.tapped is not None
        p, made = self.problem, self.tapped.sections(coils)
        nothing = np.zeros((len(coils), p.bands))
        sections = Sections(
            coil=np.concatenate([coils, made.coil]),
            turns=np.concatenate([np.zeros_like(coils), made.turns]),
            row=np.concatenate([coils, made.row]),
            self_capacitance=np.concatenate([p.self_capacitance[coils], made.self_capacitance]),
            in_play=np.concatenate([p.in_play[coils], made.in_play]),
            further_loss=np.concatenate([nothing, made.further_loss]),
            further_loss_low=np.concatenate([nothing, made.further_loss_low]),
        )
        order = np.lexsort((sections.turns, sections.coil))
        order = order[(sections.turns[order] == 0) | self._of_use(sections)[order]]
        return Sections(*(getattr(sections, name)[order] for name in Sections.__dataclass_fields__))

    def _of_use(self, sections: Sections) -> Bools:
        """Whether a section is in play at some band where it leaves room for capacitors, or needs none, (v,)."""
        p = self.problem
        limit = np.where(p.swept, 0.0, np.minimum(p.error_limit, 1.0 - 1e-9))
        fixed = sections.self_capacitance[:, None] + (p.stray + (p.trimmer_low + p.trimmer_high) / 2)[None, :]
        room = p.wanted[sections.row] / (1.0 - limit[None, :]) ** 2 * (1 + 1e-9) >= fixed
        return np.asarray((room & sections.in_play).any(axis=1))
