"""Capacitors in parallel across one coil: the figures of a circuit, and the interval it must lie in.

For the layouts in which a capacitor serves several bands, where what is in circuit is no longer one
band's own network. Rows are (coil, band, parts); parts are padded with -1.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from partpick.search.drive import Drive, borne
from partpick.search.figures import Columns, coarse_error, fine_error, quality_class, stray_class
from partpick.search.networks import PARALLEL
from partpick.search.problem import NEVER, Bools, Floats, Ints, Problem

_ROUNDING = 1e-12

AnyInts = NDArray[np.integer[Any]]
Windows = tuple[tuple[Floats, Floats], tuple[Floats, Floats]]


def species_of_parts(problem: Problem) -> Ints:
    """Return the species of each part, (P,); -1 for a part that is in none. [-]"""
    of_part = np.full(len(problem.part_stock), -1, dtype=np.int64)
    for species, options in enumerate(problem.options):
        of_part[list(options)] = species
    return of_part


def acting_parts(problem: Problem) -> Floats:
    """Return how each part acts at each band, (B, P); inf where it is of no use there. [F]"""
    of_part = species_of_parts(problem)
    acting = np.full((problem.bands, len(of_part)), np.inf)
    known = of_part >= 0
    acting[:, known] = problem.species[:, of_part[known]]
    return acting


class Circuits:
    """Figures and limits of parallel circuits, many rows at a time."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        self.acting = acting_parts(problem)
        usable = np.isfinite(self.acting)
        self._usable = _with_blank(usable, True)
        self._value = _with_blank(np.where(usable, self.acting, 0.0), 0.0)
        self._gain = _with_blank(problem.part_gain(), 1.0)
        self._loss = _with_blank(problem.part_loss, 0.0)
        self._tempco = _with_blank(problem.part_tempco, 0.0)
        self._spread = _with_blank(problem.part_tempco_spread, 0.0)
        self._commonness = _with_blank(problem.commonness[species_of_parts(problem)], 0)
        self._price = _with_blank(problem.part_price, 0)
        self._middle = (problem.trimmer_low + problem.trimmer_high) / 2
        self._fixed = problem.fixed_capacitance()
        self._limits = [problem.windows(parts) for parts in (0, 1)]
        self.limits: Windows = self._limits[0], self._limits[1]

    def sums(self, band: int, parts: AnyInts) -> Floats:
        """Return the capacitance of each row of parts at a band, (m,); inf where one is of no use there. [F]"""
        values = np.where(self._usable[band], self._value[band], np.inf)
        return np.asarray(values[parts].sum(axis=1))

    def commonness(self, parts: AnyInts) -> Ints:
        """Return the summed commonness of each row of parts, (m,). [-]"""
        return np.asarray(self._commonness[parts].sum(axis=1))

    def price(self, parts: AnyInts) -> Ints:
        """Return the price of each row of parts in hundredths, NEVER where one is unknown, (m,). [-]"""
        return np.minimum(self._price[parts].sum(axis=1), NEVER)

    def windows(self, error: Floats, coils: Ints | slice = slice(None)) -> Windows:
        """Return the intervals of the parts' capacitance inside all limits and an error of each coil.

        Parameters
        ----------
        error : (m,) array
            Largest size of error; inf: the limits alone. [fraction of f]
        coils : (m,) array, optional
            Which coils; all by default. [-]

        Returns
        -------
        intervals : tuple
            (low, high), (m, B) each, first for a circuit without capacitors, then with some. [F]
        """
        p = self.problem
        fixed, wanted = self._fixed[coils], p.wanted[coils]
        grain = _ROUNDING * wanted
        low = wanted / (1 + error[:, None]) ** 2 - fixed - grain
        high = wanted / np.maximum(1 - error[:, None], 1e-9) ** 2 - fixed + grain
        if p.lead_inductance > 0:
            squared = (2 * np.pi * p.frequency[None, :]) ** 2 * p.lead_inductance
            low, high = (np.where(c > 0, c / (1 + squared * np.maximum(c, 0)), c) for c in (low, high))
        none, some = (
            (np.maximum(low, least[coils]), np.minimum(high, most[coils])) for least, most in self._limits
        )
        return none, some

    def columns(self, coil: Ints, band: Ints, parts: AnyInts) -> tuple[Columns, Bools]:
        """Return the figures of each row, and whether it is inside every limit of its band.

        Parameters
        ----------
        coil, band : (m,) arrays
            Which coil and band. [-]
        parts : (m, k) array
            All parts in circuit, -1 where there are fewer than k. [-]
        """
        p = self.problem
        where = band[:, None]
        value = self._value[where, parts]
        nominal = value.sum(axis=1)
        network = nominal
        if p.lead_inductance > 0:
            squared = (2 * np.pi * p.frequency[band]) ** 2
            network = nominal / (1.0 - squared * p.lead_inductance * nominal)
        strays = p.self_capacitance[coil] + p.stray[band]
        wanted = p.wanted[coil, band]
        total = np.maximum(network + strays + self._middle[band], 1e-30)
        error = np.sqrt(wanted / total) - 1.0
        alone = np.maximum(nominal, 1e-30)  # behind leads what is in circuit grows faster than its parts
        share = value / alone[:, None] * self._gain[where, parts] * (network / alone)[:, None]
        weight = share * (network / total)[:, None]
        loss = p.coil_loss[coil, band] + (weight * self._loss[where, parts]).sum(axis=1)
        loss = loss + self._middle[band] / total * p.trimmer_loss[band]
        pieces = (parts >= 0).sum(axis=1)
        keep = self._inside(coil, band, nominal, pieces) & self._usable[where, parts].all(axis=1)
        keep &= np.abs(error) <= p.error_limit[band] * (1 + _ROUNDING) + 1e-15
        limited = p.q_limit[band] > 0
        keep &= ~limited | (loss * p.q_limit[band] <= 1 + _ROUNDING)
        if np.isfinite(p.drift_limit):
            keep &= self._drift(coil, band, parts, share, network) <= p.drift_limit * (1 + _ROUNDING)
        if p.drive is not None:
            rise = network / np.maximum(nominal, 1e-30)
            keep &= self._bears(p.drive, coil, band, parts, rise, loss)
        whole = np.zeros(len(coil), dtype=np.int64)
        columns = Columns(
            coil=coil,
            parts=parts.astype(np.int64),
            series=whole - 1,
            tap=whole,
            shape=np.full(len(coil), PARALLEL, np.int8),
            network=network,
            error=error,
            excess=np.zeros(len(coil)),
            pieces=pieces,
            error_class=coarse_error(error, p.floor),
            fine_error=fine_error(error),
            q_class=quality_class(loss, p.q_enough[band]),
            stray_class=stray_class(strays / total),
            reactance_class=p.reactance_class[coil, band],
            commonness=self.commonness(parts),
            error_rank=np.rint(np.abs(error) * 1e9).astype(np.int64),
            price=self.price(parts),
            excess_class=whole,
            fine_excess=whole,
        )
        return columns, keep

    def _inside(self, coil: Ints, band: Ints, nominal: Floats, pieces: Ints) -> Bools:
        (low, high), (low_some, high_some) = self._limits
        some = pieces > 0
        least = np.where(some, low_some[coil, band], low[coil, band])
        most = np.where(some, high_some[coil, band], high[coil, band])
        return np.asarray((nominal >= least) & (nominal <= most))

    def _bears(self, drive: Drive, coil: Ints, band: Ints, parts: AnyInts, rise: Floats, loss: Floats) -> Bools:
        """Whether rows keep to the ratings of all parts, (m,); each part has the whole voltage."""
        omega = 2 * np.pi * self.problem.frequency[band]
        reactance = 1.0 / (omega * self.problem.wanted[coil, band])
        acting = self._value[band[:, None], parts]
        most = drive.on_parts(omega[:, None], acting, np.broadcast_to(rise[:, None], acting.shape), parts)
        carrier = drive.carrier(reactance, loss)
        return borne(carrier, most, drive.on_coil(reactance, coil), drive.on_trimmer(band))

    def _drift(self, coil: Ints, band: Ints, parts: AnyInts, share: Floats, network: Floats) -> Floats:
        """Return |df/f| per kelvin, nominal plus spread, with the trimmer set on frequency. [1/K]"""
        p = self.problem
        strays = p.self_capacitance[coil] + p.stray[band]
        trimmer = np.clip(p.wanted[coil, band] - network - strays, p.trimmer_low[band], p.trimmer_high[band])
        total = network + strays + trimmer
        weight = share * (network / total)[:, None]
        capacitance = (weight * self._tempco[parts]).sum(axis=1)
        capacitance = capacitance + (strays * p.stray_tempco + trimmer * p.trimmer_tempco[band]) / total
        spread = p.coil_tempco_spread[coil] + (weight * self._spread[parts]).sum(axis=1)
        return np.asarray(0.5 * np.abs(p.coil_tempco[coil, band] + capacitance) + 0.5 * spread)


