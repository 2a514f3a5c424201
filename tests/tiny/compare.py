"""A search of bands held against plain enumeration: every rank, every key, and the front."""

from __future__ import annotations

from collections.abc import Sequence

import pytest

from partpick.progress import Quiet
from partpick.search.bands import leading_figure, search_bands
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem


def equals_enumeration(
    problem: Problem,
    source: ColumnSource,
    wanted: Sequence[tuple[object, ...]],
    front: Sequence[tuple[int, float]],
    seed: int,
) -> None:
    """Fail where the search finds other plans, in another order, or another front."""
    found = search_bands(problem, source, wanted=100, all_windings=False, monitor=Quiet())
    assert found.stopped_by is None
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}, by {problem.by}"
    got = [
        (
            len(choice.coils) + sum(int((columns.parts[0] >= 0).sum()) for columns in choice.columns),
            leading_figure(problem, choice),
        )
        for choice in found.front
    ]
    assert [pieces for pieces, _ in got] == [pieces for pieces, _ in front], f"front of seed {seed}"
    assert [lead for _, lead in got] == pytest.approx([lead for _, lead in front], abs=1e-12)
