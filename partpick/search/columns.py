"""Columns: every network, grade by grade, that one coil may have at one band.

A column carries the figures by which plans are ordered, as whole numbers. Columns that no plan can
prefer (same figures, later in the order of content, never scarcer) are dropped where stock is plenty.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Protocol

import numpy as np

from partpick.search.alignment import alignable
from partpick.search.bearing import BearingTables, Cache
from partpick.search.coverage import LeastExcess
from partpick.search.divided import LOADED
from partpick.search.dividers import divided_tables
from partpick.search.drift_bound import steady_enough
from partpick.search.figures import (
    Columns,
    coarse_error,
    fine_error,
    network_weights,
    padded,
    quality_class,
    stray_class,
)
from partpick.search.grades import Grades
from partpick.search.matching import matched
from partpick.search.networks import Rows, Stream, Table, network_tables
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem
from partpick.search.ratings import can_bear, inside_ratings
from partpick.search.startup import starts
from partpick.search.swept import SweptColumns


class ColumnMaker(Protocol):
    """What makes the columns of a coil at a band."""

    problem: Problem

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return every column of `parts` parts inside all limits of one band."""

    def for_shared_coils(self) -> ColumnMaker | None:
        """Return what makes the columns of coils that serve several bands; None where it makes no difference."""


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
            self.tables.append(self._networks_of(problem.species[band][valid], band))
        self.grades = Grades(problem)
        self.gain = problem.part_gain(), problem.part_gain(low_end=True)
        self._bearing_cache: Cache = {}
        self._prepare()

    def _prepare(self) -> None:
        """Make what depends on the coils."""
        problem = self.problem
        self._shared: ColumnSource | None = None
        self.levels = [
            problem.windows(parts) for parts in (0, 1)
        ]  # windows differ only by the share limit, which a band without capacitors is spared
        driven = problem.drive is not None and not problem.connect_any
        self._bearing = BearingTables(problem, self.valid, self._bearing_cache) if driven else None
        self._swept, self._least_excess = self._for_swept_bands()

    def _networks_of(self, values: Floats, band: int) -> list[Table | Stream]:
        """Return the tables of every number of parts over some capacitances as they act at a band."""
        most, matching = self.problem.most_parts if len(values) else 0, self.problem.matching
        if matching is not None and matching.divided[band]:
            return divided_tables(values, most, LOADED, self.problem.device_at(band))
        return network_tables(values, most, self.problem.connect_any)

    def _for_swept_bands(self) -> tuple[SweptColumns, LeastExcess]:
        """Return what makes the columns of swept bands, and what bounds their excess."""
        return (
            SweptColumns(self.problem, self.tables, self.valid, self.grades, self.gain),
            LeastExcess(self.problem, self.tables, self.valid),
        )

    def sharing_tables(self, problem: Problem) -> ColumnSource:
        """Return a source for other coils with the same capacitors and bands."""
        other = ColumnSource.__new__(ColumnSource)
        other.problem, other.valid, other.tables, other.grades = problem, self.valid, self.tables, self.grades
        other.gain = self.gain
        other._bearing_cache = self._bearing_cache
        other._prepare()
        return other

    def for_shared_coils(self) -> ColumnMaker | None:
        """Return the source of coils that serve several bands; None where that makes no difference."""
        p = self.problem
        if not (p.alignable > 0 and p.coil_alone and bool((p.coil_adjust > 0).any())):
            return None
        if self._shared is None:
            self._shared = self.with_problem(replace(p, coil_alone=False))
        return self._shared

    def with_problem(self, problem: Problem) -> ColumnSource:
        """Return a source of the same kind for the same coils under other rules."""
        return self.sharing_tables(problem)

    def _same_as_before(self, band: int) -> int | None:
        for earlier in range(band):
            alike = self.problem.swept[band] == self.problem.swept[earlier] or self.problem.oscillator is None
            alike &= self.problem.device_at(band) == self.problem.device_at(earlier)
            if alike and np.array_equal(self.problem.species[band], self.problem.species[earlier]):
                return earlier
        return None

    def least_errors(self, parts: int) -> Floats:
        """Return the least size of error with exactly `parts` parts, (J, B); inf where none is inside.

        A lower bound, 0, where the networks are too many to look through for every coil. A swept band has no
        error: 0 where `parts` or fewer parts cover it. [-]
        """
        p = self.problem
        low, high = self.levels[min(parts, 1)]
        best = np.full(low.shape, np.inf)
        for band, tables in enumerate(self.tables):
            if p.swept[band]:
                covered = np.isfinite(self.least_excesses(parts)[:, band])
                best[covered, band] = 0.0
                continue
            rows = np.flatnonzero(low[:, band] <= high[:, band])
            groups = iter([(rows, tables)]) if self._bearing is None else self._bearing.by_level(band, rows)
            for some, own in groups:
                if parts < len(own):
                    best[some, band] = self._least_error(band, some, own[parts], low[some, band], high[some, band])
        if np.isfinite(p.drift_limit) and p.oscillator is None and p.matching is None:
            best[~steady_enough(p, parts)] = np.inf
        if p.drive is not None:
            best[~can_bear(p, parts)] = np.inf
        return best

    def _least_error(self, band: int, rows: Ints, table: Table | Stream, lower: Floats, upper: Floats) -> Floats:
        """Return the least size of error of some coils with the networks of a table, inf for none inside, (r,). [-]"""
        p = self.problem
        if isinstance(table, Stream) and table.deep:  # too many to look through for all coils: a bound
            return np.zeros(len(rows))
        wanted = p.wanted[rows, band]
        fixed = p.self_capacitance[rows] + p.stray[band] + (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        centre = wanted - fixed
        if p.lead_inductance > 0:
            squared = (2 * np.pi * p.frequency[band]) ** 2 * p.lead_inductance
            centre = np.where(centre > 0, centre / (1 + squared * np.abs(centre)), centre)
        best = np.full(len(rows), np.inf)
        for side in table.neighbours(np.clip(centre, lower, upper)):
            inside = (side >= lower) & (side <= upper)
            total = fixed[inside] + p.behind_leads(side[inside], band)
            best[inside] = np.minimum(best[inside], np.abs(np.sqrt(wanted[inside] / total) - 1.0))
        return best

    def least_excesses(self, parts: int) -> Floats:
        """Return a lower bound of the excess with at most `parts` parts, (J, B); inf where none covers.

        0 for fixed bands; the least excess itself where no capacitor has series inductance. [-]
        """
        return self._least_excess.level(parts)

    def least_classes(self) -> tuple[Ints, Ints, Ints]:
        """Return the least Q, stray and reactance class that each coil may have, (J, B) each. [-]"""
        p = self.problem
        worse = np.maximum(p.coil_loss, p.coil_loss_low)  # of a swept band's two ends
        loss = np.where(p.swept[None, :], worse, p.coil_loss)
        error = np.minimum(p.error_limit, 0.999)[None, :]
        most = np.where(p.swept[None, :], p.most_at_high_end, p.wanted / (1 - error) ** 2)
        strays = p.strays()
        return quality_class(loss, p.q_enough[None, :]), stray_class(strays / most), p.reactance_class.copy()

    def columns(self, coil: int, band: int, parts: int, lead: float | None = None) -> Columns:
        """Return every column of `parts` parts inside all limits of one band.

        Parameters
        ----------
        coil, band, parts : int
            Which coil and band, and how many capacitors. [-]
        lead : float or None
            Keep to networks with at most this size of error (fraction of f), or at most this excess
            where every band is swept; None: the limit's. [-]
        """
        p = self.problem
        if p.swept[band]:
            return self._swept.columns(coil, band, parts, lead if p.led_by_excess else None)
        low, high = (float(side[coil, band]) for side in self.levels[min(parts, 1)])
        tables, valid, allowed = self.tables[band], self.valid[band], None
        if self._bearing is not None:
            tables, valid, allowed = self._bearing.of(coil, band)
        if low > high or parts >= len(tables):
            return Columns.empty(p.most_parts)
        if lead is not None:
            low, high = self._narrow(coil, band, low, high, lead)
        rows = tables[parts].inside(low, high)
        rows = Rows(rows.value, valid[rows.species].astype(np.int16), rows.shape)
        origin, chosen = self.grades.expand(rows, allowed=allowed)
        columns, keep = self._figures(coil, band, rows.take(origin), chosen)
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

    def _figures(self, coil: int, band: int, rows: Rows, chosen: Ints) -> tuple[Columns, Bools]:
        p = self.problem
        strays = p.self_capacitance[coil] + p.stray[band]
        trimmer = (p.trimmer_low[band] + p.trimmer_high[band]) / 2
        wanted = p.wanted[coil, band]
        network = p.behind_leads(rows.value, band)
        total = network + strays + trimmer
        error = np.sqrt(wanted / total) - 1.0
        values = p.species[band][rows.species]
        alone = np.maximum(rows.value, 1e-30)
        share_of_parts = network_weights(values, rows.shape, alone, p.device_at(band)) * self.gain[0][band][chosen]
        share_of_parts *= (network / alone)[:, None]  # behind leads a network grows faster than its parts
        loss = self._loss(coil, band, chosen, share_of_parts * (network / total)[:, None], trimmer / total)
        keep = np.abs(error) <= p.error_limit[band] * (1 + 1e-12) + 1e-15
        if p.q_limit[band] > 0:
            keep &= loss * p.q_limit[band] <= 1 + 1e-12
        if np.isfinite(p.drift_limit):
            nominal, spread = self.drift(coil, band, chosen, share_of_parts, network)
            keep &= np.abs(nominal) + spread <= p.drift_limit * (1 + 1e-12)
        keep &= p.trimmer_span[band] <= p.trim_share[band] * total * (1 + 1e-12)
        if p.alignable > 0 and p.aligned[band]:
            left = np.flatnonzero(keep)
            keep[left] = alignable(p, coil, band, values[left], chosen[left], rows.shape[left])
        if p.drive is not None:
            rise = network / np.maximum(rows.value, 1e-30)
            keep &= inside_ratings(p, coil, band, values, chosen, rows.shape, rise, loss)
        if p.matching is not None:
            load = p.device_at(band)[1]
            keep &= matched(p.matching, band, values, load, float(p.inductance_high[coil, band]), total, loss)
        if p.oscillator is not None:
            keep = starts(p, coil, band, values, rows.shape, total, loss, keep)
        whole = np.zeros(len(chosen), dtype=np.int64)
        columns = Columns(
            coil=whole + coil,
            parts=padded(chosen, p.most_parts),
            series=whole - 1,
            tap=whole,
            shape=rows.shape,
            network=network,
            error=error,
            excess=np.zeros(len(chosen)),
            pieces=whole + chosen.shape[1],
            error_class=coarse_error(error, p.floor),
            fine_error=fine_error(error),
            q_class=quality_class(loss, p.q_enough[band]),
            stray_class=stray_class(strays / total),
            reactance_class=whole + p.reactance_class[coil, band],
            commonness=p.commonness[rows.species].sum(axis=1),
            error_rank=np.rint(np.abs(error) * 1e9).astype(np.int64),
            price=np.minimum(p.part_price[chosen].sum(axis=1), NEVER),
            excess_class=whole,
            fine_excess=whole,
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
        parts_spread = parts_spread + trimmer / total * p.trimmer_tempco_spread[band]
        return nominal, 0.5 * (p.coil_tempco_spread[coil] + parts_spread)
