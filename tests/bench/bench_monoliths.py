"""The plan search against one whole model of the same instance, in CP-SAT and in HiGHS.

Run: python tests/bench/bench_monoliths.py [seconds [layout ...]]. The model has one binary a coil and whole-number
counts of each value at each band, or of the set; it minimises the number of capacitors and nothing else, while the
search proves its first plan in the whole order. One worker each. Models stop at a time limit (60 s by the clock, 30 s
for shared sets): a ratio with ">" is what they had used by then without a proof. Seconds are of the processor,
since the machine may be busy; of the search the least of three runs. Instances are random tanks of 3 to 30 MHz
(`layout_instances.py`), seed 1, E24.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path
from typing import NamedTuple

import numpy as np
from ortools.sat.python import cp_model
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import coo_array

sys.path[:0] = [str(Path(__file__).parents[level]) for level in (1, 2)]

from bench.layout_instances import tank_problem  # noqa: E402

from partpick.progress import Quiet  # noqa: E402
from partpick.search.bands import search_bands  # noqa: E402
from partpick.search.columns import ColumnSource  # noqa: E402
from partpick.search.problem import Problem  # noqa: E402
from partpick.search.shared import search_shared  # noqa: E402
from partpick.search.stacked import search_stacked  # noqa: E402

SEED = 1
FEMTO = 1e-15  # F, of the whole numbers of the models
SHARED_LIMIT = 30.0  # s
CASES = [  # layout, bands, coils, parts a band or of the set
    ("separate", 3, 30, 2),
    ("separate", 4, 100, 2),
    ("separate", 16, 10_000, 3),
    ("stacked", 3, 30, 2),
    ("stacked", 4, 100, 2),
    ("stacked", 16, 10_000, 3),
    ("shared", 6, 200, 5),
    ("shared", 9, 50, 8),
    ("shared", 16, 1, 10),
]
SEARCHES = {"separate": search_bands, "stacked": search_stacked, "shared": search_shared}


class Model:
    """Whole numbers with bounds, rows of their sums, and a sum to be made least."""

    def __init__(self) -> None:
        self.most: list[int] = []
        self.cost: list[int] = []
        self.rows: list[tuple[list[int], list[int], int | None, int | None]] = []  # columns, factors, low, high

    def whole(self, most: int, cost: int = 0) -> int:
        """Add a whole number from 0 to `most`."""
        self.most.append(most)
        self.cost.append(cost)
        return len(self.most) - 1

    def row(self, columns: list[int], factors: list[int], low: int | None, high: int | None) -> None:
        """Add low <= sum <= high."""
        self.rows.append((columns, factors, low, high))


class Answer(NamedTuple):
    """What a model came to."""

    proof: str  # "optimal", "infeasible", "unproven"
    pieces: int | None
    processor: float  # s


def model_of(layout: str, problem: Problem) -> Model:
    """Return the whole model of an instance."""
    low, high = (np.clip(side / FEMTO, -1e9, 1e9) for side in problem.windows(1))
    low, high = np.ceil(low).astype(int), np.floor(high).astype(int)
    values = np.rint(problem.species[0] / FEMTO).astype(int).tolist()
    model = Model()
    coils = [model.whole(1) for _ in range(problem.coils)]
    model.row(coils, [1] * len(coils), 1, 1)
    most, limit = problem.most_parts, problem.parts_limit
    falling = np.argsort(-problem.frequency, kind="stable").tolist()
    own_set = [model.whole(limit, 1) for _ in values] if layout == "shared" else []
    if own_set:
        model.row(own_set, [1] * len(own_set), None, limit)
    across: list[int] = []
    for step, band in enumerate(falling):
        if layout == "shared":
            own = [model.whole(limit) for _ in values]
            for count, whole in zip(own, own_set, strict=True):
                model.row([count, whole], [1, -1], None, 0)
        else:
            own = [model.whole(most, 1) for _ in values]
            model.row(own, [1] * len(own), 1 if layout == "stacked" and step else 0, most)
        across = [*across, *own] if layout == "stacked" else own
        farads = values * (len(across) // len(values))
        model.row([*across, *coils], [*farads, *(-low[:, band]).tolist()], 0, None)
        model.row([*across, *coils], [*farads, *(-high[:, band]).tolist()], None, 0)
    return model


def by_cp_sat(model: Model, seconds: float) -> Answer:
    """Solve a model with CP-SAT."""
    start = time.process_time()
    cp = cp_model.CpModel()
    x = [cp.new_int_var(0, most, "") for most in model.most]
    for columns, factors, low, high in model.rows:
        total = cp_model.LinearExpr.weighted_sum([x[c] for c in columns], factors)
        if low is not None:
            cp.add(total >= low)
        if high is not None:
            cp.add(total <= high)
    cp.minimize(cp_model.LinearExpr.weighted_sum(x, model.cost))
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = 1
    solver.parameters.max_time_in_seconds = seconds
    status = solver.solve(cp)
    spent = time.process_time() - start
    proof = {cp_model.OPTIMAL: "optimal", cp_model.INFEASIBLE: "infeasible"}.get(status, "unproven")
    known = status in (cp_model.OPTIMAL, cp_model.FEASIBLE)
    return Answer(proof, round(solver.objective_value) if known else None, spent)


def by_highs(model: Model, seconds: float) -> Answer:
    """Solve a model with HiGHS."""
    start = time.process_time()
    cells = [(r, c, f / 1000.0 if abs(f) > 1 else f) for r, (columns, factors, _, _) in enumerate(model.rows)
             for c, f in zip(columns, factors, strict=True)]  # fmt: skip
    rows, columns, factors = (np.array(each) for each in zip(*cells, strict=True))
    matrix = coo_array((factors, (rows, columns)), shape=(len(model.rows), len(model.most))).tocsr()
    low = [-np.inf if row[2] is None else row[2] for row in model.rows]
    high = [np.inf if row[3] is None else row[3] for row in model.rows]
    found = milp(
        model.cost,
        constraints=LinearConstraint(matrix, low, high),
        integrality=np.ones(len(model.most)),
        bounds=Bounds(0, np.array(model.most)),
        options={"mip_rel_gap": 0.0, "time_limit": seconds},
    )
    spent = time.process_time() - start
    proof = {0: "optimal", 2: "infeasible"}.get(found.status, "unproven")
    return Answer(proof, None if found.x is None else round(found.fun), spent)


def by_search(layout: str, problem: Problem) -> Answer:
    """Return the answer of the search, with the least time of three runs."""
    spent = []
    for _ in range(3):
        start = time.process_time()
        found = SEARCHES[layout](
            problem, ColumnSource(problem), wanted=1, all_windings=False, monitor=Quiet(60.0), front=False
        )
        spent.append(time.process_time() - start)
    assert found.stopped_by is None
    pieces = int(found.choices[0].key[0]) - 1 if found.choices else None  # type: ignore[call-overload]
    return Answer("optimal" if found.choices else "infeasible", pieces, min(spent))


def main() -> None:
    """Print the table."""
    limit = float(sys.argv[1]) if len(sys.argv) > 1 else 60.0
    print(f"{'case':32}{'by':9}{'s':>9}{'ratio':>9}{'capacitors':>12}  proof")
    wanted = sys.argv[2:] or list(SEARCHES)
    for layout, bands, coils, parts in (case for case in CASES if case[0] in wanted):
        limits = {"parts_limit": parts} if layout == "shared" else {}
        problem = tank_problem(SEED, bands, coils, parts, **limits)
        ours = by_search(layout, problem)
        name = f"{layout} ({bands}, {parts}), {coils:,} coils"
        print(f"{name:32}{'search':9}{ours.processor:9.3f}{1:9}{ours.pieces or '-':>12}  {ours.proof}", flush=True)
        model = model_of(layout, problem)
        seconds = min(limit, SHARED_LIMIT) if layout == "shared" else limit
        for by, solve in (("CP-SAT", by_cp_sat), ("HiGHS", by_highs)):
            if by == "HiGHS" and layout == "shared":
                continue
            theirs = solve(model, seconds)
            if theirs.proof == "unproven":
                assert theirs.pieces is None or (ours.pieces is not None and theirs.pieces >= ours.pieces), name
            else:
                assert (theirs.proof, theirs.pieces) == (ours.proof, ours.pieces), (name, by, theirs, ours)
            more = "> " if theirs.proof == "unproven" else ""
            ratio = f"{more}{theirs.processor / ours.processor:,.0f}"
            told = f"{theirs.processor:9.2f}{ratio:>9}{theirs.pieces or '-':>12}"
            print(f"{'':32}{by:9}{told}  {theirs.proof}", flush=True)


if __name__ == "__main__":
    main()
