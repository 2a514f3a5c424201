"""A magnetic rod in or through a single-layer coil.

The rod is cut into slices, each magnetised evenly along the axis. A slice is then itself a current sheet,
so that every coefficient is a mutual inductance of coaxial sheets.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.filaments import mutual_inductance
from partpick.physics.sheet import nagaoka_coefficient, sheet_inductance
from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]

_SLICES_PER_DIAMETER: Final = 8.0
_FEWEST_SLICES: Final = 24
_MOST_SLICES: Final = 240
_CELLS_PER_GAP: Final = 2.0  # cells of the flux table in the gap between rod and coil
_MOST_CELLS: Final = 8000


def demagnetising_factor(length_over_diameter: ArrayLike) -> FloatArray:
    """Return the demagnetising factor of a spheroid along its axis of rotation.

    Parameters
    ----------
    length_over_diameter : float or (n,) array
        Length over diameter, above 0. [-]

    Returns
    -------
    factor : float or (n,) array
        1 for a flat disc, 1/3 for a sphere, 0 for a needle; nan for 0 or less. [-]

    Notes
    -----
    Exact for a spheroid. As a stand-in for a rod of permeability 5 to 50 it is 10 to 40 % off.

    References
    ----------
    J. A. Osborn, Demagnetizing factors of the general ellipsoid, Phys. Rev. 67 (1945) 351;
    tests/published/demagnetising.csv.
    """
    m = np.asarray(length_over_diameter, float)
    square = np.where(m > 0.0, m * m, np.nan)
    excess = square - 1.0
    # Near the sphere both forms cancel: the power series in (m^2 - 1) is right to 1e-12 there.
    near = np.abs(excess) < 0.01
    root = np.sqrt(np.where(near, 1.0, np.abs(excess)))
    angle = np.where(excess > 0.0, np.arcsinh(root), np.arcsin(np.minimum(root, 1.0)))
    away = (m * angle / root - 1.0) / np.where(near, 1.0, excess)
    powers = [(-1.0) ** k / (2 * k + 3) for k in range(6)]
    del powers
    return np.where(near, _near_sphere(excess), away)[()]


def _near_sphere(excess: FloatArray) -> FloatArray:
    """Return the factor from int_0^1 t^2/(1 + e t^2) dt (1 + e): 1/3 + 2 e/15 ... for m^2 = 1 + e."""
    terms = [(-1.0) ** k / (2 * k + 3) for k in range(7)]
    return np.asarray(np.polyval(terms[::-1], excess))


class RodCoil:
    pass


def rod_inductance_ratio(
    coil_diameter: float,
    coil_length: ArrayLike,
    rod_diameter: float,
    rod_length: float,
    permeability: float,
    offset: ArrayLike = 0.0,
) -> FloatArray:
    length, shift = np.broadcast_arrays(np.asarray(coil_length, float), np.asarray(offset, float))
    slices = int(np.clip(np.ceil(_SLICES_PER_DIAMETER * rod_length / rod_diameter), _FEWEST_SLICES, _MOST_SLICES))
    thickness = rod_length / slices
    area = np.pi * rod_diameter**2 / 4.0
    edges = (np.arange(slices + 1) / slices - 0.5) * rod_length
    farthest = rod_length / 2.0 + float(np.max(length / 2.0 + np.abs(shift)))
    twice = _FluxTable(coil_diameter / 2.0, rod_diameter / 2.0, farthest)
    low, high = (shift - length / 2.0).ravel(), (shift + length / 2.0).ravel()
    at_edges = twice(high[:, None] - edges) - twice(low[:, None] - edges)
    linked = -np.diff(at_edges, axis=1) / length.reshape(-1, 1)
    answer = np.linalg.solve(_reluctance(slices, thickness, rod_diameter, permeability), linked.T).T
    added = np.sum(linked * answer, axis=1) / (MU_0 * area * thickness)
    return (1.0 + added.reshape(length.shape) / sheet_inductance(1.0, coil_diameter, length))[()]


def _reluctance(slices: int, thickness: float, diameter: float, permeability: float) -> FloatArray:
    """Return 1/chi + N, N_ij the demagnetising field in slice i of slice j for unit magnetisation."""
    reach = np.arange(slices + 1) * thickness
    moment = reach * nagaoka_coefficient(reach / diameter)
    shared = np.diff(moment, n=2, prepend=moment[1]) / (2.0 * thickness)
    apart = np.abs(np.subtract.outer(np.arange(slices), np.arange(slices)))
    return np.eye(slices) * (1.0 + 1.0 / (permeability - 1.0)) - shared[apart]


class _FluxTable:
    """The twice integrated mutual inductance of a ring of the coil and a ring of the rod, by distance."""

    def __init__(self, radius: float, rod_radius: float, farthest: float) -> None:
        gap = max(radius - rod_radius, radius / 500)
        cells = int(np.clip(np.ceil(_CELLS_PER_GAP * farthest / gap), 64, _MOST_CELLS))
        self.step = farthest / cells
        nodes, weights = np.polynomial.legendre.leggauss(4)
        inside = (nodes + 1.0) / 2.0
        weights = weights / 2.0
        distance = (np.arange(cells)[:, None] + inside) * self.step
        mutual = mutual_inductance(radius, rod_radius, distance)
        once = np.concatenate([[0.0], np.cumsum(mutual @ weights)]) * self.step
        inner = mutual @ (weights * (1.0 - inside)) * self.step**2
        self.once = once
        self.twice = np.concatenate([[0.0], np.cumsum(once[:-1] * self.step + inner)])

    def __call__(self, distance: FloatArray) -> FloatArray:
        """Return the table at these distances, by cubic interpolation on values and slopes."""
        place = np.abs(distance) / self.step
        cell = np.minimum(place.astype(np.intp), len(self.twice) - 2)
        t = place - cell
        left, right = self.twice[cell], self.twice[cell + 1]
        rise = self.once[cell] * self.step
        fall = self.once[cell + 1] * self.step
        return left + t * (rise + t * (3.0 * (right - left) - 2.0 * rise - fall + t * (2.0 * (left - right) + rise + fall)))
