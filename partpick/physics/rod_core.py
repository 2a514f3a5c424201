"""A coil wound in the middle of a magnetic rod: what the rod adds to its inductance.

Boundary elements (`sliding_core.py`) solve one rod in some 20 ms, too slow for every rod of a stock at every
start; here their answers stand in a table by proportions, for a centred coil.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]

# 1/rise = a/(mu - 1) + b, rise being L/(mu0 N^2 d) with d the rod's diameter: computed with
# `sliding_core.core_inductance_rise` at permeability 80 and 500. Blocks: coil diameter over rod diameter;
# rows: rod length over rod diameter; columns: winding length over rod length.
_CLEARANCE: Final = np.array([1.02, 1.1, 1.3])
_SLENDER: Final = np.array([3.0, 5.0, 8.0, 12.0, 20.0, 32.0])
_COVERED: Final = np.array([0.05, 0.1, 0.2, 0.35, 0.5, 0.7, 0.9])
_LOG_A: Final = np.log([
    [
        [1.686, 1.883, 2.211, 2.65, 3.088, 3.718, 4.497],
        [2.332, 2.628, 3.136, 3.832, 4.529, 5.535, 6.781],
        [3.25, 3.699, 4.49, 5.606, 6.724, 8.33, 10.31],
        [4.344, 5, 6.208, 7.924, 9.647, 12.1, 15.09],
        [6.008, 7.159, 9.267, 12.32, 15.39, 19.66, 24.7],
        [7.713, 9.589, 13.14, 18.41, 23.73, 30.96, 39],
    ],
    [
        [2.01, 2.128, 2.391, 2.796, 3.219, 3.848, 4.643],
        [2.62, 2.838, 3.282, 3.946, 4.632, 5.636, 6.897],
        [3.503, 3.882, 4.618, 5.701, 6.808, 8.412, 10.41],
        [4.555, 5.16, 6.315, 8.005, 9.718, 12.17, 15.17],
        [6.206, 7.293, 9.358, 12.39, 15.45, 19.72, 24.76],
        [7.879, 9.701, 13.21, 18.47, 23.78, 31.01, 39.06],
    ],
    [
        [2.592, 2.647, 2.821, 3.16, 3.557, 4.186, 5.017],
        [3.174, 3.3, 3.641, 4.238, 4.896, 5.899, 7.196],
        [4.041, 4.302, 4.927, 5.944, 7.024, 8.624, 10.66],
        [5.073, 5.545, 6.588, 8.214, 9.901, 12.34, 15.38],
        [6.684, 7.631, 9.59, 12.56, 15.6, 19.86, 24.93],
        [8.298, 9.989, 13.41, 18.62, 23.91, 31.12, 39.2],
    ],
])  # fmt: skip
_LOG_B: Final = np.log([
    [
        [0.1836, 0.1954, 0.2149, 0.2419, 0.2711, 0.3176, 0.382],
        [0.1453, 0.1548, 0.1707, 0.1933, 0.218, 0.2584, 0.3156],
        [0.1159, 0.1229, 0.1355, 0.1541, 0.1747, 0.2089, 0.2586],
        [0.0945, 0.09986, 0.1099, 0.1249, 0.1418, 0.1705, 0.2132],
        [0.07285, 0.07689, 0.08394, 0.09452, 0.1068, 0.1285, 0.1626],
        [0.05981, 0.06254, 0.06698, 0.07348, 0.08138, 0.09695, 0.124],
    ],
    [
        [0.2052, 0.2121, 0.2276, 0.2527, 0.2812, 0.3282, 0.3941],
        [0.1557, 0.1624, 0.1761, 0.1977, 0.2222, 0.2628, 0.3209],
        [0.1204, 0.1264, 0.138, 0.156, 0.1765, 0.2108, 0.2609],
        [0.09637, 0.1014, 0.111, 0.1258, 0.1426, 0.1713, 0.2142],
        [0.07363, 0.07742, 0.08431, 0.0948, 0.107, 0.1288, 0.163],
        [0.0601, 0.06272, 0.0671, 0.07356, 0.08146, 0.09704, 0.1242],
    ],
    [
        [0.2448, 0.248, 0.2585, 0.2803, 0.308, 0.3561, 0.4257],
        [0.1752, 0.179, 0.1896, 0.2094, 0.2334, 0.2745, 0.3345],
        [0.1301, 0.1341, 0.1439, 0.161, 0.1812, 0.2158, 0.2668],
        [0.1013, 0.1052, 0.1138, 0.128, 0.1447, 0.1736, 0.217],
        [0.07562, 0.07881, 0.08526, 0.09555, 0.1077, 0.1296, 0.1639],
        [0.0609, 0.06322, 0.06741, 0.07379, 0.08168, 0.09729, 0.1245],
    ],
])  # fmt: skip
_LEAST_PERMEABILITY: Final = 50.0


def rod_coil_rise(
    turns: ArrayLike,
    coil_diameter: ArrayLike,
    coil_length: ArrayLike,
    rod_diameter: ArrayLike,
    rod_length: ArrayLike,
    permeability: ArrayLike,
) -> FloatArray:
    """Return by how much a rod raises the inductance of a single-layer coil in its middle.

    Parameters
    ----------
    turns : float or (n,) array
        Turns of the coil. [-]
    coil_diameter : float or (n,) array
        Mean diameter of the coil, above that of the rod. [m]
    coil_length : float or (n,) array
        Winding length, turns times pitch. [m]
    rod_diameter : float or (n,) array
        Diameter of the rod. [m]
    rod_length : float or (n,) array
        Length of the rod. [m]
    permeability : float or (n,) array
        Relative permeability of the material, above 1. [-]

    Returns
    -------
    rise : float or (n,) array
        To be added to the inductance of the empty coil. [H]

    Notes
    -----
    Linear between cells in the logarithms; beyond the table's ends as at its ends. `rod_coil_spread` has
    the error.

    References
    ----------
    Own boundary elements, `sliding_core.core_inductance_rise`, whose sources stand there.
    """
    by_material, by_shape = _terms(coil_diameter, coil_length, rod_diameter, rod_length)
    scale = MU_0 * np.asarray(turns, float) ** 2 * np.asarray(rod_diameter, float)
    return (scale / (by_material / (np.asarray(permeability, float) - 1.0) + by_shape))[()]


def rod_coil_spread(
    coil_diameter: ArrayLike,
    coil_length: ArrayLike,
    rod_diameter: ArrayLike,
    rod_length: ArrayLike,
    permeability: ArrayLike,
    permeability_tolerance: ArrayLike,
) -> FloatArray:
    """Return the spread of what a rod adds: model error and the tolerance of its permeability.

    Parameters
    ----------
    coil_diameter : float or (n,) array
        Mean diameter of the coil. [m]
    coil_length : float or (n,) array
        Winding length. [m]
    rod_diameter : float or (n,) array
        Diameter of the rod. [m]
    rod_length : float or (n,) array
        Length of the rod. [m]
    permeability : float or (n,) array
        Relative permeability of the material, above 1. [-]
    permeability_tolerance : float or (n,) array
        Tolerance of the permeability, a fraction either way. [-]

    Returns
    -------
    spread : float or (n,) array
        Relative error to expect of `rod_coil_rise`. [-]

    Notes
    -----
    Model: 0.02 up to a rod 12 diameters long, 0.05 up to 32, inside the table and for a permeability of 50
    to 1000; 0.20 outside. The shape of an open rod counts for more than its material: of the permeability's
    tolerance only the share that a/(mu - 1) has in 1/rise gets through.

    References
    ----------
    Differences from `sliding_core.core_inductance_rise` between the cells of the table; propagation.
    """
    by_material, by_shape = _terms(coil_diameter, coil_length, rod_diameter, rod_length)
    mu = np.asarray(permeability, float)
    material = by_material / (mu - 1.0)
    passed = material / (material + by_shape) * mu / (mu - 1.0) * np.asarray(permeability_tolerance, float)
    slender = np.asarray(rod_length, float) / np.asarray(rod_diameter, float)
    model = np.where(slender <= 12.0, 0.02, 0.05)
    inside = rod_coil_in_range(coil_diameter, coil_length, rod_diameter, rod_length, permeability)
    return np.hypot(np.where(inside, model, 0.20), passed)[()]


def rod_coil_in_range(
    coil_diameter: ArrayLike,
    coil_length: ArrayLike,
    rod_diameter: ArrayLike,
    rod_length: ArrayLike,
    permeability: ArrayLike,
) -> NDArray[np.bool_]:
    """Return whether the table holds for a coil on a rod.

    Parameters
    ----------
    coil_diameter : float or (n,) array
        Mean diameter of the coil. [m]
    coil_length : float or (n,) array
        Winding length. [m]
    rod_diameter : float or (n,) array
        Diameter of the rod. [m]
    rod_length : float or (n,) array
        Length of the rod. [m]
    permeability : float or (n,) array
        Relative permeability of the material. [-]

    Returns
    -------
    inside : bool or (n,) array
        Rod 3 to 32 diameters long, 5 to 90 % of it covered, coil up to 1.3 times as wide, permeability 50 to
        1000. [-]

    Notes
    -----
    Answers for any sizes above 0.

    References
    ----------
    The table of this module.
    """
    rod, long = np.asarray(rod_diameter, float), np.asarray(rod_length, float)
    ratios = (
        (np.asarray(coil_diameter, float) / rod, 1.0, _CLEARANCE[-1]),
        (long / rod, _SLENDER[0], _SLENDER[-1]),
        (np.asarray(coil_length, float) / long, _COVERED[0], _COVERED[-1]),
        (np.asarray(permeability, float), _LEAST_PERMEABILITY, 1000.0),
    )
    inside = np.asarray(True)
    for value, low, high in ratios:
        inside = inside & (value >= low * (1.0 - 1e-9)) & (value <= high * (1.0 + 1e-9))
    return inside[()]


def _terms(
    coil_diameter: ArrayLike, coil_length: ArrayLike, rod_diameter: ArrayLike, rod_length: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Return a and b of the table at the proportions of each coil."""
    rod, long = np.asarray(rod_diameter, float), np.asarray(rod_length, float)
    places = (
        _place(np.asarray(coil_diameter, float) / rod, _CLEARANCE),
        _place(np.log(long / rod), np.log(_SLENDER)),
        _place(np.asarray(coil_length, float) / long, _COVERED),
    )
    shape = np.broadcast_shapes(*(share.shape for _, share in places))
    terms = [np.zeros(shape), np.zeros(shape)]
    for corner in np.ndindex(2, 2, 2):
        cell = tuple(index + step for (index, _), step in zip(places, corner, strict=True))
        weight = np.ones(shape)
        for (_, share), step in zip(places, corner, strict=True):
            weight = weight * (share if step else 1.0 - share)
        for term, table in zip(terms, (_LOG_A, _LOG_B), strict=True):
            term += weight * table[cell]
    return np.exp(terms[0]), np.exp(terms[1])


def _place(value: FloatArray, nodes: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    """Return the cell of each value and its way through it, 0 to 1; beyond the ends the end itself."""
    inside = np.clip(value, nodes[0], nodes[-1])
    index = np.clip(np.searchsorted(nodes, inside, side="right") - 1, 0, len(nodes) - 2)
    return index, (inside - nodes[index]) / (nodes[index + 1] - nodes[index])
