"""Coils of many layers: a published closed form with its range, and the sum over all turns."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.filaments import loop_inductance, mutual_inductance

FloatArray = NDArray[np.float64]

_PER_METRE: Final = 0.8e-6 / 0.0254  # the published coefficient is for microhenry and inches
OUTSIDE_SPREAD: Final = 0.20  # of the closed form outside its range, for l/a and c/a up to 3 (own sums)


def multilayer_inductance(turns: ArrayLike, diameter: ArrayLike, length: ArrayLike, depth: ArrayLike) -> FloatArray:
    """Return the low-frequency inductance of a coil of many layers, in closed form.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, spread evenly over the section. [-]
    diameter : float or (n,) array
        Mean diameter of the winding. [m]
    length : float or (n,) array
        Length of the winding along the axis. [m]
    depth : float or (n,) array
        Radial depth of the winding, below `diameter`. [m]

    Returns
    -------
    inductance : float or (n,) array
        Low-frequency inductance. [H]

    Notes
    -----
    0.8 a^2 N^2/(6 a + 9 l + 10 c) in microhenry and inches, a the mean radius, c the depth. The author gives
    about 1 % where the three terms are about equal; `multilayer_spread` has the error elsewhere.

    References
    ----------
    H. A. Wheeler, Simple inductance formulas for radio coils, Proc. IRE 16 (1928) 1398-1400 (from memory).
    """
    a = np.asarray(diameter, float) / 2.0
    denominator = np.sum(_terms(diameter, length, depth), axis=0)
    result: FloatArray = (_PER_METRE * (a * np.asarray(turns, float)) ** 2 / denominator)[()]
    return result


def multilayer_spread(diameter: ArrayLike, length: ArrayLike, depth: ArrayLike) -> FloatArray:
    """Return the model error of the closed form for many layers, as a fraction either way.

    Parameters
    ----------
    diameter : float or (n,) array
        Mean diameter of the winding. [m]
    length : float or (n,) array
        Length of the winding along the axis. [m]
    depth : float or (n,) array
        Radial depth of the winding. [m]

    Returns
    -------
    spread : float or (n,) array
        Relative error to expect of `multilayer_inductance`; nan outside its range. [-]

    Notes
    -----
    0.04 where the least of the terms 6 a, 9 l, 10 c is at least half their mean, 0.07 where it is at least
    0.3 of it; outside, nan: sum the turns with `layered_inductance`.

    References
    ----------
    Own sums over 100 to 1,500 turns for l/a 0.1 to 3 and c/a 0.1 to 1.3 (63 sections); the claim of 1 % for
    equal terms is that of H. A. Wheeler 1928 (from memory).
    """
    terms = _terms(diameter, length, depth)
    least = terms.min(axis=0) / terms.mean(axis=0)
    return np.select([least >= 0.5, least >= 0.3], [0.04, 0.07], np.nan)[()]


def multilayer_sensitivities(
    diameter: ArrayLike, length: ArrayLike, depth: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return by how many per cent the inductance follows one per cent of diameter, length and depth.

    Parameters
    ----------
    diameter : float or (n,) array
        Mean diameter of the winding. [m]
    length : float or (n,) array
        Length of the winding along the axis. [m]
    depth : float or (n,) array
        Radial depth of the winding. [m]

    Returns
    -------
    by_diameter, by_length, by_depth : tuple of three floats or (n,) arrays
        Logarithmic derivatives; together 1. [-]

    Notes
    -----
    Within the range of `multilayer_inductance`, whose derivatives they are, exactly.

    References
    ----------
    Derivative of `multilayer_inductance`.
    """
    terms = _terms(diameter, length, depth)
    shares = terms / terms.sum(axis=0)
    return (2.0 - shares[0])[()], (-shares[1])[()], (-shares[2])[()]


def layered_inductance(
    layers: int, turns: int, inner_diameter: float, pitch: float, rise: float, wire_diameter: float
) -> float:
    """Return the low-frequency inductance of equal layers of round wire, summed turn by turn.

    Parameters
    ----------
    layers : int
        Number of layers, at least 1. [-]
    turns : int
        Turns of each layer, at least 1. [-]
    inner_diameter : float
        Inner diameter of the winding: that of its former. [m]
    pitch : float
        Distance of neighbouring turns in a layer. [m]
    rise : float
        Distance of neighbouring layers; the first lies half of it above the former. [m]
    wire_diameter : float
        Bare wire diameter. [m]

    Returns
    -------
    inductance : float
        Low-frequency inductance. [H]

    Notes
    -----
    All layers in series, one sense of winding, turns square above one another. Exact for coaxial thin rings.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (summation over coaxial rings).
    """
    radius = inner_diameter / 2.0 + rise * (np.arange(layers) + 0.5)
    apart = np.arange(turns)
    # How many ordered pairs of turns, one in each of two layers, lie `apart` pitches from one another.
    pairs = np.where(apart > 0, 2 * (turns - apart), turns)
    first, second = np.triu_indices(layers, 1)
    between = mutual_inductance(radius[first][:, None], radius[second][:, None], apart * pitch)
    within = mutual_inductance(radius[:, None], radius[:, None], apart[1:] * pitch)
    own = turns * np.sum(loop_inductance(2.0 * radius, wire_diameter))
    return float(2.0 * np.sum(between * pairs) + np.sum(within * pairs[1:]) + own)


def _terms(diameter: ArrayLike, length: ArrayLike, depth: ArrayLike) -> FloatArray:
    """Return the three terms of the closed form's denominator, along the first axis."""
    sizes = np.broadcast_arrays(
        3.0 * np.asarray(diameter, float), 9.0 * np.asarray(length, float), 10.0 * np.asarray(depth, float)
    )
    return np.stack(sizes)
