"""Where the resonances of built units lie: by propagation, at the corners, and over random builds."""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from partpick.built.settings import SpreadSettings
from partpick.built.tank import Floats, VaryingTank
from partpick.built.variation import NORMAL_PARTS, Variation, deviation_of
from partpick.physics.uncertainty import quantiles, uniform_sum_distribution
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
class SweptSpread:
    """How far one swept band reaches over all units, trimmer at its middle; counted in builds."""

    low: float  # Hz: 19 of 20 units tune at least down to it
    high: float  # Hz: 19 of 20 units tune at least up to it
    worst_low: float  # Hz: every unit tunes at least down to it
    worst_high: float  # Hz
    covers: float  # share of units that cover the band as asked for, without margin


@dataclass(frozen=True, kw_only=True)
class UnitSpread:
    """The bands, and the unit as a whole."""

    bands: tuple[BandSpread | SweptSpread, ...]
    inside: float | None  # share of units with every fixed band inside the error limit, every swept one covered


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
    limit = 0.5 if error_limit is None else error_limit
    ends = [math.log1p(-limit) - nominal, math.log1p(limit) - nominal]
    if parts == NORMAL_PARTS:
        normal = NormalDist(sigma=max(deviation, 1e-300))
        low, high = normal.inv_cdf(LOW_SHARE), normal.inv_cdf(HIGH_SHARE)
        below = [normal.cdf(end) for end in ends]
    else:
        points, shares = uniform_sum_distribution(sizes)
        low, high = np.interp([LOW_SHARE, HIGH_SHARE], shares, points)
        below = [float(each) for each in np.interp(ends, points, shares)]
    inside = None if error_limit is None else below[1] - below[0]
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
    bands: list[BandSpread | SweptSpread] = []
    right = np.ones(builds.shape[1], dtype=np.bool_)
    judged = False
    for tank in variation.tanks:
        if tank.low_end is not None:
            swept, covered = _swept(variation, tank, tank.low_end, builds)
            bands.append(swept)
            right &= covered
            judged = True
            continue
        deviation, low, high, inside = propagated(variation, tank, settings.parts, limits.error)
        error = tank.resonance(builds) / tank.frequency - 1.0
        if limits.error is not None:
            ok = np.abs(error) <= limits.error
            right &= ok
            judged = True
            inside = float(ok.mean()) if counted else inside
        if counted:
            low, high = (float(point) for point in quantiles(error, (LOW_SHARE, HIGH_SHARE)))
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
    return UnitSpread(bands=tuple(bands), inside=float(right.mean()) if judged else None)


def _swept(
    variation: Variation, upper: VaryingTank, lower: VaryingTank, builds: Floats
) -> tuple[SweptSpread, NDArray[np.bool_]]:
    down, up = lower.resonance(builds), upper.resonance(builds)
    covered = (down <= lower.frequency) & (up >= upper.frequency)
    figures = SweptSpread(
        low=float(quantiles(down, [HIGH_SHARE])[0]),
        high=float(quantiles(up, [LOW_SHARE])[0]),
        worst_low=float(lower.resonance(variation.corners).max()),
        worst_high=float(upper.resonance(variation.corners).min()),
        covers=float(covered.mean()),
    )
    return figures, covered
