"""Sums of independent tolerances: their spread, their distribution, and random draws of them.

A tolerance is a largest deviation either way. Without further knowledge it is taken as uniform between its ends.
"""

from __future__ import annotations

from functools import cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

UNIFORM: Final = 1.0 / np.sqrt(3.0)  # standard deviation over half-width: JCGM 100:2008, 4.3.7
NORMAL: Final = 0.5  # a tolerance of a normal quantity is taken as two standard deviations

_HARMONICS: Final = 256
_POINTS: Final = 257  # of the tabulated distribution, on its upper half


@cache
def _sines() -> FloatArray:
    """Return sin(k pi x) / (k pi) for x from 0 to 1 and k from 1, (points, harmonics). [-]"""
    k = np.arange(1, _HARMONICS + 1)
    x = np.linspace(0.0, 1.0, _POINTS)
    return np.sin(np.pi * x[:, None] * k) / (np.pi * k)


def uniform_sum_distribution(half_widths: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return the distribution of a sum of independent uniform quantities, each centred on zero.

    Parameters
    ----------
    half_widths : (k,) array
        Largest deviation of each, from 0. [any unit]

    Returns
    -------
    deviation : (513,) array
        From the least sum to the largest. [the same unit]
    share : (513,) array
        Share of sums up to there, 0 to 1. [-]

    Notes
    -----
    The Fourier series of the distribution over its whole width A = sum a: F(x) = 1/2 + x/2A +
    sum_k prod_i sinc(k a_i/A) sin(k pi x/A)/(k pi). Within 1e-3 of the Irwin-Hall distribution at any point;
    no deviation at all gives a step.

    References
    ----------
    Characteristic function of the uniform distribution and its product for a sum; P. Hall, The distribution
    of means for samples of size N drawn from a rectangular population, Biometrika 19 (1927) 240-245.
    """
    a = np.abs(np.asarray(half_widths, float))
    whole = float(a.sum())
    x = np.linspace(0.0, 1.0, _POINTS)
    if whole > 0.0:
        k = np.arange(1, _HARMONICS + 1)
        weights = np.sinc(a[:, None] / whole * k).prod(axis=0)
        upper = np.maximum.accumulate(np.clip(0.5 + 0.5 * x + _sines() @ weights, 0.5, 1.0))
    else:
        upper = np.ones(_POINTS)
    deviation = whole * np.concatenate([-x[:0:-1], x])
    share = np.concatenate([1.0 - upper[:0:-1], upper])
    return deviation, share


def correlated_uniform(common: ArrayLike, own: ArrayLike, correlation: float) -> FloatArray:
    """Return uniform quantities that share part of their variation, from independent standard normal ones.

    Parameters
    ----------
    common : (n,) array
        What all members of a batch share, standard normal. [-]
    own : (m, n) array
        What each member has of its own, standard normal. [-]
    correlation : float
        Correlation of two members wanted, 0 to 1. [-]

    Returns
    -------
    deviation : (m, n) array
        Uniform from -1 to 1. [-]

    Notes
    -----
    Normal quantities of correlation r turned into uniform ones have 6/pi asin(r/2); so r = 2 sin(pi c/6).
    Exact for two, any correlation from -1 to 1.

    References
    ----------
    K. Pearson, On further methods of determining correlation, Drapers' Company Research Memoirs 4 (1907);
    checked against draws.
    """
    r = 2.0 * np.sin(np.pi * correlation / 6.0)
    mixed = np.sqrt(r) * np.asarray(common, float) + np.sqrt(1.0 - r) * np.asarray(own, float)
    from scipy.special import ndtr  # takes longer to import than a whole search for one pair

    result: FloatArray = 2.0 * ndtr(mixed) - 1.0
    return result


def quantiles(values: ArrayLike, shares: ArrayLike) -> FloatArray:
    """Return the values below which given shares of a sample lie, linear between neighbours.

    Parameters
    ----------
    values : (n,) array
        The sample, at least one. [any]
    shares : (m,) array
        Shares, 0 to 1. [-]

    Returns
    -------
    quantiles : (m,) array
        Type 7 of the reference, the default of numpy.quantile; that function brings in masked arrays, whose
        import takes a tenth of a whole search for one pair. [any]

    Notes
    -----
    Exact for the sample; any size from 1 value on, shares from 0 to 1.

    References
    ----------
    R. J. Hyndman and Y. Fan, Sample quantiles in statistical packages, Am. Statistician 50 (1996) 361-365.
    """
    ordered = np.sort(np.asarray(values, float))
    place = np.asarray(shares, float) * (len(ordered) - 1)
    result: FloatArray = np.interp(place, np.arange(len(ordered)), ordered)
    return result
