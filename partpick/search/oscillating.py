"""Columns of oscillators: a capacitive divider in every network, or a tap of the coil at the common terminal."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from partpick.search.columns import ColumnSource
from partpick.search.coverage import LeastExcess
from partpick.search.divided import CLAPPED, DIVIDED
from partpick.search.dividers import divided_tables
from partpick.search.figures import Columns
from partpick.search.networks import Stream, Table, network_tables
from partpick.search.problem import PLENTY, Floats, Ints, Oscillator, Problem
from partpick.search.split import SplitColumns, SplitExcess
from partpick.search.swept import SweptColumns
from partpick.search.taps import Sections, TappedSource, section_problem


class DividedSource(ColumnSource):
    """Columns with a divider of two capacitors, three in a Clapp circuit whose frequency is fixed."""

    def _networks_of(self, values: Floats, band: int) -> list[Table | Stream]:
        oscillator, most = self.problem.oscillator, self.problem.most_parts if len(values) else 0
        assert oscillator is not None
        if oscillator.circuit == "clapp" and self.problem.swept[band]:  # the divider stands with the tuning element
            return network_tables(values, max(0, most - 2), connect_any=False)
        shape = CLAPPED if oscillator.circuit == "clapp" else DIVIDED
        return divided_tables(values, most, shape, oscillator.device)

    def _for_swept_bands(self) -> tuple[SweptColumns, LeastExcess]:
        oscillator = self.problem.oscillator
        assert oscillator is not None
        if oscillator.circuit != "clapp":
            return super()._for_swept_bands()
        return (
            SplitColumns(self.problem, self.tables, self.valid, self.grades, self.gain),
            SplitExcess(self.problem, self.tables, self.valid),
        )


@dataclass(frozen=True, eq=False)
class CommonTaps(Sections):
    """Coils with their common terminal at a turn; all turns are in circuit, `turns` those at the output, (v,) each."""

    output_turns: Floats  # share of the turns
    output_share: Floats  # of the inductance
    control_share: Floats
    mutual_share: Floats


TapMaker = Callable[[Ints], CommonTaps]


class HartleySource(TappedSource):
    """Columns of coils with every tap at which they start."""

    def __init__(self, problem: Problem, taps: TapMaker, counts: Ints) -> None:
        super().__init__(problem, taps, counts)
        oscillator = problem.oscillator
        assert oscillator is not None
        self._taps = taps
        self._alike = oscillator.device == (0.0, 0.0)  # a tap then decides on nothing but whether it starts
        self._bare = self.sharing_tables(replace(problem, oscillator=None))

    def least_errors(self, parts: int) -> Floats:
        """Return the least size of error over all taps, (J, B). [-]"""
        if self._alike:
            return ColumnSource.least_errors(self, parts)
        best = np.full(self.problem.wanted.shape, np.inf)
        for taps, source in self._blocks():
            np.minimum.at(best, taps.coil, source.least_errors(parts))
        return best

    def least_excesses(self, parts: int) -> Floats:
        """Return a lower bound of the excess over all taps, (J, B). [-]"""
        if self._alike or not self.problem.swept.any():
            return ColumnSource.least_excesses(self, parts)
        best = np.where(self.problem.swept[None, :], np.inf, np.zeros(self.problem.wanted.shape))
        for taps, source in self._blocks():
            np.minimum.at(best, taps.coil, source.least_excesses(parts))
        return best

    def least_classes(self) -> tuple[Ints, Ints, Ints]:
        """Return the least Q, stray and reactance class, (J, B) each. [-]"""
        return ColumnSource.least_classes(self)  # a tap adds capacitance of the device, never less

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return every column of the coil with each tap at which it starts; of equal ones the first tap alone."""
        none = Columns.empty(self.problem.most_parts)
        most = len(self._bare.columns(coil, band, parts, lead)) if self._alike and self.counts[coil] else PLENTY
        if not self.counts[coil] or not most:
            return none
        taps, source, _ = self._of_coil(coil)
        blocks, known = [none], set[bytes]()
        for row in range(len(taps.turns)):
            if len(known) >= most:
                break
            columns = source.columns(row, band, parts, lead)
            if self._alike:
                spelled = [line.tobytes() for line in np.column_stack([columns.parts, columns.series, columns.shape])]
                columns = columns.take(np.array([line not in known for line in spelled], dtype=np.bool_))
                known.update(spelled)
            if len(columns):
                whole = np.zeros(len(columns), dtype=np.int64)
                blocks.append(replace(columns, coil=whole + coil, tap=whole + int(taps.turns[row])))
        return Columns.join(blocks)

    def _sections_alone(self, sections: Sections) -> Problem:
        assert isinstance(sections, CommonTaps)
        problem, oscillator = self.problem, self.problem.oscillator
        assert oscillator is not None
        of_taps: Oscillator = replace(
            oscillator,
            coil_loss=oscillator.coil_loss[sections.row],
            coil_loss_low=oscillator.coil_loss_low[sections.row],
            output_turns=sections.output_turns,
            output_share=sections.output_share,
            control_share=sections.control_share,
            mutual_share=sections.mutual_share,
        )
        return replace(section_problem(problem, sections), oscillator=of_taps)
