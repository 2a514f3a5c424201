"""Columns: every network, grade by grade, that one coil may have at one band.

A column carries the figures by which plans are ordered, as whole numbers. Columns that no plan can
prefer (same figures, later in the order of content, never scarcer) are dropped where stock is plenty.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED, Rows, Stream, Table, network_tables
from partpick.search.problem import NEVER, PLENTY, Bools, Floats, Ints, Problem


@dataclass(frozen=True, eq=False)
class Columns:
    """Networks of known grades for one (coil, band), (m,) each; `parts` is padded with -1."""

    coil: Ints
    parts: Ints  # (m, most parts)
    shape: NDArray[np.int8]
    network: Floats  # F, effective
    error: Floats  # signed fraction
    pieces: Ints
    error_class: Ints  # round(max(|error|, floor) 1e9)
    fine_error: Ints  # round(max(|error|, 1e-9) 1e12)
    q_class: Ints
    stray_class: Ints
    reactance_class: Ints
    commonness: Ints
    error_rank: Ints  # round(|error| 1e9)
    price: Ints

    def __len__(self) -> int:
        return len(self.network)

    def take(self, chosen: NDArray[np.generic]) -> Columns:
        """Return the columns chosen by a mask or an index array."""
        return Columns(*(getattr(self, name)[chosen] for name in self.__dataclass_fields__))

    @staticmethod
    def join(blocks: list[Columns]) -> Columns:
        """Return all columns of several blocks."""
        names = Columns.__dataclass_fields__
        return Columns(*(np.concatenate([getattr(b, name) for b in blocks]) for name in names))


def quality_class(loss: Floats, enough: Floats | float) -> Ints:
    """Return the steps of 25 % by which Q is below enough, 0 to 4; 5 where it is unknown.

    Parameters
    ----------
    loss : array
        1/Q, nan where unknown. [-]
    enough : array or float
        The Q that is enough. [-]
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        below = 1.0 - 1.0 / (loss * enough)
    steps = np.ceil(np.clip(below, 0.0, 1.0) / 0.25 - 1e-9)
    return np.where(np.isnan(loss), 5, np.nan_to_num(steps)).astype(np.int64)


def stray_class(share: Floats) -> Ints:
    """Return 0 up to 10 % of strays in the capacitance in circuit, 1 up to 20 %, else 2. [-]"""
    return np.where(share <= 0.1 * (1 + 1e-12), 0, np.where(share <= 0.2 * (1 + 1e-12), 1, 2)).astype(np.int64)


def coarse_error(error: Floats, floor: float) -> Ints:
    """Return the error class round(max(|error|, floor) 1e9). [-]"""
    return np.rint(np.maximum(np.abs(error), floor) * 1e9).astype(np.int64)


def fine_error(error: Floats) -> Ints:
    """Return round(max(|error|, 1e-9) 1e12); below 1e-9 all are equal. [-]"""
    return np.rint(np.maximum(np.abs(error), 1e-9) * 1e12).astype(np.int64)


def network_weights(part: Floats, shape: NDArray[np.int8], network: Floats) -> Floats:
    """Return d ln(network) / d ln(part), (m, k): how much each part weighs in its network. [-]"""
    weights = np.zeros_like(part)
    for kind in (PARALLEL, SERIES, SHUNTED, CHAINED):
        rows = shape == kind
        if not rows.any():
            continue
        c, net = part[rows], network[rows, None]
        if kind == PARALLEL:
            weights[rows] = c / net
        elif kind == SERIES:
            with np.errstate(divide="ignore", invalid="ignore"):
                weights[rows] = np.where(c > 0, net / c, 0.0)
        elif kind == SHUNTED:
            pair = c[:, 1:2] * c[:, 2:3] / (c[:, 1:2] + c[:, 2:3])
            weights[rows, :3] = np.concatenate([c[:, :1], pair**2 / c[:, 1:2], pair**2 / c[:, 2:3]], 1) / net
        else:
            pair = c[:, 1:2] + c[:, 2:3]
            weights[rows, :3] = np.concatenate(
                [net / c[:, :1], net * c[:, 1:2] / pair**2, net * c[:, 2:3] / pair**2], 1
            )
    return weights


