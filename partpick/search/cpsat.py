"""Choosing columns under shared limits with CP-SAT: parts, values, price and stock.

The only module that imports ortools. One boolean a column, exactly one column a band; the steps of
the order are solved one after the other, each fixed before the next. Whole numbers only; the true
error never enters the model, its class does.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor, wait
from fractions import Fraction

import numpy as np
from ortools.sat.python import cp_model

from partpick.progress import Monitor
from partpick.search.choose import (
    SUMS,
    Choice,
    Key,
    Stopped,
    column_content,
    plan_content,
    plan_effort,
    plan_price,
)
from partpick.search.figures import Columns
from partpick.search.problem import NEVER, Problem

SEED = 1
WORK_LIMIT = 60.0  # deterministic time of one solve
LISTEN_SECONDS = 0.05  # between two looks at the monitor


def choose_coupled(
    problem: Problem, bands: list[Columns], coils: tuple[int, ...], order: tuple[str, ...], monitor: Monitor
) -> Choice | None:
    """Return the first choice in the order inside every shared limit, or None where none exists.

    Raises
    ------
    Stopped
        The monitor or the work limit ended the proof before it was complete.
    """
    if problem.price_limit < NEVER:
        bands = [columns.take(columns.price < NEVER) for columns in bands]
    if any(len(columns) == 0 for columns in bands):
        return None
    model = _ColumnModel(problem, bands, coils, monitor)
    key: list[int | tuple[object, ...]] = []
    for name in order:
        if name == "effort":
            key.append(plan_effort(problem, coils))
            continue
        value = model.least(name)
        if value is None:
            return None
        key.append(value)
    taken = model.first_by_content()
    key.append(plan_content(problem, coils, taken))
    return Choice(_as_key(key), coils, taken)


def _as_key(key: list[int | tuple[object, ...]]) -> Key:
    return tuple(key)


class _ColumnModel:
    """Columns still allowed, the sums already fixed, and the solves on them."""

    def __init__(
        self, problem: Problem, bands: list[Columns], coils: tuple[int, ...], monitor: Monitor
    ) -> None:
        self.problem = problem
        self.bands = bands
        self.coils = coils
        self.monitor = monitor
        self.fixed: list[tuple[str, int]] = []

    def least(self, name: str) -> int | None:
        """Return the least sum or worst value of one figure, and keep to it from here on."""
        if name == "price" and self._price_unknown():
            return NEVER
        figures = [getattr(columns, name) for columns in self.bands]
        if name not in SUMS:
            value = self._solve(figures, worst=True)
            if value is None:
                return None
            self.bands = [c.take(f <= value) for c, f in zip(self.bands, figures, strict=True)]
            return value
        if name == "price":
            self.bands = [columns.take(columns.price < NEVER) for columns in self.bands]
            figures = [columns.price for columns in self.bands]
        value = self._solve(figures, worst=False)
        if value is None:
            return None
        self.fixed.append((name, value))
        own = {"pieces": len(self.coils), "price": plan_price(self.problem, self.coils)}.get(name, 0)
        return value + own

    def _price_unknown(self) -> bool:
        """Whether every allowed choice has an unpriced piece."""
        if plan_price(self.problem, self.coils) >= NEVER:
            return True
        priced = [columns.take(columns.price < NEVER) for columns in self.bands]
        if any(len(columns) == 0 for columns in priced):
            return True
        trial = _ColumnModel(self.problem, priced, self.coils, self.monitor)
        trial.fixed = list(self.fixed)
        return trial._solve([columns.price for columns in priced], worst=False) is None

    def first_by_content(self) -> tuple[Columns, ...]:
        """Return the choice that comes first by content, bands in order of frequency."""
        problem = self.problem
        for band in np.argsort(problem.frequency, kind="stable"):
            columns = self.bands[band]
            order = sorted(range(len(columns)), key=lambda r: column_content(problem, columns, r))
            place = np.empty(len(order), dtype=np.int64)
            place[order] = np.arange(len(order))
            figures = [np.zeros(len(c), dtype=np.int64) for c in self.bands]
            figures[band] = place
            best = self._solve(figures, worst=False)
            assert best is not None
            self.bands[band] = columns.take(place == best)
        return tuple(self.bands)

    def _solve(self, figures: list[np.ndarray], *, worst: bool) -> int | None:
        model = cp_model.CpModel()
        picks = [[model.new_bool_var("") for _ in range(len(columns))] for columns in self.bands]
        for band in picks:
            model.add_exactly_one(band)
        self._add_limits(model, picks)
        totals = [
            sum(int(value) * pick for value, pick in zip(figure, band, strict=True))
            for figure, band in zip(figures, picks, strict=True)
        ]
        if worst:
            most = max(int(figure.max()) for figure in figures)
            top = model.new_int_var(0, most, "")
            for total in totals:
                model.add(top >= total)
            model.minimize(top)
        else:
            model.minimize(sum(totals))
        return self._run(model)

    def _run(self, model: cp_model.CpModel) -> int | None:
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        solver.parameters.random_seed = SEED
        solver.parameters.max_deterministic_time = WORK_LIMIT
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        status = self._status(solver, model)
        if status == cp_model.OPTIMAL:
            return round(solver.objective_value)
        if status == cp_model.INFEASIBLE:
            return None
        raise Stopped(self.monitor.stopped() or "work limit")

    def _status(self, solver: cp_model.CpSolver, model: cp_model.CpModel) -> cp_model.CpSolverStatus:
        """Solve in a thread of its own: a signal reaches Python only where this one is not inside the solver."""
        solver.parameters.catch_sigint_signal = False
        with ThreadPoolExecutor(max_workers=1) as executor:
            solving = executor.submit(solver.solve, model)
            try:
                while not wait([solving], timeout=LISTEN_SECONDS).done:
                    if self.monitor.stopped() is not None:
                        solver.stop_search()
            except BaseException:  # a second Ctrl-C: leave at once
                solver.stop_search()
                raise
            return solving.result()

    def _add_limits(self, model: cp_model.CpModel, picks: list[list[cp_model.IntVar]]) -> None:
        problem = self.problem
        use: dict[int, list[cp_model.LinearExpr]] = {}
        holders: dict[tuple[int, Fraction], list[cp_model.IntVar]] = {}
        own: dict[int, list[cp_model.IntVar]] = {coil: [] for coil in self.coils}
        for band, (columns, picked) in enumerate(zip(self.bands, picks, strict=True)):
            for row, pick in enumerate(picked):
                own[int(columns.coil[row])].append(pick)
                parts = [int(part) for part in columns.parts[row] if part >= 0]
                for part in set(parts):
                    if problem.part_stock[part] < len(picks) * problem.most_parts:
                        use.setdefault(part, []).append(parts.count(part) * pick)
                for value in {problem.part_value[part] for part in parts}:
                    holders.setdefault((band, value), []).append(pick)
        if len(self.coils) > 1:
            for every in own.values():
                model.add_at_least_one(every)
        for piece, terms in use.items():
            model.add(sum(terms) <= int(problem.part_stock[piece]))
        if problem.values_limit < NEVER:
            used = {value: model.new_bool_var("") for _, value in holders}
            for (_, value), every in holders.items():
                model.add(sum(every) <= used[value])
            model.add(sum(used.values()) <= problem.values_limit)
        if problem.parts_limit < NEVER:
            model.add(self._sum(picks, "pieces") <= problem.parts_limit)
        if problem.price_limit < NEVER:
            coils = plan_price(problem, self.coils)
            model.add(self._sum(picks, "price") <= problem.price_limit - coils)
        for name, total in self.fixed:
            model.add(self._sum(picks, name) == total)

    def _sum(self, picks: list[list[cp_model.IntVar]], name: str) -> cp_model.LinearExprT:
        return sum(
            int(value) * pick
            for columns, band in zip(self.bands, picks, strict=True)
            for value, pick in zip(getattr(columns, name), band, strict=True)
        )
