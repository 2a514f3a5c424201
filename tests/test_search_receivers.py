"""The search of receivers against plain enumeration: every rank, every step of the order, the front."""

from __future__ import annotations

import numpy as np
import pytest
from tiny.brute_force_receiver import ranking
from tiny.random_receiver import random_receiver

from partpick.progress import Quiet
from partpick.search.columns import ColumnSource
from partpick.search.receivers import search_receivers
from partpick.search.tracking import curve_of

SHAPES = {
    "one band": {"bands": 1},
    "one band under limits of the plan": {"bands": 1, "coupled": True},
    "two bands": {"bands": 2},
}


def agree(seed: int, shape: dict[str, int]) -> int:
    """Compare one receiver, return how many rows it has; -1 where the search does not say that it is certain."""
    problem, bands = random_receiver(seed, **shape)
    wanted, front = ranking(problem, bands)
    found = search_receivers(
        problem, ColumnSource(problem), bands=bands, wanted=500, all_windings=False, monitor=Quiet()
    )
    if found.stopped_by is not None:
        return -1
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = []
    for choice in found.front:
        shares = []
        for place, band in enumerate(bands):
            pair = choice.columns[2 * place], choice.columns[2 * place + 1]
            shares.append(np.abs(curve_of(problem, band, pair)[1]).max() / band.limit)
        pieces = len(choice.coils) + sum(int((columns.parts[0] >= 0).sum()) for columns in choice.columns)
        got.append((pieces, max(shares)))
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [error for _, error in got] == pytest.approx([error for _, error in front], abs=2e-9)
    return len(wanted)


# seeds of the usual run, seeds of the long one, and how many of each must have an answer
SAMPLES = {
    "one band": (30, 400, 6, 80),
    "one band under limits of the plan": (40, 400, 4, 40),
    "two bands": (12, 200, 2, 30),
}


@pytest.mark.parametrize("name", SHAPES)
def test_every_rank_and_the_front_equal_plain_enumeration(name: str) -> None:
    """Padders, coils and networks are enumerated with loops that know no window."""
    seeds, _, answered, _ = SAMPLES[name]
    sizes = [agree(seed, SHAPES[name]) for seed in range(seeds)]
    assert sum(size > 0 for size in sizes) >= answered, "the sample must hold receivers, not only refusals"


@pytest.mark.slow
@pytest.mark.parametrize("name", SHAPES)
def test_many_receivers_equal_plain_enumeration(name: str) -> None:
    """The same over some hundreds of receivers of each shape."""
    first, last, _, answered = SAMPLES[name]
    sizes = [agree(seed, SHAPES[name]) for seed in range(first, last)]
    assert sum(size > 0 for size in sizes) >= answered
