"""What every winding form hands over: its coils as arrays, and helpers that the forms share."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.parts import Wire
from partpick.physics.loss import CORE_LOSS_SPREAD, q_bounds

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

TAIL = 0.05  # m of wire left at each end of a winding; common practice, no source
FIT_ROUNDING = 1e-9  # a winding that fits exactly fits

BOUGHT, RING, TUBE, OTHER = range(4)  # classes of effort, easiest first; turns decide between the last two


@dataclass(frozen=True, kw_only=True)
class Support:
    """What a coil is wound on, or the coil as bought."""

    name: str
    quantity: int | None
    source: str
    notes: tuple[str, ...] = ()
    frequency_low: float | None = None  # Hz, useful range of a core
    frequency_high: float | None = None
    adjust: float | None = None  # fraction of the inductance either way
    current: float | None = None  # A rms; None: not rated


@dataclass(frozen=True, kw_only=True, eq=False)
class Losses:
    """Loss of J coils at B frequencies by cause, (J, B) each, as shares of 1/Q; nan: unknown."""

    skin: Floats
    proximity: Floats
    core: Floats  # 0 in air
    former: Floats  # 0 without one; in layers, of what lies between them

    @property
    def q(self) -> Floats:
        """Q of all of them together; unknown if one is."""
        return 1.0 / (self.skin + self.proximity + self.core + self.former)

    def in_core(self, share: Floats, core_q: Floats) -> Losses:
        """Return the losses of the same winding with a core, where it has `share` of the inductance."""
        copper = self.skin * share, self.proximity * share
        return Losses(skin=copper[0], proximity=copper[1], core=1.0 / core_q, former=self.former)

    def with_former(self, loss: Floats) -> Losses:
        """Return the losses of the same winding on a former that takes `loss` of 1/Q, (J, B)."""
        return Losses(skin=self.skin, proximity=self.proximity, core=self.core, former=loss)

    def q_spread(self, copper_spread: Floats) -> Floats:
        """Return by which fraction Q may fall below and rise above the nominal, at worst, (J, 2)."""
        causes = self.skin, self.proximity, self.core, self.former
        low, high = q_bounds(*causes, copper_spread[:, None], CORE_LOSS_SPREAD)
        both = np.stack([1.0 - low / self.q, high / self.q - 1.0])
        worst: Floats = np.fmax.reduce(both, axis=2, initial=np.nan)  # nan only where no band is known
        return worst.T


def no_losses(coils: int, bands: int) -> Losses:
    """Return losses that nobody knows."""
    unknown = np.full((coils, bands), np.nan)
    return Losses(skin=unknown, proximity=unknown, core=unknown, former=unknown)


def _nothing_to_say(_row: int, _frequency: float) -> tuple[str, ...]:
    return ()


@dataclass(frozen=True, kw_only=True, eq=False)
class Block:
    """All J coils of one form; arrays are (J,), those by frequency (J, B)."""

    form: str
    effort_form: int  # BOUGHT, RING, TUBE or OTHER
    tappable: bool = False  # coils of one layout follow each other by turns, and a section is such a coil
    eased_resonance: bool = False  # twice the highest frequency is enough unless the plan says more
    supports: tuple[Support, ...]
    wires: tuple[Wire, ...] = ()
    considered: int = 0  # coils that there are, those included which no band can use
    support: Ints
    wire: Ints  # -1: none
    turns: Ints  # 0: bought
    pitch: Floats  # m, 0: none
    mean_diameter: Floats  # m, 0: none
    winding_length: Floats  # m, 0: none
    wire_length: Floats  # m in the winding, without tails
    inductance_dc: Floats  # H
    inductance: Floats  # H, (J, B)
    q: Floats  # (J, B) nan: unknown
    losses: Losses
    self_capacitance: Floats  # F
    loss_tangent: Floats  # of the self-capacitance: of the former, by the share of the field in it; 0 without one
    spread: Floats  # fraction of the inductance
    q_spread: Floats  # (J, 2) fraction below and above, nan: unknown
    self_capacitance_spread: Floats  # (J, 2) fraction below and above, nan: unknown
    tempco: Floats  # 1/K, (J, B) nan: unknown
    tempco_spread: Floats  # 1/K
    price: Floats  # nan: unknown
    volume: Floats  # m3
    wire_diameter: Floats  # m bare
    proportions: Floats | None = None  # winding length / mean diameter, single layers only
    bore: Floats | None = None  # m, inside diameter of the former of a single layer, nan: it has none
    core_area: Floats | None = None  # m2, section of a magnetic ring; nan or None: no such core
    label: Callable[[int], str] = field(repr=False)
    cautions: Callable[[int, float], tuple[str, ...]] = field(repr=False, default=_nothing_to_say)  # at a Hz

    def __len__(self) -> int:
        return len(self.turns)


@dataclass(frozen=True, eq=False)
class Layouts:
    """Ways to put a wire on a support, each good for `least` to `most` turns, and the coils that follow."""

    support: Ints  # (F,)
    wire: Ints  # (F,)
    pitch: Floats  # (F,) m
    most: Ints  # (F,)
    least: Ints  # (F,)

    @staticmethod
    def of(rows: Sequence[tuple[int, int, float, int]], least: Sequence[int] | None = None) -> Layouts:
        """Return layouts from rows of (support, wire, pitch, most turns), from one turn or `least` on."""
        support, wire, pitch, most = zip(*rows, strict=True) if rows else ((), (), (), ())
        return Layouts(
            np.array(support, np.int64),
            np.array(wire, np.int64),
            np.array(pitch, float),
            np.array(most, np.int64),
            np.ones(len(rows), np.int64) if least is None else np.array(least, np.int64),
        )

    def coils(self) -> tuple[Ints, Ints]:
        """Return the layout and the turns of every coil, (J,) each."""
        count = self.most - self.least + 1
        layout = np.repeat(np.arange(len(count)), count)
        first = np.repeat(np.cumsum(count) - count - self.least, count)
        return layout, np.arange(len(layout)) - first


def enough(quantity: int | None, units: int) -> bool:
    """Whether there is one for each unit that is built."""
    return quantity is None or quantity >= units


def column(values: Sequence[float | None]) -> Floats:
    """Return values as an array, nan where not stated."""
    return np.array([np.nan if value is None else value for value in values], dtype=float)


def at_every(values: Floats, frequency: Floats) -> Floats:
    """Return (J,) figures that do not depend on frequency as (J, B)."""
    return np.repeat(values[:, None], len(frequency), axis=1)


def either_way(spread: Floats) -> Floats:
    """Return a (J,) spread that is alike below and above as (J, 2)."""
    return np.repeat(spread[:, None], 2, axis=1)


def stacked(per_band: Sequence[Floats], coils: int) -> Floats:
    """Return a list of (J,) arrays, one a band, as (J, B)."""
    return np.stack(per_band, axis=1) if per_band else np.empty((coils, 0))


def wound_price(
    unit_prices: Sequence[float | None], support: Ints, wires: Sequence[Wire], wire: Ints, length: Floats
) -> Floats:
    """Return the price of each wound coil, its wire with tails included; nan where either is unknown."""
    per_metre = column([w.price_per_m for w in wires])
    if not len(support):
        return np.empty(0)
    return column(unit_prices)[support] + per_metre[wire] * (length + 2 * TAIL)
