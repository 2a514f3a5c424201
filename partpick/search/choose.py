"""The best columns for a given set of coils, in the order of the request.

Bands are independent unless a shared limit binds, and each step of the order is a sum over bands or
the worst of them. So the exact choice comes stage by stage: a sum is least where every band's share
is, a worst value where no band exceeds the largest of the bands' least values. Where stock or another
shared limit rules that choice out, `cpsat.py` settles it.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from partpick.progress import Monitor
from partpick.search.contacts import contacts_of
from partpick.search.figures import Columns
from partpick.search.problem import NEVER, Ints, Problem

SUMS = frozenset({"pieces", "commonness", "price"})
_REST = (
    "error_class",
    "excess_class",
    "q_class",
    "stray_class",
    "reactance_class",
    "effort",
    "commonness",
    "error_rank",
)
ORDERS = {
    "build": ("pieces", *_REST, "price"),
    "error": ("fine_error", "fine_excess", "pieces", *_REST, "price"),
    "price": ("price", "pieces", *_REST),
}

Key = tuple[int | tuple[object, ...], ...]


@dataclass(frozen=True)
class Choice:
    """One network a band: its figures in order, and the column taken at each band."""

    key: Key
    coils: tuple[int, ...]
    columns: tuple[Columns, ...]  # one row each


@dataclass(frozen=True)
class Stopped(Exception):  # noqa: N818 - a stop that was asked for is no error
    """A shared-limit choice that ran out of time."""

    reason: str


class Beaten(Exception):  # noqa: N818 - a coil that cannot win is no error
    """Every choice of a set of coils ranks behind the one to beat."""


class Deeper(Exception):  # noqa: N818 - the columns at hand were too few
    """Columns of more parts are wanted before a choice can be called the first."""


def column_content(problem: Problem, columns: Columns, row: int) -> tuple[object, ...]:
    """Return what orders equal columns: values, connection, grades, coil, tap, trimmer; never row numbers.

    The connection is the shape of the network, then the place by content of the series padder, -1 for none.
    """
    used = [int(part) for part in columns.parts[row] if part >= 0]
    values: tuple[Fraction, ...] = tuple(sorted(problem.part_value[part] for part in used))
    ranks = tuple(int(problem.part_rank[part]) for part in used)
    padder = columns.series_padder(row)
    in_series = -1 if padder is None else int(problem.part_rank[padder])
    connection = int(columns.shape[row]), in_series
    coil = int(problem.coil_rank[columns.coil[row]]), int(columns.tap[row])
    trimmer = int(columns.trimmer[row])  # by rising range
    return (values, connection, ranks, *coil) if trimmer < 0 else (values, connection, ranks, *coil, trimmer)


def plan_effort(problem: Problem, coils: tuple[int, ...]) -> tuple[int, ...]:
    """Return the effort of winding a set of coils: form classes, unusual wires, volume steps. [-]"""
    return tuple(int(total) for total in problem.effort[list(coils)].sum(axis=0))


def plan_price(problem: Problem, coils: tuple[int, ...]) -> int:
    """Return the price of a set of coils in hundredths, NEVER where one is unknown. [-]"""
    return min(int(problem.coil_price[list(coils)].sum()), NEVER)


def choose(
    problem: Problem,
    bands: list[Columns],
    coils: tuple[int, ...],
    order: tuple[str, ...],
    monitor: Monitor,
    to_beat: Key | None = None,
    complete_to: int | None = None,
) -> Choice | None:
    """Return the first choice in the order for these coils, each used at least once; None if there is none.

    Raises
    ------
    Deeper
        It has more than `complete_to` pieces, up to which every column is among those given.
    Beaten
        No choice ranks before or with `to_beat`; not always told where one is found without a solver.
    """
    if any(len(columns) == 0 for columns in bands):
        return None
    best = first_without_shared_limits(problem, bands, coils, order)
    if best is None or inside_shared_limits(problem, best):
        return best
    from partpick.search.cpsat import choose_coupled

    if to_beat is not None and best.key > to_beat:
        raise Beaten
    return choose_coupled(problem, bands, coils, order, monitor, to_beat, complete_to)


def first_without_shared_limits(
    problem: Problem, bands: list[Columns], coils: tuple[int, ...], order: tuple[str, ...]
) -> Choice | None:
    """Return the first choice in the order with each coil used, stock and limits in common left aside."""
    free = _uncoupled(problem, bands, coils, order)
    if {int(columns.coil[0]) for columns in free.columns} == set(coils):
        return free
    best: Choice | None = None
    for restricted in _each_coil_used(bands, coils):
        choice = _uncoupled(problem, restricted, coils, order)
        if best is None or choice.key < best.key:
            best = choice
    return best


def _each_coil_used(bands: list[Columns], coils: tuple[int, ...]) -> list[list[Columns]]:
    """Return restrictions of the bands which together cover every way to use all the coils."""
    ways = [bands]
    for coil in coils:
        grown = []
        for way in ways:
            for band, columns in enumerate(way):
                own = columns.take(columns.coil == coil)
                if len(own):
                    grown.append([*way[:band], own, *way[band + 1 :]])
        ways = _without_repeats(grown)
    return ways


def _without_repeats(ways: list[list[Columns]]) -> list[list[Columns]]:
    seen: set[tuple[tuple[int, ...], ...]] = set()
    kept = []
    for way in ways:
        signature = tuple(tuple(np.unique(columns.coil)) for columns in way)
        if signature not in seen:
            seen.add(signature)
            kept.append(way)
    return kept


def _uncoupled(
    problem: Problem, bands: list[Columns], coils: tuple[int, ...], order: tuple[str, ...]
) -> Choice:
    """Return the first choice in the order, each band for itself."""
    key: list[int | tuple[object, ...]] = []
    rows = [np.arange(len(columns)) for columns in bands]  # still in the race
    for name in order:
        if name == "effort":
            key.append(plan_effort(problem, coils))
            continue
        figures = [getattr(columns, name)[row] for columns, row in zip(bands, rows, strict=True)]
        least = [int(figure.min()) for figure in figures]
        if name in SUMS:
            own = {"pieces": len(coils), "price": plan_price(problem, coils)}.get(name, 0)
            total = sum(least) + own
            if name == "price" and total >= NEVER:
                key.append(NEVER)
                continue
        else:
            total = max(least)
            least = [total] * len(bands)
        key.append(total)
        rows = [row[figure <= most] for row, figure, most in zip(rows, figures, least, strict=True)]
    pairs = zip(bands, rows, strict=True)
    taken = tuple(columns.take(_first_by_content(problem, columns, row)) for columns, row in pairs)
    key.append(plan_content(problem, coils, taken))
    return Choice(tuple(key), coils, taken)


def _first_by_content(problem: Problem, columns: Columns, rows: Ints) -> Ints:
    first = rows[0]
    if len(rows) > 1:
        first = min(rows.tolist(), key=lambda row: column_content(problem, columns, row))
    return np.array([first])


def plan_content(problem: Problem, coils: tuple[int, ...], taken: tuple[Columns, ...]) -> tuple[object, ...]:
    """Return the last step of the order: the coils, then each band's network, bands by frequency."""
    ranks = tuple(sorted(int(problem.coil_rank[coil]) for coil in coils))
    by_frequency = np.argsort(problem.frequency, kind="stable")
    return ranks, tuple(column_content(problem, taken[band], 0) for band in by_frequency)


def inside_shared_limits(problem: Problem, choice: Choice) -> bool:
    """Whether a choice keeps to stock, parts, values, contacts and price of the whole plan."""
    used = Counter(int(part) for columns in choice.columns for part in columns.parts[0] if part >= 0)
    if any(count > problem.part_stock[part] for part, count in used.items()):
        return False
    trimmers = Counter(int(columns.trimmer[0]) for columns in choice.columns if columns.trimmer[0] >= 0)
    if any(count > problem.trimmer_stock[trimmer] for trimmer, count in trimmers.items()):
        return False
    if used.total() > problem.parts_limit:
        return False
    if len({problem.part_value[part] for part in used}) > problem.values_limit:
        return False
    if problem.contacts_limit < NEVER and contacts_of(problem, choice.coils, choice.columns) > problem.contacts_limit:
        return False
    price = sum(int(columns.price[0]) for columns in choice.columns) + plan_price(problem, choice.coils)
    return problem.price_limit >= NEVER or price <= problem.price_limit
