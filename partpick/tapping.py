"""Sections of coils for bands that may use a tap: which there are, and what acts across them."""

from __future__ import annotations

import numpy as np

from partpick.candidates import Coils, Ints, inside_as_wound, inside_in_circuit
from partpick.matching import suits_load
from partpick.oscillating import oscillator_source
from partpick.request import Request
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem
from partpick.search.taps import Sections, TappedSource

LEAST_TURNS = 3  # in a section; fewer cannot be tapped neatly


def column_source(request: Request, coils: Coils, problem: Problem) -> ColumnSource:
    """Return the columns of every coil, and of its tapped sections where the plan allows taps."""
    if problem.oscillator is not None:
        return oscillator_source(coils, problem)
    if not request.coil.taps:
        return ColumnSource(problem)
    wound = inside_as_wound(request, coils)
    counts = _section_counts(coils)

    def sections(chosen: Ints) -> Sections:
        coil = np.repeat(chosen, counts[chosen])
        first = np.repeat(np.cumsum(counts[chosen]) - counts[chosen], counts[chosen])
        turns = LEAST_TURNS + np.arange(len(coil)) - first
        row = coil - (coils.turns[coil] - turns)
        own = coils.section_self_capacitance(coil, turns)
        in_play = wound[coil] & inside_in_circuit(request, coils, coil, row, own) & suits_load(request, coils, row)
        loss, loss_low = (coils.section_loss(row, own, low_end=low_end) for low_end in (False, True))
        return Sections(coil, turns, row, own, loss, loss_low, in_play)

    return TappedSource(problem, sections, counts)


def _section_counts(coils: Coils) -> Ints:
    """Return how many sections of at least three whole turns each coil has, the whole coil not counted."""
    start, counts = 0, np.zeros(len(coils), dtype=np.int64)
    for block in coils.blocks:
        rows = slice(start, start + len(block))
        start += len(block)
        if block.tappable:
            counts[rows] = np.maximum(block.turns - LEAST_TURNS, 0)
    return counts
