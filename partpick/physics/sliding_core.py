"""A rod of magnetic material that slides in a single-layer coil: inductance against position.

The rod's magnetisation acts as a current sheet on its own surface. Boundary elements find that current once
for a rod; any coil and any position are then products with the rod's few modes (`core_modes`).
The coil is taken as a current sheet: what the rod adds hardly depends on the single turns.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline
from scipy.special import ellipkm1

from partpick.physics.coaxial_field import ring_field, ring_potential, sheet_end
from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]

_GRADING: Final = 1.5  # panels shrink towards the edge of the rod, where its field is strongest
_DISC_PANELS: Final = 16
_SIDE_PANELS: Final = (16.0, 5.0)  # half a side has a + b length/diameter of them
_MOST_PANELS: Final = 400  # reached at 77 diameters; longer rods are less exact
_POINTS: Final = 4  # Gauss points on a panel that receives
_MOST_POINTS: Final = 24
_SOURCE_POINTS: Final = 8  # on a panel of an end face that sends
_KNOT_DENSITY: Final = 6.0  # knots while a coil's end moves by a gap, or by the coil's radius
_REACH: Final = 40.0  # the table ends that many rod lengths and coil radii away
_WEAKEST_MODE: Final = 1e-7  # share of the greatest self-term at which the modes end


@dataclass(frozen=True, kw_only=True, eq=False)
class RodCore:
    """A rod with its boundary elements solved.

    Parameters
    ----------
    radius : float
        Of the rod. [m]
    length : float
        Of the rod. [m]
    side : (s,) array
        Edges of the panels along the side, 0 in the middle of the rod. [m]
    disc : (d,) array
        Edges of the panels on an end face, from the axis outwards. [m]
    direct : float
        Surface current for unit tangential field on the spot. [-]
    answer : (p, p) array
        What the other currents add, on each panel for unit field on each: side, upper and lower face. [-]
    """

    radius: float
    length: float
    side: FloatArray
    disc: FloatArray
    direct: float
    answer: FloatArray


class _Linked(NamedTuple):
    """What one end of a coil does to a rod, for each of n ends."""

    field: FloatArray  # mean tangential field on each panel, (n, panels)
    flux: FloatArray  # of the coil's potential through each panel's width, (n, panels)
    field_at: FloatArray  # the same at the Gauss points, (n, points)
    flux_at: FloatArray


@dataclass(frozen=True, kw_only=True, eq=False)
class CoreModes:
    """How one rod answers coils of one diameter: a few modes against the place of a coil's end.

    Parameters
    ----------
    reach : float
        Greatest distance in the table, from the middle of the rod to an end of the coil. [m]
    spline : CubicSpline
        Amplitudes of the modes against that distance; their squares are inductances times m^2. [H^0.5 m]
    """

    reach: float
    spline: CubicSpline


def core_offset(inserted: ArrayLike, coil_length: ArrayLike, core_length: ArrayLike) -> FloatArray:
    """Return the distance of the rod's middle from the coil's, from how far the rod is pushed in.

    Parameters
    ----------
    inserted : float or (n,) array
        Length of the rod beyond the plane of the coil's end, from 0: rod just outside. [m]
    coil_length : float or (n,) array
        Winding length; broadcasts. [m]
    core_length : float or (n,) array
        Length of the rod; broadcasts. [m]

    Returns
    -------
    offset : float or (n,) array
        Negative on the side from which the rod comes, 0 where it is centred. [m]

    Notes
    -----
    Exact geometry; from a rod just outside (0) to one at the far side.

    References
    ----------
    Geometry.
    """
    ends = np.asarray(coil_length, float) + np.asarray(core_length, float)
    result: FloatArray = np.asarray(inserted, float) - ends / 2.0
    return result


def core_inductance_rise(
    turns: float,
    coil_diameter: float,
    coil_length: float,
    core_diameter: float,
    core_length: float,
    permeability: float,
    offset: ArrayLike,
) -> FloatArray:
    """Return by how much a rod raises the inductance of a single-layer coil, without a table.

    Parameters
    ----------
    turns : float
        Turns of the coil. [-]
    coil_diameter : float
        Mean diameter of the coil. [m]
    coil_length : float
        Winding length, turns times pitch. [m]
    core_diameter : float
        Diameter of the rod, below that of the coil. [m]
    core_length : float
        Length of the rod. [m]
    permeability : float
        Relative permeability of the material, at least 1. [-]
    offset : float or (n,) array
        Distance of the rod's middle from the coil's, either sign. [m]

    Returns
    -------
    rise : float or (n,) array
        To be added to the inductance of the empty coil. [H]

    Raises
    ------
    ValueError
        If the rod is not thinner than the coil, a size is not positive, or the permeability is below 1.

    Notes
    -----
    Solid rod, uniform and lossless. Checked by refinement for rods of 0.5 to 20 diameters that clear the coil
    by 5 % or more, coils of 0.1 to 2 rod lengths and a permeability up to 1000: within 0.3 % of the greatest
    rise. It grows up to the centre, but for a ripple of 0.01 % where a short coil travels along a long rod.
    0.5 to 2 ms a position; for many coils take `core_modes`.

    References
    ----------
    Boundary elements on the equivalent surface current: M. V. K. Chari and S. J. Salon, Numerical Methods in
    Electromagnetism, Academic Press 2000 (method; from memory). tests/published/sliding_core.csv.
    """
    rod = _checked_rod(core_diameter, core_length, permeability, coil_diameter)
    shift = np.asarray(offset, float)
    low, high = (shift.ravel() + half for half in (coil_length / 2.0, -coil_length / 2.0))
    pairs = zip(*(_linked(rod, coil_diameter, end) for end in (low, high)), strict=True)
    coil = _Linked(*(from_low - from_high for from_low, from_high in pairs))
    rise = np.sum((coil.flux @ rod.answer) * coil.field, axis=1)
    rise += rod.direct * np.sum(coil.flux_at * coil.field_at, axis=1)
    return (MU_0 * (turns / coil_length) ** 2 * rise.reshape(shift.shape))[()]


@lru_cache(maxsize=128)
def core_modes(core_diameter: float, core_length: float, permeability: float, coil_diameter: float) -> CoreModes:
    """Return the table from which `tabulated_inductance_rise` reads, for one rod and coils of one diameter.

    Parameters
    ----------
    core_diameter : float
        Diameter of the rod, below that of the coil. [m]
    core_length : float
        Length of the rod. [m]
    permeability : float
        Relative permeability of the material, at least 1. [-]
    coil_diameter : float
        Mean diameter of the coils. [m]

    Returns
    -------
    modes : CoreModes
        Table; computed once for a set of arguments. [H^0.5 m]

    Raises
    ------
    ValueError
        As `core_inductance_rise`.

    Notes
    -----
    The rise is a quadratic form in what the two ends of the coil contribute, a form of low rank: the columns
    of its Cholesky factor, largest pivot first, are the modes. 15 to 300 ms a table, longest for a long rod
    in a close coil.

    References
    ----------
    As `core_inductance_rise`; H. Harbrecht, M. Peters, R. Schneider, On the low-rank approximation by the
    pivoted Cholesky decomposition, Appl. Numer. Math. 62 (2012) 428-440 (from memory).
    """
    rod = _checked_rod(core_diameter, core_length, permeability, coil_diameter)
    knots = _knots(rod, coil_diameter / 2.0)
    ends = _mirrored(rod, _linked(rod, coil_diameter, knots[len(knots) // 2 :]))
    form = ends.flux @ rod.answer @ ends.field.T + rod.direct * (ends.flux_at @ ends.field_at.T)
    amplitudes = np.sqrt(MU_0) * _modes((form + form.T) / 2.0)
    return CoreModes(reach=float(knots[-1]), spline=CubicSpline(knots, amplitudes))


def tabulated_inductance_rise(
    modes: CoreModes, turns: ArrayLike, coil_length: ArrayLike, offset: ArrayLike
) -> FloatArray:
    """Return by how much a rod raises the inductance of single-layer coils of one diameter.

    Parameters
    ----------
    modes : CoreModes
        Table of the rod and the coils' diameter. [H^0.5 m]
    turns : float or (n,) array
        Turns of the coil. [-]
    coil_length : float or (n,) array
        Winding length, turns times pitch; broadcasts. [m]
    offset : float or (n,) array
        Distance of the rod's middle from the coil's, either sign; broadcasts. [m]

    Returns
    -------
    rise : float or (n,) array
        To be added to the inductance of the empty coil; never negative. [H]

    Notes
    -----
    Interpolation adds less than 0.01 % of the greatest rise to the error of `core_inductance_rise`, up to
    0.05 % where the rod clears the coil by 5 %. About 2 microseconds a coil and position.

    References
    ----------
    As `core_inductance_rise`.
    """
    length, shift = np.asarray(coil_length, float), np.asarray(offset, float)
    low, high = (modes.spline(np.clip(shift + half, -modes.reach, modes.reach)) for half in (length / 2, -length / 2))
    linked = np.sum((low - high) ** 2, axis=-1)
    result: FloatArray = (np.asarray(turns, float) / length) ** 2 * linked
    return result


def _checked_rod(core_diameter: float, core_length: float, permeability: float, coil: float) -> RodCore:
    """Return the solved rod, or say what is wrong with it."""
    if not 0.0 < core_diameter < coil or not core_length > 0.0:
        raise ValueError(f"a rod of {core_diameter} m by {core_length} m does not fit a coil of {coil} m")
    if not permeability >= 1.0:
        raise ValueError(f"relative permeability {permeability} is below 1")
    return _solved_rod(core_diameter / 2.0, core_length, permeability)


@lru_cache(maxsize=16)
def _solved_rod(radius: float, length: float, permeability: float) -> RodCore:
    """Return the rod with K (1/chi + 1/2) = tangential field solved for the surface current K."""
    first, per_diameter = _SIDE_PANELS
    count = int(min(np.ceil(first + per_diameter * length / (2.0 * radius)), _MOST_PANELS))
    half = length / 2.0 * (1.0 - (np.arange(count + 1) / count) ** _GRADING)[::-1]
    side = np.concatenate([-half[:0:-1], half])
    disc = radius * (1.0 - (np.arange(_DISC_PANELS, -1, -1) / _DISC_PANELS) ** _GRADING)
    own = _own_field(side, disc, radius, length)
    chi = permeability - 1.0
    # (1/chi + 1/2 - T)^-1 written so that chi = 0 gives no current instead of a division by 0
    matrix = np.eye(len(own)) * (1.0 + chi / 2.0) - chi * own
    direct = chi / (1.0 + chi / 2.0)
    answer: FloatArray = chi * np.asarray(np.linalg.inv(matrix), float) - direct * np.eye(len(own))
    return RodCore(radius=radius, length=length, side=side, disc=disc, direct=direct, answer=answer)


def _points(edges: FloatArray, count: int) -> tuple[FloatArray, FloatArray]:
    """Return Gauss points on each panel, (panels, count), and weights that add up to its width."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    half = np.diff(edges)[:, None] / 2.0
    return (edges[1:] + edges[:-1])[:, None] / 2.0 + half * nodes, half * weights


