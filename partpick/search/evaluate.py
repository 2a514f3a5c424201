"""The exact best choice for a given set of coils, with only as many columns made as it needs."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from partpick.progress import Monitor
from partpick.search.choose import ORDERS, Choice, choose
from partpick.search.columns import Columns, ColumnSource
from partpick.search.problem import NEVER, Problem


class Evaluator:
    """Turns a set of coils into its best choice; exact under every limit of the problem."""

    def __init__(self, problem: Problem, source: ColumnSource, monitor: Monitor) -> None:
        self.problem = problem
        self.source = source
        self.monitor = monitor

    def best(self, coils: tuple[int, ...], by: str) -> Choice | None:
        """Return the first choice for these coils, each used at least once, or None.

        Raises
        ------
        Stopped
            A shared limit was in force and its proof was ended early.
        """
        if not self._supports_in_stock(coils):
            return None
        if by == "build":
            return self._by_pieces(coils)
        if by == "error":
            return self._by_error(coils)
        return choose(self.problem, self._all_columns(coils), coils, ORDERS[by], self.monitor)

    def least_error(self, coils: tuple[int, ...], pieces: int) -> Choice | None:
        """Return the choice of least worst error with at most `pieces` pieces in all, or None."""
        if not self._supports_in_stock(coils):
            return None
        capped = min(self.problem.parts_limit, pieces - len(coils))
        inner = Evaluator(replace(self.problem, parts_limit=capped), self.source, self.monitor)
        return inner._by_error(coils)

    def _supports_in_stock(self, coils: tuple[int, ...]) -> bool:
        problem = self.problem
        supports, used = np.unique(problem.support[list(coils)], return_counts=True)
        return bool((used <= problem.support_stock[supports]).all())

    def _by_pieces(self, coils: tuple[int, ...]) -> Choice | None:
        """Fewest parts first; more parts a band only where a shared limit asks for them."""
        order, extra = ORDERS["build"], 0
        most = self.problem.most_parts
        while True:
            bands, least = self._lowest_levels(coils, extra)
            if least is None:
                return None
            choice = choose(self.problem, bands, coils, order, self.monitor)
            if choice is None:
                if extra >= most:
                    return None
                extra += 1
                continue
            pieces = choice.key[0]
            assert isinstance(pieces, int)
            beyond = pieces - len(coils) - least
            if beyond <= extra or extra >= most:
                return choice
            extra = min(beyond, most)

    def _lowest_levels(self, coils: tuple[int, ...], extra: int) -> tuple[list[Columns], int | None]:
        """Return each coil's columns from its fewest parts at each band up to `extra` more, and the least sum."""
        bands: list[Columns] = []
        least = 0
        for band in range(self.problem.bands):
            blocks: list[Columns] = []
            fewest = NEVER
            for coil in coils:
                found = self._levels_of(coil, band, extra)
                blocks += found
                fewest = min([fewest, *(int(block.pieces[0]) for block in found)])
            if not blocks:
                return [], None
            least += fewest
            bands.append(Columns.join(blocks))
        return bands, least

    def _levels_of(self, coil: int, band: int, extra: int) -> list[Columns]:
        found: list[Columns] = []
        for parts in range(self.problem.least_parts, self.problem.most_parts + 1):
            if found and parts > int(found[0].pieces[0]) + extra:
                break
            columns = self.source.columns(coil, band, parts)
            if len(columns):
                found.append(columns)
        return found

    def _all_columns(self, coils: tuple[int, ...], error: float | None = None) -> list[Columns]:
        levels = range(self.problem.least_parts, self.problem.most_parts + 1)
        return [
            Columns.join([self.source.columns(coil, band, k, error) for coil in coils for k in levels])
            for band in range(self.problem.bands)
        ]

    def _by_error(self, coils: tuple[int, ...]) -> Choice | None:
        """Least error first: columns up to a trial error, which grows until a choice lies inside it."""
        limit = float(np.max(self.problem.error_limit))
        trial = 1e-9
        while True:
            trial = min(trial, limit)
            choice = self._inside(coils, trial)
            if choice is not None or trial >= limit or trial > 1e3:
                return choice
            trial *= 8.0

    def _inside(self, coils: tuple[int, ...], trial: float) -> Choice | None:
        bands = self._all_columns(coils, trial * (1 + 1e-9))
        if any(len(columns) == 0 for columns in bands):
            return None
        if self.problem.parts_limit < NEVER:
            few = self._few_enough(bands, coils)
            if few is None:
                return None
            choice = choose(self.problem, few, coils, ("pieces", *ORDERS["build"][1:]), self.monitor)
            if choice is not None:
                return self._with_error_first(choice)
        return choose(self.problem, bands, coils, ORDERS["error"], self.monitor)

    def _few_enough(self, bands: list[Columns], coils: tuple[int, ...]) -> list[Columns] | None:
        """Keep the columns up to the least worst error that the limit on parts leaves possible; else None."""
        cap = self.problem.parts_limit
        errors = np.unique(np.concatenate([columns.fine_error for columns in bands]))
        low, high = 0, len(errors) - 1
        if self._fewest(bands, int(errors[high])) > cap:
            return None
        while low < high:
            middle = (low + high) // 2
            if self._fewest(bands, int(errors[middle])) <= cap:
                high = middle
            else:
                low = middle + 1
        return [columns.take(columns.fine_error <= errors[high]) for columns in bands]

    @staticmethod
    def _fewest(bands: list[Columns], fine_error: int) -> int:
        total = 0
        for columns in bands:
            inside = columns.pieces[columns.fine_error <= fine_error]
            total += int(inside.min()) if len(inside) else NEVER
        return total

    @staticmethod
    def _with_error_first(choice: Choice) -> Choice:
        worst = max(int(columns.fine_error[0]) for columns in choice.columns)
        return replace(choice, key=(worst, *choice.key))
