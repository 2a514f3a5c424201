"""Lengths and counts of windings: mean diameter, wire length, turns that fit."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_ROUNDING: Final = 1e-9  # a winding that fits exactly fits


def mean_diameter(former_diameter: ArrayLike, overall_diameter: ArrayLike) -> FloatArray:
    """Return the diameter of a coil from centre of wire to centre of wire.

    Parameters
    ----------
    former_diameter : float or (n,) array
        Outside diameter of the former. [m]
    overall_diameter : float or (n,) array
        Wire diameter over its covering; broadcasts. [m]

    Returns
    -------
    diameter : float or (n,) array
        Mean diameter. [m]

    Notes
    -----
    Exact for wire that lies on the former; any sizes above 0.

    References
    ----------
    Geometry.
    """
    result: FloatArray = (np.asarray(former_diameter, float) + np.asarray(overall_diameter, float))[()]
    return result


def solenoid_wire_length(turns: ArrayLike, diameter: ArrayLike, pitch: ArrayLike) -> FloatArray:
    """Return the length of wire in a single-layer coil.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns. [-]
    diameter : float or (n,) array
        Mean diameter. [m]
    pitch : float or (n,) array
        Distance of neighbouring turns. [m]

    Returns
    -------
    length : float or (n,) array
        Length of the helix, without tails. [m]

    Notes
    -----
    Exact for a helix of constant pitch; from part of a turn on.

    References
    ----------
    Geometry of the helix.
    """
    around = np.pi * np.asarray(diameter, float)
    result: FloatArray = (np.asarray(turns, float) * np.hypot(around, np.asarray(pitch, float)))[()]
    return result


def solenoid_turns_that_fit(winding_length: ArrayLike, pitch: ArrayLike) -> IntArray:
    """Return how many turns a winding length holds.

    Parameters
    ----------
    winding_length : float or (n,) array
        Room along the former. [m]
    pitch : float or (n,) array
        Distance of neighbouring turns. [m]

    Returns
    -------
    turns : int or (n,) array
        Most turns: turns times pitch must fit. [-]

    Notes
    -----
    Any sizes above 0; a winding that fits exactly fits, within one part in 10^9.

    References
    ----------
    Geometry.
    """
    room = np.asarray(winding_length, float) / np.asarray(pitch, float)
    result: IntArray = np.floor(room * (1.0 + _ROUNDING)).astype(np.int64)[()]
    return result


def ring_wire_length(
    turns: ArrayLike,
    outer_diameter: ArrayLike,
    inner_diameter: ArrayLike,
    height: ArrayLike,
    wire_diameter: ArrayLike,
) -> FloatArray:
    """Return the length of wire on a ring core of rectangular section, in one layer.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns. [-]
    outer_diameter : float or (n,) array
        Outer diameter of the ring. [m]
    inner_diameter : float or (n,) array
        Bore of the ring. [m]
    height : float or (n,) array
        Height of the ring. [m]
    wire_diameter : float or (n,) array
        Overall wire diameter. [m]

    Returns
    -------
    length : float or (n,) array
        Length along the wire's centre, pulled tight round the corners, without tails. [m]

    Notes
    -----
    A turn is (OD - ID) + 2 h + pi d. Stiff wire stands off at the corners and takes a little more.
    Any sizes above 0; real turns, less tight, take a few per cent more.

    References
    ----------
    Geometry: a curve at half a wire's distance round the section.
    """
    section = np.asarray(outer_diameter, float) - np.asarray(inner_diameter, float)
    around = section + 2.0 * np.asarray(height, float) + np.pi * np.asarray(wire_diameter, float)
    result: FloatArray = (np.asarray(turns, float) * around)[()]
    return result


def window_turns_that_fit(width: ArrayLike, depth: ArrayLike, wire_diameter: ArrayLike) -> IntArray:
    """Return how many turns a rectangular window holds, wound layer on layer.

    Parameters
    ----------
    width : float or (n,) array
        Width of the window along the axis. [m]
    depth : float or (n,) array
        Depth of the window, from the innermost to the outermost layer. [m]
    wire_diameter : float or (n,) array
        Overall wire diameter. [m]

    Returns
    -------
    turns : int or (n,) array
        Whole turns a layer times whole layers. [-]

    Notes
    -----
    Square lay: layers that sink into one another would take up to 15 % more, and no one winds so by hand.

    References
    ----------
    Geometry.
    """
    wire = np.asarray(wire_diameter, float)
    side = np.floor(np.asarray(width, float) / wire * (1.0 + _ROUNDING))
    layers = np.floor(np.asarray(depth, float) / wire * (1.0 + _ROUNDING))
    result: IntArray = (side * layers).astype(np.int64)[()]
    return result


def layered_wire_length(turns: ArrayLike, inner_diameter: ArrayLike, depth: ArrayLike) -> FloatArray:
    """Return the length of wire in a coil of many layers.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, spread evenly over the layers. [-]
    inner_diameter : float or (n,) array
        Inner diameter of the winding. [m]
    depth : float or (n,) array
        Radial depth of the winding. [m]

    Returns
    -------
    length : float or (n,) array
        Turns times the mean circumference, without tails. [m]

    Notes
    -----
    Turns as circles: their pitch, below a hundredth of the circumference, adds less than 0.01 %.

    References
    ----------
    Geometry.
    """
    mean = np.asarray(inner_diameter, float) + np.asarray(depth, float)
    result: FloatArray = (np.asarray(turns, float) * np.pi * mean)[()]
    return result
