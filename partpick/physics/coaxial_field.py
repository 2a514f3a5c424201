"""Magnetic field of thin coaxial rings and of cylindrical current sheets, off the axis, in closed form.

Lengths may be in any one unit where a result does not name another; currents are per unit.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ellipe, ellipkm1, elliprj

from partpick.physics.filaments import mutual_inductance
from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]


class RingField(NamedTuple):
    """Field of a thin ring, for one ampere.

    Parameters
    ----------
    axial : float or (n,) array
        Along the axis of the ring. [1/m]
    radial : float or (n,) array
        Away from the axis. [1/m]
    """

    axial: FloatArray
    radial: FloatArray


class SheetEnd(NamedTuple):
    """What one end of a cylindrical current sheet contributes, for one ampere per metre.

    The field of a sheet from z1 to z2 is that of its end at z1 less that of its end at z2.

    Parameters
    ----------
    axial : float or (n,) array
        Axial field. [-]
    radial : float or (n,) array
        Radial field. [-]
    potential : float or (n,) array
        Azimuthal vector potential over mu0. [m]
    """

    axial: FloatArray
    radial: FloatArray
    potential: FloatArray


def ring_potential(radius: ArrayLike, distance_from_axis: ArrayLike, height: ArrayLike) -> FloatArray:
    """Return the azimuthal vector potential of a thin ring, over mu0 and for one ampere.

    Parameters
    ----------
    radius : float or (n,) array
        Radius of the ring, above 0. [m]
    distance_from_axis : float or (n,) array
        Of the point, above 0; broadcasts with `radius`. [m]
    height : float or (n,) array
        Of the point above the plane of the ring; broadcasts. [m]

    Returns
    -------
    potential : float or (n,) array
        Flux through the circle about the axis through the point, over its circumference. [-]

    Notes
    -----
    Exact for a thin wire, off the axis; on it the potential is 0 and this gives nan.

    References
    ----------
    W. R. Smythe, Static and Dynamic Electricity, McGraw-Hill 1950, section 7.10 (circular loop; from memory).
    """
    rho = np.asarray(distance_from_axis, float)
    result: FloatArray = mutual_inductance(radius, rho, height) / (2.0 * np.pi * MU_0 * rho)
    return result


def ring_field(radius: ArrayLike, distance_from_axis: ArrayLike, height: ArrayLike) -> RingField:
    """Return the magnetic field of a thin ring, for one ampere.

    Parameters
    ----------
    radius : float or (n,) array
        Radius of the ring, above 0. [m]
    distance_from_axis : float or (n,) array
        Of the point, above 0; broadcasts with `radius`. [m]
    height : float or (n,) array
        Of the point above the plane of the ring; broadcasts. [m]

    Returns
    -------
    field : RingField
        Axial and radial component, each a float or (n,) array; not finite on the ring itself. [1/m]

    Notes
    -----
    Exact for a wire thin against its distance; on the axis and off it, at any distance from the wire.

    References
    ----------
    W. R. Smythe, Static and Dynamic Electricity, McGraw-Hill 1950, section 7.10 (circular loop; from memory).
    """
    a, rho, z = np.asarray(radius, float), np.asarray(distance_from_axis, float), np.asarray(height, float)
    near, far = (a - rho) ** 2 + z * z, (a + rho) ** 2 + z * z
    first, second = ellipkm1(near / far), ellipe(4.0 * a * rho / far)
    scale = 1.0 / (2.0 * np.pi * np.sqrt(far))
    axial = scale * (first + (a * a - rho * rho - z * z) / near * second)
    radial = scale * z / rho * ((a * a + rho * rho + z * z) / near * second - first)
    return RingField(axial, radial)


def sheet_end(radius: ArrayLike, distance_from_axis: ArrayLike, height: ArrayLike) -> SheetEnd:
    """Return what one end of a cylindrical current sheet contributes to field and potential.

    Parameters
    ----------
    radius : float or (n,) array
        Radius of the sheet, above 0. [m]
    distance_from_axis : float or (n,) array
        Of the point, above 0 and other than `radius`; broadcasts with it. [m]
    height : float or (n,) array
        Of the point above that end of the sheet; broadcasts. [m]

    Returns
    -------
    end : SheetEnd
        Axial and radial field [-] and vector potential over mu0 [m], each a float or (n,) array.

    Notes
    -----
    Odd in `height` but for the radial field, which is even. The integral of the third kind is
    Pi(n, m) = K(m) + n/3 R_J(0, 1 - m, 1, 1 - n). About 0.4 microseconds a point.

    References
    ----------
    E. E. Callaghan and S. H. Maslen, The magnetic field of a finite solenoid, NASA TN D-465, 1960 (from
    memory; confirmed in tests/test_physics_coaxial_field.py by summing rings and by magpylib).
    """
    a, rho, z = np.asarray(radius, float), np.asarray(distance_from_axis, float), np.asarray(height, float)
    far = (a + rho) ** 2 + z * z
    left = ((a - rho) ** 2 + z * z) / far  # 1 - m
    m, n = 4.0 * a * rho / far, 4.0 * a * rho / (a + rho) ** 2
    first, second = ellipkm1(left), ellipe(m)
    third = first + n / 3.0 * elliprj(0.0, left, 1.0, ((a - rho) / (a + rho)) ** 2)
    scale = z / np.sqrt(far) / np.pi
    axial = scale / 2.0 * (first + (a - rho) / (a + rho) * third)
    shape = (m + n - n * m) / (n * m) * first - second / m + (n - 1.0) / n * third
    return SheetEnd(axial, -ring_potential(a, rho, z), scale * a * shape)
