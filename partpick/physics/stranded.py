"""Loss of stranded wire, and of windings whose layers lie on one another, by cause.

Solid wire is a bundle of one strand: the same formulas hold for it in a winding of many layers.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.loss import CopperLoss
from partpick.physics.proximity import thin_wire_proximity
from partpick.physics.skin import skin_ratio, transverse_loss_ratio

FloatArray = NDArray[np.float64]

STRANDED_HIGHEST: Final = 3e6  # Hz: above, the capacitance between strands undoes the lay (Terman 1943, memory)
# Lay, broken strands and fabric leave the formula by about this (common practice, no source).
STRANDED_RESISTANCE_SPREAD: Final = 0.25
# The field in layers is an average that ignores the gap and the ends: it enters squared (see `section_field`).
LAYERED_RESISTANCE_SPREAD: Final = 0.40


def stranded_resistance(
    dc_resistance: ArrayLike,
    a_over_delta: ArrayLike,
    strands: ArrayLike,
    strand_diameter: ArrayLike,
    bundle_diameter: ArrayLike,
    pitch: ArrayLike,
    l_over_d: ArrayLike,
    few_turns: ArrayLike = 1.0,
) -> CopperLoss:
    """Return the copper resistance of a single-layer coil of insulated, evenly laid strands, by cause.

    Parameters
    ----------
    dc_resistance : float or (n,) array
        Direct-current resistance of the winding, all strands together. [ohm]
    a_over_delta : float or (n,) array
        Strand radius over skin depth. [-]
    strands : int or (n,) array
        Number of strands. [-]
    strand_diameter : float or (n,) array
        Bare diameter of one strand. [m]
    bundle_diameter : float or (n,) array
        Diameter of the bundle, without its outer covering. [m]
    pitch : float or (n,) array
        Distance between turns; infinity for a straight wire. [m]
    l_over_d : float or (n,) array
        Winding length over mean diameter; infinity for a winding without ends. [-]
    few_turns : float or (n,) array
        Share of the many-turn field (`few_turns_factor`). [-]

    Returns
    -------
    loss : CopperLoss
        Skin part of the strands and proximity of strands and turns, each a float or (n,) array. [ohm]

    Notes
    -----
    R_dc [H + g (n d)^2 (k/(2 D^2) + c/s^2)]: d strand, D bundle, s pitch, n strands, H and g of one strand,
    k = 0, 1.55, 1.84, 1.92, 2 for 1, 3, 9, 27 and endlessly many strands, c of `thin_wire_proximity`. For
    strands up to about one skin depth in radius and below some 3 MHz (`STRANDED_HIGHEST`); at higher
    frequencies the capacitance between strands undoes the lay. Within 25 % (`STRANDED_RESISTANCE_SPREAD`).

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2 (stranded wire), after
    S. Butterworth, Experimental Wireless 3 (1926); from memory. Field of the coil: own sum.
    """
    coil = thin_wire_proximity(l_over_d) * np.asarray(few_turns, float) / np.asarray(pitch, float) ** 2
    return _by_cause(dc_resistance, a_over_delta, strands, strand_diameter, bundle_diameter, coil)


def layered_resistance(
    dc_resistance: ArrayLike,
    a_over_delta: ArrayLike,
    strands: ArrayLike,
    strand_diameter: ArrayLike,
    bundle_diameter: ArrayLike,
    field: ArrayLike,
) -> CopperLoss:
    """Return the copper resistance of a winding of many layers of solid or stranded wire, by cause.

    Parameters
    ----------
    dc_resistance : float or (n,) array
        Direct-current resistance of the winding, all strands together. [ohm]
    a_over_delta : float or (n,) array
        Radius of the strand, or of solid wire, over skin depth. [-]
    strands : int or (n,) array
        Number of strands, 1 for solid wire. [-]
    strand_diameter : float or (n,) array
        Bare diameter of one strand, or of solid wire. [m]
    bundle_diameter : float or (n,) array
        Diameter of the bundle, without its outer covering. [m]
    field : float or (n,) array
        Root mean square over the winding of the field that one ampere makes (`window_field`,
        `section_field`). [1/m]

    Returns
    -------
    loss : CopperLoss
        Skin part and proximity of strands, turns and layers, each a float or (n,) array. [ohm]

    Notes
    -----
    R_dc [H + g (n d)^2 (k/(2 D^2) + 2 pi^2 H_rms^2)]: as `stranded_resistance`, with the field of the layers
    in place of a single layer's. For wire thinner than its layers' distance and up to some two skin depths
    in radius. Within 40 % (`LAYERED_RESISTANCE_SPREAD`): the proximity part goes with the field squared.

    References
    ----------
    Loss of a round wire in an even field: S. Butterworth, Experimental Wireless 3 (1926), from memory; field
    in a layered winding: P. L. Dowell, Effects of eddy currents in transformer windings, Proc. IEE 113 (1966)
    1387-1394 (from memory).
    """
    coil = 2.0 * np.pi**2 * np.asarray(field, float) ** 2
    return _by_cause(dc_resistance, a_over_delta, strands, strand_diameter, bundle_diameter, coil)


def window_field(turns: ArrayLike, width: ArrayLike, layers: ArrayLike) -> FloatArray:
    """Return the mean field in a winding that fills the window of a closed core, for one ampere.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns. [-]
    width : float or (n,) array
        Width of the window along the layers. [m]
    layers : float or (n,) array
        Number of layers, at least 1. [-]

    Returns
    -------
    field : float or (n,) array
        Root mean square over the turns. [1/m]

    Notes
    -----
    (N/w) sqrt(1/3 - 1/(12 m^2)): the field rises from layer to layer from nothing to N/w, each layer meeting
    the mean of its two sides. One layer: half of N/w, as in an endless solenoid. The field of the gap is
    left out: keep turns away from it.
    Exact for full layers between plane walls of high permeability.

    References
    ----------
    P. L. Dowell, Proc. IEE 113 (1966) 1387-1394 (from memory).
    """
    number = np.asarray(layers, float)
    share = np.sqrt(1.0 / 3.0 - 1.0 / (12.0 * number**2))
    return (np.asarray(turns, float) / np.asarray(width, float) * share)[()]


def section_field(turns: ArrayLike, diameter: ArrayLike, length: ArrayLike, depth: ArrayLike) -> FloatArray:
    """Return the mean field inside the section of a coil of many layers in air, for one ampere.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, spread evenly over the section. [-]
    diameter : float or (n,) array
        Mean diameter of the winding. [m]
    length : float or (n,) array
        Length of the winding along the axis. [m]
    depth : float or (n,) array
        Radial depth of the winding. [m]

    Returns
    -------
    field : float or (n,) array
        Root mean square over the section. [1/m]

    Notes
    -----
    N/(1.96 l + 2.1 c + 0.117 D), fitted to sums over rings: within 15 % for l/D from 0.15 to 1 and c/D from
    0.05 to 0.4.

    References
    ----------
    Own sums with `coaxial_field.ring_field`; the test repeats one.
    """
    spread_out = (
        1.96 * np.asarray(length, float) + 2.1 * np.asarray(depth, float) + 0.117 * np.asarray(diameter, float)
    )
    return (np.asarray(turns, float) / spread_out)[()]


def _by_cause(
    dc_resistance: ArrayLike,
    a_over_delta: ArrayLike,
    strands: ArrayLike,
    strand_diameter: ArrayLike,
    bundle_diameter: ArrayLike,
    coil: ArrayLike,
) -> CopperLoss:
    """Return the loss by cause; `coil` is the proximity of the turns over (n d)^2 g R_dc, in 1/m^2."""
    dc = np.asarray(dc_resistance, float)
    number = np.asarray(strands, float)
    copper = number * np.asarray(strand_diameter, float)
    crowding = np.interp(1.0 / number, [0.0, 1 / 27, 1 / 9, 1 / 3, 1.0], [2.0, 1.92, 1.84, 1.55, 0.0])
    own = crowding / 2.0 / np.asarray(bundle_diameter, float) ** 2
    return CopperLoss(
        skin=(dc * skin_ratio(a_over_delta))[()],
        proximity=(dc * transverse_loss_ratio(a_over_delta) * copper**2 * (own + coil))[()],
    )
