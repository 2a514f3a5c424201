"""From species to parts: every choice of grades for networks of known capacitances, spelled once."""

from __future__ import annotations

import numpy as np

from partpick.search.divided import OWN_PARTS
from partpick.search.networks import PARALLEL, SERIES, Rows
from partpick.search.problem import PLENTY, Bools, Ints, Problem


class Grades:
    """The parts of each species that may be worth taking."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        self._figures = self._in_full()
        useful = [self.useful(options) for options in problem.options]
        self._starts = np.concatenate([[0], np.cumsum([len(o) for o in useful])]).astype(np.int64)
        self._flat = np.array([p for o in useful for p in o], dtype=np.int64)

    def useful(self, options: tuple[int, ...]) -> tuple[int, ...]:
        """Drop a part that another in plenty equals in every figure and precedes in content."""
        p = self.problem
        kept: list[int] = []
        seen: set[tuple[object, ...]] = set()
        for part in sorted(options, key=lambda i: int(p.part_rank[i])):
            if p.part_stock[part] < 1:
                continue
            figures = self._figures[part]
            if figures in seen:
                continue
            if p.part_stock[part] >= PLENTY:
                seen.add(figures)
            kept.append(part)
        return tuple(kept)

    def _in_full(self) -> list[tuple[float, ...]]:
        """Return every figure of each part that the order or a limit asks for."""
        p = self.problem
        figures = [*np.nan_to_num(p.part_loss, nan=-1.0), *np.nan_to_num(p.part_loss_low, nan=-1.0)]
        figures.append(p.part_price.astype(float))
        if np.isfinite(p.drift_limit):
            figures += [np.nan_to_num(p.part_tempco, nan=9.0), p.part_tempco_spread]
        if p.alignable > 0:
            figures.append(p.part_tolerance)
        if p.drive is not None:
            figures += [p.drive.part_voltage[:-1], p.drive.part_current[:-1]]
        return [tuple(row) for row in np.stack(figures, axis=1).tolist()]

    def expand(
        self, rows: Rows, *, last_apart: bool = False, allowed: Bools | None = None
    ) -> tuple[Ints, Ints]:
        """Return the row of each choice of grades, (m,), and the parts chosen, (m, k).

        Parameters
        ----------
        rows : Rows
            Networks of species. [-]
        last_apart : bool
            The last place is a series padder, which changes places with no other part. [-]
        allowed : (P,) array of bool, optional
            Which parts may be taken; all by default. [-]
        """
        count = self._starts[1:] - self._starts[:-1]
        places = rows.species.shape[1]
        source = np.arange(len(rows.value))
        chosen = np.empty((len(source), 0), dtype=np.int64)
        for place in range(places):
            species = rows.species[source, place]
            times = count[species]
            first = np.cumsum(times) - times
            origin = np.repeat(np.arange(len(times)), times)
            offset = np.arange(int(times.sum())) - first[origin]
            source = source[origin]
            part = self._flat[self._starts[species[origin]] + offset]
            chosen = np.concatenate([chosen[origin], part[:, None]], axis=1)
            keep = self._in_stock(chosen)
            if allowed is not None:
                keep = keep & allowed[chosen[:, -1]]
            if place > 0 and not (last_apart and place == places - 1):
                keep = keep & self._one_spelling(rows.take(source), chosen, place)
            source, chosen = source[keep], chosen[keep]
        return source, chosen

    def _one_spelling(self, rows: Rows, chosen: Ints, place: int) -> Bools:
        """Equal species in interchangeable places: only the order of content."""
        twins = rows.species[:, place] == rows.species[:, place - 1]
        if place == 1:
            twins &= (rows.shape == PARALLEL) | (rows.shape == SERIES)
        for shape, own in OWN_PARTS.items():  # each place of a divider is its own
            if place <= own:
                twins &= rows.shape != shape
        rank = self.problem.part_rank
        return np.asarray(~twins | (rank[chosen[:, place]] >= rank[chosen[:, place - 1]]))

    def _in_stock(self, chosen: Ints) -> Bools:
        last = chosen[:, -1]
        used = (chosen == last[:, None]).sum(axis=1)
        return np.asarray(used <= self.problem.part_stock[last])
