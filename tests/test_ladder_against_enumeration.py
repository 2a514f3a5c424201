"""Relay ladders: as few capacitors, and the same sets, as enumeration of every set and every subset finds."""

from __future__ import annotations

import math
import random
from pathlib import Path

import numpy as np
import pytest
from tiny.brute_force_ladder import fewest, rungs
from workbench import write_drawer

import partpick
from partpick.planfile import request_from_tables
from partpick.preferred import commonness
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


def first_of_one_coil(seed: int, folder: Path) -> bool:
    """Hold the first row of a whole run against every set of every size; return whether there is any."""
    draw = random.Random(seed)
    low = draw.uniform(3e6, 8e6)
    high = low * draw.uniform(1.02, 1.15)
    count = draw.choice((2, 3, 4, 5, 6))
    total = draw.uniform(40.0, 120.0)
    henry = 1.0 / ((2 * math.pi * high) ** 2 * total * 1e-12)
    pool = [e * scale for e in E6 for scale in (1, 10)]
    values = sorted({*draw.sample(pool[:8], 5), round(total - 10.0 - draw.uniform(0, 1), 1)})
    rows = [{"value": f"{value} pF", "grade": "C0G", "tolerance": "5 %", "q": 1000} for value in values]
    write_drawer(folder, capacitors=rows)
    tables = {
        "steps": {"from": low, "to": high, "step": (high - low) / count},
        "coil": {"measured": henry, "self_capacitance": 0},
        "stray": {"share": "none"},
        "limits": {"parts": 4},
    }
    result = partpick.solve(request_from_tables(tables, "bands"), partpick.load_catalogue(str(folder)), top=1)
    farads = [v * 1e-12 for v in values]
    found = fewest(henry, 10e-12, [(f, 0.0) for f in farads], [9] * len(farads), low, high, (high - low) / count, 4)
    if found is None:
        assert result.proof.status == "infeasible", seed
        return False
    (first,) = result.candidates
    assert (result.proof.status, first.part_count) == ("optimal", found[0]), seed
    ranked = []
    for base, switched in found[1]:
        all_rungs = rungs(henry, 10e-12, [(farads[i], 0.0) for i in base], [(farads[i], 0.0) for i in switched])
        wanted = [low + place * (high - low) / count for place in range(count + 1)]
        taken = [min(all_rungs, key=lambda f, w=w: abs(f - w)) for w in wanted]
        error = max(abs(f - w) / w for f, w in zip(taken, wanted, strict=True))
        share = max(10e-12 * henry * (2 * math.pi * f) ** 2 for f in taken)
        strays = 0 if share <= 0.1 else 1 if share <= 0.2 else 2
        common = sum(0 if round(values[i], 1) in pool else min(int(commonness(values[i])), 9) for i in base + switched)
        ranked.append((strays, common, error))
    strays, common, error = min(ranked)
    order = dict(first.order)
    assert (order["stray_class"], order["commonness"]) == (strays, common), (seed, order, sorted(ranked)[:3])
    assert abs(int(str(order["error_rank"])) - error * 1e9) <= 2, (seed, order, sorted(ranked)[:3])
    return True


def test_first_rows_of_one_coil_equal_enumeration(tmp_path: Path) -> None:
    """Fewest capacitors, the least share of strays, the commonest values, the least error: drawer to result."""
    assert {first_of_one_coil(seed, tmp_path / str(seed)) for seed in range(12)} == {True, False}


@pytest.mark.slow
def test_many_first_rows_of_one_coil_equal_enumeration(tmp_path: Path) -> None:
    """The same, many times."""
    assert {first_of_one_coil(seed, tmp_path / str(seed)) for seed in range(2000, 2200)} == {True, False}


@pytest.mark.slow
def test_many_small_ladders_equal_enumeration() -> None:
    """The same, many times."""
    found = [check(seed) for seed in range(1000, 1400)]
    assert {None, 1, 2, 3, 4} <= set(found)
