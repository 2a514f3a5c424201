"""Thin coaxial rings: the mutual inductance of two, and the self-inductance of one of round wire.

Every coil that is summed turn by turn rests on these two functions.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.skin import MU_0
from partpick.physics.special import elliptic_integrals

FloatArray = NDArray[np.float64]

# Parameter m = k^2 under which the terms of the closed form cancel; the series is then exact to 1e-15.
_SERIES_BELOW: Final = 0.04


def _far_series(terms: int) -> FloatArray:
    """Return c[n] of (2 - m) K(m) - 2 E(m) = pi/2 m^2 sum c[n] m^n, from the power series of K and E."""
    squares = np.cumprod([1.0] + [((2 * n - 1) / (2 * n)) ** 2 for n in range(1, terms + 1)])
    return np.array([squares[n + 1] * (n + 1) / (n + 2) for n in range(terms)])


_FAR: Final = _far_series(11)


def mutual_inductance(radius: ArrayLike, other_radius: ArrayLike, distance: ArrayLike) -> FloatArray:
    """Return the mutual inductance of two coaxial thin rings.

    Parameters
    ----------
    radius : float or (n,) array
        Radius of one ring, above 0. [m]
    other_radius : float or (n,) array
        Radius of the other; broadcasts with `radius`. [m]
    distance : float or (n,) array
        Axial distance of their planes, either sign; broadcasts. [m]

    Returns
    -------
    mutual : float or (n,) array
        Mutual inductance; infinite where the rings coincide. [H]

    Notes
    -----
    mu0 sqrt(a b) [(2 - m) K(m) - 2 E(m)]/k with m = k^2 = 4 a b/((a + b)^2 + z^2). Far apart, where its terms
    cancel, by the power series in m: 12 digits hold at every distance.

    References
    ----------
    J. C. Maxwell, A Treatise on Electricity and Magnetism, vol. 2, 1873, section 701; NIST Digital Library of
    Mathematical Functions, 19.34.5.
    """
    a, b, z = np.asarray(radius, float), np.asarray(other_radius, float), np.asarray(distance, float)
    square = z * z
    far_side = (a + b) ** 2 + square
    m = 4.0 * a * b / far_side
    with np.errstate(invalid="ignore"):
        first, second = elliptic_integrals(((a - b) ** 2 + square) / far_side)
        shape = np.asarray((2.0 - m) * first - 2.0 * second)
    far = m < _SERIES_BELOW
    if np.any(far):
        shape = np.where(far, np.pi / 2.0 * m * m * np.polyval(_FAR[::-1], np.where(far, m, 0.0)), shape)
    result: FloatArray = (MU_0 / 2.0 * np.sqrt(far_side) * shape)[()]
    return result


def loop_inductance(diameter: ArrayLike, wire_diameter: ArrayLike) -> FloatArray:
    """Return the low-frequency self-inductance of one circular turn of round wire.

    Parameters
    ----------
    diameter : float or (n,) array
        Mean diameter, centre of wire to centre of wire. [m]
    wire_diameter : float or (n,) array
        Bare wire diameter, below `diameter`; broadcasts with it. [m]

    Returns
    -------
    inductance : float or (n,) array
        Self-inductance with the current spread evenly over the wire. [H]

    Notes
    -----
    mu0 a [(1 + q/8) ln(8/r) - 7/4 + q/24], r = wire radius over ring radius a, q = r^2. The next term is of
    order r^4: below 0.1 % of L up to a wire half as thick as the ring is wide.

    References
    ----------
    Lord Rayleigh and W. D. Niven as quoted in E. B. Rosa and F. W. Grover, Formulas and tables for the
    calculation of mutual and self-inductance, Bull. Bur. Stand. 8 (1912) 1-237 (Scientific Paper 169);
    from memory, confirmed by tests/published/solenoid_round_wire.csv.
    """
    ratio = np.asarray(wire_diameter, float) / np.asarray(diameter, float)
    log = np.log(8.0 / ratio)
    square = ratio * ratio
    shape = (1.0 + square / 8.0) * log - 1.75 + square / 24.0
    result: FloatArray = (MU_0 / 2.0 * np.asarray(diameter, float) * shape)[()]
    return result
