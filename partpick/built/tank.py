"""One band's tank as a function of what varies in it: capacitance, resonance, and the weight of each part."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from partpick.physics.resonance import effective_capacitance, resonance_frequency
from partpick.request import Trimmer
from partpick.search.divided import (
    FIRST_OF_DIVIDER,
    LOADED,
    NO_DEVICE,
    OWN_PARTS,
    SPLIT,
    Device,
    loaded_slopes,
    loaded_value,
)
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED

Floats = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Swept:
    """The tuning element at one end of its range, with the padder in series."""

    source: int
    capacitance: float  # F
    padder: int | None  # place among the sources
    padder_capacitance: float  # F
    padder_inductance: float  # H

    def acting(self, x: Floats, frequency: float) -> Floats:
        """Return element and padder together. [F]"""
        own = self.capacitance * (1.0 + x[self.source])
        if self.padder is None:
            return own
        padder = self.padder_capacitance * (1.0 + x[self.padder])
        return connected([own, effective_capacitance(padder, self.padder_inductance, frequency)], SERIES)


@dataclass(frozen=True, kw_only=True)
class Moved:
    """An element that moves inductance, at one end of its travel."""

    source: int
    coil_share: float  # d ln L / d ln of the coil as wound
    element_share: float  # d ln L / d ln of what the element has a tolerance of


@dataclass(frozen=True, kw_only=True)
class VaryingTank:
    """One band, a swept one at its upper end; `coil`, `parts` and the rest are places among the sources."""

    name: str
    frequency: float  # Hz: the target, or the end of the range that is asked for
    inductance: float  # H
    coil: int
    coil_tempco: float  # 1/K, nan: unknown
    parts: tuple[int, ...]
    values: tuple[float, ...]  # F
    series_inductances: tuple[float, ...]  # H
    shape: int
    leads: float  # H
    wiring: int
    wiring_capacitance: float  # F
    winding: int
    winding_capacitance: float  # F
    trimmer: Trimmer | None
    swept: Swept | None = None
    moved: Moved | None = None
    low_end: VaryingTank | None = None  # of a swept band
    device: Device = NO_DEVICE  # F, across the halves of an oscillator's divider; without deviations

    def network(self, x: Floats) -> Floats:
        """Return how the capacitors act in builds with deviations `x` (S, n). [F]"""
        if not self.parts:
            return np.zeros(x.shape[1])
        whole = connected(self._acting(x), self.shape, self.device)
        return effective_capacitance(whole, self.leads, self.frequency) if self.leads else whole

    def _acting(self, x: Floats) -> list[Floats]:
        """Return what each capacitor acts as, the device across those of a divider. [F]"""
        acting = [
            effective_capacitance(value * (1.0 + x[part]), inductance, self.frequency)
            for part, value, inductance in zip(self.parts, self.values, self.series_inductances, strict=True)
        ]
        return [each + beside for each, beside in zip(acting, self._beside(), strict=True)]

    def _beside(self) -> list[float]:
        """Return what of the device is across each capacitor. [F]"""
        beside = [0.0] * len(self.parts)
        if self.shape in FIRST_OF_DIVIDER:
            first = FIRST_OF_DIVIDER[self.shape]
            beside[first : first + 2] = self.device
        return beside

    def _tuned(self, x: Floats, swept: Swept) -> Floats:
        """Return the tuning element with all that is in series with it. [F]"""
        whole = swept.acting(x, self.frequency)
        return connected([whole, *self._acting(x)[:2]], SERIES) if self.shape == SPLIT else whole

    def fixed_capacitance(self, x: Floats) -> Floats:
        """Return all capacitance but the trimmer. [F]"""
        wiring = self.wiring_capacitance * (1.0 + x[self.wiring])
        fixed = self.network(x) + wiring + self.winding_capacitance * (1.0 + x[self.winding])
        return fixed if self.swept is None else fixed + self._tuned(x, self.swept)

    def built_inductance(self, x: Floats) -> Floats:
        """Return the inductance. [H]"""
        if self.moved is None:
            return self.inductance * (1.0 + x[self.coil])
        off = self.moved.coil_share * x[self.coil] + self.moved.element_share * x[self.moved.source]
        return np.asarray(self.inductance * (1.0 + off))

    def resonance(self, x: Floats) -> Floats:
        """Return the resonance with the trimmer at the middle of its range. [Hz]"""
        trimmer = self.trimmer.middle if self.trimmer else 0.0
        return resonance_frequency(self.built_inductance(x), self.fixed_capacitance(x) + trimmer)

    def nominal_fixed(self) -> float:
        """Return all capacitance but the trimmer of a build without deviations. [F]"""
        return float(self.fixed_capacitance(self._nothing_off())[0])

    def wanted(self, inductance: float | Floats) -> float | Floats:
        """Return the capacitance that is on frequency with an inductance. [F]"""
        return 1.0 / ((2.0 * np.pi * self.frequency) ** 2 * inductance)

    def _nothing_off(self) -> Floats:
        others: tuple[int, ...] = () if self.swept is None else (self.swept.source, self.swept.padder or 0)
        others += () if self.moved is None else (self.moved.source,)
        return np.zeros((1 + max((self.coil, self.wiring, self.winding, *self.parts, *others)), 1))

    def weights(self, trimmer: float) -> dict[int, float]:
        """Return d ln C / d ln c of every capacitance, C being all in circuit; the coil has 1. [-]"""
        across = float(self.network(self._nothing_off())[0])
        total = self.nominal_fixed() + trimmer
        found = {
            self.coil: 1.0 if self.moved is None else self.moved.coil_share,
            self.wiring: self.wiring_capacitance / total,
            self.winding: self.winding_capacitance / total,
        }
        for part, slope in zip(self.parts, self._slopes(across), strict=True):
            found[part] = found.get(part, 0.0) + slope / total
        if self.swept is not None:
            for source, weight in self._swept_weights(self.swept, total).items():
                found[source] = found.get(source, 0.0) + weight
        if self.moved is not None:  # of the inductance, but it counts alike
            found[self.moved.source] = self.moved.element_share
        return found

    def _swept_weights(self, swept: Swept, total: float) -> dict[int, float]:
        whole = float(self._tuned(self._nothing_off(), swept)[0])
        if self.shape == SPLIT:
            return self._split_weights(swept, whole, total)
        if swept.padder is None:
            return {swept.source: whole / total}
        padder = float(effective_capacitance(swept.padder_capacitance, swept.padder_inductance, self.frequency))
        by_padder = whole**2 / padder * padder / swept.padder_capacitance
        return {swept.source: whole**2 / swept.capacitance / total, swept.padder: by_padder / total}

    def _split_weights(self, swept: Swept, whole: float, total: float) -> dict[int, float]:
        """Return the weights of element and divider in series; a part that is both halves counts twice."""
        grown = [float(each[0]) for each in self._acting(self._nothing_off())]
        found = {swept.source: whole**2 / swept.capacitance / total}
        for place in range(2):
            own = grown[place] - self._beside()[place]
            slope = whole**2 * own / grown[place] ** 2 * own / self.values[place] / total
            found[self.parts[place]] = found.get(self.parts[place], 0.0) + slope
        return found

    def _slopes(self, across: float) -> list[float]:
        """Return c dC/dc of each capacitor, C being the network with its leads. [F]"""
        if not self.parts:
            return []
        pairs = zip(self.values, self.series_inductances, strict=True)
        acting = [float(effective_capacitance(value, inductance, self.frequency)) for value, inductance in pairs]
        grown = [each + beside for each, beside in zip(acting, self._beside(), strict=True)]
        bare = float(connected([np.array(each) for each in grown], self.shape, self.device)) or 1.0
        # c/(1 - w^2 L c) has the logarithmic derivative 1/(1 - w^2 L c), the ratio of acting to own capacitance
        by_leads = across / bare
        slopes = network_slopes(grown, self.shape, self.device)
        return [
            across * by_leads * slope / bare * each / with_device * each / value
            for slope, each, with_device, value in zip(slopes, acting, grown, self.values, strict=True)
        ]


def connected(c: Sequence[Floats], shape: int, device: Device = NO_DEVICE) -> Floats:
    """Return a network of up to six capacitances in parallel, of one of the shapes of three, or with a divider. [F]"""
    if shape in OWN_PARTS:
        own = OWN_PARTS[shape]
        beside = reduce(np.add, c[own:], np.zeros_like(c[0]))
        if shape == LOADED:
            return np.asarray(loaded_value(c[0], c[1], device[1]) + beside)
        return beside if shape == SPLIT else connected(c[:own], SERIES) + beside
    if shape == PARALLEL or len(c) == 1:
        return reduce(np.add, c)
    if shape == SERIES:
        return 1.0 / reduce(np.add, [1.0 / each for each in c])
    if shape == SHUNTED:
        return c[0] + c[1] * c[2] / (c[1] + c[2])
    assert shape == CHAINED
    pair = c[1] + c[2]
    return c[0] * pair / (c[0] + pair)


def network_slopes(c: Sequence[float], shape: int, device: Device = NO_DEVICE) -> list[float]:
    """Return c dC/dc of each part of a network of plain capacitances. [F]"""
    if shape in OWN_PARTS:
        own = OWN_PARTS[shape]
        if shape == LOADED:
            return [*loaded_slopes(c[0], c[1], device[1]), *c[own:]]
        divider = [0.0] * own if shape == SPLIT else network_slopes(c[:own], SERIES)
        return [*divider, *c[own:]]
    if shape == PARALLEL or len(c) == 1:
        return list(c)
    if shape == SERIES:
        whole = 1.0 / sum(1.0 / each for each in c)
        return [whole**2 / each for each in c]
    if shape == SHUNTED:
        pair = c[1] * c[2] / (c[1] + c[2])
        return [c[0], pair**2 / c[1], pair**2 / c[2]]
    pair = c[1] + c[2]
    whole = c[0] * pair / (c[0] + pair)
    return [whole**2 / c[0], whole**2 * c[1] / pair**2, whole**2 * c[2] / pair**2]