def _with_blank(of_parts: Any, blank: object) -> Any:
    """Add what index -1 stands for as the last entry of the last axis."""
    column = np.full((*of_parts.shape[:-1], 1), blank, dtype=of_parts.dtype)
    return np.concatenate([of_parts, column], axis=-1)


def distinct(coil: Ints, letters: AnyInts, count: int) -> tuple[Ints, Ints]:
    """Return one row of each different (coil, letters), and the place of every row among those.

    Parameters
    ----------
    coil : (m,) array
        Coil of each row. [-]
    letters : (m, k) array
        Whole numbers from -1 to `count` - 1, sorted in each row. [-]
    count : int
        Number of letters. [-]
    """
    keys = [coil]
    room = np.iinfo(np.int64).max // (int(coil.max(initial=0)) + 1)
    for column in letters.T:
        if room < count + 1:
            keys.append(np.zeros_like(coil))
            room = np.iinfo(np.int64).max
        keys[-1] = keys[-1] * (count + 1) + (column.astype(np.int64) + 1)
        room //= count + 1
    return distinct_rows(keys)


def distinct_rows(keys: list[Ints]) -> tuple[Ints, Ints]:
    """Return one row of each different tuple of keys, and the place of every row among those. [-]"""
    if len(keys) == 1:
        _, first, place = np.unique(keys[0], return_index=True, return_inverse=True)
        return first, place
    order = np.lexsort(keys)
    new = np.zeros(len(order), dtype=np.bool_)
    new[:1] = True
    for key in keys:
        new[1:] |= np.diff(key[order]) != 0
    place = np.empty(len(order), dtype=np.int64)
    place[order] = np.cumsum(new) - 1
    return order[new], place
