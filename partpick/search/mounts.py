"""What a stack's capacitors may be mounted on at each band: a coil or a section, and with what in series.

A stack is planned step by step: a step is one band on one of the plan's coils. At a step each plan has
its *mounts*, a place (`places.py`), for a swept band with a series padder or without, and for each the
interval that the capacitors across the coil must lie in.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.search.circuits import AnyInts, Windows
from partpick.search.figures import Columns
from partpick.search.grades import Grades
from partpick.search.places import PlaceMaker
from partpick.search.problem import Bools, Floats, Ints, Problem
from partpick.search.swept_circuits import SweptCircuits

Pattern = tuple[int, ...]  # (B,) which of the plan's coils each band uses


@dataclass(frozen=True)
class Step:
    """One band in the sequence in which the stacks of a plan are filled."""

    band: int
    slot: int  # which of the plan's coils
    fresh: bool  # the first of its stack: nothing is in circuit yet
    last: bool  # of its stack


def falling_bands(problem: Problem) -> list[int]:
    """Return the bands in the order of a stack: by target, swept bands by their lower end, highest first."""
    lowest = np.where(problem.swept, problem.low_end, problem.frequency)
    return sorted(range(problem.bands), key=lambda b: (-lowest[b], -problem.frequency[b], b))


def steps_of(problem: Problem, pattern: Pattern) -> tuple[Step, ...]:
    """Return the steps of a pattern: stack after stack, in each from the highest band down."""
    falling = falling_bands(problem)
    steps = []
    for slot in range(max(pattern) + 1):
        own = [band for band in falling if pattern[band] == slot]
        steps += [Step(band, slot, place == 0, place == len(own) - 1) for place, band in enumerate(own)]
    return tuple(steps)


@dataclass(frozen=True, eq=False)
class MountsOfStep:
    """Mounts at one step, plan by plan, (n,) each."""

    row: Ints  # the plan
    place: Ints
    padder: Ints  # part in series with the tuning element, -1: none
    low: Floats  # F, of the capacitors across the coil, where there is any capacitor
    high: Floats
    bare: Bools  # whether no capacitor at all will do
    start: Ints  # (m + 1,) first mount of each plan

    @property
    def single(self) -> bool:
        """Whether no plan has a choice of mounts."""
        return len(self.row) < 2 or bool((np.diff(self.row) > 0).all())


class Mounts:
    """The mounts of some plans of one pattern, at all steps, within an error (or excess) of each plan."""

    def __init__(self, maker: MountMaker, coils: Ints, steps: tuple[Step, ...], lead: Floats) -> None:
        """Take the coils of each plan, (m, slots), and the largest leading figure of interest, (m,)."""
        self.coils = coils
        self.steps = steps
        self.lead = lead.copy()
        self.maker = maker
        self.places = maker.places.of(coils.ravel())
        place, group = self.places.of(coils.ravel())
        self._place, self._row, self._slot = place, group // coils.shape[1], group % coils.shape[1]
        self._of_step: dict[int, MountsOfStep] = {}
        self._windows: Windows | None = None
        self.swept = SweptCircuits(self.places.problem, self.places.circuits) if maker.any_swept else None

    def __len__(self) -> int:
        return len(self.coils)

    def narrow(self, row: int, lead: float) -> None:
        """Leave out of one plan what is worse than something already found."""
        self.lead[row] = lead
        self._of_step.clear()
        self._windows = None

    def at(self, number: int) -> MountsOfStep:
        """Return the mounts of one step."""
        if number not in self._of_step:
            step = self.steps[number]
            made = self._swept(step) if self.maker.problem.swept[step.band] else self._fixed(step)
            self._of_step[number] = made
        return self._of_step[number]

    def _fixed(self, step: Step) -> MountsOfStep:
        if self._windows is None:
            lead = np.full(len(self), np.inf) if self.maker.problem.led_by_excess else self.lead
            self._windows = self.places.circuits.windows(lead[self._row], self._place)
        (bare_low, bare_high), (low, high) = ((a[:, step.band], b[:, step.band]) for a, b in self._windows)
        bare = (bare_low <= 0) & (bare_high >= 0)
        chosen = np.flatnonzero((self._slot == step.slot) & (bare | (low <= high)))
        none = np.full(len(chosen), -1, dtype=np.int64)
        return self._made(self._row[chosen], self._place[chosen], none, low[chosen], high[chosen], bare[chosen])

    def _swept(self, step: Step) -> MountsOfStep:
        assert self.swept is not None
        own = np.flatnonzero(self._slot == step.slot)
        excess = self.maker.problem.led_by_excess
        parts = self.swept.padders(step.band, self.maker.padders)
        if not self.maker.problem.most_parts:
            parts = parts[:0]
        padder = np.tile(np.append(-1, parts), len(own))
        own = np.repeat(own, len(parts) + 1)
        place, row = self._place[own], self._row[own]
        lead = self.lead[row] if excess else np.full(len(own), np.inf)
        low, high, bare_low = self.swept.windows(step.band, place, padder, lead)
        bare = (padder < 0) & (bare_low <= 0) & (high >= 0)
        keep = np.flatnonzero(bare | ((low <= high) & (high >= 0)))
        return self._made(row[keep], place[keep], padder[keep], low[keep], high[keep], bare[keep])

    def _made(self, row: Ints, place: Ints, padder: Ints, low: Floats, high: Floats, bare: Bools) -> MountsOfStep:
        start = np.searchsorted(row, np.arange(len(self) + 1))
        return MountsOfStep(row, place, padder, low, high, bare, start)

    def columns(self, number: int, place: Ints, parts: AnyInts, padder: Ints) -> tuple[Columns, Bools]:
        """Return the figures of circuits at one step, and whether each is inside every limit of the band.

        Coils and taps are those of the whole problem.
        """
        band = self.steps[number].band
        if self.maker.problem.swept[band]:
            assert self.swept is not None
            return self.swept.columns(place, band, parts, padder)
        return self.places.circuits.columns(place, np.full(len(place), band), parts)


class MountMaker:
    """What the mounts of all plans of a problem have in common."""

    def __init__(self, problem: Problem, places: PlaceMaker) -> None:
        self.problem = problem
        self.places = places
        self.any_swept = bool(problem.swept.any())
        grades = Grades(problem)
        useful = [part for options in problem.options for part in grades.useful(options)]
        self.padders = np.array(sorted(useful), dtype=np.int64)

    def mounts(self, coils: Ints, steps: tuple[Step, ...], lead: Floats) -> Mounts:
        """Return the mounts of plans with some coils, (m, slots), within a leading figure, (m,)."""
        return Mounts(self, coils, steps, lead)

