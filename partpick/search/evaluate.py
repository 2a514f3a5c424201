"""The exact best choice for a given set of coils, with only as many columns made as it needs."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace

import numpy as np

from partpick.progress import Monitor
from partpick.search.choose import (
    ORDERS,
    Beaten,
    Choice,
    Deeper,
    Key,
    choose,
    first_without_shared_limits,
    inside_shared_limits,
)
from partpick.search.columns import ColumnMaker
from partpick.search.contacts import least_contacts
from partpick.search.figures import Columns, fine_error
from partpick.search.problem import NEVER, Floats, Ints, Problem
from partpick.search.service import ways_to_serve

NO_FIGURE = 1 << 62


class Evaluator:
    """Turns a set of coils into its best choice; exact under every limit of the problem."""

    def __init__(
        self,
        problem: Problem,
        source: ColumnMaker,
        monitor: Monitor,
        least: list[Floats] | None = None,
        fewest: Ints | None = None,
    ) -> None:
        self.problem = problem
        self.source = source
        self.monitor = monitor
        self.fewest = fewest  # (J, B) a bound of the parts of each band, if known
        self.least = least  # (J, B) of each number of parts: a bound of the error (or excess), if known
        self.leading = "fine_excess" if problem.led_by_excess else "fine_error"
        self.leading_place = ORDERS["error"].index(self.leading)
        self.least_possible = 0 if problem.led_by_excess else int(fine_error(np.zeros(1))[0])
        self.reached: dict[tuple[int, int], list[int]] = {}

    def best(self, coils: tuple[int, ...], by: str, to_beat: Key | None = None) -> Choice | None:
        """Return the first choice for these coils, each used at least once, or None.

        Parameters
        ----------
        coils : tuple of int
            The coils.
        by : str
            The order.
        to_beat : tuple, optional
            A key in this order; None may be returned where every choice ranks behind it.

        Raises
        ------
        Stopped
            A shared limit was in force and its proof was ended early.
        """
        if not self._supports_in_stock(coils) or self._beyond_shared_limits(coils):
            return None
        return _first(way._best(coils, by, to_beat) for way in self._ways(coils))

    def _best(self, coils: tuple[int, ...], by: str, to_beat: Key | None) -> Choice | None:
        try:
            if by == "build":
                return self._by_pieces(coils, to_beat)
            if by == "error":
                return self._by_error(coils)
            return self._by_price(coils, to_beat)
        except Beaten:
            return None

    def _ways(self, coils: tuple[int, ...]) -> Iterator[Evaluator]:
        """Yield one evaluator for each way in which adjustable coils may serve one band alone."""
        for source in ways_to_serve(self.source, coils):
            if source is self.source:
                yield self
            else:
                yield Evaluator(self.problem, source, self.monitor, self.least, self.fewest)

    def least_error(self, coils: tuple[int, ...], pieces: int) -> Choice | None:
        """Return the choice of least worst error (or excess) with at most `pieces` pieces in all, or None."""
        if not self._supports_in_stock(coils):
            return None
        capped = min(self.problem.parts_limit, pieces - len(coils))
        inner = Evaluator(
            replace(self.problem, parts_limit=capped), self.source, self.monitor, self.least, self.fewest
        )
        if inner._beyond_shared_limits(coils):
            return None
        inner.reached = self.reached
        # at the least error no fewer pieces will do, so a mixed plan too has its parts before its excess
        return _first(way._by_error(coils, fewest_parts_first=True) for way in inner._ways(coils))

    def _figure(self, coils: tuple[int, ...], band: int, parts: int) -> int:
        """Return the least leading figure of the coils with at most `parts` parts inside the band's limits."""
        least = NO_FIGURE
        for coil in coils:
            known = self.reached.setdefault((coil, band), [])
            while len(known) <= parts:
                best = known[-1] if known else NO_FIGURE
                if len(known) >= self.problem.least_parts and best > self.least_possible:
                    best = min(best, self._least_figure(coil, band, len(known), best))
                known.append(best)
            least = min(least, known[parts])
        return least

    def _least_figure(self, coil: int, band: int, parts: int, best: int) -> int:
        """Return the least leading figure with exactly `parts` parts, NO_FIGURE where it is not below `best`."""
        bound = 0.0 if self.least is None else float(self.least[parts][coil, band])
        if not np.isfinite(bound):
            return NO_FIGURE
        for beyond in (1e-6, 1e-4, 1e-2, 1.0, None):
            lead = None if beyond is None else bound * (1 + beyond) + 2e-9
            columns = self.source.columns(coil, band, parts, lead)
            if len(columns):
                return int(getattr(columns, self.leading).min())
            if lead is not None and lead * 1e12 > best:
                break
        return NO_FIGURE

    def _least_worst(self, coils: tuple[int, ...]) -> tuple[int, list[int]] | None:
        """Return the least worst figure inside the limit on parts, and the fewest parts of each band for it.

        The other limits that the bands share are left aside; None where not even then a plan exists.
        """
        most = self.problem.most_parts
        levels: list[int] = []
        for band in range(self.problem.bands):
            served = (k for k in range(most + 1) if self._figure(coils, band, k) < NO_FIGURE)
            fewest = next(served, None)
            if fewest is None:
                return None
            levels.append(fewest)
        best: tuple[int, list[int]] | None = None
        while sum(levels) <= self.problem.parts_limit:
            figures = [self._figure(coils, band, parts) for band, parts in enumerate(levels)]
            worst = max(figures)
            best = worst, list(levels)
            band = figures.index(worst)
            better = (k for k in range(levels[band] + 1, most + 1) if self._figure(coils, band, k) < worst)
            parts = next(better, None)
            if parts is None:
                break
            levels[band] = parts
        return best

    def _at_least_worst(self, coils: tuple[int, ...], worst: int, parts: list[int]) -> Choice | None:
        """Return the choice with this worst figure and these parts a band; None if a limit is in its way."""
        bands = []
        for band, count in enumerate(parts):
            found = [self.source.columns(coil, band, count, (worst + 1) * 1e-12) for coil in coils]
            columns = Columns.join(found)
            bands.append(columns.take(getattr(columns, self.leading) <= worst))
        choice = first_without_shared_limits(self.problem, bands, coils, ORDERS["error"])
        if choice is None or choice.key[self.leading_place] != worst:
            return None  # a coil would be left out
        return choice if inside_shared_limits(self.problem, choice) else None

    def _beyond_shared_limits(self, coils: tuple[int, ...]) -> bool:
        """Whether even the fewest and cheapest parts are more than a shared limit allows."""
        p = self.problem
        if self.fewest is None or not p.coupled:
            return False
        fewest = self.fewest[list(coils)].min(axis=0)
        parts = int(fewest.sum())
        if parts > p.parts_limit or min(parts, 1) > p.values_limit:
            return True
        if p.contacts_limit < NEVER and least_contacts(p, fewest, len(coils)) > p.contacts_limit:
            return True
        if p.price_limit >= NEVER:
            return False
        cheapest = int(p.part_price.min()) if len(p.part_price) else 0
        return int(p.coil_price[list(coils)].sum()) + parts * cheapest > p.price_limit

    def _supports_in_stock(self, coils: tuple[int, ...]) -> bool:
        problem = self.problem
        supports, used = np.unique(problem.support[list(coils)], return_counts=True)
        return bool((used <= problem.support_stock[supports]).all())

    def _by_pieces(self, coils: tuple[int, ...], to_beat: Key | None = None) -> Choice | None:
        """Fewest parts first; more parts a band only where a shared limit asks for them."""
        order, most = ORDERS["build"], self.problem.most_parts
        for extra in range(most + 1):
            bands, least = self._lowest_levels(coils, extra)
            if least is None:
                return None
            pieces = least + len(coils) + extra  # every choice that the columns of this step add has as many
            if extra and to_beat is not None and (pieces,) > to_beat[:1]:
                return None
            complete_to = pieces if extra < most else None
            try:
                choice = choose(self.problem, bands, coils, order, self.monitor, to_beat, complete_to)
            except (Beaten, Deeper):
                continue
            if choice is not None and (complete_to is None or choice.key[:1] <= (pieces,)):
                return choice
        return None

    def _lowest_levels(self, coils: tuple[int, ...], extra: int) -> tuple[list[Columns], int | None]:
        """Return each coil's columns from its fewest parts up to `extra` more, and the least sum."""
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
            if self.least is not None and not np.isfinite(self.least[parts][coil, band]):
                continue
            columns = self.source.columns(coil, band, parts)
            if len(columns):
                found.append(columns)
        return found

    def _by_price(self, coils: tuple[int, ...], to_beat: Key | None = None) -> Choice | None:
        """Cheapest first; more parts a band only where they could cost less or a shared limit asks for them."""
        bands: list[Columns] = []
        for band in range(self.problem.bands):
            blocks = [block for coil in coils for block in self._cheap_levels(coil, band)]
            if not blocks:
                return None
            bands.append(Columns.join(blocks))
        choice = first_without_shared_limits(self.problem, bands, coils, ORDERS["price"])
        if choice is None or inside_shared_limits(self.problem, choice):
            return choice
        return choose(self.problem, self._all_columns(coils), coils, ORDERS["price"], self.monitor, to_beat)

    def _cheap_levels(self, coil: int, band: int) -> list[Columns]:
        """Return a coil's columns from its fewest parts on, while more parts may be cheaper."""
        found: list[Columns] = []
        cheapest = NEVER
        cheapest_part = int(self.problem.part_price.min(initial=NEVER))
        for parts in range(self.problem.least_parts, self.problem.most_parts + 1):
            if cheapest < NEVER and parts * cheapest_part >= cheapest:
                break
            columns = self.source.columns(coil, band, parts)
            if len(columns):
                found.append(columns)
                cheapest = min(cheapest, int(columns.price.min()))
        return found

    def _all_columns(self, coils: tuple[int, ...], lead: float | None = None) -> list[Columns]:
        levels = range(self.problem.least_parts, self.problem.most_parts + 1)
        return [
            Columns.join([self.source.columns(coil, band, k, lead) for coil in coils for k in levels])
            for band in range(self.problem.bands)
        ]

    def _by_error(self, coils: tuple[int, ...], *, fewest_parts_first: bool = False) -> Choice | None:
        """Least error first; where a shared limit is in the way, all columns up to a trial error that grows."""
        least = self._least_worst(coils)
        if least is None:
            return None
        worst, parts = least
        if fewest_parts_first or not self.problem.mixed:
            choice = self._at_least_worst(coils, worst, parts)
            if choice is not None:
                return choice
        trial = (worst + 1) * 1e-12
        limit = self._largest()
        while trial < limit:
            choice = self._inside(coils, trial)
            if choice is not None:
                return choice
            trial *= 8.0
        return self._inside(coils, None)

    def _largest(self) -> float:
        """Return an error or excess at which a trial is worth no more than the limit itself. [-]"""
        problem = self.problem
        if problem.led_by_excess:
            return min(problem.excess_limit, 1e3)
        return min(float(np.max(problem.error_limit[~problem.swept])), 1e3)

    def _inside(self, coils: tuple[int, ...], trial: float | None) -> Choice | None:
        bands = self._all_columns(coils, trial if trial is None else trial * (1 + 1e-9))
        if any(len(columns) == 0 for columns in bands):
            return None
        if self.problem.parts_limit < NEVER:
            few = self._few_enough(bands, "fine_error")
            if few is None:
                return None
            few = self._few_enough(few, "fine_excess")
            assert few is not None
            choice = choose(self.problem, few, coils, ORDERS["error"][2:], self.monitor)
            if choice is not None:
                return self._with_leading_figures(choice)
        return choose(self.problem, bands, coils, ORDERS["error"], self.monitor)

    def _few_enough(self, bands: list[Columns], name: str) -> list[Columns] | None:
        """Keep the columns up to the least worst figure that the limit on parts allows; else None."""
        cap = self.problem.parts_limit
        figures = [getattr(columns, name) for columns in bands]
        steps = np.unique(np.concatenate(figures))
        low, high = 0, len(steps) - 1
        if _fewest(bands, figures, int(steps[high])) > cap:
            return None
        while low < high:
            middle = (low + high) // 2
            if _fewest(bands, figures, int(steps[middle])) <= cap:
                high = middle
            else:
                low = middle + 1
        return [columns.take(figure <= steps[high]) for columns, figure in zip(bands, figures, strict=True)]

    @staticmethod
    def _with_leading_figures(choice: Choice) -> Choice:
        error = max(int(columns.fine_error[0]) for columns in choice.columns)
        excess = max(int(columns.fine_excess[0]) for columns in choice.columns)
        return replace(choice, key=(error, excess, *choice.key))


def _first(choices: Iterable[Choice | None]) -> Choice | None:
    """Return the choice that comes first in the order, None where there is none."""
    return min((choice for choice in choices if choice is not None), key=lambda choice: choice.key, default=None)


def _fewest(bands: list[Columns], figures: list[Ints], most: int) -> int:
    """Return the fewest parts in all with every figure up to `most`. [-]"""
    total = 0
    for columns, figure in zip(bands, figures, strict=True):
        inside = columns.pieces[figure <= most]
        total += int(inside.min()) if len(inside) else NEVER
    return total