def _own_field(side: FloatArray, disc: FloatArray, radius: float, length: float) -> FloatArray:
    """Return the mean tangential field on each panel for unit current on each, its own jump left out."""
    weights = np.polynomial.legendre.leggauss(_POINTS)[1] / 2.0
    at_side, at_disc = _points(side, _POINTS)[0], _points(disc, _POINTS)[0]
    source, width = _points(disc, _SOURCE_POINTS)
    sides, discs = len(side) - 1, len(disc) - 1
    own = np.zeros((sides + 2 * discs,) * 2)
    own[:sides, :sides] = weights @ -np.diff(_field_on_sheet(at_side[..., None] - side, radius), axis=-1)
    upper, lower = slice(sides, sides + discs), slice(sides + discs, None)
    for face, other, sign in ((upper, lower, 1.0), (lower, upper, -1.0)):
        height = sign * length / 2.0
        # the radial field of a sheet's end is minus a ring's potential; face currents run with M x n
        radial = np.diff(ring_potential(radius, at_disc[..., None], height - side), axis=-1)
        own[face, :sides] = -sign * (weights @ radial)
        axial = ring_field(source, radius, at_side[..., None, None] - height).axial
        own[:sides, face] = weights @ np.sum(axial * width, axis=-1)
        across = ring_field(source, at_disc[..., None, None], sign * length).radial
        own[face, other] = -sign * (weights @ np.sum(across * width, axis=-1))
    return own


