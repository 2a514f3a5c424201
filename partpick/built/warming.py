"""How the bands move between two temperatures, with the tolerances of the temperature coefficients."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from partpick.built.spread import HIGH_SHARE, LOW_SHARE
from partpick.built.tank import VaryingTank
from partpick.built.variation import COIL, Variation
from partpick.physics.uncertainty import uniform_sum_distribution


@dataclass(frozen=True, kw_only=True)
class BandDrift:
    """The drift of one band, trimmer set on frequency; df/f per kelvin, and the shift over the range."""

    nominal: float  # 1/K
    low: float  # 1/K, 5 % of units drift further down
    high: float  # 1/K
    spread: float  # 1/K, size: all coefficients at their ends the same way
    shift: float  # Hz from the lower to the upper temperature
    shift_low: float  # Hz
    shift_high: float  # Hz
    shift_spread: float  # Hz, size


def on_frequency(tank: VaryingTank) -> float:
    """Return the trimmer where it brings the nominal parts on frequency, or its nearer end; 0 without one. [F]"""
    if tank.trimmer is None:
        return 0.0
    missing = float(tank.wanted(tank.inductance)) - tank.nominal_fixed()
    return min(max(missing, tank.trimmer.low), tank.trimmer.high)


def band_drift(variation: Variation, tank: VaryingTank, kelvin: float) -> BandDrift | None:
    """Return the drift of one band; None where a coefficient is unknown.

    Parameters
    ----------
    variation : Variation
        What varies.
    tank : VaryingTank
        The band.
    kelvin : float
        Upper less lower temperature. [K]

    Notes
    -----
    Coefficients are constant over the range, as class 1 dielectrics have them; a coefficient is uniform
    within its tolerance, and independent of the others.
    """
    trimmer = on_frequency(tank)
    weights = tank.weights(trimmer)
    nominal, sizes = 0.0, []
    for place, weight in weights.items():
        source = variation.sources[place]
        tempco = tank.coil_tempco if source.kind == COIL else source.tempco
        nominal -= 0.5 * weight * (math.nan if tempco is None else tempco) if weight else 0.0
        sizes.append(0.5 * weight * source.tempco_size)
    if tank.trimmer is not None:
        own = math.nan if tank.trimmer.tempco is None else tank.trimmer.tempco
        weight = trimmer / (tank.nominal_fixed() + trimmer)
        nominal -= 0.5 * weight * own
        sizes.append(0.5 * weight * (tank.trimmer.tempco_tolerance or 0.0))
    if not math.isfinite(nominal):
        return None
    points, shares = uniform_sum_distribution(sizes)
    low, high = (nominal + float(each) for each in np.interp([LOW_SHARE, HIGH_SHARE], shares, points))
    scale = tank.frequency * kelvin
    size = math.fsum(abs(each) for each in sizes)
    return BandDrift(
        nominal=nominal,
        low=low,
        high=high,
        spread=size,
        shift=nominal * scale,
        shift_low=low * scale,
        shift_high=high * scale,
        shift_spread=size * scale,
    )