class ColumnSource:
    """Makes columns on demand from the problem's network tables."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        self.valid = [np.flatnonzero(np.isfinite(values)) for values in problem.species]
        self.tables: list[list[Table | Stream]] = []
        for band, valid in enumerate(self.valid):
            twin = self._same_as_before(band)
            if twin is not None:
                self.tables.append(self.tables[twin])
                continue
            values = problem.species[band][valid]
            most = problem.most_parts if len(values) else 0
            self.tables.append(network_tables(values, most, problem.connect_any))
        self.levels = [
            problem.windows(parts) for parts in (0, 1)
        ]  # windows differ only by the share limit, which a band without capacitors is spared
        self._lists = self._option_arrays()

    def _same_as_before(self, band: int) -> int | None:
        for earlier in range(band):
            if np.array_equal(self.problem.species[band], self.problem.species[earlier]):
                return earlier
        return None

    def _option_arrays(self) -> tuple[Ints, Ints]:
        """Return the useful parts of all species end to end, and where each species starts."""
        useful = [self._useful(options) for options in self.problem.options]
        starts = np.concatenate([[0], np.cumsum([len(o) for o in useful])]).astype(np.int64)
        return np.array([p for o in useful for p in o], dtype=np.int64), starts

    def _useful(self, options: tuple[int, ...]) -> tuple[int, ...]:
        """Drop a part that another in plenty equals in every figure and precedes in content."""
        p = self.problem
        kept: list[int] = []
        seen: set[tuple[object, ...]] = set()
        for part in sorted(options, key=lambda i: int(p.part_rank[i])):
            if p.part_stock[part] < 1:
                continue
            figures = (
                tuple(np.nan_to_num(p.part_loss[:, part], nan=-1.0)),
                float(np.nan_to_num(p.part_tempco[part], nan=9.0)) if np.isfinite(p.drift_limit) else 0.0,
                float(p.part_tempco_spread[part]) if np.isfinite(p.drift_limit) else 0.0,
                int(p.part_price[part]),
            )
            if figures in seen:
                continue
            if p.part_stock[part] >= PLENTY:
                seen.add(figures)
            kept.append(part)
        return tuple(kept)

    def counts(self, parts: int) -> Ints:
        """Return how many networks of `parts` parts lie in each window, (J, B); streams tell 0 from some."""
        low, high = self.levels[min(parts, 1)]
        found = np.zeros(low.shape, dtype=np.int64)
        for band, tables in enumerate(self.tables):
            if parts < len(tables):
                found[:, band] = tables[parts].counts(low[:, band], high[:, band])
        return found

    def least_errors(self, parts: int) -> Floats:
        """Return the least size of error with exactly `parts` parts, (J, B); inf where none is inside. [-]"""
        p = self.problem
        low, high = self.levels[min(parts, 1)]
        fixed = p.fixed_capacitance()
        best = np.full(low.shape, np.inf)
        for band, tables in enumerate(self.tables):
            if parts >= len(tables):
                continue
            rows = np.flatnonzero(low[:, band] <= high[:, band])
            lower, upper = low[rows, band], high[rows, band]
            centre = p.wanted[rows, band] - fixed[rows, band]
            if p.lead_inductance > 0:
                squared = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
                centre = np.where(centre > 0, centre / (1 + squared * np.abs(centre)), centre)
            centre = np.clip(centre, lower, upper)
            for side in tables[parts].neighbours(centre):
                inside = (side >= lower) & (side <= upper)
                network = p.behind_leads(side[inside], band)
                total = fixed[rows[inside], band] + network
                error = np.abs(np.sqrt(p.wanted[rows[inside], band] / total) - 1.0)
                best[rows[inside], band] = np.minimum(best[rows[inside], band], error)
        return best

    def columns(self, coil: int, band: int, parts: int, error: float | None = None) -> Columns:
        """Return every column of `parts` parts inside all limits of one band.

        Parameters
        ----------
        coil, band, parts : int
            Which coil and band, and how many capacitors. [-]
        error : float or None
            Keep to networks with at most this size of error (fraction of f); None: the limit's. [-]
        """
        p = self.problem
        low, high = (float(side[coil, band]) for side in self.levels[min(parts, 1)])
        tables = self.tables[band]
        if low > high or parts >= len(tables):
            return self._empty()
        if error is not None:
            low, high = self._narrow(coil, band, low, high, error)
        rows = tables[parts].inside(low, high)
        rows = Rows(rows.value, self.valid[band][rows.species].astype(np.int16), rows.shape)
        rows, chosen = self._grades(rows)
        columns, keep = self._figures(coil, band, rows, chosen)
        return columns.take(keep)

    def _narrow(self, coil: int, band: int, low: float, high: float, error: float) -> tuple[float, float]:
        p = self.problem
        fixed = p.self_capacitance[coil] + p.stray[band] + (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        wanted = p.wanted[coil, band]
        grain = 1e-12 * wanted
        least = wanted / (1 + error) ** 2 - fixed - grain
        most = wanted / max(1 - error, 1e-9) ** 2 - fixed + grain
        if p.lead_inductance > 0:
            squared = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
            least, most = (c / (1 + squared * c) if c > 0 else c for c in (least, most))
        return max(low, least), min(high, most)

    def _empty(self) -> Columns:
        most = max(1, self.problem.most_parts)
        whole = np.empty(0, np.int64)
        return Columns(
            whole, np.empty((0, most), np.int64), np.empty(0, np.int8), np.empty(0), np.empty(0),
            *([whole] * 9),
        )  # fmt: skip

    def _grades(self, rows: Rows) -> tuple[Rows, Ints]:
        """Return each network once for every choice of grades, and the parts chosen, (m, k)."""
        flat, starts = self._lists
        count = starts[1:] - starts[:-1]
        chosen = np.empty((len(rows.value), 0), dtype=np.int64)
        for place in range(rows.species.shape[1]):
            times = count[rows.species[:, place]]
            first = np.cumsum(times) - times
            origin = np.repeat(np.arange(len(times)), times)
            offset = np.arange(int(times.sum())) - first[origin]
            rows, chosen = rows.take(origin), chosen[origin]
            part = flat[starts[rows.species[:, place]] + offset]
            chosen = np.concatenate([chosen, part[:, None]], axis=1)
            keep = self._one_spelling(rows, chosen, place) & self._in_stock(chosen)
            rows, chosen = rows.take(keep), chosen[keep]
        return rows, chosen

    def _one_spelling(self, rows: Rows, chosen: Ints, place: int) -> Bools:
        """Equal species in interchangeable places: only the order of content."""
        if place == 0:
            return np.ones(len(chosen), dtype=np.bool_)
        twins = rows.species[:, place] == rows.species[:, place - 1]
        if place == 1:
            twins &= (rows.shape == PARALLEL) | (rows.shape == SERIES)
        rank = self.problem.part_rank
        return ~twins | (rank[chosen[:, place]] >= rank[chosen[:, place - 1]])

    def _in_stock(self, chosen: Ints) -> Bools:
        last = chosen[:, -1]
        used = (chosen == last[:, None]).sum(axis=1)
        return used <= self.problem.part_stock[last]

    def _figures(self, coil: int, band: int, rows: Rows, chosen: Ints) -> tuple[Columns, Bools]:
        p = self.problem
        strays = p.self_capacitance[coil] + p.stray[band]
        trimmer = (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        wanted = p.wanted[coil, band]
        network = p.behind_leads(rows.value, band)
        total = network + strays + trimmer
        error = np.sqrt(wanted / total) - 1.0
        values = p.species[band][rows.species]
        share_of_parts = network_weights(values, rows.shape, np.maximum(rows.value, 1e-30))
        loss = self._loss(coil, band, chosen, share_of_parts * (network / total)[:, None], trimmer / total)
        keep = np.abs(error) <= p.error_limit[band] * (1 + 1e-12) + 1e-15
        if p.q_limit[band] > 0:
            keep &= loss * p.q_limit[band] <= 1 + 1e-12
        if np.isfinite(p.drift_limit):
            nominal, spread = self.drift(coil, band, chosen, share_of_parts, network)
            keep &= np.abs(nominal) + spread <= p.drift_limit * (1 + 1e-12)
        k = chosen.shape[1]
        padded = np.full((len(chosen), max(1, p.most_parts)), -1, dtype=np.int64)
        padded[:, :k] = chosen
        whole = np.full(len(chosen), 0, dtype=np.int64)
        columns = Columns(
            coil=whole + coil,
            parts=padded,
            shape=rows.shape,
            network=network,
            error=error,
            pieces=whole + k,
            error_class=coarse_error(error, p.floor),
            fine_error=fine_error(error),
            q_class=quality_class(loss, p.q_enough[band]),
            stray_class=stray_class(strays / total),
            reactance_class=whole + p.reactance_class[coil, band],
            commonness=p.commonness[rows.species].sum(axis=1),
            error_rank=np.rint(np.abs(error) * 1e9).astype(np.int64),
            price=np.minimum(p.part_price[chosen].sum(axis=1), NEVER),
        )
        return columns, keep

    def _loss(self, coil: int, band: int, chosen: Ints, weight: Floats, trimmer_share: Floats) -> Floats:
        p = self.problem
        parts = (weight * p.part_loss[band][chosen]).sum(axis=1)
        return p.coil_loss[coil, band] + parts + trimmer_share * p.trimmer_loss[band]

    def drift(
        self, coil: int, band: int, chosen: Ints, share_of_parts: Floats, network: Floats
    ) -> tuple[Floats, Floats]:
        """Return df/f per kelvin, nominal (signed) and spread (size), (m,) each. [1/K]"""
        p = self.problem
        strays = p.self_capacitance[coil] + p.stray[band]
        trimmer = np.clip(
            p.wanted[coil, band] - network - strays, p.trimmer_low[band], p.trimmer_high[band]
        )
        total = network + strays + trimmer
        weight = share_of_parts * (network / total)[:, None]
        fixed = (strays * p.stray_tempco + trimmer * p.trimmer_tempco[band]) / total
        capacitance = (weight * p.part_tempco[chosen]).sum(axis=1) + fixed
        nominal = -0.5 * (p.coil_tempco[coil, band] + capacitance)
        parts_spread = (weight * p.part_tempco_spread[chosen]).sum(axis=1)
        return nominal, 0.5 * (p.coil_tempco_spread[coil] + parts_spread)
