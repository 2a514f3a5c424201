"""Choosing columns under shared limits with CP-SAT: parts, values, contacts, price and stock.

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
    Beaten,
    Choice,
    Deeper,
    Key,
    Stopped,
    column_content,
    plan_content,
    plan_effort,
    plan_price,
)
from partpick.search.contacts import coil_contacts, element_contacts, figures_for_contacts
from partpick.search.figures import Columns, coarse_error
from partpick.search.problem import NEVER, Problem

SEED = 1
WORK_LIMIT = 60.0  # deterministic time of one solve
LISTEN_SECONDS = 0.05  # between two looks at the monitor


def choose_coupled(
    problem: Problem,
    bands: list[Columns],
    coils: tuple[int, ...],
    order: tuple[str, ...],
    monitor: Monitor,
    to_beat: Key | None = None,
    complete_to: int | None = None,
) -> Choice | None:
    """Return the first choice in the order inside every shared limit, or None where none exists.

    Raises
    ------
    Deeper
        It has more than `complete_to` pieces, so that columns of more parts are wanted.
    Beaten
        Every choice ranks behind `to_beat`, figures of the same order.
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
        else:
            value = model.follow(name, key, order)
            value = model.least(name) if value is None else value
            if value is None:
                return None
            if name == "pieces" and complete_to is not None and value > complete_to:
                raise Deeper
            key.append(value)
        if to_beat is not None and tuple(key) > to_beat[: len(key)]:
            raise Beaten
    taken = model.first_by_content()
    key.append(plan_content(problem, coils, taken))
    return Choice(_as_key(key), coils, taken)


def _as_key(key: list[int | tuple[object, ...]]) -> Key:
    return tuple(key)


class _Watch(cp_model.CpSolverSolutionCallback):
    """What a solve has reached so far, in words."""

    def __init__(self) -> None:
        super().__init__()
        self.best: str | None = None
        self.bound: str | None = None

    def on_solution_callback(self) -> None:
        """Note a better choice."""
        self.best = f"{self.objective_value:.0f}"

    def bounded(self, bound: float) -> None:
        """Note a better bound."""
        self.bound = f"{bound:.0f}"


