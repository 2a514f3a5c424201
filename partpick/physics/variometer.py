"""Two concentric single-layer coils, the inner one turning: inductance against angle.

Coils are given as coaxial rings: radius, and height above the common centre along the coil's own axis.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.filaments import mutual_inductance
from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]

_TERMS_AT_MOST: Final = 2000
_BLOCK: Final = 2_000_000  # ring pairs times points held at a time


class Rings(NamedTuple):
    """A single-layer coil as coaxial thin rings about the common centre.

    Parameters
    ----------
    radius : (n,) array
        Mean radius of each turn. [m]
    height : (n,) array
        Height of each turn above the centre. [m]
    """

    radius: FloatArray
    height: FloatArray


def coil_rings(turns: int, diameter: float, pitch: float, centre_gap: float = 0.0) -> Rings:
    """Return the turns of a coil with the pivot in its middle.

    Parameters
    ----------
    turns : int
        Number of turns. [-]
    diameter : float
        Mean diameter. [m]
    pitch : float
        Distance of neighbouring turns. [m]
    centre_gap : float
        Added between the two middle turns, for the shaft. [m]

    Returns
    -------
    rings : Rings
        Radius and height of each turn, both (turns,) arrays. [m]

    Notes
    -----
    Turns as rings: exact for close pitch; from one turn on.

    References
    ----------
    Geometry.
    """
    height = (np.arange(turns) - (turns - 1) / 2.0) * pitch
    return Rings(np.full(turns, diameter / 2.0), height + centre_gap / 2.0 * np.sign(height))


def clearance(stator: Rings, rotor: Rings, stator_wire: float = 0.0, rotor_wire: float = 0.0) -> float:
    """Return what is left between the rotor and the stator when the rotor goes right round.

    Parameters
    ----------
    stator : Rings
        Outer coil. [m]
    rotor : Rings
        Inner coil. [m]
    stator_wire : float
        Overall wire diameter of the stator. [m]
    rotor_wire : float
        Overall wire diameter of the rotor. [m]

    Returns
    -------
    clearance : float
        From the sphere that the rotor sweeps to the nearest turn of the stator; negative: it does not turn
        through. [m]

    Notes
    -----
    Exact geometry for a rotor that turns about the middle of the stator.

    References
    ----------
    Geometry.
    """
    inner = np.hypot(stator.radius, stator.height).min() - stator_wire / 2.0
    outer = np.hypot(rotor.radius, rotor.height).max() + rotor_wire / 2.0
    return float(inner - outer)


def tilted_mutual_inductance(stator: Rings, rotor: Rings, angle: ArrayLike) -> FloatArray:
    """Return the mutual inductance of two concentric coils whose axes meet at an angle, by zonal harmonics.

    Parameters
    ----------
    stator : Rings
        Outer coil. [m]
    rotor : Rings
        Inner coil, clear of the sphere through the nearest turn of the stator. [m]
    angle : float or (n,) array
        Between the axes; 0: aiding. [degree]

    Returns
    -------
    mutual : float or (n,) array
        Mutual inductance, negative beyond 90 degrees. [H]

    Raises
    ------
    ValueError
        If the rotor is so large that the series does not converge: take `tilted_mutual_by_line_integral`.

    Notes
    -----
    mu0 pi sum over n of P_n(cos angle)/(n (n + 1)) times a sum over the turns of each coil; exact to 1e-12
    for thin rings. Not a plain cosine: some per cent off it between the ends. Time goes with the number of
    turns, not of pairs of turns; all angles share the two sums: 2 ms for 20 by 20 turns and 180 angles.

    References
    ----------
    A. Gray, Absolute Measurements in Electricity and Magnetism, 1893; C. Snow, Formulas for Computing
    Capacitance and Inductance, NBS Circular 544, 1954 (both from memory); tests/published/variometer.csv.
    """
    far, near = np.hypot(*stator), np.hypot(*rotor)
    ratio = float(near.max() / far.min())
    terms = int(np.ceil(np.log(1e-14) / np.log(ratio))) if ratio < 1.0 else _TERMS_AT_MOST + 1
    if terms > _TERMS_AT_MOST:
        raise ValueError("the rotor reaches the sphere through the nearest turn of the stator")
    unit = float(far.min())
    outer = _zonal_sums(stator, far, (unit / far)[:, None] ** np.arange(1, terms + 1))
    inner = _zonal_sums(rotor, near, (near / unit)[:, None] ** np.arange(1, terms + 1) * near[:, None])
    order = np.arange(1, terms + 1)
    weight = outer * inner / (order * (order + 1.0))
    facing = np.cos(np.deg2rad(np.asarray(angle, float)))
    legendre = _legendre(facing.ravel(), terms)[0]
    return (MU_0 * np.pi * (weight @ legendre).reshape(facing.shape))[()]


def tilted_mutual_by_line_integral(stator: Rings, rotor: Rings, angle: ArrayLike, points: int = 720) -> FloatArray:
    """Return the mutual inductance of two concentric coils at an angle, for any two that do not touch.

    Parameters
    ----------
    stator : Rings
        One coil. [m]
    rotor : Rings
        The other. [m]
    angle : float or (n,) array
        Between the axes; 0: aiding. [degree]
    points : int
        Points on each turn of the rotor. [-]

    Returns
    -------
    mutual : float or (n,) array
        Mutual inductance; not finite where wires cross. [H]

    Notes
    -----
    The stator's vector potential (elliptic integrals) along each turn of the rotor; the sum over equal steps
    of a closed curve converges as fast as any rule. About 15 ms an angle for 20 by 20 turns.

    References
    ----------
    J. C. Maxwell, A Treatise on Electricity and Magnetism, vol. 2, 1873, sections 423 and 701;
    tests/published/variometer.csv.
    """
    tilt = np.deg2rad(np.asarray(angle, float))
    result = [_line_integral(stator, rotor, float(t), points) for t in tilt.ravel()]
    return np.array(result).reshape(tilt.shape)[()]


def series_inductance(first: ArrayLike, second: ArrayLike, mutual: ArrayLike) -> FloatArray:
    """Return the inductance of two coupled coils in series.

    Parameters
    ----------
    first : float or (n,) array
        Self-inductance of one coil. [H]
    second : float or (n,) array
        Self-inductance of the other; broadcasts. [H]
    mutual : float or (n,) array
        Mutual inductance, positive where aiding. [H]

    Returns
    -------
    inductance : float or (n,) array
        L1 + L2 + 2 M. [H]

    Notes
    -----
    Exact; for a mutual inductance of either sign up to the root of L1 L2.

    References
    ----------
    J. C. Maxwell, A Treatise on Electricity and Magnetism, vol. 2, 1873.
    """
    one, two, shared = (np.asarray(x, float) for x in (first, second, mutual))
    result: FloatArray = one + two + 2.0 * shared
    return result


def parallel_inductance(first: ArrayLike, second: ArrayLike, mutual: ArrayLike) -> FloatArray:
    """Return the inductance of two coupled coils in parallel.

    Parameters
    ----------
    first : float or (n,) array
        Self-inductance of one coil. [H]
    second : float or (n,) array
        Self-inductance of the other; broadcasts. [H]
    mutual : float or (n,) array
        Mutual inductance, positive where aiding. [H]

    Returns
    -------
    inductance : float or (n,) array
        (L1 L2 - M^2)/(L1 + L2 - 2 M). [H]

    Notes
    -----
    Exact without loss; for a mutual inductance below the root of L1 L2.

    References
    ----------
    J. C. Maxwell, A Treatise on Electricity and Magnetism, vol. 2, 1873.
    """
    one, two, shared = (np.asarray(x, float) for x in (first, second, mutual))
    result: FloatArray = (one * two - shared**2) / (one + two - 2.0 * shared)
    return result


def _zonal_sums(rings: Rings, distance: FloatArray, powers: FloatArray) -> FloatArray:
    """Return for n = 1, 2, ... the sum over rings of sin^2 P_n'(cos) times a power of their distance."""
    cosine = rings.height / distance
    derivative = _legendre(cosine, powers.shape[1])[1]
    squared_sine = (rings.radius / distance) ** 2
    return np.asarray(np.sum(squared_sine[:, None] * derivative.T * powers, axis=0))


