"""Self-capacitance of windings and the self-resonance that it makes."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.resonance import resonance_frequency

FloatArray = NDArray[np.float64]

VACUUM_PERMITTIVITY: Final = 8.8541878128e-12  # F/m, CODATA 2018

# Single-layer solenoid, one end earthed: H = C/D in pF/cm against length / mean diameter.
# R. G. Medhurst, H.F. resistance and self-capacitance of single-layer solenoids, Wireless Engineer 24 (1947)
# 35-43, 80-92; from memory, stated there as within 5 %.
_LENGTH_RATIO: Final = np.array([
    0.1, 0.15, 0.25, 0.3, 0.35, 0.45, 0.5, 0.6, 0.8, 0.9, 1.0, 2.0, 2.5, 3.0, 4.0, 4.5, 5.0, 7.0, 8.0, 9.0,
    15.0, 20.0, 25.0, 40.0, 50.0,
])  # fmt: skip
_PICOFARAD_PER_CM: Final = np.array([
    0.96, 0.79, 0.64, 0.60, 0.57, 0.52, 0.50, 0.48, 0.46, 0.46, 0.46, 0.50, 0.56, 0.61, 0.72, 0.77, 0.81,
    1.01, 1.12, 1.22, 1.86, 2.36, 2.9, 4.6, 5.8,
])  # fmt: skip
TABLE_PERMITTIVITY: Final = 2.56  # of the formers it was measured on
_TABLE_SPREAD: Final = 0.08  # 5 % stated by the source, and the figures are from memory
_OUTSIDE_SPREAD: Final = 0.30  # very short or very long coils, a floating coil (common practice, no source)

RING_CAPACITANCE_PER_DIAMETER: Final = 80e-12  # F/m: 0.08 pF per mm (common practice, no source)
RING_SPREAD: Final = 0.50
LAYERED_SPREAD: Final = 0.50


def solenoid_self_capacitance(mean_diameter: ArrayLike, l_over_d: ArrayLike) -> FloatArray:
    """Return the self-capacitance of a single-layer solenoid with one end earthed.

    Parameters
    ----------
    mean_diameter : float or (n,) array
        Mean diameter, centre of wire to centre of wire. [m]
    l_over_d : float or (n,) array
        Winding length over mean diameter, above 0; broadcasts with `mean_diameter`. [-]

    Returns
    -------
    capacitance : float or (n,) array
        Self-capacitance; nan for l/D not above 0. [F]

    Notes
    -----
    C = H D. The table is taken by way of its smooth closed form 0.1126 l/D + 0.08 + 0.27 sqrt(D/l): what is
    interpolated, linearly in log(l/D), is the few per cent between the two; outside l/D from 0.1 to 50 the
    closed form goes on alone, scaled to join. Well below self-resonance; see `solenoid_spread`.

    References
    ----------
    R. G. Medhurst, H.F. resistance and self-capacitance of single-layer solenoids, Wireless Engineer 24
    (1947) 35-43, 80-92; from memory.
    """
    ratio = np.asarray(l_over_d, float)
    good = ratio > 0.0
    safe = np.where(good, ratio, 1.0)
    known = _PICOFARAD_PER_CM / _closed_form(_LENGTH_RATIO)
    departure = np.interp(np.log(safe), np.log(_LENGTH_RATIO), known)
    per_metre = 1e-10 * departure * _closed_form(safe)  # pF/cm
    return np.where(good, per_metre * np.asarray(mean_diameter, float), np.nan)[()]


def solenoid_spread(l_over_d: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return by which fraction a solenoid's self-capacitance may fall below and rise above the nominal.

    Parameters
    ----------
    l_over_d : float or (n,) array
        Winding length over mean diameter, above 0. [-]

    Returns
    -------
    below, above : tuple of two floats or (n,) arrays
        Relative errors, both positive. [-]

    Notes
    -----
    The table was measured on solid formers of polystyrene (permittivity 2.56); a hollow former or none
    lies between that and air, whose value follows from
    1 + k (1 + e_i)/2, k = 0.717439 D/l + 0.933048 (D/l)^1.5 + 0.106 (D/l)^2: a third less at l/D = 1.
    Above: 8 % inside the table, 30 % outside it.

    References
    ----------
    D. W. Knight, The self-resonance and self-capacitance of solenoid coils, 2010-2016; from memory.
    R. G. Medhurst, Wireless Engineer 24 (1947); from memory.
    """
    ratio = np.asarray(l_over_d, float)
    inside = (ratio >= _LENGTH_RATIO[0]) & (ratio <= _LENGTH_RATIO[-1])
    above = np.where(inside, _TABLE_SPREAD, _OUTSIDE_SPREAD)
    with np.errstate(divide="ignore", invalid="ignore"):
        k = _radial_part(ratio)
        air = (1.0 + k) / (1.0 + k * (1.0 + TABLE_PERMITTIVITY) / 2.0)
    return np.maximum(above, 1.0 - air)[()], above[()]


