"""The fewest capacitors whose subsets tune one coil in frequency steps no coarser than asked.

A *rung* is the frequency of one subset of the switched capacitors, each with a relay, besides those that are
always in circuit (the *base*, at most two). A set is a *ladder* where two neighbouring rungs are never further
apart than a step, from the rung with every relay open, at the upper end of the span or above it, down to its
lower end.

With the switched values rising, every rung that needs a capacitor lies below all that do without it and
without larger ones, or overlaps them. So each value may at most bridge one step from the rung with all smaller
ones closed: necessary. The step of capacitance grows towards the lower end, so that it is enough as well. What
more relays reach at most follows: take the largest value that the rule allows each time. This gives a bound for
every coil without a search, and cuts the search of one coil to the few sets that are close to it.

A capacitor with inductance in series acts as more the higher the frequency; the bound takes what it acts as at
the ends, the search at the very frequency.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import combinations_with_replacement
from typing import NamedTuple

import numpy as np

from partpick.search.problem import Floats, Ints

MOST_BASE = 2  # capacitors always in circuit
LOOSER = 1.02  # times a step, where bases are compared by what they act as at one frequency alone
TURNS = 12  # of the fixed point for a frequency; each gains a decimal at worst, three and more as a rule
FEW_TURNS = 5  # where the inductance alone depends on the frequency
GRAIN = 1e-11  # of a frequency: rounding
ABOVE = 1.25  # times the upper end: the highest rung looked at
NEAR_OWN_RESONANCE = 0.25  # of 1 in w^2 Ls C, as elsewhere


class Set(NamedTuple):
    """A ladder: places among the values, rising."""

    base: tuple[int, ...]
    switched: tuple[int, ...]

    @property
    def members(self) -> tuple[int, ...]:
        """Every capacitor, the base first."""
        return self.base + self.switched


@dataclass(frozen=True, kw_only=True, eq=False)
class Span:
    """What is asked for, and the values to make it of."""

    low: float  # Hz
    high: float  # Hz
    step: float  # Hz
    values: Floats  # (V,) F, rising
    series_inductance: Floats  # (V,) H
    stock: Ints  # (V,) pieces

    @property
    def half(self) -> float:
        """Half a step. [Hz]"""
        return self.step / 2

    def acting(self, frequency: Floats | float) -> Floats:
        """Return what each value acts as at some frequencies, (..., V). [F]"""
        squared = (2 * np.pi * np.asarray(frequency, dtype=float)[..., None]) ** 2
        near = squared * self.series_inductance * self.values
        found: Floats = np.where(near > NEAR_OWN_RESONANCE, np.inf, self.values / (1.0 - np.minimum(near, 0.5)))
        return found


@dataclass(frozen=True, eq=False)
class Coil:
    """One coil: its inductance as a parabola over the span, and what is across it besides the capacitors."""

    span: Span
    inductance: tuple[float, float, float]  # H, at the lower end, the middle and the upper end
    strays: float  # F

    def henries(self, frequency: Floats) -> Floats:
        """Return the inductance. [H]"""
        return parabola(np.array(self.inductance), self.span, frequency)

    def room(self, frequency: float) -> float:
        """Return what capacitors must act as to resonate at a frequency. [F]"""
        return 1.0 / ((2 * math.pi * frequency) ** 2 * self.henry(frequency)) - self.strays

    def resonance_of(self, network: float) -> float:
        """Return where capacitors that act as so much resonate. [Hz]"""
        frequency = self.span.high
        for _ in range(FEW_TURNS):
            frequency = self.resonance_at(network, frequency)
        return frequency

    def resonance_at(self, network: float, frequency: float) -> float:
        """Return the same with the inductance at a frequency nearby. [Hz]"""
        total = max(network + self.strays, 1e-18)
        return 1.0 / (2 * math.pi * math.sqrt(self.henry(frequency) * total))

    def henry(self, frequency: float) -> float:
        """Return the inductance at one frequency. [H]"""
        low, middle, high = self.inductance
        u = (frequency - (self.span.low + self.span.high) / 2) * 2 / (self.span.high - self.span.low)
        return max(middle + (high - low) / 2 * u + ((high + low) / 2 - middle) * u * u, 1e-3 * middle)

    def rungs(self, base: tuple[int, ...], switched: tuple[int, ...]) -> Floats:
        """Return the frequency of every subset, (2^m,): bit i closes the i-th switched capacitor. [Hz]"""
        bits = (np.arange(1 << len(switched))[:, None] >> np.arange(len(switched))) & 1
        closed = np.concatenate([np.ones((len(bits), len(base)), dtype=bits.dtype), bits], axis=1)
        own = list(base + switched)
        values, leads = self.span.values[own], self.span.series_inductance[own]
        frequency = np.full(len(bits), self.span.high)
        for _ in range(TURNS):
            near = (2 * np.pi * frequency[:, None]) ** 2 * leads * values
            acting = (closed * values / (1.0 - np.minimum(near, 0.5))).sum(axis=1)
            frequency = 1.0 / (2 * np.pi * np.sqrt(self.henries(frequency) * (acting + self.strays)))
        return frequency


def parabola(ends: Floats, span: Span, frequency: Floats) -> Floats:
    """Return what is known at the lower end, the middle and the upper end of a span at other frequencies."""
    u = (frequency - (span.low + span.high) / 2) * 2 / (span.high - span.low)
    low, middle, high = ends[..., 0], ends[..., 1], ends[..., 2]
    return np.asarray(middle + (high - low) / 2 * u + ((high + low) / 2 - middle) * u**2)


def is_ladder(span: Span, rungs: Floats) -> bool:
    """Whether every frequency of a span lies within half a step of some rung."""
    rounding = GRAIN * span.high
    inside = np.sort(rungs[(rungs >= span.low - span.half - rounding) & (rungs <= span.high + span.half + rounding)])
    if not len(inside) or inside[0] > span.low + span.half + rounding:
        return False
    apart = float(np.diff(inside).max(initial=0.0))
    return bool(inside[-1] >= span.high - span.half - rounding and apart <= span.step + rounding)


# ---------------------------------------------------------------- a bound for every coil at once


def least_pieces(span: Span, inductance: Floats, strays: Floats, most: int, bases: Ints) -> Ints:
    """Return a number of capacitors below which no coil has a ladder, (J,); `most` + 1: none up to `most`.

    Parameters
    ----------
    span : Span
        What is asked for.
    inductance : (J, 3) array
        At the lower end, the middle and the upper end. [H]
    strays : (J,) array
        What is across each coil besides. [F]
    most : int
        Capacitors at most. [-]
    bases : (J,) array
        The least capacitors always in circuit: 0, or 1 where strays alone are too large a share. [-]
    """
    best = np.full(len(strays), most + 1, dtype=np.int64)
    values = span.acting(span.high - span.half)
    sums = {0: np.zeros(1), 1: values, 2: np.unique(values[:, None] + values[None, :])}
    room = _room(span, inductance, strays, np.full(len(strays), span.high - span.half))
    for size in range(MOST_BASE + 1):
        table = np.sort(sums[size][np.isfinite(sums[size])])
        place = np.searchsorted(table, room * (1 + 1e-9), side="right") - 1
        able = (place >= 0) & (room >= 0) & (bases <= size)
        rows = np.flatnonzero(able)
        if len(rows):
            start = table[place[rows]]
            relays = _least_relays(span, inductance[rows], strays[rows], start, most - size)
            best[rows] = np.minimum(best[rows], relays + size)
    return best


def _room(span: Span, inductance: Floats, strays: Floats, frequency: Floats) -> Floats:
    return np.asarray(1.0 / ((2 * np.pi * frequency) ** 2 * parabola(inductance, span, frequency)) - strays)


def _least_relays(span: Span, inductance: Floats, strays: Floats, base: Floats, most: int) -> Ints:
    """Return how few relays can reach the lower end from the largest base that fits, (J,). [-]

    `base` is what the base acts as just below the upper end; at any other frequency no part of it differs by more
    than the one with the most inductance times capacitance that has room.
    """
    under = span.acting(span.low - span.half)
    fits = np.isfinite(span.acting(ABOVE * span.high))
    values, leads, under = span.values[fits], span.series_inductance[fits], under[fits]
    widest = _room(span, inductance, strays, np.full(len(strays), span.low - span.half))
    worst = np.concatenate([[0.0], np.maximum.accumulate(values * leads)])
    product = worst[np.searchsorted(under, widest * (1 + 1e-9), side="right")]
    at_top = 1.0 - (2 * np.pi * (span.high - span.half)) ** 2 * product

    def based(frequency: Floats) -> Floats:
        return np.asarray(base * at_top / (1.0 - (2 * np.pi * frequency) ** 2 * product))

    frequency = np.full(len(strays), span.high)
    for _ in range(TURNS):
        frequency = np.minimum(_resonance(span, inductance, strays, based(frequency)), ABOVE * span.high)
    position = based(frequency)
    goal = _room(span, inductance, strays, np.full(len(strays), span.low + span.half)) * (1 - 1e-9)
    relays = np.full(len(strays), most + 1, dtype=np.int64)
    able = _resonance(span, inductance, strays, position) <= ABOVE * span.high * (1 + 1e-9)
    for count in range(most + 1):
        relays = np.where(able & (position >= goal) & (relays > most), count, relays)
        frequency = np.minimum(_resonance(span, inductance, strays, position), ABOVE * span.high)
        below = np.maximum(frequency - span.step, 0.5 * span.low)
        bridge = _room(span, inductance, strays, below) - based(below)
        place = np.searchsorted(under, bridge * (1 + 1e-9), side="right") - 1
        if len(values):
            value, lead = values[np.maximum(place, 0)], leads[np.maximum(place, 0)]
            acting = value / (1.0 - (2 * np.pi * frequency) ** 2 * lead * value)
            position = np.where(place >= 0, position + acting, position)
    return relays


def _resonance(span: Span, inductance: Floats, strays: Floats, network: Floats) -> Floats:
    """Return where capacitors that act as so much resonate, (J,). [Hz]"""
    frequency = np.full(len(strays), span.high)
    for _ in range(TURNS):
        henries = np.maximum(parabola(inductance, span, frequency), 1e-3 * inductance[:, 1])
        frequency = 1.0 / (2 * np.pi * np.sqrt(henries * np.maximum(network + strays, 1e-18)))
    return frequency


# ---------------------------------------------------------------- the ladders of one coil


class Ladders:
    """Every ladder of one coil with so many capacitors."""

    def __init__(self, coil: Coil, stop: Callable[[], bool]) -> None:
        self.coil, self.span, self.stop = coil, coil.span, stop
        self.nodes = 0
        self.bases: dict[int, list[tuple[int, ...]]] = {}
        top, foot = self.span.acting(ABOVE * self.span.high), self.span.acting(self.span.low - self.span.half)
        usable = np.isfinite(top) & (foot <= coil.room(self.span.low - self.span.half) * (1 + 1e-9))
        self.usable = int(np.count_nonzero(usable))  # the values rise, and large ones resonate first
        self.under = foot[usable].tolist()
        self.parts = list(zip(self.span.values.tolist(), self.span.series_inductance.tolist(), strict=True))
        self.goal = coil.room(self.span.low + self.span.half) * (1 - 1e-9)

    def of(self, pieces: int, least_base: int, most_relays: int, worth: Callable[[Set], bool]) -> Iterator[Set]:
        """Yield the ladders of so many capacitors; those with a part set that is not `worth` it are left out."""
        for size in range(least_base, MOST_BASE + 1):
            relays = pieces - size
            if 0 <= relays <= most_relays:
                for base in self._bases(size):
                    if not self._reaches(base, (), relays, LOOSER):
                        break  # nor do smaller ones
                    yield from self._grow(base, (), relays, worth)

    def _bases(self, size: int) -> list[tuple[int, ...]]:
        """Return what may be always in circuit, by falling capacitance: open, the tank is at the upper end or above."""
        if size in self.bases:
            return self.bases[size]
        room = self.coil.room(self.span.high - self.span.half)
        acting = self.span.acting(self.span.high - self.span.half)[: self.usable]
        found = []
        for base in combinations_with_replacement(range(self.usable), size):
            if all(base.count(i) <= self.span.stock[i] for i in base):
                total = float(acting[list(base)].sum()) if base else 0.0
                if total <= room * (1 + 1e-9):
                    found.append((-total, base))
        self.bases[size] = [base for _, base in sorted(found)]
        return self.bases[size]

    def _grow(
        self, base: tuple[int, ...], switched: tuple[int, ...], left: int, worth: Callable[[Set], bool]
    ) -> Iterator[Set]:
        self.nodes += 1
        if self.stop() or not worth(Set(base, switched)):
            return
        if left == 0:
            if is_ladder(self.span, self.coil.rungs(base, switched)):
                yield Set(base, switched)
            return
        frequency = self._closed(base + switched)
        if frequency > ABOVE * self.span.high:
            return
        below = frequency - self.span.step
        acting = self.span.acting(below)[: self.usable]
        bridge = self.coil.room(below) - float(acting[list(base)].sum())
        last = int(np.searchsorted(acting, bridge * (1 + 1e-9), side="right")) - 1
        first = switched[-1] if switched else 0
        for place in range(last, first - 1, -1):
            if (base + switched).count(place) >= self.span.stock[place]:
                continue
            grown = (*switched, place)
            if not self._reaches(base, grown, left - 1):
                return  # nor do smaller ones
            yield from self._grow(base, grown, left - 1, worth)

    def _closed(self, members: tuple[int, ...]) -> float:
        """Return the resonance of some capacitors together. [Hz]"""
        frequency = self.span.high
        for _ in range(TURNS):
            frequency = self.coil.resonance_at(self._acting(members, frequency), frequency)
        return frequency

    def _acting(self, places: tuple[int, ...], frequency: float) -> float:
        """Return what some parts act as at a frequency. [F]"""
        squared = (2 * math.pi * frequency) ** 2
        return sum(c / (1.0 - squared * leads * c) for c, leads in (self.parts[i] for i in places))

    def _reaches(self, base: tuple[int, ...], switched: tuple[int, ...], left: int, looser: float = 1.0) -> bool:
        """Whether so many more relays could reach the lower end, stock left aside.

        `looser` widens each step, so that the answer falls with what the base acts as and nothing else.
        """
        frequency = min(self._closed(base + switched), ABOVE * self.span.high)
        position = self.coil.room(frequency)
        for _ in range(left):
            if position >= self.goal:
                return True
            below = max(frequency - self.span.step * looser, 0.5 * self.span.low)
            bridge = self.coil.room(below) - self._acting(base, below)
            place = bisect_right(self.under, bridge * (1 + 1e-9)) - 1
            if place < 0:
                return False
            position += self._acting((place,), frequency)
            frequency = self.coil.resonance_of(position)
        return position >= self.goal
