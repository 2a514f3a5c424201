"""Closed magnetic cores: ring constants, inductance from AL, turns for a value, and what fits on a ring."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.skin import MU_0

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

WINDING_ARC: Final = 330.0  # degrees of a ring that a layer covers, the rest is left bare; common practice
_ROUNDING: Final = 1e-9  # a winding that fits exactly fits


class CoreConstants(NamedTuple):
    """Effective parameters of a closed core.

    Parameters
    ----------
    c1 : float or (n,) array
        Sum of path length over section. [1/m]
    c2 : float or (n,) array
        Sum of path length over section squared. [1/m3]
    path_length : float or (n,) array
        Effective length of the magnetic path. [m]
    area : float or (n,) array
        Effective section. [m2]
    volume : float or (n,) array
        Effective volume. [m3]
    """

    c1: FloatArray
    c2: FloatArray
    path_length: FloatArray
    area: FloatArray
    volume: FloatArray


def ring_constants(outer_diameter: ArrayLike, inner_diameter: ArrayLike, height: ArrayLike) -> CoreConstants:
    """Return the effective parameters of a ring core of rectangular section.

    Parameters
    ----------
    outer_diameter : float or (n,) array
        Outer diameter. [m]
    inner_diameter : float or (n,) array
        Bore, above 0 and below `outer_diameter`. [m]
    height : float or (n,) array
        Height along the axis. [m]

    Returns
    -------
    constants : CoreConstants
        C1, C2, length, section and volume, each a float or (n,) array. [SI]

    Notes
    -----
    Sharp corners. C1 = 2 pi/(h ln(OD/ID)), C2 = 4 pi (1/ID - 1/OD)/(h^2 ln^3(OD/ID)).

    References
    ----------
    IEC 60205, Calculation of the effective parameters of magnetic piece parts, clause on ring cores (from
    memory, checked against the integrals over the section); tests/published/ring_core.csv.
    """
    outer, inner = np.asarray(outer_diameter, float), np.asarray(inner_diameter, float)
    h = np.asarray(height, float)
    log = np.log(outer / inner)
    c1 = 2.0 * np.pi / (h * log)
    c2 = 4.0 * np.pi * (1.0 / inner - 1.0 / outer) / (h**2 * log**3)
    return CoreConstants(c1, c2, c1**2 / c2, c1 / c2, c1**3 / c2**2)


def ring_al(
    outer_diameter: ArrayLike, inner_diameter: ArrayLike, height: ArrayLike, permeability: ArrayLike
) -> FloatArray:
    """Return the inductance of a ring core for one turn.

    Parameters
    ----------
    outer_diameter : float or (n,) array
        Outer diameter. [m]
    inner_diameter : float or (n,) array
        Bore, above 0 and below `outer_diameter`. [m]
    height : float or (n,) array
        Height along the axis. [m]
    permeability : float or (n,) array
        Relative permeability of the material. [-]

    Returns
    -------
    al : float or (n,) array
        Inductance per turn squared. [H]

    Notes
    -----
    mu0 mu/C1: all flux in the core. Rings of low permeability leak, see `ring_leak`.

    References
    ----------
    IEC 60205 (from memory); tests/published/ring_core.csv.
    """
    c1 = ring_constants(outer_diameter, inner_diameter, height).c1
    return (MU_0 * np.asarray(permeability, float) / c1)[()]


def round_toroid_inductance(
    turns: ArrayLike, mean_radius: ArrayLike, section_radius: ArrayLike, permeability: ArrayLike = 1.0
) -> FloatArray:
    """Return the inductance of a toroid whose turns are circles, wound evenly all round.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns. [-]
    mean_radius : float or (n,) array
        From the axis to the middle of the turns. [m]
    section_radius : float or (n,) array
        Radius of a turn, above 0 and below `mean_radius`. [m]
    permeability : float or (n,) array
        Relative permeability inside, 1 for air. [-]

    Returns
    -------
    inductance : float or (n,) array
        Inductance; nan where a turn would reach past the axis. [H]

    Notes
    -----
    mu0 mu N^2 (R - sqrt(R^2 - a^2)): a current sheet, all flux inside. Exact for many turns; few or bunched
    turns leak, see `ring_leak`. It is what `ring_al` is for a rectangular section.

    References
    ----------
    F. W. Grover, Inductance Calculations, Van Nostrand 1946, toroidal coils of circular section (from memory);
    tests/published/round_toroid.csv.
    """
    middle, radius = np.asarray(mean_radius, float), np.asarray(section_radius, float)
    square = np.where(radius < middle, middle**2 - radius**2, np.nan)
    squared_turns = np.asarray(turns, float) ** 2
    return (MU_0 * np.asarray(permeability, float) * squared_turns * (middle - np.sqrt(square)))[()]


def core_inductance(al: ArrayLike, turns: ArrayLike) -> FloatArray:
    """Return the inductance of turns on a closed core: a ring, a gapped pot or any other with known AL.

    Parameters
    ----------
    al : float or (n,) array
        Inductance per turn squared. [H]
    turns : float or (n,) array
        Number of turns, counted as passes through the hole; broadcasts with `al`. [-]

    Returns
    -------
    inductance : float or (n,) array
        AL N^2. [H]

    Notes
    -----
    AL holds for small signals and inside the useful frequencies of the material; for any turns above 0.

    References
    ----------
    IEC 60205 (definition of the inductance factor); tests/published/al_turns.csv.
    """
    result: FloatArray = (np.asarray(al, float) * np.asarray(turns, float) ** 2)[()]
    return result


def core_turns(al: ArrayLike, inductance: ArrayLike) -> IntArray:
    """Return the whole number of turns that comes nearest to an inductance.

    Parameters
    ----------
    al : float or (n,) array
        Inductance per turn squared. [H]
    inductance : float or (n,) array
        Inductance wanted. [H]

    Returns
    -------
    turns : int or (n,) array
        Turns with the least error of the inductance, at least 1. [-]

    Notes
    -----
    For any inductance above 0; at least one turn, so that less than half of AL cannot be met.

    References
    ----------
    Arithmetic; tests/published/al_turns.csv.
    """
    exact = np.sqrt(np.asarray(inductance, float) / np.asarray(al, float))
    fewer = np.floor(exact)
    # Nearest in inductance, not in turns: halfway lies at the root mean square of the two counts.
    more = exact**2 > (fewer**2 + (fewer + 1.0) ** 2) / 2.0
    result: IntArray = np.maximum(fewer + more, 1.0).astype(np.int64)[()]
    return result


def ring_turns_that_fit(inner_diameter: ArrayLike, wire_diameter: ArrayLike, arc: ArrayLike = WINDING_ARC) -> IntArray:
    """Return how many turns lie side by side on the bore of a ring, in one layer.

    Parameters
    ----------
    inner_diameter : float or (n,) array
        Bore of the ring. [m]
    wire_diameter : float or (n,) array
        Overall wire diameter. [m]
    arc : float or (n,) array
        Part of the ring that may be covered; 360 all round. [deg]

    Returns
    -------
    turns : int or (n,) array
        Most turns; 0 where not even one wire passes through the hole. [-]

    Notes
    -----
    Centres on a circle of diameter ID - d, chords of at least d: N 2 asin(d/(ID - d)) <= arc. A wire thicker
    than half the bore passes once.
    Exact geometry for any sizes above 0.

    References
    ----------
    Plane geometry; the bare 30 degrees are common practice, no source; tests/published/ring_fit.csv.
    """
    bore, wire = np.asarray(inner_diameter, float), np.asarray(wire_diameter, float)
    circle = np.maximum(bore - wire, wire)
    step = np.degrees(2.0 * np.arcsin(wire / circle))
    most = np.floor(np.asarray(arc, float) / step * (1.0 + _ROUNDING)).astype(np.int64)
    return np.where(wire < bore, most, 0)[()]


def ring_leak(
    turns: ArrayLike,
    outer_diameter: ArrayLike,
    inner_diameter: ArrayLike,
    height: ArrayLike,
    permeability: ArrayLike,
    wire_diameter: ArrayLike,
    arc: ArrayLike = WINDING_ARC,
) -> FloatArray:
    """Return how much inductance a ring shows beyond AL N^2, because flux runs outside the core.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1. [-]
    outer_diameter : float or (n,) array
        Outer diameter of the ring. [m]
    inner_diameter : float or (n,) array
        Bore of the ring. [m]
    height : float or (n,) array
        Height of the ring. [m]
    permeability : float or (n,) array
        Relative permeability of the material. [-]
    wire_diameter : float or (n,) array
        Wire diameter, wound tight on the core. [m]
    arc : float or (n,) array
        Part of the ring that the turns are spread over. [deg]

    Returns
    -------
    leak : float or (n,) array
        Further inductance over AL N^2, 0 or more. [-]

    Notes
    -----
    What the same winding has in air beyond mu0 N^2/C1, over the permeability: the space between wire and
    core, the bare arc, the field close round each wire (mu0/2pi [ln(s/pi d) + 1/4] a metre, s its distance to
    the next), and one turn along the ring. Nothing to speak of for ferrite, the better part of L for few turns on
    a plastic ring. At permeability 1, against filaments summed (3 to 60 turns, over 330 or 165 degrees), the
    whole inductance comes within 14 % on rings of 20 mm and more, within 25 % on smaller ones (31 % short
    where the wire is thicker than an eighth of the bore): half the leak is its uncertainty, three quarters
    there. At permeability 6 it gives the
    few to 20 % of common experience; there, take the leak itself as its uncertainty (estimate).

    References
    ----------
    Own derivation; the wire term is the limit of Rosa's A + B for many turns (Rosa and Grover 1912); the few
    to 20 % are from memory.
    """
    outer, inner = np.asarray(outer_diameter, float), np.asarray(inner_diameter, float)
    h, wire, n = np.asarray(height, float), np.asarray(wire_diameter, float), np.asarray(turns, float)
    share = np.asarray(arc, float) / 360.0
    ideal = MU_0 * n**2 * h * np.log(outer / inner) / (2.0 * np.pi)
    rim, bore = (outer + wire) / 2.0, (inner - wire) / 2.0
    sheet = MU_0 * n**2 * (h + wire) * np.log(rim / bore) / (2.0 * np.pi * share)
    sides = [(h + wire, bore), (h + wire, rim), (2.0 * (rim - bore), np.sqrt(rim * bore))]
    around = 2.0 * np.pi * share / n
    wires = n * sum(MU_0 / (2.0 * np.pi) * a * (np.log(around * r / (np.pi * wire)) + 0.25) for a, r in sides)
    hoop_radius = (rim + bore) / 2.0
    # The turn made by going round the ring once, as a round wire with the outline of the winding's section.
    section = (rim - bore + h + wire) / np.pi
    hoop = MU_0 * hoop_radius * np.maximum(np.log(8.0 * hoop_radius / section) - 2.0, 0.0)
    leak = (sheet + wires + hoop - ideal) / (np.asarray(permeability, float) * ideal)
    result: FloatArray = np.maximum(leak, 0.0)[()]
    return result
