"""What may differ from unit to unit, and random builds of it.

A source is one piece, or one stray, with its largest deviation. A piece that serves several bands is one
source: a coil shared by all bands moves them together.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.built.tank import Floats, VaryingTank
from partpick.physics.uncertainty import NORMAL, UNIFORM, correlated_uniform

COIL, CAPACITOR, WIRING, SELF_CAPACITANCE, TUNING = "coil", "capacitor", "wiring", "self-capacitance", "tuning"
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
class Variation:
    """All sources of one design, and its bands."""

    sources: tuple[Source, ...]
    tanks: tuple[VaryingTank, ...]  # in plan order
    notes: tuple[str, ...] = ()  # defaults taken, in words

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
