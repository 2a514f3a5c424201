"""Bands of a tiny problem that choose a trimmer, each trimmer tried after the other: shares no code with the search."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace

import numpy as np

from partpick.search.problem import NEVER, Problem
from tiny.brute_force import band_columns
from tiny.brute_force_alignment import aligned_columns


@dataclass(frozen=True)
class Piece:
    """One trimmer on offer."""

    low: float
    high: float
    loss: float
    tempco: float
    tempco_spread: float
    price: int
    stock: int


def with_piece(problem: Problem, choosing: np.ndarray, piece: Piece) -> Problem:
    """Return the problem with one trimmer in the bands that choose."""

    def here(value, elsewhere):
        return np.where(choosing, value, elsewhere)

    return replace(
        problem,
        trimmer_low=here(piece.low, problem.trimmer_low),
        trimmer_high=here(piece.high, problem.trimmer_high),
        trimmer_loss=here(piece.loss, problem.trimmer_loss),
        trimmer_tempco=here(piece.tempco, problem.trimmer_tempco),
        trimmer_tempco_spread=here(piece.tempco_spread, problem.trimmer_tempco_spread),
    )


def columns_with_trimmers(choosing: np.ndarray, pieces: list[Piece], most_share: float):
    """Return what makes the columns of a coil at a band, with every trimmer where the band chooses."""

    def columns(problem: Problem, coil: int, band: int) -> list[dict]:
        of = aligned_columns if problem.alignable == 1.0 and problem.aligned[band] else band_columns
        if not choosing[band]:
            return of(problem, coil, band)
        found = []
        for place, piece in enumerate(pieces):
            variant = with_piece(problem, choosing, piece)
            for column in of(variant, coil, band):
                if (piece.high - piece.low) > most_share * column["total"] * (1 + 1e-11):
                    continue
                found.append({**column, "trimmer": place, "price": min(column["price"] + piece.price, NEVER)})
        return found

    return columns


def in_stock(pieces: list[Piece], columns: tuple[dict, ...]) -> bool:
    """Return whether there are as many of each trimmer as a plan takes."""
    used = Counter(column["trimmer"] for column in columns if "trimmer" in column)
    return all(count <= pieces[place].stock for place, count in used.items())