def _field_on_sheet(height: FloatArray, radius: float) -> FloatArray:
    """Return the axial field of a sheet's end on the sheet itself, mean of inside and outside."""
    far = 4.0 * radius**2 + height**2
    result: FloatArray = height / (2.0 * np.pi * np.sqrt(far)) * ellipkm1(height**2 / far)
    return result


def _linked(rod: RodCore, coil_diameter: float, end: FloatArray) -> _Linked:
    """Return what the end of a coil does to the rod; `end`: how far the rod's middle lies above that end."""
    gap = coil_diameter / 2.0 - rod.radius
    # a close coil's field changes within a panel: points twice as dense as the gap is wide
    count = int(np.clip(np.ceil(2.0 * np.max(np.diff(rod.side)) / gap), _POINTS, _MOST_POINTS))
    along, along_width = _points(rod.side, count)
    across, across_width = _points(rod.disc, _POINTS)
    on_face = np.full_like(across, rod.length / 2.0)
    places = (
        (along, np.full_like(along, rod.radius), along_width, 0.0),
        (on_face, across, across_width, -1.0),  # face currents run with M x n, opposite on the two faces
        (-on_face, across, across_width, 1.0),
    )
    parts = []
    for height, rho, width, sign in places:
        contribution = sheet_end(coil_diameter / 2.0, rho, end[:, None, None] + height)
        field = sign * contribution.radial if sign else contribution.axial
        flux = 2.0 * np.pi * rho * contribution.potential * width
        mean = np.sum(field * width, axis=-1) / np.sum(width, axis=-1)
        flat = (len(end), -1)
        parts.append((mean, np.sum(flux, axis=-1), field.reshape(flat), flux.reshape(flat)))
    return _Linked(*(np.concatenate(group, axis=1) for group in zip(*parts, strict=True)))


