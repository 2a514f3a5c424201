"""Coils and values in play for [steps], and the order of its ladders as whole numbers."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from partpick.candidates import Coils
from partpick.objective import effort, enough_q, reactance_class, tolerance_floor
from partpick.parts import Capacitor
from partpick.preferred import commonness
from partpick.request import Request
from partpick.search.figures import quality_class, stray_class
from partpick.search.ladder import Coil, Set, Span, least_pieces
from partpick.search.problem import NEVER, PLENTY, Floats, Ints

MOST_CAPACITORS = 12  # where the plan states no limit, and at most

SPARE_Q = 1.002  # over the limit on Q: the loss of the coil is taken on straight lines between three frequencies

Key = tuple[object, ...]


@dataclass(frozen=True)
class Steps:
    """The span in equal steps, as many as it takes for none to be coarser than asked."""

    low: float  # Hz
    high: float  # Hz
    count: int

    @property
    def step(self) -> float:
        """One step. [Hz]"""
        return (self.high - self.low) / self.count

    @property
    def positions(self) -> tuple[float, ...]:
        """Every wanted frequency, rising. [Hz]"""
        return (*(self.low + place * self.step for place in range(self.count)), self.high)


class LadderField:
    """Coils and values of one request with what is known of each before any set is."""

    def __init__(self, request: Request, steps: Steps, coils: Coils, capacitors: tuple[Capacitor, ...]) -> None:
        self.request, self.steps, self.coils, self.capacitors = request, steps, coils, capacitors
        limits = request.limits
        self.most = MOST_CAPACITORS if limits.parts is None else min(limits.parts, MOST_CAPACITORS)
        self.most_relays = self.most if limits.contacts is None else min(limits.contacts, self.most)
        self.choices = _choices(capacitors, steps.high, request.units)
        values = sorted(self.choices)
        self.span = Span(
            low=steps.low,
            high=steps.high,
            step=steps.step,
            values=np.array([float(exact) for exact, _ in values]),
            series_inductance=np.array([leads for _, leads in values]),
            stock=np.array([len(self.choices[value]) for value in values], dtype=np.int64),
        )
        self.options = [self.choices[value] for value in values]
        self.common = commonness(self.span.values).astype(np.int64) if values else np.zeros(0, np.int64)
        self.floor = max(tolerance_floor(coils, capacitors, None), steps.step / 2 / steps.low)
        self.strays = coils.self_capacitance + request.stray.capacitance
        self.rows = np.flatnonzero(coils.in_play.all(axis=1))
        self.share = math.inf if request.stray.share is None else request.stray.share
        self.classes = self._classes()
        inductance, strays = coils.inductance[self.rows], self.strays[self.rows]
        open_room = 1.0 / ((2 * np.pi * (steps.high - self.span.half)) ** 2 * inductance[:, 2])
        self.least_base = np.where(strays > self.share * open_room * (1 + 1e-9), 1, 0).astype(np.int64)
        self.least = least_pieces(self.span, inductance, strays, self.most, self.least_base)

    def _classes(self) -> Ints:
        """Return of each coil in play classes of Q, strays, reactance, then effort as three, none above the truth."""
        coils, rows, bands = self.coils, self.rows, self.request.bands
        total = 1.0 / ((2 * np.pi * coils.frequency) ** 2 * coils.inductance[rows])
        own = [[_loss(part, float(f)) for part in self.capacitors] for f in coils.frequency]
        least = np.array([np.nanmin(each, initial=math.inf) for each in own])
        least = np.where(np.isfinite(least), least, 0.0)  # unknown of each of them: the class is worse anyway
        network = np.maximum(1.0 - self.strays[rows][:, None] / total - 3 * self.steps.step / self.steps.low, 0.0)
        loss = 1.0 / coils.q[rows] + network * least * (1 - 1e-6)
        enough = np.array([enough_q(band.highest, band.q) for band in bands])
        q = np.max([quality_class(loss[:, i], enough[i]) for i in range(len(bands))], axis=0)
        largest = 1.0 / ((2 * np.pi * (self.steps.high - self.span.half)) ** 2 * coils.inductance[rows, 2])
        strays = stray_class(self.strays[rows] / largest * (1 - 1e-4))
        omega = 2 * np.pi * coils.frequency
        reactance = np.max(
            [reactance_class(omega[i] * coils.inductance[rows, i], float(coils.frequency[i])) for i in (0, 2)], axis=0
        )
        return np.concatenate([np.stack([q, strays, reactance], axis=1), effort(coils)[rows]], axis=1)

    def coil(self, place: int) -> Coil:
        """Return one coil in play for the search."""
        row = self.rows[place]
        low, middle, high = (float(x) for x in self.coils.inductance[row])
        return Coil(self.span, (low, middle, high), float(self.strays[row]))

    def bound(self, place: int, pieces: int) -> Key:
        """Return figures that no ladder of a coil with so many capacitors ranks before."""
        q, strays, reactance, *work = (int(x) for x in self.classes[place])
        return (pieces + 1, q, strays, reactance, tuple(work))

    def parts_of(self, ladder: Set) -> tuple[int, ...]:
        """Return the parts of a ladder: of equal values the parts of least loss first."""
        used: dict[int, int] = {}
        parts = []
        for value in ladder.members:
            parts.append(self.options[value][used.get(value, 0)])
            used[value] = used.get(value, 0) + 1
        return tuple(parts)

    def key(self, place: int, ladder: Set) -> Key | None:
        """Return the figures of a ladder in order, None where a limit rules it out."""
        coil, row = self.coil(place), int(self.rows[place])
        rungs, wanted = coil.rungs(ladder.base, ladder.switched), np.array(self.steps.positions)
        nearest = np.abs(rungs[None, :] - wanted[:, None]).argmin(axis=1)
        error = float((np.abs(rungs[nearest] - wanted) / wanted).max())
        closed = np.concatenate(
            [
                np.ones((len(wanted), len(ladder.base))),
                (nearest[:, None] >> np.arange(len(ladder.switched))) & 1,
            ],
            axis=1,
        )
        parts = [self.capacitors[i] for i in self.parts_of(ladder)]
        total = self.strays[row] + np.array([coil.room(f) for f in rungs[nearest]])
        share = (self.strays[row] / total)[closed.any(axis=1)].max(initial=0.0)
        if share > self.share * (1 + 1e-9):
            return None
        q = self._quality(row, parts, closed, total, wanted)
        if q is None:
            return None
        strays = int(stray_class(np.array([(self.strays[row] / total).max()]))[0])
        _, _, reactance, *work = (int(x) for x in self.classes[place])
        prices = [part.unit_price for part in parts]
        own = float(self.coils.price[row])
        known = all(price is not None for price in prices) and math.isfinite(own)
        price = round(sum(p for p in prices if p is not None) * 100 + own * 100) if known else NEVER
        exact = tuple(part.exact for part in parts)
        return (
            len(parts) + 1, q, strays, reactance, tuple(work), int(self.common[list(ladder.members)].sum()),
            round(error * 1e9), price, int(self.coils.rank[row]), exact, tuple(part.label for part in parts),
        )  # fmt: skip

    def _quality(
        self, row: int, parts: list[Capacitor], closed: Floats, total: Floats, wanted: Floats
    ) -> int | None:
        """Return the class of the worst position's Q, None where the limit on Q rules it out."""
        values = np.array([part.value for part in parts])
        own = 1.0 / self.coils.q[row]
        coil_loss = np.interp(wanted, self.coils.frequency, own)
        loss = np.array([[_loss(part, float(f)) for part in parts] for f in wanted]).reshape(len(wanted), len(parts))
        loss = coil_loss + np.where(closed > 0, closed * values * loss, 0.0).sum(axis=1) / total
        limit = self.request.limits.q
        if limit is not None and not bool((1.0 / loss >= limit * SPARE_Q).all()):
            return None
        enough = np.array([enough_q(float(f), limit) for f in wanted])
        return int(quality_class(loss, enough).max())


def _loss(part: Capacitor, frequency: float) -> float:
    known = part.q is not None and (part.q_below is None or frequency <= part.q_below)
    return 1.0 / part.q if known and part.q else math.nan


def _choices(
    capacitors: tuple[Capacitor, ...], frequency: float, units: int
) -> dict[tuple[Fraction, float], list[int]]:
    """Return for each value, and inductance in series, its pieces: least loss first, then price and content."""

    def preferred(index: int) -> tuple[object, ...]:
        part = capacitors[index]
        loss = _loss(part, frequency)
        price = math.inf if part.unit_price is None else part.unit_price
        return (math.inf if math.isnan(loss) else loss, price, part.grade, part.tolerance, part.label)

    found: dict[tuple[Fraction, float], list[int]] = {}
    for index in sorted(range(len(capacitors)), key=preferred):
        part = capacitors[index]
        pieces = PLENTY if part.quantity is None else part.quantity // units
        if pieces > 0:
            own = found.setdefault((part.exact, part.series_inductance or 0.0), [])
            own += [index] * min(pieces, MOST_CAPACITORS - len(own))
    return found
