"""The rows that a layout with shared capacitors is searched by: some coils, and what they need at least."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.search.figures import coarse_error, fine_error, whole_excess
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem

LAST = np.iinfo(np.int64).max
MOST_PATTERNS = 1 << 17
_COARSE = 10**6  # of the excess, in steps of 1e-12


@dataclass(eq=False)
class PlanRows:
    """Coils and bounds of every row, (R,) each."""

    problem: Problem
    coils: Ints  # (R, most coils), -1 where there are fewer
    pattern: Ints  # number of the way in which bands are shared out among the coils
    least_pieces: Ints  # capacitors, IMPOSSIBLE where nothing serves
    least_error: Floats  # 0 where every band is swept
    q_class: Ints
    stray_class: Ints
    reactance_class: Ints
    omitted: int = LAST  # packed bound of what is in no row, LAST: everything is

    def __post_init__(self) -> None:
        """Add up what the coils bring with them."""
        p, used = self.problem, self.coils >= 0
        self.size: Ints = used.sum(axis=1)
        price = np.where(used, p.coil_price[self.coils], 0).sum(axis=1)
        self.price: Ints = np.minimum(price, NEVER)
        self.effort: Ints = np.where(used[:, :, None], p.effort[self.coils], 0).sum(axis=1)

    def __len__(self) -> int:
        return len(self.coils)

    def coils_of(self, row: int) -> tuple[int, ...]:
        """Return the coils of one row, in rising order."""
        return tuple(sorted(int(coil) for coil in self.coils[row] if coil >= 0))

    def groups(self, all_windings: bool) -> Ints:
        """Return a number for each row, equal for those that share a place among the results."""
        shown = self.coils if all_windings else np.where(self.coils >= 0, self.problem.support[self.coils], -1)
        if shown.shape[1] == 1:
            return shown[:, 0]
        return np.unique(np.sort(shown, axis=1), axis=0, return_inverse=True)[1].reshape(-1)

    def supports_in_stock(self) -> Bools:
        """Whether there are enough formers, cores and bought inductors for the coils of each row."""
        p, used = self.problem, self.coils >= 0
        support = np.where(used, p.support[self.coils], -1)
        alike = (support[:, :, None] == support[:, None, :]).sum(axis=2)
        return np.asarray((~used | (alike <= p.support_stock[support])).all(axis=1))

    def figures(self, rows: Ints, lead: Floats) -> dict[str, Ints]:
        """Return what no plan of some rows undercuts, given that none has a smaller leading figure."""
        p = self.problem
        nothing = np.zeros(len(rows))
        error, excess = (nothing, lead) if p.led_by_excess else (lead, nothing)
        figures = {
            "error_class": coarse_error(error, p.floor),
            "fine_error": fine_error(error) - 1,
            "excess_class": np.maximum(whole_excess(excess, 1e-9) - 1, 0),
            "fine_excess": np.maximum(whole_excess(excess, 1e-12) - 1, 0),
            "coarse_excess": np.maximum(whole_excess(excess, 1e-12) // _COARSE - 1, 0),
            "q_class": self.q_class[rows],
            "stray_class": self.stray_class[rows],
            "reactance_class": self.reactance_class[rows],
            "price": self.price[rows],
        }
        return figures | dict(zip(("forms", "wires", "volume"), self.effort[rows].T, strict=True))
