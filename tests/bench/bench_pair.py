"""`pair` over 20,000 windings against plain numpy brute force over the same candidates.

Run: python tests/bench/bench_pair.py. The brute force is timed on a few windings and scaled up: each
winding costs it the same.
"""

from __future__ import annotations

import itertools
import time
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from partpick.candidates import realisable_coils
from partpick.catalogue import load_catalogue, select_capacitors
from partpick.objective import build_problem, tolerance_floor
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.bands import Found, search_bands
from partpick.search.columns import ColumnSource
from partpick.search.problem import Problem

WINDINGS, SAMPLE = 20_000, 40
Floats = NDArray[np.float64]


def problem_of(windings: int, frequency: float = 7.1e6) -> Problem:
    """Return the pair at one frequency with E24, up to 3 capacitors in any network, and so many windings."""
    tables = {
        "limits": {"parts_per_band": 3},
        "capacitors": {"connect": "any", "series": "E24", "grades": ["C0G"]},
        "band": [{"at": frequency}],
    }
    request, catalogue = request_from_tables(tables, "pair"), load_catalogue(None)
    coils = realisable_coils(request, catalogue)
    capacitors = select_capacitors(catalogue, request.capacitors, False)
    problem = build_problem(request, coils, capacitors, tolerance_floor(coils, capacitors, 0.005))
    usable = np.flatnonzero(problem.in_play[:, 0])
    return only(problem, np.sort(np.random.default_rng(1).choice(usable, windings, replace=False)))


def only(problem: Problem, coils: NDArray[np.int64]) -> Problem:
    """Return the problem with these coils only."""
    names = [
        name
        for name, value in vars(problem).items()
        if isinstance(value, np.ndarray) and value.shape[:1] == (problem.coils,) and problem.coils > 64
    ]
    return replace(problem, **{name: getattr(problem, name)[coils] for name in names})


def search(problem: Problem, *, front: bool, all_windings: bool = False) -> tuple[float, Found]:
    """Return seconds and the ten best, tables of networks included."""
    start = time.perf_counter()
    found = search_bands(
        problem, ColumnSource(problem), wanted=10, all_windings=all_windings, monitor=Quiet(), front=front
    )
    return time.perf_counter() - start, found


def every_network(values: Floats) -> tuple[Floats, NDArray[np.int64]]:
    """Return the capacitance of each network of 1 to 3 parts, any way connected, and its parts."""
    n = len(values)
    pairs = np.array(list(itertools.combinations_with_replacement(range(n), 2)))
    triples = np.array(list(itertools.combinations_with_replacement(range(n), 3)))
    a, b = values[pairs].T
    x, y, z = values[triples].T
    inner = np.concatenate([a * b / (a + b), a + b])
    shunted = (values[:, None] + inner[None, : len(a)]).ravel()
    rest = inner[None, len(a) :]
    chained = (values[:, None] * rest / (values[:, None] + rest)).ravel()
    blocks = [values, a + b, a * b / (a + b), x + y + z, 1 / (1 / x + 1 / y + 1 / z), shunted, chained]
    parts = [1, 2, 2, 3, 3, 3, 3]
    return np.concatenate(blocks), np.repeat(parts, [len(block) for block in blocks])


def brute_force(problem: Problem) -> tuple[float, float, list[tuple[int, int]]]:
    """Return seconds for the networks, seconds for all windings, and (pieces, error class) of each best."""
    start = time.perf_counter()
    network, parts = every_network(problem.species[0])
    ready = time.perf_counter()
    best = []
    for coil in range(problem.coils):
        strays = problem.self_capacitance[coil] + problem.stray[0]
        total = network + strays
        error = np.abs(np.sqrt(problem.wanted[coil, 0] / total) - 1.0)
        inside = np.flatnonzero((error <= problem.error_limit[0]) & (strays <= problem.share * total))
        if len(inside):
            kind = np.rint(np.maximum(error[inside], problem.floor) * 1e9)
            first = np.lexsort((error[inside], kind, parts[inside]))[0]
            best.append((1 + int(parts[inside][first]), int(kind[first])))
    return ready - start, time.perf_counter() - ready, sorted(best)


def main() -> None:
    """Print the table."""
    problem = problem_of(WINDINGS)
    search(only(problem, np.arange(100)), front=False)  # libraries warm
    seconds, found = search(problem, front=False)
    with_front, _ = search(problem, front=True)
    few = only(problem, np.arange(0, WINDINGS, WINDINGS // SAMPLE))
    networks, looped, best = brute_force(few)
    scaled = networks + looped * WINDINGS / few.coils
    _, same = search(few, front=False, all_windings=True)
    agreed = [(choice.key[0], choice.key[1]) for choice in same.choices]
    assert agreed == best[: len(agreed)], "the two disagree"
    assert found.settled
    count = len(every_network(problem.species[0])[0])
    print(f"pair at 7.1 MHz: {WINDINGS} windings, {problem.species.shape[1]} values of E24, {count} networks")
    print(f"{'':44}{'seconds':>10}{'ratio':>10}")
    print(f"{'look-up, ten best proven':44}{seconds:10.3f}{1.0:10.0f}")
    print(f"{'look-up, ten best and the front':44}{with_front:10.3f}{with_front / seconds:10.1f}")
    scale = f"plain numpy, scaled from {few.coils} windings"
    print(f"{scale:44}{scaled:10.1f}{scaled / seconds:10.0f}")


if __name__ == "__main__":
    main()
