"""What each part does to each band, and the one part worth having closer."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from partpick.built.spread import slopes
from partpick.built.tank import VaryingTank
from partpick.built.variation import CAPACITOR, COIL, Variation
from partpick.built.warming import on_frequency

USEFUL = 0.05  # of a band's standard deviation must go for a part to be worth it
BETTER = 0.01  # tolerance of a capacitor that is bought better or measured, of a coil measured after winding


@dataclass(frozen=True, kw_only=True)
class Contribution:
    """One source on one band, or the band's trimmer, which is set and so adds to drift alone."""

    reference: str
    kind: str
    band: str
    tolerance: float | None  # of the source, a fraction; None: it is set
    hertz_per_percent: float  # shift for one per cent more of it
    largest_shift: float  # Hz, size, at the end of its tolerance
    share_of_variance: float  # of the band's spread
    drift: float | None  # 1/K of the frequency; None: its tempco is unknown
    drift_spread: float  # 1/K, size


@dataclass(frozen=True, kw_only=True)
class WorthImproving:
    """The part whose closer tolerance narrows the bands most."""

    reference: str
    label: str
    kind: str
    tolerance: float  # now
    better: float  # then
    band: str  # where it matters most
    deviation: float  # standard deviation of that band now, a fraction of f
    deviation_then: float


def sensitivity(variation: Variation, deviation_per_size: float) -> tuple[Contribution, ...]:
    """Return what every source contributes to every band that it acts on, a swept band at its upper end.

    Parameters
    ----------
    variation : Variation
        What varies.
    deviation_per_size : float
        Standard deviation over tolerance (`variation.deviation_of`); cancels in the shares. [-]
    """
    found = []
    for tank in variation.tanks:
        slope = slopes(variation, tank)
        variance = (slope * variation.sizes * deviation_per_size) ** 2
        whole = float(variance.sum()) or 1.0
        set_to = on_frequency(tank)
        when_set = tank.weights(set_to)  # drift is that of a band on frequency
        for place in np.flatnonzero(slope):
            source = variation.sources[int(place)]
            tempco = tank.coil_tempco if source.kind == COIL else source.tempco
            known = tempco is not None and math.isfinite(tempco)
            share = -0.5 * when_set[int(place)]
            found.append(
                Contribution(
                    reference=source.reference,
                    kind=source.kind,
                    band=tank.name,
                    tolerance=source.size,
                    hertz_per_percent=float(slope[place]) * tank.frequency * 0.01,
                    largest_shift=abs(float(slope[place])) * tank.frequency * source.size,
                    share_of_variance=float(variance[place]) / whole,
                    drift=share * tempco if known and tempco is not None else None,
                    drift_spread=abs(share) * source.tempco_size,
                )
            )
        if tank.trimmer is not None:
            found.append(_of_trimmer(tank, set_to))
    return tuple(found)


def _of_trimmer(tank: VaryingTank, set_to: float) -> Contribution:
    assert tank.trimmer is not None
    share = -0.5 * set_to / (tank.nominal_fixed() + set_to)
    return Contribution(
        reference=f"trimmer of {tank.name}",
        kind="trimmer",
        band=tank.name,
        tolerance=None,
        hertz_per_percent=share * tank.frequency * 0.01,
        largest_shift=0.0,
        share_of_variance=0.0,
        drift=None if tank.trimmer.tempco is None else share * tank.trimmer.tempco,
        drift_spread=abs(share) * (tank.trimmer.tempco_tolerance or 0.0),
    )


def worth_improving(variation: Variation, deviation_per_size: float) -> WorthImproving | None:
    """Return the part that narrows the bands most when it is at 1 %; None where none does much.

    The gain is the sum over bands of the variance that goes, each as a fraction of the band's own.
    """
    tanks = variation.tanks
    if not tanks:
        return None
    variance = np.array([(slopes(variation, tank) * variation.sizes * deviation_per_size) ** 2 for tank in tanks])
    whole = variance.sum(axis=1, keepdims=True)
    left = np.minimum(BETTER / np.maximum(variation.sizes, BETTER), 1.0) ** 2
    part = np.array([source.kind in (COIL, CAPACITOR) for source in variation.sources])
    gain = np.where(part, variance * (1.0 - left), 0.0)
    relative = (gain / np.where(whole > 0.0, whole, 1.0)).sum(axis=0)
    best = int(relative.argmax())
    if relative[best] <= 0.0:
        return None
    at = int(gain[:, best].argmax())
    if gain[at, best] < (1.0 - (1.0 - USEFUL) ** 2) * whole[at, 0]:
        return None
    source = variation.sources[best]
    return WorthImproving(
        reference=source.reference,
        label=source.label,
        kind=source.kind,
        tolerance=source.size,
        better=BETTER,
        band=tanks[at].name,
        deviation=float(np.sqrt(whole[at, 0])),
        deviation_then=float(np.sqrt(whole[at, 0] - gain[at, best])),
    )
