"""`bands` with switching "separate" against one CP-SAT model with the coil as a variable.

Run: python tests/bench/bench_bands.py [seconds]. The model has one boolean a coil and whole-number counts
of each capacitor value at each band; it minimises pieces, then the worst error. It is stopped after a
time limit (60 s by default), so that its ratio is a lower bound where the table says "not proven".
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace

import numpy as np
from ortools.sat.python import cp_model

from partpick.candidates import realisable_coils
from partpick.catalogue import load_catalogue, select_capacitors
from partpick.objective import build_problem, tolerance_floor
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.bands import search_bands
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem

BANDS = (3.55e6, 3.9e6, 4.6e6, 5.35e6, 6.1e6, 7.05e6, 7.9e6, 9.0e6, 10.12e6)
WINDINGS = 2_000
GRAIN = 1e-15  # F, of the model's whole numbers; tests every window to 1 fF
PPM = 10**6


def problem_of(windings: int) -> Problem:
    """Return nine bands on one coil, up to two capacitors a band, over so many windings of the catalogue."""
    tables = {
        "limits": {"parts_per_band": 2},
        "capacitors": {"series": "E24", "grades": ["C0G"]},
        "band": [{"name": f"band {i}", "at": f} for i, f in enumerate(BANDS)],
    }
    request, catalogue = request_from_tables(tables, "bands"), load_catalogue(None)
    coils = realisable_coils(request, catalogue)
    capacitors = select_capacitors(catalogue, request.capacitors, False)
    problem = build_problem(request, coils, capacitors, tolerance_floor(coils, capacitors, 0.005))
    low, high = problem.windows(1)
    usable = np.flatnonzero((problem.in_play & (high > 0) & (low <= high)).all(axis=1))
    chosen = np.sort(np.random.default_rng(1).choice(usable, windings, replace=False))
    names = [
        name
        for name, value in vars(problem).items()
        if isinstance(value, np.ndarray) and value.shape[:1] == (problem.coils,)
    ]
    return replace(problem, **{name: getattr(problem, name)[chosen] for name in names})


def monolith(problem: Problem, seconds: float) -> tuple[str, float, int | None, float | None]:
    """Return status, seconds, pieces and worst error of one model over coils, bands and capacitors."""
    start = time.perf_counter()
    low, high = (np.rint(side / GRAIN).astype(np.int64) for side in problem.windows(1))
    fixed = np.rint(problem.fixed_capacitance() / GRAIN).astype(np.int64)
    wanted = np.rint(problem.wanted / GRAIN).astype(np.int64)
    model = cp_model.CpModel()
    coil = [model.new_bool_var("") for _ in range(problem.coils)]
    model.add_exactly_one(coil)
    worst = model.new_int_var(0, 2 * PPM, "")  # of the capacitance: twice that of the frequency
    pieces = 0
    for band in range(problem.bands):
        values = np.rint(problem.species[band] / GRAIN).astype(np.int64)
        count = [model.new_int_var(0, problem.most_parts, "") for _ in values]
        own = sum(count)
        model.add(own <= problem.most_parts)
        pieces = pieces + own
        network = sum(int(v) * n for v, n in zip(values, count, strict=True))
        model.add(network >= sum(int(c) * x for c, x in zip(low[:, band], coil, strict=True)))
        model.add(network <= sum(int(c) * x for c, x in zip(high[:, band], coil, strict=True)))
        target = model.new_int_var(int(wanted[:, band].min()), int(wanted[:, band].max()), "")
        model.add(target == sum(int(c) * x for c, x in zip(wanted[:, band], coil, strict=True)))
        off = network + sum(int(c) * x for c, x in zip(fixed[:, band], coil, strict=True)) - target
        allowed = model.new_int_var(0, 2 * PPM * int(wanted[:, band].max()), "")
        model.add_multiplication_equality(allowed, [worst, target])
        model.add(PPM * off <= allowed)
        model.add(-PPM * off <= allowed)
    model.minimize(pieces * (4 * PPM) + worst)
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.random_seed = 1
    solver.parameters.max_time_in_seconds = seconds
    status = solver.solve(model)
    taken = time.perf_counter() - start
    if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
        return solver.status_name(status).lower(), taken, None, None
    found = round(solver.objective_value)
    return solver.status_name(status).lower(), taken, found // (4 * PPM) + 1, found % (4 * PPM) / 2e6


def main() -> None:
    """Print the table."""
    limit = float(sys.argv[1]) if len(sys.argv) > 1 else 60.0
    problem = problem_of(WINDINGS)
    times = []
    for _ in range(3):
        start = time.perf_counter()
        source = ColumnSource(problem)
        found = search_bands(problem, source, wanted=10, all_windings=True, monitor=Quiet(), front=False)
        times.append(time.perf_counter() - start)
    assert found.settled and found.choices
    ours = min(times)
    first = found.choices[0]
    error = max(abs(float(columns.error[0])) for columns in first.columns)
    status, taken, pieces, their_error = monolith(problem, limit)
    assert pieces is None or pieces >= first.key[0], "the model has found a plan of fewer pieces"
    assert status != "optimal" or pieces == first.key[0]
    values = problem.species.shape[1]
    print(f"separate, {len(BANDS)} bands, {WINDINGS} windings, up to {problem.most_parts} of {values} values a band")
    print(f"{'':40}{'seconds':>10}{'ratio':>8}{'pieces':>8}{'worst error':>13}  proof")
    print(f"{'columns a band, ten best plans':40}{ours:10.3f}{1.0:8.0f}{first.key[0]:8}{error:13.3%}  optimal")
    told = f"{'-' if pieces is None else pieces:>8}{'-' if their_error is None else format(their_error, '.3%'):>13}"
    proof = "optimal" if status == "optimal" else f"not proven in {limit:.0f} s"
    print(f"{'one model, the coil as a variable':40}{taken:10.1f}{taken / ours:8.0f}{told}  {proof}")


if __name__ == "__main__":
    main()
