"""Relay ladders: as few capacitors, and the same sets, as enumeration of every set and every subset finds."""

from __future__ import annotations

import math
import random

import numpy as np
import pytest
from tiny.brute_force_ladder import fewest

from partpick.search.ladder import Coil, Ladders, Span, least_pieces

MOST = 4
E6 = (1.0, 1.5, 2.2, 3.3, 4.7, 6.8)


def instance(seed: int) -> tuple[Span, float, float]:
    """Return a span with few values, an inductance and strays; often near what a ladder of four can do."""
    draw = random.Random(seed)
    high = draw.uniform(3e6, 20e6)
    low = high * draw.uniform(0.75, 0.98)
    step = (high - low) / draw.choice((1, 2, 3, 4, 5, 6, 7, 8))
    total = draw.uniform(20e-12, 120e-12)
    inductance = 1.0 / ((2 * math.pi * high) ** 2 * total)
    strays = total * draw.choice((0.05, 0.3, 0.6, 0.9, 1.0))
    pool = {e * scale * 1e-12 for e in E6 for scale in (1, 10)} | {round((total - strays) * 1e12, 1) * 1e-12}
    kept = sorted(draw.sample(sorted(value for value in pool if value > 0), k=6))
    leads = [draw.choice((0.0, 1.2e-9, 8e-9)) for _ in kept]
    stock = [draw.choice((1, 2, 9, 9, 9)) for _ in kept]
    span = Span(
        low=low, high=high, step=step, values=np.array(kept), series_inductance=np.array(leads), stock=np.array(stock)
    )
    return span, inductance, strays


def check(seed: int) -> int | None:
    span, inductance, strays = instance(seed)
    parts = list(zip(span.values.tolist(), span.series_inductance.tolist(), strict=True))
    want = fewest(inductance, strays, parts, span.stock.tolist(), span.low, span.high, span.step, MOST)
    coil = Coil(span, (inductance,) * 3, strays)
    search = Ladders(coil, lambda: False)
    bound = int(least_pieces(span, np.full((1, 3), inductance), np.array([strays]), MOST, np.zeros(1, np.int64))[0])
    for pieces in range(MOST + 1):
        found = {(s.base, s.switched) for s in search.of(pieces, 0, MOST, lambda _: True)}
        if found:
            assert want is not None and (pieces, found) == want, seed
            assert bound <= pieces, seed
            return pieces
    assert want is None, seed
    return None


def test_small_ladders_equal_enumeration() -> None:
    """Stock of one, parts of unlike inductance in series, strays that tune the upper end alone."""
    found = [check(seed) for seed in range(24)]
    assert {None, 2, 3} <= set(found)


@pytest.mark.slow
def test_many_small_ladders_equal_enumeration() -> None:
    """The same, many times."""
    found = [check(seed) for seed in range(1000, 1400)]
    assert {None, 1, 2, 3, 4} <= set(found)
