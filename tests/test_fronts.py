"""Fronts of two criteria against plain enumeration of every plan of a small drawer."""

from __future__ import annotations

import itertools
import json
import math
from pathlib import Path

import numpy as np
import pytest
from workbench import Row, plan, run, write_drawer

from partpick.fronts import PAIRS

STRAY = 10e-12


def small(folder: Path, seed: int) -> tuple[Path, Path, list[tuple[float, float]], list[tuple[float, float, float]]]:
    """Return a drawer of four capacitors and two chokes, and a plan of two bands that some of them serve."""
    rng = np.random.default_rng(seed)
    farads = sorted(rng.choice([22, 33, 47, 68, 82, 100, 120, 150], 4, replace=False).tolist())
    parts = [(c * 1e-12, int(rng.integers(5, 60)) / 100) for c in farads]
    chokes = [(float(h) * 1e-6, 1e-12, int(rng.integers(50, 300)) / 100) for h in rng.choice([2.2, 3.3, 4.7], 2, False)]
    capacitors: list[Row] = [
        {"value": f"{c * 1e12:g} pF", "grade": "C0G", "tolerance": "5 %", "q": 1000, "unit_price": price}
        for c, price in parts
    ]
    inductors: list[Row] = [
        {"value": f"{h * 1e6:g} µH", "tolerance": "5 %", "q": 90, "self_capacitance": "1 pF", "unit_price": price,
         "label": f"choke {h * 1e6:g}"}
        for h, _, price in chokes
    ]  # fmt: skip
    drawer = write_drawer(folder / "drawer", capacitors=capacitors, inductors=inductors, formers=(), wires=())
    h, own, _ = chokes[0]
    nets = rng.choice([c for c, _ in parts], 2, replace=False) + rng.choice([0.0, parts[0][0]], 2)
    at = [1 / (2 * math.pi * math.sqrt(h * (net + STRAY + own))) * (1 + rng.uniform(-0.01, 0.01)) for net in nets]
    bands = [(name, f"{f / 1e6:.6f} MHz") for name, f in zip(("one", "two"), at, strict=True)]
    head = '[limits]\nerror = "4 %"\nparts_per_band = 3\n[stray]\nshare = "none"\n[coil]\nself_resonance = "none"\n'
    return drawer, plan(folder / "plan.toml", bands, head), parts, chokes


def every_plan(at: list[float], parts: list[tuple[float, float]], chokes: list[tuple[float, float, float]]):
    """Yield (values, pieces, price, error) of every plan inside the limits, by loops alone."""
    nets = [n for k in range(4) for n in itertools.combinations_with_replacement(range(len(parts)), k)]
    for inductance, own, price in chokes:
        fits = []
        for target in at:
            inside = []
            for net in nets:
                total = sum(parts[i][0] for i in net) + STRAY + own
                error = abs(1 / (2 * math.pi * math.sqrt(inductance * total)) / target - 1)
                if error <= 0.04:
                    inside.append((net, error))
            fits.append(inside)
        for (first, one), (second, two) in itertools.product(*fits):
            used = first + second
            cost = price + sum(parts[i][1] for i in used)
            yield {"values": len(set(used)), "pieces": len(used) + 1, "price": cost, "error": max(one, two)}


def plain_front(plans: list[dict[str, float]], limited: str, least: str, same: float) -> list[tuple[float, float]]:
    points = []
    for most in sorted({p[limited] for p in plans}):
        best = min(p[least] for p in plans if p[limited] <= most)
        if not points or best < points[-1][1] - same:
            points.append((most, best))
    return points[::-1]


@pytest.mark.parametrize("pair", PAIRS)
def test_a_front_is_every_plan_that_no_other_beats_in_both(pair: str, tmp_path: Path) -> None:
    """A point left out would be a choice that the builder never hears of."""
    assert max(compared(pair, seed, tmp_path) for seed in range(6)) > 1


@pytest.mark.slow
@pytest.mark.parametrize("pair", PAIRS)
def test_a_front_is_every_plan_that_no_other_beats_in_both_at_length(pair: str, tmp_path: Path) -> None:
    """The same over more drawers than the default suite has time for."""
    assert max(compared(pair, seed, tmp_path) for seed in range(100, 180)) > 1


def compared(pair: str, seed: int, tmp_path: Path) -> int:
    """Compare one front and return how many points it has, 0 where nothing fits."""
    folder = tmp_path / str(seed)
    folder.mkdir()
    drawer, path, parts, chokes = small(folder, seed)
    done = run("bands", path, "--drawer", drawer, "--front", pair, "--json", "-")
    if done.code == 1:
        return 0
    assert done.code == 0, done.err
    result = json.loads(done.out)
    at = [band["at"] for band in result["request"]["bands"]]
    limited, least, _ = PAIRS[pair]
    wanted = plain_front(list(every_plan(at, parts, chokes)), limited, least, 1e-9)
    (front,) = result["fronts"]
    assert front["criteria"] == [limited, least] and front["complete"]
    keys = {"values": "value_count", "pieces": "piece_count", "price": "price", "error": "worst_error_ppm"}
    got = [(c[keys[limited]], c[keys[least]] / (1e6 if least == "error" else 1)) for c in front["candidates"]]
    assert [x for x, _ in got] == [x for x, _ in wanted], f"seed {seed}"
    assert [y for _, y in got] == pytest.approx([y for _, y in wanted], abs=1e-8), f"seed {seed}"
    return len(got)
