"""How a tank meets its load: capacitive divider, tap on the coil, link winding.

Loads are brought across the tank exactly, at one frequency; `loading.py` has the high-Q forms and
`coupled_tanks.py` two tanks on one another.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


class CapacitiveLoad(NamedTuple):
    """A load seen across the tank through capacitors.

    Parameters
    ----------
    resistance : float or (n,) array
        Equivalent resistance across the tank. [ohm]
    capacitance : float or (n,) array
        Equivalent capacitance across the tank. [F]
    """

    resistance: FloatArray
    capacitance: FloatArray


class InductiveLoad(NamedTuple):
    """A load seen across the tank through its coil.

    Parameters
    ----------
    resistance : float or (n,) array
        Equivalent resistance across the tank. [ohm]
    inductance : float or (n,) array
        Of the coil with the load on, across the tank. [H]
    """

    resistance: FloatArray
    inductance: FloatArray


class Divider(NamedTuple):
    """Two capacitors across a tank, the load across the lower one.

    Parameters
    ----------
    upper : float or (n,) array
        From the hot end to the load; nan where no divider does it. [F]
    lower : float or (n,) array
        From the load to the cold end; nan likewise. [F]
    """

    upper: FloatArray
    lower: FloatArray


def divider_load(frequency: ArrayLike, upper: ArrayLike, lower: ArrayLike, resistance: ArrayLike) -> CapacitiveLoad:
    """Return what a resistance on a capacitive divider does to the tank.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency. [Hz]
    upper : float or (n,) array
        From the hot end to the load. [F]
    lower : float or (n,) array
        Across the load, its own capacitance included. [F]
    resistance : float or (n,) array
        The load. [ohm]

    Returns
    -------
    load : CapacitiveLoad
        Resistance [ohm] and capacitance [F] across the tank, each a float or (n,) array.

    Notes
    -----
    Tends to R ((C1 + C2)/C1)^2 and C1 C2/(C1 + C2) where the load is light (w C2 R large).
    Exact at one frequency, any values above 0.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (series-parallel equivalents).
    """
    s = 2j * np.pi * np.asarray(frequency, float)
    at_load = 1.0 / np.asarray(resistance, float) + s * np.asarray(lower, float)
    through = s * np.asarray(upper, float)
    seen = through * at_load / (through + at_load)
    return CapacitiveLoad((1.0 / seen.real)[()], (seen.imag / s.imag)[()])


def divider_for(frequency: ArrayLike, resistance: ArrayLike, across: ArrayLike, capacitance: ArrayLike) -> Divider:
    """Return the divider that brings a resistance across the tank as a wanted one.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency. [Hz]
    resistance : float or (n,) array
        The load. [ohm]
    across : float or (n,) array
        Equivalent resistance wanted across the tank. [ohm]
    capacitance : float or (n,) array
        Equivalent capacitance wanted across the tank. [F]

    Returns
    -------
    divider : Divider
        Both capacitors, each a float or (n,) array; nan where the wanted resistance or capacitance is out
        of reach. [F]

    Notes
    -----
    Exact at one frequency. In reach where R/(1 + (w C R)^2) of the wanted R is not above the load.

    References
    ----------
    `divider_load` solved for the capacitors.
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    load, wanted = np.asarray(resistance, float), np.asarray(across, float)
    q = omega * np.asarray(capacitance, float) * wanted
    in_series = wanted / (1.0 + q * q)
    with np.errstate(invalid="ignore"):
        q_load = np.sqrt(load / in_series - 1.0)
    left = np.where(q - q_load > 0.0, q - q_load, np.nan)
    return Divider((1.0 / (omega * in_series * left))[()], (q_load / (omega * load) + 0.0 * left)[()])


def link_load(
    frequency: ArrayLike,
    inductance: ArrayLike,
    link_inductance: ArrayLike,
    mutual: ArrayLike,
    resistance: ArrayLike,
) -> InductiveLoad:
    """Return what a resistance on a link winding does to the tank.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency. [Hz]
    inductance : float or (n,) array
        Of the tank's coil. [H]
    link_inductance : float or (n,) array
        Of the link. [H]
    mutual : float or (n,) array
        Between coil and link, either sign. [H]
    resistance : float or (n,) array
        The load. [ohm]

    Returns
    -------
    load : InductiveLoad
        Resistance [ohm] across the tank, and its inductance [H] with the load, each a float or (n,) array.

    Notes
    -----
    Z = j w L + w^2 M^2/(R + j w L2), turned into its parallel form. Tends to R (L/M)^2 for a light load.
    Exact for coils without loss of their own.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (coupled impedance).
    """
    s = 2j * np.pi * np.asarray(frequency, float)
    coil, link = s * np.asarray(inductance, float), s * np.asarray(link_inductance, float)
    impedance = coil - (s * np.asarray(mutual, float)) ** 2 / (np.asarray(resistance, float) + link)
    seen = 1.0 / impedance
    with np.errstate(divide="ignore"):
        return InductiveLoad((1.0 / seen.real)[()], (-1.0 / (seen.imag * s.imag))[()])


def tap_load(
    frequency: ArrayLike, total: ArrayLike, section: ArrayLike, mutual: ArrayLike, resistance: ArrayLike
) -> InductiveLoad:
    """Return what a resistance across part of the coil does to the tank across the whole of it.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency. [Hz]
    total : float or (n,) array
        Inductance of the whole coil. [H]
    section : float or (n,) array
        Of the section that the load lies across. [H]
    mutual : float or (n,) array
        Between that section and the rest. [H]
    resistance : float or (n,) array
        The load. [ohm]

    Returns
    -------
    load : InductiveLoad
        Resistance [ohm] across the whole coil, and its inductance [H] with the load, each a float or (n,)
        array.

    Notes
    -----
    A link of the section's inductance, coupled by section + mutual.
    Exact for coils without loss of their own.

    References
    ----------
    As `link_load`.
    """
    shared = np.asarray(section, float) + np.asarray(mutual, float)
    return link_load(frequency, total, section, shared, resistance)
