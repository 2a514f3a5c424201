"""Variable capacitors: the laws their plates are cut to, ganged sections, the range left by padders, the gap.

Rotation counts from 0 degrees, plates out and least capacitance, to 180 degrees.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

HALF_TURN: Final = 180.0  # degrees of rotation from least to greatest capacitance

# What grows in proportion to the rotation, as a function of the capacitance in circuit, and its inverse.
_LAWS: Final[dict[str, tuple[Callable[[FloatArray], FloatArray], Callable[[FloatArray], FloatArray]]]] = {
    "straight-line capacitance": (lambda c: c, lambda x: x),
    "straight-line wavelength": (np.sqrt, np.square),
    "straight-line frequency": (lambda c: -1.0 / np.sqrt(c), lambda x: 1.0 / np.square(x)),
}
LAWS: Final = tuple(_LAWS)


class CapacitanceRange(NamedTuple):
    """Least and greatest capacitance of a circuit that a variable capacitor tunes.

    Parameters
    ----------
    least : float or (n,) array
        In circuit with the plates out. [F]
    greatest : float or (n,) array
        In circuit with the plates in. [F]
    """

    least: FloatArray
    greatest: FloatArray

    @property
    def frequency_ratio(self) -> FloatArray:
        """Highest over lowest resonance with a fixed coil: a plain ratio."""
        result: FloatArray = np.sqrt(np.asarray(self.greatest, float) / np.asarray(self.least, float))
        return result


def capacitance_at(
    rotation: ArrayLike, low: ArrayLike, high: ArrayLike, law: str = LAWS[0], fixed: ArrayLike = 0.0
) -> FloatArray:
    """Return the capacitance of one section against rotation.

    Parameters
    ----------
    rotation : float or (n,) array
        Rotation from 0 (plates out) to 180 (plates in). [degree]
    low : float or (n,) array
        Least capacitance; broadcasts with `rotation`. [F]
    high : float or (n,) array
        Greatest capacitance; broadcasts. [F]
    law : str
        One of `LAWS`: what is straight against rotation. [-]
    fixed : float or (n,) array
        Capacitance across the section for which the plates are cut; without effect on straight-line
        capacitance. [F]

    Returns
    -------
    capacitance : float or (n,) array
        Of the section alone; nan outside 0 to 180 degrees. [F]

    Raises
    ------
    KeyError
        If there is no such law.

    Notes
    -----
    With C the capacitance in circuit and x the rotation over 180 degrees: C, sqrt(C) or 1/sqrt(C) goes in
    equal steps of x between its values at the ends. Real plates keep to it within a few per cent of the
    range (common practice, no source), worst at the ends.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2 (variable condensers, shape of
    plates; from memory).
    """
    straight, back = _LAWS[law]
    across = np.asarray(fixed, float)
    first = straight(np.asarray(low, float) + across)
    last = straight(np.asarray(high, float) + across)
    turned = _within(np.asarray(rotation, float) / HALF_TURN)
    return (back(first + (last - first) * turned) - across)[()]


def rotation_for(
    capacitance: ArrayLike, low: ArrayLike, high: ArrayLike, law: str = LAWS[0], fixed: ArrayLike = 0.0
) -> FloatArray:
    """Return the rotation at which one section has a capacitance; the inverse of `capacitance_at`.

    Parameters
    ----------
    capacitance : float or (n,) array
        Wanted of the section alone. [F]
    low : float or (n,) array
        Least capacitance; broadcasts with `capacitance`. [F]
    high : float or (n,) array
        Greatest capacitance, above `low`; broadcasts. [F]
    law : str
        One of `LAWS`. [-]
    fixed : float or (n,) array
        Capacitance across the section for which the plates are cut. [F]

    Returns
    -------
    rotation : float or (n,) array
        0 to 180; nan for a capacitance that the section does not reach. [degree]

    Raises
    ------
    KeyError
        If there is no such law.

    Notes
    -----
    Within the range of `capacitance_at`, whose inverse it is, exactly.

    References
    ----------
    As `capacitance_at`.
    """
    straight, _ = _LAWS[law]
    across = np.asarray(fixed, float)
    first, last, wanted = (straight(np.asarray(c, float) + across) for c in (low, high, capacitance))
    return _within((wanted - first) / (last - first))[()] * HALF_TURN


def sections_in_parallel(section: ArrayLike, count: ArrayLike) -> FloatArray:
    """Return the capacitance of equal ganged sections in parallel.

    Parameters
    ----------
    section : float or (n,) array
        Capacitance of one section. [F]
    count : int or (n,) array
        Sections in parallel. [-]

    Returns
    -------
    capacitance : float or (n,) array
        Of all of them; ratio and law are those of one. [F]

    Notes
    -----
    Exact; from one section on.

    References
    ----------
    Capacitances in parallel add.
    """
    result: FloatArray = np.asarray(section, float) * np.asarray(count, float)
    return result


def with_padders(variable: ArrayLike, series: ArrayLike = np.inf, parallel: ArrayLike = 0.0) -> FloatArray:
    """Return the capacitance in circuit of a variable capacitor with its padders.

    Parameters
    ----------
    variable : float or (n,) array
        Capacitance of the variable capacitor. [F]
    series : float or (n,) array
        Padder in series with it alone; infinity: none. [F]
    parallel : float or (n,) array
        All that lies across the coil: padder, trimmer, strays, self-capacitance. [F]

    Returns
    -------
    capacitance : float or (n,) array
        C S/(C + S) + P. [F]

    Notes
    -----
    Exact; any values above 0, without series padder infinity.

    References
    ----------
    F. Langford-Smith (ed.), Radiotron Designer's Handbook, 4th ed. 1953, chapter 25 (from memory);
    tests/published/variable_capacitor_range.csv.
    """
    value, padder = np.asarray(variable, float), np.asarray(series, float)
    return (value / (1.0 + value / padder) + np.asarray(parallel, float))[()]


def capacitance_range(
    low: ArrayLike, high: ArrayLike, series: ArrayLike = np.inf, parallel: ArrayLike = 0.0
) -> CapacitanceRange:
    """Return the least and the greatest capacitance in circuit.

    Parameters
    ----------
    low : float or (n,) array
        Least capacitance of the variable capacitor. [F]
    high : float or (n,) array
        Greatest capacitance of it; broadcasts with `low`. [F]
    series : float or (n,) array
        Padder in series with it alone; infinity: none. [F]
    parallel : float or (n,) array
        All that lies across the coil. [F]

    Returns
    -------
    range : CapacitanceRange
        With the plates out and in, each a float or (n,) array. [F]

    Notes
    -----
    Exact; any values above 0, without series padder infinity.

    References
    ----------
    As `with_padders`.
    """
    return CapacitanceRange(with_padders(low, series, parallel), with_padders(high, series, parallel))


def parallel_for_ratio(
    low: ArrayLike, high: ArrayLike, frequency_ratio: ArrayLike, series: ArrayLike = np.inf
) -> FloatArray:
    """Return the capacitance across the coil that leaves a wanted tuning ratio.

    Parameters
    ----------
    low : float or (n,) array
        Least capacitance of the variable capacitor. [F]
    high : float or (n,) array
        Greatest capacitance of it. [F]
    frequency_ratio : float or (n,) array
        Highest over lowest resonance, above 1. [-]
    series : float or (n,) array
        Padder in series with the variable capacitor alone; infinity: none. [F]

    Returns
    -------
    parallel : float or (n,) array
        (C_high - r^2 C_low)/(r^2 - 1); negative: the element cannot do it. [F]

    Notes
    -----
    Exact without loss; frequency ratio above 1.

    References
    ----------
    As `with_padders`.
    """
    square = np.asarray(frequency_ratio, float) ** 2
    ends = capacitance_range(low, high, series)
    result: FloatArray = (ends.greatest - square * ends.least) / (square - 1.0)
    return result


def gap_breakdown_voltage(spacing: ArrayLike, air_density: ArrayLike = 1.0) -> FloatArray:
    """Return the peak voltage at which air between flat plates breaks down.

    Parameters
    ----------
    spacing : float or (n,) array
        Clear distance between plates, 0.1 mm to 0.1 m. [m]
    air_density : float or (n,) array
        Over that at 20 degrees Celsius and 1 bar; 0.8 at 2000 m. [-]

    Returns
    -------
    voltage : float or (n,) array
        Peak; nan outside the range of spacings. [V]

    Notes
    -----
    24.36 p d + 6.72 sqrt(p d) kV, p d in bar cm, in an even field. Plate edges, dust and damp bring it down:
    a working voltage of half of it or less is common practice (no source).

    References
    ----------
    E. Kuffel, W. S. Zaengl, J. Kuffel, High Voltage Engineering: Fundamentals, 2nd ed. 2000, section 5
    (breakdown in uniform fields; from memory).
    """
    gap = np.asarray(spacing, float)
    product = np.where((gap >= 1e-4) & (gap <= 0.1), gap, np.nan) * 100.0 * np.asarray(air_density, float)
    return (1000.0 * (24.36 * product + 6.72 * np.sqrt(product)))[()]


def _within(share: FloatArray) -> FloatArray:
    """Return the share of the travel, nan beyond either end by more than rounding."""
    inside = (share >= -1e-9) & (share <= 1.0 + 1e-9)
    return np.where(inside, np.clip(share, 0.0, 1.0), np.nan)
