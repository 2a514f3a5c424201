"""Times of the switching layouts on random tanks of 3 to 30 MHz: `python tests/bench/layouts.py`.

Each line is one request, proven; times are of the search alone, after imports. Run it on an idle machine.
"""

from __future__ import annotations

import resource
import sys
import time
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[level]) for level in (1, 2)]

from bench.layout_instances import tank_problem  # noqa: E402

from partpick.progress import Quiet  # noqa: E402
from partpick.search.shared import search_shared  # noqa: E402
from partpick.search.stacked import search_stacked  # noqa: E402

SEEDS = (1, 2, 3)
CASES = [  # layout, bands, coils, parts a band or of the set
    ("shared", 6, 200, 5),
    ("shared", 9, 50, 8),
    ("shared", 16, 1, 10),
    ("stacked", 16, 10_000, 3),
    ("stacked", 6, 10_000, 3),
]


def timed(layout: str, bands: int, coils: int, parts: int, seed: int, by: str, **how: object) -> str:
    """Run one request and describe it in a line."""
    limit = {"parts_limit": parts} if layout == "shared" else {}
    leads = float(how.pop("leads", 0.0))  # type: ignore[arg-type]
    problem = tank_problem(seed, bands, coils, parts, leads=leads, by=by, **limit)
    search = search_shared if layout == "shared" else search_stacked
    start = time.perf_counter()
    found = search(problem, wanted=int(how["wanted"]), all_windings=False, monitor=Quiet(), front=bool(how["front"]))  # type: ignore[call-overload]
    spent = time.perf_counter() - start
    if found.choices:
        first = found.choices[0]
        worst = max(abs(float(columns.error[0])) for columns in first.columns)
        pieces = first.key[{"build": 0, "error": 2, "price": 1}[by]]
        answer = f"{pieces} pieces, {worst * 1e6:.1f} ppm, {len(found.choices)} rows"
    else:
        answer = "nothing fits"
    if how["front"]:
        steps = [(f.key[2], round(max(abs(float(c.error[0])) for c in f.columns) * 1e6, 2)) for f in found.front]
        answer += f", front {steps}"
    return f"{spent:8.3f} s  {found.stopped_by or 'proven':10}  {answer}"


def main() -> None:
    """Print every case for every seed."""
    for layout, bands, coils, parts in CASES:
        for by in ("build", "error"):
            for leads in (0.0, 1.2e-9):
                for wanted, front in ((1, False), (10, False), (1, True)):
                    for seed in SEEDS:
                        line = timed(layout, bands, coils, parts, seed, by, wanted=wanted, front=front, leads=leads)
                        what = f"{layout} {bands}x{coils} K={parts} by {by} leads {leads * 1e9:g} nH"
                        how = f"top {wanted:2} {'+front' if front else '      '} seed {seed}"
                        print(f"{what:45} {how} {line}", flush=True)
    print(f"peak memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


if __name__ == "__main__":
    main()
