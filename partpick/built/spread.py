"""Where the resonances of built units lie: by propagation, at the corners, and over random builds."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr, ndtri

from partpick.built.settings import SpreadSettings
from partpick.built.variation import NORMAL_PARTS, Floats, Variation, VaryingTank, deviation_of
from partpick.physics.uncertainty import uniform_sum_distribution
from partpick.request import Limits

LOW_SHARE, HIGH_SHARE = 0.05, 0.95


@dataclass(frozen=True, kw_only=True)
class BandSpread:
    """The error of one band over all units, nothing adjusted; fractions of the target."""

    deviation: float  # standard deviation, by propagation
    low: float  # 5 % of units lie below
    high: float  # 5 % of units lie above
    worst_low: float  # every part at its upper end
    worst_high: float
    inside: float | None  # share of units inside the error limit; None: no limit
    counted: bool  # whether `low`, `high` and `inside` were counted in builds, or come by propagation


@dataclass(frozen=True, kw_only=True)
class UnitSpread:
    """The bands, and the unit as a whole; a swept band has None."""

    bands: tuple[BandSpread | None, ...]
    inside: float | None  # share of units with every fixed band inside the error limit


def slopes(variation: Variation, tank: VaryingTank) -> Floats:
    """Return d ln f of one band over each source's fraction, trimmer at its middle, (S,). [-]"""
    by_source = np.zeros(len(variation.sources))
    for place, weight in tank.weights(tank.trimmer.middle if tank.trimmer else 0.0).items():
        by_source[place] = -0.5 * weight
    return by_source


def propagated(
    variation: Variation, tank: VaryingTank, parts: str, error_limit: float | None
) -> tuple[float, float, float, float | None]:
    """Return standard deviation, 5 % and 95 % points and the share inside the limit, all to first order.

    Notes
    -----
    ln f is linear in the fractions to first order. Uniform parts: the exact distribution of that sum; normal
    parts: a normal one (JCGM 100:2008, 5.1.2). Capacitors of one batch are taken as independent.
    """
    sizes = np.abs(slopes(variation, tank)) * variation.sizes
    nominal = float(np.log(tank.resonance(np.zeros((len(sizes), 1)))[0] / tank.frequency))
    deviation = deviation_of(parts) * float(np.sqrt((sizes**2).sum()))
    ends = None if error_limit is None else np.log([1.0 - error_limit, 1.0 + error_limit]) - nominal
    if parts == NORMAL_PARTS:
        low, high = deviation * ndtri([LOW_SHARE, HIGH_SHARE])
        below = None if ends is None else ndtr(ends / max(deviation, 1e-300))
    else:
        points, shares = uniform_sum_distribution(sizes)
        low, high = np.interp([LOW_SHARE, HIGH_SHARE], shares, points)
        below = None if ends is None else np.interp(ends, points, shares)
    inside = None if below is None else float(below[1] - below[0])
    return deviation, float(np.expm1(nominal + low)), float(np.expm1(nominal + high)), inside


def spread(
    variation: Variation, limits: Limits, settings: SpreadSettings, builds: Floats, *, counted: bool
) -> UnitSpread:
    """Return how the bands of built units lie around their targets with nothing adjusted.

    Parameters
    ----------
    variation : Variation
        What varies.
    limits : Limits
        Its error limit says which units are right.
    settings : SpreadSettings
        How the builds were drawn.
    builds : (S, n) array
        Random builds (`Variation.draw`). [fraction]
    counted : bool
        Whether each band's range is counted in the builds; by propagation otherwise. The whole unit is
        always counted: its bands depend on each other.
    """
    bands: list[BandSpread | None] = []
    right = np.ones(builds.shape[1], dtype=np.bool_)
    for tank in variation.tanks:
        if tank is None:
            bands.append(None)
            continue
        deviation, low, high, inside = propagated(variation, tank, settings.parts, limits.error)
        error = tank.resonance(builds) / tank.frequency - 1.0
        if limits.error is not None:
            ok = np.abs(error) <= limits.error
            right &= ok
            inside = float(ok.mean()) if counted else inside
        if counted:
            low, high = (float(point) for point in np.quantile(error, (LOW_SHARE, HIGH_SHARE)))
        worst_high, worst_low = tank.resonance(variation.corners) / tank.frequency - 1.0
        bands.append(
            BandSpread(
                deviation=deviation,
                low=low,
                high=high,
                worst_low=float(worst_low),
                worst_high=float(worst_high),
                inside=inside,
                counted=counted,
            )
        )
    share = None if limits.error is None or not any(bands) else float(right.mean())
    return UnitSpread(bands=tuple(bands), inside=share)
