"""The cylindrical current sheet: a coil of one layer as an even sheet, and what round wire changes in it.

The closed form for a coil of any number of turns, whole or not; `solenoid.py` sums the turns themselves.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.skin import MU_0
from partpick.physics.special import elliptic_integrals

FloatArray = NDArray[np.float64]

# Length / diameter outside which the closed form loses digits and a series takes over.
_SHORT: Final = 2e-3
_LONG: Final = 10.0


def _long_series(terms: int) -> FloatArray:
    """Return the coefficients in (d/l)^2 of 2F1(-1/2, 1/2; 2; -(d/l)^2)."""
    steps = [-(n - 0.5) * (n + 0.5) / ((n + 2.0) * (n + 1.0)) for n in range(terms - 1)]
    return np.cumprod(np.array([1.0, *steps]))


_LONG_TERMS: Final = _long_series(9)


class Sensitivities(NamedTuple):
    """How the inductance of a single-layer coil follows its size, the turns fixed.

    Parameters
    ----------
    diameter : float or (n,) array
        d ln L / d ln D. [-]
    length : float or (n,) array
        d ln L / d ln l; the two add up to 1. [-]
    """

    diameter: FloatArray
    length: FloatArray


def nagaoka_coefficient(length_over_diameter: ArrayLike) -> FloatArray:
    """Return the factor by which the ends of a current sheet lower its inductance.

    Parameters
    ----------
    length_over_diameter : float or (n,) array
        Length over diameter of the sheet, from 0. [-]

    Returns
    -------
    coefficient : float or (n,) array
        0 for a flat ring to 1 for an endless sheet; nan below 0. [-]

    Notes
    -----
    Exact, by complete elliptic integrals; 10 digits at every proportion, the series of short and of long
    sheets taking over where the closed form cancels.

    References
    ----------
    H. Nagaoka, The inductance coefficients of solenoids, J. Coll. Sci. Imp. Univ. Tokyo 27 (1909) art. 6;
    L. Lorenz 1879; tests/published/nagaoka.csv.
    """
    x = np.asarray(length_over_diameter, float)
    return _by_proportion(x, _middle(x)[0], 0)[()]


def sheet_inductance(turns: ArrayLike, diameter: ArrayLike, length: ArrayLike) -> FloatArray:
    """Return the inductance of a cylindrical current sheet.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns that the sheet stands for. [-]
    diameter : float or (n,) array
        Diameter of the sheet: the mean diameter of a coil. [m]
    length : float or (n,) array
        Length of the sheet: turns times pitch for a coil. [m]

    Returns
    -------
    inductance : float or (n,) array
        Inductance of the sheet. [H]

    Notes
    -----
    mu0 pi (D/2)^2 N^2 K/l. As a figure for a coil of round wire it is off by 6 % rms, 16 % at worst.
    For an endless thin sheet it is exact, any l/D above 0.

    References
    ----------
    H. Nagaoka, J. Coll. Sci. Imp. Univ. Tokyo 27 (1909) art. 6; tests/published/solenoid_round_wire.csv.
    """
    n, d, axial = np.asarray(turns, float), np.asarray(diameter, float), np.asarray(length, float)
    result: FloatArray = (MU_0 * np.pi / 4.0 * d * d * n * n * nagaoka_coefficient(axial / d) / axial)[()]
    return result


def pitch_correction(wire_over_pitch: ArrayLike) -> FloatArray:
    """Return how the self-inductance of a round turn differs from that of its strip of sheet (Rosa's A).

    Parameters
    ----------
    wire_over_pitch : float or (n,) array
        Bare wire diameter over pitch, above 0. [-]

    Returns
    -------
    correction : float or (n,) array
        A, to be taken mu0 (D/2) N times from the sheet's inductance. [-]

    Notes
    -----
    5/4 - ln 2 + ln(d/p), even current in the wire.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237, table VII; tests/published/rosa_pitch.csv.
    """
    result: FloatArray = (1.25 - np.log(2.0) + np.log(np.asarray(wire_over_pitch, float)))[()]
    return result


def turns_correction(turns: ArrayLike) -> FloatArray:
    """Return how the mutual inductances of round turns differ from those of strips of sheet (Rosa's B).

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1. [-]

    Returns
    -------
    correction : float or (n,) array
        B, to be taken mu0 (D/2) N times from the sheet's inductance; nan below one turn. [-]

    Notes
    -----
    ln(2 pi) - 3/2 - ln(N)/(6N) - 0.33084236/N - 1/(120 N^3) + 1/(504 N^5) - 0.0011925/N^7: within 1.1e-6 of
    the exact sum from 2 turns; 0 for one turn.

    References
    ----------
    E. B. Rosa, Bull. Bur. Stand. 2 (1906) 161; F. W. Grover, Inductance Calculations, Van Nostrand 1946,
    table 39; series from memory, confirmed by tests/published/rosa_turns.csv.
    """
    n = np.asarray(turns, float)
    good = np.where(n >= 1.0, n, np.nan)
    inverse = 1.0 / good
    powers = inverse**3 * (-1.0 / 120.0 + inverse**2 * (1.0 / 504.0 - 0.0011925 * inverse**2))
    series = np.log(2.0 * np.pi) - 1.5 - inverse * (np.log(good) / 6.0 + 0.33084236) + powers
    return np.where(good == 1.0, 0.0, series)[()]


def solenoid_inductance(
    turns: ArrayLike, diameter: ArrayLike, wire_diameter: ArrayLike, pitch: ArrayLike
) -> FloatArray:
    """Return the low-frequency inductance of a single-layer coil of round wire, in closed form.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1, whole or not. [-]
    diameter : float or (n,) array
        Mean diameter, centre of wire to centre of wire. [m]
    wire_diameter : float or (n,) array
        Bare wire diameter. [m]
    pitch : float or (n,) array
        Distance of neighbouring turns, at least the wire diameter. [m]

    Returns
    -------
    inductance : float or (n,) array
        Low-frequency inductance; nan below one turn. [H]

    Notes
    -----
    Current sheet of length N p less mu0 (D/2) N (A + B). Against the sum over the turns
    (`solenoid.solenoid_families`), 5 to 200 turns, pitch up to 3 wire diameters: within 0.8 % where the coil
    is 10 wires wide or more (0.4 % up to a pitch of 2), 2.2 % at 5 wires wide.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (Scientific Paper 169);
    tests/published/solenoid_round_wire.csv.
    """
    n, d, p = np.asarray(turns, float), np.asarray(diameter, float), np.asarray(pitch, float)
    correction = pitch_correction(np.asarray(wire_diameter, float) / p) + turns_correction(n)
    result: FloatArray = (sheet_inductance(n, d, n * p) - MU_0 / 2.0 * d * n * correction)[()]
    return result


def inductance_sensitivities(length_over_diameter: ArrayLike) -> Sensitivities:
    """Return by how many per cent the inductance follows one per cent of diameter and of length.

    Parameters
    ----------
    length_over_diameter : float or (n,) array
        Length over mean diameter of the winding, above 0. [-]

    Returns
    -------
    sensitivities : Sensitivities
        Logarithmic derivatives by diameter and by length, each a float or (n,) array. [-]

    Notes
    -----
    2 - s and s - 1, with s = d ln K/d ln(l/D) in closed form, of the current sheet. They add up to 1: a coil
    that grows evenly by 1 % has 1 % more inductance.

    References
    ----------
    Derivative of the coefficient of H. Nagaoka 1909; tests/published/sheet_sensitivity.csv.
    """
    x = np.asarray(length_over_diameter, float)
    coefficient, slope = _middle(x)
    s = _by_proportion(x, slope, 1) / _by_proportion(x, coefficient, 0)
    return Sensitivities((2.0 - s)[()], (s - 1.0)[()])


def _middle(length_over_diameter: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the coefficient K and x dK/dx by elliptic integrals, good between the two series."""
    x = np.clip(np.nan_to_num(length_over_diameter, nan=1.0), _SHORT, _LONG)
    square = x * x
    m = 1.0 / (1.0 + square)
    k = np.sqrt(m)
    first, second = elliptic_integrals(square * m)
    shape = square * (first - second) + second - k
    grown = 2.0 * square * (first - second) - square * m * (2.0 * second - first - k)
    scale = 4.0 / (3.0 * np.pi * x * k)
    return scale * shape, scale * (grown - m * shape)


def _by_proportion(x: FloatArray, middle: FloatArray, order: int) -> FloatArray:
    """Return K (order 0) or x dK/dx (order 1), by series for short and long sheets, else as given."""
    result = middle
    if np.any(x > _LONG):
        inverse = 1.0 / np.maximum(x, _LONG)
        weights = _LONG_TERMS * (-2.0 * np.arange(len(_LONG_TERMS))) ** order
        end = (-1.0) ** order * 4.0 / (3.0 * np.pi) * inverse
        series = np.polyval(weights[::-1], inverse * inverse) - end
        result = np.where(x > _LONG, series, result)
    if not np.all(x >= _SHORT):
        result = np.where(x < _SHORT, _short(np.clip(x, 0.0, _SHORT), order), result)
    return np.where(x >= 0.0, result, np.nan)


def _short(x: FloatArray, order: int) -> FloatArray:
    """Return K or x dK/dx of a very short sheet, by the logarithmic series of Rayleigh and Niven."""
    with np.errstate(divide="ignore", invalid="ignore"):
        log = np.log(4.0 / x)
        square = x * x / 8.0
        value = 2.0 * x / np.pi * (log - 0.5 + square * (log + 0.25))
        slope = value + 2.0 * x / np.pi * (-1.0 + square * (2.0 * log - 0.5))
    return np.where(x > 0.0, slope if order else value, 0.0)
