"""Demagnetising factor of a rod and the permeability that is left of its material's.

The quick estimate for an open core; `sliding_core.py` solves a rod in a coil.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

_NEAR_SPHERE: Final = 0.01  # |(l/d)^2 - 1| under which the closed forms cancel and the series is exact


def _sphere_series(terms: int) -> FloatArray:
    """Return the coefficients of the factor in powers of (l/d)^2 - 1, from the series of the inverse sine."""
    inverse_sine = np.cumprod([1.0] + [-2.0 * k / (2.0 * k + 1.0) for k in range(1, terms + 1)])
    return np.asarray(inverse_sine[1:] + inverse_sine[:-1])


_SPHERE_TERMS: Final = _sphere_series(7)


def demagnetising_factor(length_over_diameter: ArrayLike) -> FloatArray:
    """Return the demagnetising factor of a spheroid along its axis of rotation.

    Parameters
    ----------
    length_over_diameter : float or (n,) array
        Length over diameter, above 0. [-]

    Returns
    -------
    factor : float or (n,) array
        Near 1 for a flat disc, 1/3 for a sphere, near 0 for a needle; nan for 0 or less. [-]

    Notes
    -----
    Exact for a spheroid. A rod of the same proportions and high permeability has 0.7 to 0.9 of it.

    References
    ----------
    J. A. Osborn, Demagnetizing factors of the general ellipsoid, Phys. Rev. 67 (1945) 351; rods: R. M.
    Bozorth and D. M. Chapin, J. Appl. Phys. 13 (1942) 320, from memory; tests/published/demagnetising.csv.
    """
    m = np.asarray(length_over_diameter, float)
    excess = np.where(m > 0.0, m * m - 1.0, np.nan)
    near = np.abs(excess) < _NEAR_SPHERE
    away = np.where(near, 1.0, excess)
    root = np.sqrt(np.abs(away))
    angle = np.where(away > 0.0, np.arcsinh(root), np.arcsin(np.minimum(root, 1.0)))
    series = np.polyval(_SPHERE_TERMS[::-1], np.where(near, excess, 0.0))
    return np.where(near, series, (m * angle / root - 1.0) / away)[()]


def rod_permeability(permeability: ArrayLike, factor: ArrayLike) -> FloatArray:
    """Return the apparent permeability of a rod in an even field.

    Parameters
    ----------
    permeability : float or (n,) array
        Relative permeability of the material, at least 1. [-]
    factor : float or (n,) array
        Demagnetising factor of the rod, 0 to 1; broadcasts. [-]

    Returns
    -------
    permeability : float or (n,) array
        Flux through the rod's middle over that without it, at most 1/factor. [-]

    Notes
    -----
    mu/(1 + N (mu - 1)). A coil that is shorter than the rod, or wider, gains less than this: it is no
    substitute for `sliding_core.core_inductance_rise`.
    Within the range of the factor N that it is given.

    References
    ----------
    R. M. Bozorth and D. M. Chapin, Demagnetizing factors of rods, J. Appl. Phys. 13 (1942) 320.
    """
    mu = np.asarray(permeability, float)
    return (mu / (1.0 + np.asarray(factor, float) * (mu - 1.0)))[()]
