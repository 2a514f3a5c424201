"""What may differ from unit to unit, and each band's tank as a function of it.

A source is one piece, or one stray, with its largest deviation. A piece that serves several bands is one
source: a coil shared by all bands moves them together.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.candidates import Coils
from partpick.circuit import Design, Tank
from partpick.parts import Capacitor
from partpick.physics.resonance import effective_capacitance, resonance_frequency
from partpick.physics.uncertainty import NORMAL, UNIFORM, correlated_uniform
from partpick.request import Request, Trimmer
from partpick.result import Candidate
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED

Floats = NDArray[np.float64]

COIL, CAPACITOR, WIRING, SELF_CAPACITANCE = "coil", "capacitor", "wiring", "self-capacitance"
UNIFORM_PARTS, NORMAL_PARTS = "uniform", "normal"
MOST_DEVIATION = 0.95  # a part is never less than nothing


@dataclass(frozen=True, kw_only=True)
class Source:
    """One thing that differs from unit to unit."""

    reference: str  # "C3", "L1", or "wiring of weather", "self-capacitance of L1"
    kind: str
    label: str
    size: float  # largest deviation, as a fraction of its value
    batch: int | None = None  # capacitors of one batch have one number
    tempco: float | None = None  # 1/K; of a coil it depends on the band
    tempco_size: float = 0.0  # 1/K


@dataclass(frozen=True, kw_only=True)
class VaryingTank:
    """One fixed band; `coil`, `parts` and the rest are places among the sources."""

    name: str
    frequency: float  # Hz, target
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

    def network(self, x: Floats) -> Floats:
        """Return how the capacitors act in builds with deviations `x` (S, n). [F]"""
        if not self.parts:
            return np.zeros(x.shape[1])
        acting = [
            effective_capacitance(value * (1.0 + x[part]), inductance, self.frequency)
            for part, value, inductance in zip(self.parts, self.values, self.series_inductances, strict=True)
        ]
        whole = connected(acting, self.shape)
        return effective_capacitance(whole, self.leads, self.frequency) if self.leads else whole

    def fixed_capacitance(self, x: Floats) -> Floats:
        """Return all capacitance but the trimmer. [F]"""
        wiring = self.wiring_capacitance * (1.0 + x[self.wiring])
        return self.network(x) + wiring + self.winding_capacitance * (1.0 + x[self.winding])

    def built_inductance(self, x: Floats) -> Floats:
        """Return the inductance. [H]"""
        return self.inductance * (1.0 + x[self.coil])

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
        return np.zeros((1 + max((self.coil, self.wiring, self.winding, *self.parts)), 1))

    def weights(self, trimmer: float) -> dict[int, float]:
        """Return d ln C / d ln c of every capacitance, C being all in circuit; the coil has 1. [-]"""
        across = float(self.network(self._nothing_off())[0])
        total = self.nominal_fixed() + trimmer
        found = {
            self.coil: 1.0,
            self.wiring: self.wiring_capacitance / total,
            self.winding: self.winding_capacitance / total,
        }
        for part, slope in zip(self.parts, self._slopes(across), strict=True):
            found[part] = found.get(part, 0.0) + slope / total
        return found

    def _slopes(self, across: float) -> list[float]:
        """Return c dC/dc of each capacitor, C being the network with its leads. [F]"""
        if not self.parts:
            return []
        pairs = zip(self.values, self.series_inductances, strict=True)
        acting = [float(effective_capacitance(value, inductance, self.frequency)) for value, inductance in pairs]
        bare = float(connected([np.array(each) for each in acting], self.shape))
        # c/(1 - w^2 L c) has the logarithmic derivative 1/(1 - w^2 L c), the ratio of acting to own capacitance
        by_leads = across / bare
        slopes = network_slopes(acting, self.shape)
        return [
            across * by_leads * slope / bare * each / value
            for slope, each, value in zip(slopes, acting, self.values, strict=True)
        ]


@dataclass(frozen=True, kw_only=True)
class Variation:
    """All sources of one design, and its fixed bands; a band that is swept has None."""

    sources: tuple[Source, ...]
    tanks: tuple[VaryingTank | None, ...]  # in plan order

    @property
    def sizes(self) -> Floats:
        """Largest deviation of each source, (S,). [fraction]"""
        return np.minimum([source.size for source in self.sources], MOST_DEVIATION)

    @property
    def corners(self) -> Floats:
        """All sources at their lower ends, then all at their upper ends, (S, 2). [fraction]"""
        return np.stack([-self.sizes, self.sizes], axis=1)

    def draw(self, builds: int, seed: int, parts: str = UNIFORM_PARTS, batch: float = 0.0) -> Floats:
        """Return the deviations of random builds, (S, builds). [fraction]

        Parameters
        ----------
        builds : int
            How many units. [-]
        seed : int
            The same seed gives the same builds.
        parts : str
            "uniform" between the tolerances, or "normal" with the tolerance as two standard deviations.
        batch : float
            Correlation of capacitors of one batch, 0 to 1. [-]
        """
        generator = np.random.default_rng(seed)
        if parts == NORMAL_PARTS or batch > 0.0:
            x = generator.standard_normal((len(self.sources), builds))
            for members in self._batches() if batch > 0.0 else ():
                x[members] = _of_one_batch(generator, x[members], batch, parts)
            loose = np.array([source.batch is None for source in self.sources]) | (batch <= 0.0)
            x[loose] = x[loose] * NORMAL if parts == NORMAL_PARTS else correlated_uniform(0.0, x[loose], 0.0)
        else:
            x = generator.random((len(self.sources), builds))
            x *= 2.0
            x -= 1.0
        x *= self.sizes[:, None]
        return np.maximum(x, -MOST_DEVIATION, out=x) if parts == NORMAL_PARTS else x

    def _batches(self) -> list[list[int]]:
        found: dict[int, list[int]] = {}
        for place, source in enumerate(self.sources):
            if source.batch is not None:
                found.setdefault(source.batch, []).append(place)
        return list(found.values())


def _of_one_batch(generator: np.random.Generator, own: Floats, correlation: float, parts: str) -> Floats:
    common = generator.standard_normal(own.shape[1])
    if parts == NORMAL_PARTS:
        return NORMAL * (np.sqrt(correlation) * common + np.sqrt(1.0 - correlation) * own)
    return correlated_uniform(common, own, correlation)


def deviation_of(parts: str) -> float:
    """Return the standard deviation of a source over its tolerance. [-]"""
    return NORMAL if parts == NORMAL_PARTS else float(UNIFORM)


def connected(c: Sequence[Floats], shape: int) -> Floats:
    """Return a network of up to six capacitances in parallel, or of one of the shapes of three. [F]"""
    if shape == PARALLEL or len(c) == 1:
        return np.sum(c, axis=0)
    if shape == SERIES:
        return 1.0 / np.sum([1.0 / each for each in c], axis=0)
    if shape == SHUNTED:
        return c[0] + c[1] * c[2] / (c[1] + c[2])
    assert shape == CHAINED
    pair = c[1] + c[2]
    return c[0] * pair / (c[0] + pair)


def network_slopes(c: Sequence[float], shape: int) -> list[float]:
    """Return c dC/dc of each part of a network of plain capacitances. [F]"""
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


def variation(
    request: Request, coils: Coils, capacitors: Sequence[Capacitor], design: Design, candidate: Candidate
) -> Variation:
    """Return what varies in a design, by the references of its assessed candidate.

    Parameters
    ----------
    request : Request
        Its strays and their tolerance.
    coils : Coils
        Every coil in play.
    capacitors : sequence of Capacitor
        Every capacitor in play.
    design : Design
        What was picked.
    candidate : Candidate
        The same design assessed: pieces that two bands share have one reference there.
    """
    places: dict[str, int] = {}
    sources: list[Source] = []

    def place(source: Source) -> int:
        if source.reference not in places:
            places[source.reference] = len(sources)
            sources.append(source)
        return places[source.reference]

    tanks: list[VaryingTank | None] = []
    for index, (band, figures) in enumerate(zip(request.bands, candidate.bands, strict=True)):
        tank = Tank(request=request, coils=coils, capacitors=capacitors, design=design, index=index)
        coil = place(_coil_source(tank, figures.coil, candidate))
        winding = place(_stray_source(request, SELF_CAPACITANCE, figures.coil))
        parts = tuple(
            place(_capacitor_source(reference, part, capacitors[part]))
            for reference, part in zip(figures.capacitors, tank.network.parts, strict=False)
        )
        if band.swept:
            tanks.append(None)
            continue
        chosen = [capacitors[part] for part in tank.network.parts]
        tanks.append(
            VaryingTank(
                name=band.name,
                frequency=band.highest,
                inductance=figures.inductance,
                coil=coil,
                coil_tempco=float(coils.tempco[tank.row, index]),
                parts=parts,
                values=tuple(part.value for part in chosen),
                series_inductances=tuple(part.series_inductance or 0.0 for part in chosen),
                shape=tank.network.shape,
                leads=request.stray.inductance,
                wiring=place(_stray_source(request, WIRING, band.name)),
                wiring_capacitance=band.stray,
                winding=winding,
                winding_capacitance=figures.self_capacitance,
                trimmer=band.trimmer,
            )
        )
    return Variation(sources=tuple(sources), tanks=tuple(tanks))


def _coil_source(tank: Tank, reference: str, candidate: Candidate) -> Source:
    label = next(coil.label for coil in candidate.coils if coil.reference == reference)
    return Source(
        reference=reference,
        kind=COIL,
        label=label,
        size=float(tank.coils.spread[tank.coil]),
        tempco_size=float(tank.coils.tempco_spread[tank.coil]),
    )


def _capacitor_source(reference: str, index: int, part: Capacitor) -> Source:
    return Source(
        reference=reference,
        kind=CAPACITOR,
        label=part.label,
        size=part.tolerance,
        batch=index,
        tempco=part.tempco,
        tempco_size=part.tempco_tolerance or 0.0,
    )


def _stray_source(request: Request, kind: str, of: str) -> Source:
    stray = request.stray  # its tolerance and tempco hold for wiring and self-capacitance alike
    return Source(reference=f"{kind} of {of}", kind=kind, label=kind, size=stray.tolerance, tempco=stray.tempco)
