"""Swept bands against plain enumeration of the same candidates: `python tests/bench/bench_swept.py`.

16 bands of one octave share, up to 3 capacitors a band, 10,000 coils, one variable capacitor; the least excess of
every coil at every band. Plain: every series padder with every network, all of a coil's at once in numpy, timed on
a few coils and scaled. Search: from the arrays to the proven first rows, and to the front. Then the tables of a
sliding core and of a variometer for 10,000 coils. Run it on an idle machine; ratios are what counts.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np

sys.path[:0] = [str(Path(__file__).parents[level]) for level in (1, 2)]

from bench.layout_instances import tank_problem  # noqa: E402

from partpick.physics.core_tables import inductance_rises  # noqa: E402
from partpick.physics.variometer_families import family_mutual_inductance  # noqa: E402
from partpick.progress import Quiet  # noqa: E402
from partpick.search.bands import search_bands  # noqa: E402
from partpick.search.columns import ColumnSource  # noqa: E402
from partpick.search.coverage import series_padders  # noqa: E402
from partpick.search.problem import Problem  # noqa: E402

BANDS, COILS, PARTS = 16, 10_000, 3
TUNING = (12e-12, 150e-12)  # F
PLAIN_COILS = 3


def swept_problem(leads: float, seed: int = 1) -> Problem:
    """Return 16 bands that together span 3 to 6 MHz, each swept, on random coils."""
    plain = tank_problem(seed, BANDS, COILS, PARTS, leads=leads)
    rng = np.random.default_rng(seed)
    edges = 3e6 * 2 ** (np.arange(BANDS + 1) / BANDS)
    inductance = np.exp(rng.uniform(np.log(0.5e-6), np.log(8e-6), COILS))[:, None]
    low, high = edges[:-1], edges[1:]
    values = plain.species[0]
    acting = [values / (1 - (2 * np.pi * f[:, None]) ** 2 * leads * values) for f in (low, high)]
    return replace(
        plain,
        frequency=high,
        wanted=1 / ((2 * np.pi * high) ** 2 * inductance),
        species=acting[1],
        swept=np.ones(BANDS, np.bool_),
        low_end=low,
        tuning_low=np.full(BANDS, TUNING[0]),
        tuning_high=np.full(BANDS, TUNING[1]),
        tuning_loss=np.zeros(BANDS),
        tuning_tempco=np.zeros(BANDS),
        inductance_low=np.repeat(inductance, BANDS, axis=1),
        coil_loss_low=plain.coil_loss,
        species_low=acting[0],
        part_loss_low=plain.part_loss,
        margin=0.01,
        in_play=np.ones((COILS, BANDS), np.bool_),
    )


def plain_least(problem: Problem, source: ColumnSource, coil: int, band: int) -> float:
    """Return the least excess of one coil at one band, every padder with every network looked at."""
    p, best = problem, np.inf
    fixed = float(p.fixed_capacitance()[coil, band])
    padders = series_padders(p, band, source.valid[band])
    ends = [(p.tuning_high[band], p.tuning_low[band], 0)]
    ends += [(a, b, 1) for a, b in zip(padders.at_low_end, padders.at_high_end, strict=True)]
    strays = float(p.strays()[coil, band])
    for at_low, at_high, taken in ends:
        for count in range(PARTS - taken + 1):
            table = source.tables[band][count]
            high = table.value + at_high + fixed  # type: ignore[union-attr]
            low = table.acting_as(p.species_low[band][source.valid[band]]) + at_low + fixed  # type: ignore[union-attr]
            tuned = [
                1 / (2 * np.pi * np.sqrt(inductance * total))
                for inductance, total in ((p.inductance_low[coil, band], low), (p.inductance_high[coil, band], high))
            ]
            covers = (tuned[0] <= p.low_end[band] * (1 - p.margin)) & (tuned[1] >= p.frequency[band] * (1 + p.margin))
            if count + taken:
                covers &= strays <= high * p.share
            beyond = np.maximum(p.low_end[band] - tuned[0], tuned[1] - p.frequency[band])[covers]
            if len(beyond):
                best = min(best, float(beyond.min() / (p.frequency[band] - p.low_end[band])))
    return best


def main() -> None:
    """Print the times and their ratio, without and with inductance in series with every capacitor."""
    for leads in (0.0, 1.2e-9):
        problem = swept_problem(leads)
        start = time.perf_counter()
        source = ColumnSource(problem)
        tables = time.perf_counter() - start
        for front in (False, True):
            start = time.perf_counter()
            fresh = source.with_problem(problem)
            found = search_bands(fresh.problem, fresh, wanted=10, all_windings=False, monitor=Quiet(), front=front)
            spent = time.perf_counter() - start
            rows = f"{len(found.choices)} rows, {len(found.front)} on the front, {found.stopped_by or 'proven'}"
            print(f"leads {leads * 1e9:g} nH: tables {tables:.2f} s, search {spent:.2f} s ({rows})", flush=True)
        start = time.perf_counter()
        least = [[plain_least(problem, source, coil, band) for band in range(BANDS)] for coil in range(PLAIN_COILS)]
        plain = (time.perf_counter() - start) / PLAIN_COILS * COILS
        bound = source.least_excesses(PARTS)[:PLAIN_COILS]
        able = np.isfinite(least).all(axis=1)  # one coil has to serve every band: others are left out
        assert np.allclose(bound[able], np.array(least)[able], rtol=0, atol=1e-9)
        print(f"leads {leads * 1e9:g} nH: plain {plain:,.0f} s, {plain / spent:,.0f} times the search with its front")
    rng = np.random.default_rng(1)
    family = rng.integers(0, 300, COILS)
    diameter, turns = rng.uniform(0.008, 0.03, 300)[family], rng.integers(3, 80, COILS)
    for words in ("first", "again"):
        start = time.perf_counter()
        inductance_rises(0.006, 0.02, 10.0, turns, diameter, turns * 0.6e-3, 0.0)
        print(f"sliding core, 10,000 coils, {words}: {time.perf_counter() - start:.2f} s")
    start = time.perf_counter()
    rotor = np.minimum(turns, 8)
    family_mutual_inductance(turns, diameter + 0.02, 0.6e-3, rotor, 0.018, 0.6e-3, np.array([0.0, 180.0]))
    print(f"variometer, 10,000 coils at two angles: {time.perf_counter() - start:.2f} s")


if __name__ == "__main__":
    main()
