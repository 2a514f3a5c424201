"""What one rod adds to many coils of different diameters, from a few tables."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.sliding_core import core_modes, tabulated_inductance_rise

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

INTERPOLATION_SPREAD: Final = 5e-4  # of the greatest rise: by diameter and by position together
_STEP: Final = 1.3  # ratio of neighbouring gaps between rod and coil
_STENCIL: Final = 4


def inductance_rises(
    core_diameter: float,
    core_length: float,
    permeability: float,
    turns: ArrayLike,
    coil_diameter: ArrayLike,
    coil_length: ArrayLike,
    offset: ArrayLike,
) -> FloatArray:
    """Return by how much one rod raises the inductance of many single-layer coils.

    Parameters
    ----------
    core_diameter : float
        Diameter of the rod, below that of every coil. [m]
    core_length : float
        Length of the rod. [m]
    permeability : float
        Relative permeability of the material, at least 1. [-]
    turns : (n,) array
        Turns of each coil. [-]
    coil_diameter : (n,) array
        Mean diameter of each coil. [m]
    coil_length : (n,) array
        Winding length, turns times pitch. [m]
    offset : (n,) array
        Distance of the rod's middle from each coil's, either sign. [m]

    Returns
    -------
    rise : (n,) array
        To be added to the inductance of each empty coil; never negative. [H]

    Raises
    ------
    ValueError
        As `core_modes`.

    Notes
    -----
    Tables stand at gaps (coil less rod) 1.3 times apart; between them a cubic of the logarithms of rise and
    gap. That adds less than 0.01 % of the greatest rise, the tables themselves less than 0.05 %
    (`INTERPOLATION_SPREAD`). About 25 ms a table, then 10 microseconds a coil.

    References
    ----------
    As `sliding_core.core_inductance_rise`.
    """
    diameter = np.asarray(coil_diameter, float)
    every = (np.asarray(each, float) for each in (turns, coil_length, offset))
    count, length, shift = (np.broadcast_to(each, diameter.shape) for each in every)
    if not diameter.size or permeability == 1.0:
        return np.zeros(diameter.shape)
    gap = np.log(diameter - core_diameter)
    nodes = _nodes(gap)
    first = np.clip(np.searchsorted(nodes, gap) - _STENCIL // 2, 0, len(nodes) - _STENCIL)
    total = np.zeros(diameter.shape)
    for node, place in enumerate(nodes):
        rows = np.flatnonzero((first <= node) & (node < first + _STENCIL))
        if not len(rows):
            continue
        modes = core_modes(core_diameter, core_length, permeability, core_diameter + float(np.exp(place)))
        rise = tabulated_inductance_rise(modes, 1.0, length[rows], shift[rows])
        weight = _weight(nodes, first[rows], node, gap[rows])
        total[rows] += weight * np.log(np.maximum(rise, np.finfo(float).tiny))
    result: FloatArray = count**2 * np.exp(total)
    return result


def _nodes(gap: FloatArray) -> FloatArray:
    """Return where tables stand, logarithms of the gap: multiples of one step, so that calls share them."""
    step = np.log(_STEP)
    low, high = int(np.floor(gap.min() / step)), int(np.ceil(gap.max() / step))
    return np.arange(low - 1, max(high + 2, low + _STENCIL)) * step


def _weight(nodes: FloatArray, first: IntArray, node: int, gap: FloatArray) -> FloatArray:
    """Return the weight of one node in each coil's cubic (Lagrange)."""
    weight = np.ones(len(gap))
    for other in range(_STENCIL):
        place = first + other
        factor = (gap - nodes[place]) / np.where(place == node, 1.0, nodes[node] - nodes[place])
        weight *= np.where(place == node, 1.0, factor)
    return weight