class _ColumnModel:
    """Columns still allowed, the sums already fixed, a choice inside both, and the solves on them."""

    def __init__(self, problem: Problem, bands: list[Columns], coils: tuple[int, ...], monitor: Monitor) -> None:
        self.problem = problem
        self.bands = bands
        self.coils = coils
        self.monitor = monitor
        self.fixed: list[tuple[str, int]] = []
        self.proving = ""  # the figure that is being minimised, in words
        self.known: list[int] | None = None  # a row of each band, of a choice inside every limit
        self.value_of: list[int] = _numbered(problem.part_value)

    def least(self, name: str) -> int | None:
        """Return the least sum or worst value of one figure, and keep to it from here on."""
        self.proving = f"the least {name.replace('_', ' ')}"
        if name == "price":
            if self._price_unknown():
                return NEVER
            self._keep([columns.price < NEVER for columns in self.bands])
        figures = [getattr(columns, name) for columns in self.bands]
        if any(len(figure) == 0 for figure in figures):
            return None
        if name not in SUMS:
            value = self._solve(figures, worst=True)
            if value is not None:
                self._keep([figure <= value for figure in figures])
            return value
        value = self._solve(figures, worst=False)
        if value is None:
            return None
        self.fixed.append((name, value))
        least = [int(figure.min()) for figure in figures]
        self._keep([figure <= value - (sum(least) - own) for figure, own in zip(figures, least, strict=True)])
        own = {"pieces": len(self.coils), "price": plan_price(self.problem, self.coils)}.get(name, 0)
        return value + own

    def follow(self, name: str, key: list[int | tuple[object, ...]], order: tuple[str, ...]) -> int | None:
        """Return what a figure must be because of those before it, None where it is still open."""
        if name == "error_rank":  # above the floor the class is the error itself
            error_class = key[order.index("error_class")]
            if isinstance(error_class, int) and error_class > int(coarse_error(np.zeros(1), self.problem.floor)[0]):
                return error_class
        return None

    def _keep(self, masks: list[np.ndarray]) -> None:
        """Keep to some columns; the known choice goes if it is not among them."""
        if self.known is not None:
            inside = all(bool(mask[row]) for mask, row in zip(masks, self.known, strict=True))
            places = [int(mask[:row].sum()) for mask, row in zip(masks, self.known, strict=True)]
            self.known = places if inside else None
        self.bands = [columns.take(mask) for columns, mask in zip(self.bands, masks, strict=True)]

    def _price_unknown(self) -> bool:
        """Whether every allowed choice has an unpriced piece."""
        if plan_price(self.problem, self.coils) >= NEVER:
            return True
        if all(bool((columns.price < NEVER).all()) for columns in self.bands) and self.known is not None:
            return False
        priced = [columns.take(columns.price < NEVER) for columns in self.bands]
        if any(len(columns) == 0 for columns in priced):
            return True
        trial = _ColumnModel(self.problem, priced, self.coils, self.monitor)
        trial.fixed = list(self.fixed)
        return trial._solve([columns.price for columns in priced], worst=False) is None

    def first_by_content(self) -> tuple[Columns, ...]:
        """Return the choice that comes first by content, bands in order of frequency."""
        problem = self.problem
        self.proving = "which of equal plans comes first,"
        for band in np.argsort(problem.frequency, kind="stable"):
            columns = self.bands[band]
            if len(columns) == 1:
                continue
            order = sorted(range(len(columns)), key=lambda r: column_content(problem, columns, r))
            place = np.empty(len(order), dtype=np.int64)
            place[order] = np.arange(len(order))
            figures = [np.zeros(len(c), dtype=np.int64) for c in self.bands]
            figures[band] = place
            best = self._solve(figures, worst=False)
            assert best is not None
            self._keep([figure == best if i == band else figure == 0 for i, figure in enumerate(figures)])
        return tuple(self.bands)

    def _solve(self, figures: list[np.ndarray], *, worst: bool) -> int | None:
        """Return the least sum or worst of the figures over the choices still allowed; None if there is none."""
        least = [int(figure.min()) for figure in figures]
        if self.known is not None:
            reached = [int(figure[row]) for figure, row in zip(figures, self.known, strict=True)]
            total, bound = (max(reached), max(least)) if worst else (sum(reached), sum(least))
            if total == bound:
                return total
        model = cp_model.CpModel()
        picks = [[model.new_bool_var("") for _ in range(len(columns))] for columns in self.bands]
        for band in picks:
            model.add_exactly_one(band)
        self._add_limits(model, picks)
        flat = [pick for band in picks for pick in band]
        if worst:
            top = model.new_int_var(max(least), max(int(figure.max()) for figure in figures), "")
            for band, figure in zip(picks, figures, strict=True):
                model.add(top >= cp_model.LinearExpr.weighted_sum(band, figure.tolist()))
            model.minimize(top)
        else:
            weights = [int(value) for figure in figures for value in figure]
            model.minimize(cp_model.LinearExpr.weighted_sum(flat, weights))
        if self.known is not None:
            for band, row in zip(picks, self.known, strict=True):
                for place, pick in enumerate(band):
                    model.add_hint(pick, int(place == row))
        solver = self._run(model)
        if solver is None:
            return None
        self.known = [next(r for r, pick in enumerate(band) if solver.boolean_value(pick)) for band in picks]
        return round(solver.objective_value)

    def _run(self, model: cp_model.CpModel) -> cp_model.CpSolver | None:
        """Return the solver with the optimum, None where there is no choice at all."""
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        solver.parameters.random_seed = SEED
        solver.parameters.max_deterministic_time = WORK_LIMIT
        # Sharing of values is proven by the linear relaxation; without it proofs take a hundred times as long.
        solver.parameters.linearization_level = 2
        reason = self.monitor.stopped()
        if reason is not None:
            raise Stopped(reason)
        status = self._status(solver, model)
        if status == cp_model.OPTIMAL:
            return solver
        if status == cp_model.INFEASIBLE:
            return None
        raise Stopped(self.monitor.stopped() or "work limit")

    def _status(self, solver: cp_model.CpSolver, model: cp_model.CpModel) -> cp_model.CpSolverStatus:
        """Solve in a thread of its own: a signal reaches Python only where this one is not inside the solver."""
        solver.parameters.catch_sigint_signal = False
        watch = _Watch()
        solver.best_bound_callback = watch.bounded
        with ThreadPoolExecutor(max_workers=1) as executor:
            solving = executor.submit(solver.solve, model, watch)
            self.monitor.on_stop(solver.stop_search)
            try:
                while not wait([solving], timeout=LISTEN_SECONDS).done:
                    if self.monitor.stopped() is not None:
                        solver.stop_search()
                    self.monitor.report(f"{self.proving} of one choice of coils", watch.best, watch.bound)
            except BaseException:  # a second Ctrl-C: leave at once
                solver.stop_search()
                raise
            finally:
                self.monitor.on_stop(None)
            return solving.result()

    def _add_limits(self, model: cp_model.CpModel, picks: list[list[cp_model.IntVar]]) -> None:
        problem = self.problem
        use: dict[int, list[tuple[cp_model.IntVar, int]]] = {}
        holders: dict[tuple[int, int], list[cp_model.IntVar]] = {}
        own: dict[int, list[cp_model.IntVar]] = {coil: [] for coil in self.coils}
        scarce = problem.part_stock < len(picks) * problem.most_parts
        for band, (columns, picked) in enumerate(zip(self.bands, picks, strict=True)):
            for pick, coil, row in zip(picked, columns.coil.tolist(), columns.parts.tolist(), strict=True):
                own[coil].append(pick)
                parts = [part for part in row if part >= 0]
                for part in set(parts):
                    if scarce[part]:
                        use.setdefault(part, []).append((pick, parts.count(part)))
                for value in {self.value_of[part] for part in parts}:
                    holders.setdefault((band, value), []).append(pick)
        if len(self.coils) > 1:
            for every in own.values():
                model.add_at_least_one(every)
        for piece, terms in use.items():
            names, counts = zip(*terms, strict=True)
            model.add(cp_model.LinearExpr.weighted_sum(names, counts) <= int(problem.part_stock[piece]))
        self._add_trimmer_stock(model, picks)
        if problem.values_limit < NEVER:
            used = {value: model.new_bool_var("") for _, value in holders}
            for (_, value), every in holders.items():
                model.add(cp_model.LinearExpr.sum(every) <= used[value])
            model.add(cp_model.LinearExpr.sum(list(used.values())) <= problem.values_limit)
        if problem.parts_limit < NEVER:
            model.add(self._sum(picks, "pieces") <= problem.parts_limit)
        if problem.price_limit < NEVER:
            coils = plan_price(problem, self.coils)
            model.add(self._sum(picks, "price") <= problem.price_limit - coils)
        if problem.contacts_limit < NEVER and problem.bands > 1:
            self._limit_contacts(model, picks)
        for name, total in self.fixed:
            model.add(self._sum(picks, name) == total)

    def _add_trimmer_stock(self, model: cp_model.CpModel, picks: list[list[cp_model.IntVar]]) -> None:
        use: dict[int, list[cp_model.IntVar]] = {}
        for columns, picked in zip(self.bands, picks, strict=True):
            for trimmer, pick in zip(columns.trimmer.tolist(), picked, strict=True):
                if trimmer >= 0 and self.problem.trimmer_stock[trimmer] < len(picks):
                    use.setdefault(trimmer, []).append(pick)
        for trimmer, every in use.items():
            model.add(cp_model.LinearExpr.sum(every) <= int(self.problem.trimmer_stock[trimmer]))

    def _limit_contacts(self, model: cp_model.CpModel, picks: list[list[cp_model.IntVar]]) -> None:
        """A pole that any pick asks for has all its contacts."""
        problem = self.problem
        own, tapped, padded = (np.concatenate(figure) for figure in figures_for_contacts(problem, self.bands))
        flat = [pick for band in picks for pick in band]
        coil_pole, element_pole = model.new_bool_var(""), model.new_bool_var("")
        for pole, asks, always in (
            (coil_pole, tapped, len(self.coils) > 1),
            (element_pole, padded, problem.mixed),
        ):
            if always:
                model.add(pole == 1)
            for place in np.flatnonzero(asks):
                model.add_implication(flat[int(place)], pole)
        poles = coil_contacts(problem) * coil_pole + element_contacts(problem) * element_pole
        model.add(cp_model.LinearExpr.weighted_sum(flat, own.tolist()) + poles <= problem.contacts_limit)

    def _sum(self, picks: list[list[cp_model.IntVar]], name: str) -> cp_model.LinearExprT:
        flat = [pick for band in picks for pick in band]
        weights = [value for columns in self.bands for value in getattr(columns, name).tolist()]
        return cp_model.LinearExpr.weighted_sum(flat, weights)


def _numbered(values: tuple[Fraction, ...]) -> list[int]:
    """Return equal numbers for equal values."""
    number: dict[Fraction, int] = {}
    return [number.setdefault(value, len(number)) for value in values]