def _legendre(x: FloatArray, terms: int) -> tuple[FloatArray, FloatArray]:
    """Return P_n(x) and its derivative for n = 1 ... terms, both (terms, points)."""
    value, slope = np.empty((terms + 1, x.size)), np.empty((terms + 1, x.size))
    value[0], slope[0] = 1.0, 0.0
    value[1], slope[1] = x, 1.0
    for n in range(1, terms):
        value[n + 1] = ((2 * n + 1) * x * value[n] - n * value[n - 1]) / (n + 1)
        slope[n + 1] = x * slope[n] + (n + 1) * value[n]
    return value[1:], slope[1:]


def _line_integral(stator: Rings, rotor: Rings, tilt: float, points: int) -> float:
    """Return M at one angle."""
    phase = np.arange(points) * (2.0 * np.pi / points)
    radius, height = rotor.radius[:, None], rotor.height[:, None]
    # rotor turned about the x axis: its own y axis is (0, cos, sin), its own axis (0, -sin, cos)
    x, own_y = radius * np.cos(phase), radius * np.sin(phase)
    y = own_y * np.cos(tilt) - height * np.sin(tilt)
    z = own_y * np.sin(tilt) + height * np.cos(tilt)
    swept = (x * x * np.cos(tilt) + y * own_y).ravel()  # x dy - y dx over d phase
    rho, z = np.maximum(np.hypot(x, y).ravel(), 1e-12 * float(rotor.radius.max())), z.ravel()
    total = 0.0
    step = max(1, _BLOCK // max(1, rho.size))
    for start in range(0, len(stator.radius), step):
        a, h = stator.radius[start : start + step, None], stator.height[start : start + step, None]
        potential = mutual_inductance(a, rho, z - h) / (2.0 * np.pi * rho)
        total += float(np.sum(potential * swept / rho))
    return total * 2.0 * np.pi / points
