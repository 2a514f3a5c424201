"""Every case of the plan search to proof, each in a process of its own: processor seconds and peak memory.

Run: python tests/bench/bench_proofs.py [runs]. The least of several runs is shown; the machine may be busy.
Instances are random tanks of 3 to 30 MHz (`layout_instances.py`), seed 1, E24.
"""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[level]) for level in (1, 2)]

SEED = 1
LIMIT = 60.0  # s
CASES = {  # layout, bands, coils, parts a band or of the set, shared limits
    "separate 16 x 10,000, K = 3": ("separate", 16, 10_000, 3, False),
    "stacked 16 x 10,000, K = 3": ("stacked", 16, 10_000, 3, False),
    "shared (6, 5), 200 coils": ("shared", 6, 200, 5, False),
    "shared (9, 8), 50 coils": ("shared", 9, 50, 8, False),
    "shared (16, 10), 1 coil": ("shared", 16, 1, 10, False),
    "separate 12 x 2,000, values, price, stock": ("separate", 12, 2_000, 2, True),
    "separate 8 x 10,000, K = 3": ("separate", 8, 10_000, 3, False),
    "separate 4 x 10,000, K = 3": ("separate", 4, 10_000, 3, False),
    "separate 16 x 1,000, K = 3": ("separate", 16, 1_000, 3, False),
    "separate 16 x 100,000, K = 3": ("separate", 16, 100_000, 3, False),
    "separate 16 x 10,000, K = 2": ("separate", 16, 10_000, 2, False),
    "separate 16 x 10,000, K = 4": ("separate", 16, 10_000, 4, False),
}


def one(name: str) -> dict[str, object]:
    """Solve one case and return processor and clock seconds, peak memory and the proof."""
    import numpy as np
    from bench.layout_instances import tank_problem

    from partpick.progress import Quiet
    from partpick.search.bands import search_bands
    from partpick.search.columns import ColumnSource
    from partpick.search.shared import search_shared
    from partpick.search.stacked import search_stacked

    layout, bands, coils, parts, limited = CASES[name]
    problem = tank_problem(SEED, bands, coils, parts, **({"parts_limit": parts} if layout == "shared" else {}))
    if limited:  # the free optimum has 13 values, two of them thrice, and costs 8.64
        import ortools.sat.python.cp_model  # noqa: F401 - its import is no part of the search

        rng = np.random.default_rng(SEED)
        n = len(problem.part_value)
        prices = {"part_price": rng.integers(5, 60, n), "coil_price": rng.integers(100, 400, coils)}
        stock = rng.integers(1, 4, n)
        problem = replace(problem, **prices, part_stock=stock, values_limit=12, price_limit=850)
    search = {"separate": search_bands, "stacked": search_stacked, "shared": search_shared}[layout]
    clock, processor = time.perf_counter(), time.process_time()
    source = ColumnSource(problem)
    found = search(problem, source, wanted=1, all_windings=False, monitor=Quiet(LIMIT), front=False)
    return {
        "clock": time.perf_counter() - clock,
        "processor": time.process_time() - processor,
        "memory": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024,
        "proof": found.stopped_by or ("optimal" if found.choices else "infeasible"),
        "first": None if not found.choices else int(found.choices[0].key[0]),  # type: ignore[arg-type]
    }


def main() -> None:
    """Print the table, or one case as JSON."""
    if len(sys.argv) > 2:
        print(json.dumps(one(sys.argv[2])))
        return
    runs = int(sys.argv[1]) if len(sys.argv) > 1 else 3
    print(f"{'case':44}{'processor s':>12}{'clock s':>9}{'peak MB':>9}{'pieces':>8}  proof")
    for name in CASES:
        told = [json.loads(_run(name)) for _ in range(runs)]
        least = {key: min(each[key] for each in told) for key in ("processor", "clock")}
        memory = max(each["memory"] for each in told)
        first = told[0]
        print(f"{name:44}{least['processor']:12.2f}{least['clock']:9.2f}{memory:9.0f}{first['first'] or '-':>8}  "
              f"{first['proof']}", flush=True)  # fmt: skip


def _run(name: str) -> str:
    command = [sys.executable, __file__, "1", name]
    return subprocess.run(command, capture_output=True, text=True, check=True).stdout


if __name__ == "__main__":
    main()
