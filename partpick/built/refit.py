"""Refit from a measured drift: which capacitor to swap for which, at constant capacitance.

The drift was measured, so the coil's share of it need not be known: only its change counts. Part of a
capacitor is replaced by a grade of another coefficient; what is left of it stays the old grade.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from partpick.built.tank import VaryingTank
from partpick.built.variation import CAPACITOR, Source, Variation
from partpick.built.warming import on_frequency
from partpick.parts import Capacitor
from partpick.search.networks import PARALLEL

ENOUGH = 0.1  # of the measured drift may stay: closer than that nobody measures
MOST_CHANGE_TRIMMED = 0.01  # of the capacitance in circuit, where a trimmer takes it up
MOST_CHANGE = 0.004  # without one: 0.2 % of the frequency


Kind = tuple[str, float | None]  # grade and its tempco: one grade may stand for several


@dataclass(frozen=True, kw_only=True)
class Swap:
    """One way to take the drift out of a band."""

    band: str
    replaces: str  # reference
    label: str  # of the part that goes
    by: tuple[str, ...]  # labels of the parts that come
    drift: float  # 1/K that is left, nominal
    drift_spread: float  # 1/K, size: old and new coefficients within their tolerances
    capacitance_change: float  # F


@dataclass(frozen=True, kw_only=True)
class _Pool:
    """Capacitors to choose from, by rising value."""

    parts: tuple[Capacitor, ...]

    def nearest(self, value: float, kind: Kind) -> Iterator[Capacitor]:
        """Return the parts of a kind just below and above a value."""
        own = [part for part in self.parts if (part.grade, part.tempco) == kind]
        place = int(np.searchsorted([part.value for part in own], value))
        yield from own[max(place - 1, 0) : place + 1]


def swaps(
    variation: Variation, tank: VaryingTank, measured: float, pool: Sequence[Capacitor], most: int = 3
) -> tuple[Swap, ...]:
    """Return the best swaps of one capacitor of a band, least remaining drift first.

    Parameters
    ----------
    variation : Variation
        What is in circuit.
    tank : VaryingTank
        The band; its capacitors are in parallel, or there is but one.
    measured : float
        Drift of the frequency that was measured, signed. [1/K]
    pool : sequence of Capacitor
        What may come in; its tempco must be known.
    most : int
        How many to return. [-]

    Notes
    -----
    d ln f/dT changes by -(c_new a_new - c_old a_old)/(2 C): swapping the share s of C for a grade that is
    lower by d moves the drift by s d/2 upwards. A capacitor gives way to one or two others of about its
    value. What the parts that stay do is in the measurement; the spread is that of the part that goes and of
    those that come.
    """
    if tank.shape != PARALLEL and len(tank.parts) > 1:
        return ()
    total = tank.nominal_fixed() + on_frequency(tank)
    change = MOST_CHANGE_TRIMMED if tank.trimmer else MOST_CHANGE
    usable = [part for part in pool if part.tempco is not None and _loss_known(part, tank.frequency)]
    known = _Pool(parts=tuple(sorted(usable, key=lambda part: (part.value, part.label))))
    found: list[tuple[tuple[int, int, int, str, tuple[str, ...]], Swap]] = []
    for place, value in zip(tank.parts, tank.values, strict=True):
        source = variation.sources[place]
        if source.kind != CAPACITOR or source.tempco is None:
            continue
        for coming in _replacements(known, value, source.tempco, source.label, 2.0 * measured * total):
            swap = _swap(tank, source, value, coming, measured, total)
            if abs(swap.capacitance_change) <= change * total and abs(swap.drift) < abs(measured):
                found.append((_order(swap, measured), swap))
    found.sort(key=lambda each: each[0])
    return tuple(swap for _, swap in found[:most])


def _loss_known(part: Capacitor, frequency: float) -> bool:
    return part.q is not None and (part.q_below is None or frequency <= part.q_below)


def _replacements(
    pool: _Pool, value: float, tempco: float, label: str, wanted: float
) -> Iterator[tuple[Capacitor, ...]]:
    """Return one or two parts for a capacitor; `wanted` is the change of sum(c a). [F/K]"""
    kinds = dict.fromkeys((part.grade, part.tempco) for part in pool.parts)
    old = next(((part.grade, part.tempco) for part in pool.parts if part.label == label), None)
    for kind in kinds:
        own = kind[1]
        if own is None or own == tempco:
            continue
        share = wanted / (own - tempco)  # F of it at constant capacitance
        if share <= 0.0:
            continue
        for first in pool.nearest(min(share, value), kind):
            yield (first,)
            if old is not None and value > first.value:
                for second in pool.nearest(value - first.value, old):
                    yield (first, second)


def _swap(
    tank: VaryingTank,
    old: Source,
    value: float,
    coming: tuple[Capacitor, ...],
    measured: float,
    total: float,
) -> Swap:
    change = sum(part.value * (part.tempco or 0.0) for part in coming) - value * (old.tempco or 0.0)
    size = sum(part.value * (part.tempco_tolerance or 0.0) for part in coming) + value * old.tempco_size
    return Swap(
        band=tank.name,
        replaces=old.reference,
        label=old.label,
        by=tuple(part.label for part in coming),
        drift=measured - change / (2.0 * total),
        drift_spread=size / (2.0 * total),
        capacitance_change=sum(part.value for part in coming) - value,
    )


def _order(swap: Swap, measured: float) -> tuple[int, int, int, str, tuple[str, ...]]:
    """Rank: drift left beyond what can be measured, then fewer parts, then least change of capacitance."""
    left = max(abs(swap.drift), ENOUGH * abs(measured))
    return (round(left * 1e9), len(swap.by), round(abs(swap.capacitance_change) * 1e16), swap.replaces, swap.by)