def _modes(form: FloatArray) -> FloatArray:
    """Return columns whose products with themselves add up to a positive form, the largest share first."""
    left = np.diag(form).copy()
    floor = _WEAKEST_MODE * np.max(left)
    columns = np.zeros((len(form), 0))
    while np.max(left) > floor and columns.shape[1] < len(form):
        pivot = int(np.argmax(left))
        column = (form[:, pivot] - columns @ columns[pivot]) / np.sqrt(left[pivot])
        columns = np.column_stack([columns, column])
        left -= column**2
    return columns


def _mirrored(rod: RodCore, upper: _Linked) -> _Linked:
    """Return rows for ends below the rod's middle too: the mirror image, with its sign."""
    faces = len(rod.disc) - 1

    def both(half: FloatArray, on_face: int) -> FloatArray:
        count = half.shape[1]
        side, face = np.arange(count - 2 * on_face), count - 2 * on_face + np.arange(on_face)
        order = np.concatenate([side[::-1], face + on_face, face])
        return np.concatenate([-half[:0:-1, order], half])

    at = faces * _POINTS
    return _Linked(*(both(half, n) for half, n in zip(upper, (faces, faces, at, at), strict=True)))


def _knots(rod: RodCore, coil_radius: float) -> FloatArray:
    """Return places for the table, odd in number and symmetric, dense where an end passes an end."""
    gap = max(coil_radius - rod.radius, 0.1 * coil_radius)
    reach = _REACH * (rod.length + coil_radius)
    fine = np.linspace(0.0, 1.0, 4001)
    trial = reach * np.sinh(12.0 * fine) / np.sinh(12.0)
    half = rod.length / 2.0
    measure = np.arcsinh((trial - half) / gap) + np.arcsinh((trial + half) / gap)
    measure += np.minimum(trial, half) / coil_radius  # a short coil on a long rod needs the middle too
    even = np.linspace(0.0, measure[-1], int(np.ceil(_KNOT_DENSITY * measure[-1])))
    upper = np.interp(even, measure, trial)
    return np.concatenate([-upper[:0:-1], upper])