def dielectric_share(l_over_d: ArrayLike, permittivity: ArrayLike = 2.56) -> FloatArray:
    """Return the share of a solenoid's electric energy that is inside a solid former.

    Parameters
    ----------
    l_over_d : float or (n,) array
        Winding length over mean diameter, above 0. [-]
    permittivity : float or (n,) array
        Relative permittivity of the former, at least 1; 2.56 is the polystyrene of the table of
        self-capacitance. [-]

    Returns
    -------
    share : float or (n,) array
        From 0 to 1; nan for l/D not above 0. [-]

    Notes
    -----
    d ln C/d ln e of C ~ 1 + k (1 + e)/2 (`solenoid_spread` has k), which is what the energy inside takes of
    the whole. Above 0.9 for a flat coil, 0.55 at l/D = 1, 0.3 at 3. A hollow former holds less: the figure is
    on the careful side. For l/D from 0.1 to 50, as the table.

    References
    ----------
    D. W. Knight, The self-resonance and self-capacitance of solenoid coils, 2010-2016, for C; from memory.
    The share as a derivative of the capacitance: own derivation.
    """
    ratio = np.asarray(l_over_d, float)
    good = ratio > 0.0
    k, e = _radial_part(np.where(good, ratio, 1.0)), np.asarray(permittivity, float)
    return np.where(good, k * e / (2.0 + k * (1.0 + e)), np.nan)[()]


def ring_self_capacitance(outer_diameter: ArrayLike) -> FloatArray:
    """Return a rough self-capacitance of a single layer spread over a ring core.

    Parameters
    ----------
    outer_diameter : float or (n,) array
        Outer diameter of the ring. [m]

    Returns
    -------
    capacitance : float or (n,) array
        Self-capacitance. [F]

    Notes
    -----
    0.08 pF per millimetre of outer diameter, within 50 % (`RING_SPREAD`); a gap of 30 degrees between the
    ends is taken for granted.

    References
    ----------
    Common practice, no source.
    """
    return (RING_CAPACITANCE_PER_DIAMETER * np.asarray(outer_diameter, float))[()]


def layered_self_capacitance(
    mean_diameter: ArrayLike,
    winding_length: ArrayLike,
    layers: ArrayLike,
    layer_distance: ArrayLike,
    permittivity: ArrayLike = 3.0,
) -> FloatArray:
    """Return a rough self-capacitance of a winding of several layers, such as in a pot core.

    Parameters
    ----------
    mean_diameter : float or (n,) array
        Mean diameter of the winding. [m]
    winding_length : float or (n,) array
        Axial length of a layer. [m]
    layers : float or (n,) array
        Number of layers; 2 or more. [-]
    layer_distance : float or (n,) array
        Insulation between the copper of neighbouring layers. [m]
    permittivity : float or (n,) array
        Relative permittivity of that insulation; 3 for enamel and paper. [-]

    Returns
    -------
    capacitance : float or (n,) array
        Self-capacitance; nan for fewer than two layers. [F]

    Notes
    -----
    C = 4 (n - 1)/(3 n^2) C1, with C1 that of two neighbouring layers as plates, wound back and forth.
    Within 50 % (`LAYERED_SPREAD`); dividing the winding into sections lowers it much.

    References
    ----------
    E. C. Snelling, Soft Ferrites, 2nd ed., Butterworths 1988, chapter 11 (self-capacitance of windings);
    from memory.
    """
    number = np.asarray(layers, float)
    plates = (
        VACUUM_PERMITTIVITY
        * np.asarray(permittivity, float)
        * np.pi
        * np.asarray(mean_diameter, float)
        * np.asarray(winding_length, float)
        / np.asarray(layer_distance, float)
    )
    return np.where(number >= 2.0, 4.0 * (number - 1.0) / (3.0 * number**2) * plates, np.nan)[()]


def layer_distance(bare_diameter: ArrayLike, overall_diameter: ArrayLike) -> FloatArray:
    """Return the distance of two plates that stand for two layers of round wire on one another.

    Parameters
    ----------
    bare_diameter : float or (n,) array
        Bare wire diameter, or that of a bundle. [m]
    overall_diameter : float or (n,) array
        Over the covering, above `bare_diameter`: the distance of turns and layers. [m]

    Returns
    -------
    distance : float or (n,) array
        Between plates with the same capacitance. [m]

    Notes
    -----
    s/c with c = 2 s/sqrt(s^2 - d^2) arctan sqrt((s + d)/(s - d)) - pi/2: field lines straight across from
    wire to wire, each facing one of the other layer at the distance s of centres. It leaves out the little
    that goes round; the covering's uncertainty is larger (`LAYERED_SPREAD`).

    References
    ----------
    Own integral of the gap between two cylinders.
    """
    s, d = np.asarray(overall_diameter, float), np.asarray(bare_diameter, float)
    facing = 2.0 * s / np.sqrt(s**2 - d**2) * np.arctan(np.sqrt((s + d) / (s - d))) - np.pi / 2.0
    return (s / facing)[()]


def self_resonance_frequency(inductance: ArrayLike, self_capacitance: ArrayLike) -> FloatArray:
    """Return the frequency at which a coil resonates with its own capacitance.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    self_capacitance : float or (n,) array
        Self-capacitance; broadcasts with `inductance`. [F]

    Returns
    -------
    frequency : float or (n,) array
        Self-resonance; infinity for a coil without capacitance. [Hz]

    Notes
    -----
    Within 10 % for a solenoid with one end earthed (tests/published/self_resonance.csv).

    References
    ----------
    R. G. Medhurst, Wireless Engineer 24 (1947) 35-43, 80-92, for the capacitance so defined.
    """
    return resonance_frequency(inductance, self_capacitance)


def _radial_part(l_over_d: FloatArray) -> FloatArray:
    """Return the part k of the capacitance that a former fills half of; see `solenoid_spread`."""
    slender = 1.0 / l_over_d
    k: FloatArray = 0.717439 * slender + 0.933048 * slender * np.sqrt(slender) + 0.106 * slender**2
    return k


def _closed_form(l_over_d: FloatArray) -> FloatArray:
    """Return the closed form that the table's author gives for H, in pF/cm."""
    return 0.1126 * l_over_d + 0.08 + 0.27 / np.sqrt(l_over_d)
