"""Resonance of a coil and a capacitor, ideal and with the coil's loss.

With loss, three frequencies that coincide in an ideal tank part by about 1/Q^2. All forms are exact for
inductance with a series resistance, in parallel with a capacitance, at any Q.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


class LossyResonances(NamedTuple):
    """The three resonances of a tank whose coil has a series resistance.

    Parameters
    ----------
    unity_power_factor : float or (n,) array
        Where the impedance is real; nan where it never is. [Hz]
    greatest_impedance : float or (n,) array
        Where the impedance is greatest; 0 where it falls from zero frequency on. [Hz]
    ringing : float or (n,) array
        At which the tank rings freely; nan where it does not. [Hz]
    """

    unity_power_factor: FloatArray
    greatest_impedance: FloatArray
    ringing: FloatArray


def resonance_frequency(inductance: ArrayLike, capacitance: ArrayLike) -> FloatArray:
    """Return the frequency at which an inductance and a capacitance resonate.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit; broadcasts with `inductance`. [F]

    Returns
    -------
    frequency : float or (n,) array
        1/(2 pi sqrt(L C)); infinity where either is 0, nan where the product is negative. [Hz]

    Notes
    -----
    Exact without loss; with it right to 1/Q^2 (`lossy_resonances` tells the three apart).

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        root = np.sqrt(np.asarray(inductance, float) * np.asarray(capacitance, float))
        result: FloatArray = 1.0 / (2.0 * np.pi * root)
        return result


def capacitance_for(frequency: ArrayLike, inductance: ArrayLike) -> FloatArray:
    """Return the capacitance that resonates with an inductance.

    Parameters
    ----------
    frequency : float or (n,) array
        Resonance wanted. [Hz]
    inductance : float or (n,) array
        Inductance; broadcasts with `frequency`. [H]

    Returns
    -------
    capacitance : float or (n,) array
        All capacitance in circuit, strays included. [F]

    Notes
    -----
    Exact without loss; with it right to 1/Q^2. Any frequency and inductance above 0.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    result: FloatArray = 1.0 / (omega**2 * np.asarray(inductance, float))
    return result


def inductance_for(frequency: ArrayLike, capacitance: ArrayLike) -> FloatArray:
    """Return the inductance that resonates with a capacitance.

    Parameters
    ----------
    frequency : float or (n,) array
        Resonance wanted. [Hz]
    capacitance : float or (n,) array
        All capacitance in circuit; broadcasts with `frequency`. [F]

    Returns
    -------
    inductance : float or (n,) array
        Inductance. [H]

    Notes
    -----
    Exact without loss; with it right to 1/Q^2. Any frequency and capacitance above 0.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    return capacitance_for(frequency, capacitance)  # L and C change places in the formula


def reactance(inductance: ArrayLike, capacitance: ArrayLike) -> FloatArray:
    """Return the reactance of coil and capacitor at their resonance.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit; broadcasts with `inductance`. [F]

    Returns
    -------
    reactance : float or (n,) array
        sqrt(L/C). [ohm]

    Notes
    -----
    Exact without loss; any values above 0.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (resonant circuits).
    """
    result: FloatArray = np.sqrt(np.asarray(inductance, float) / np.asarray(capacitance, float))
    return result


def hertz_per_farad(inductance: ArrayLike, capacitance: ArrayLike) -> FloatArray:
    """Return how far the resonance moves for a small change of capacitance.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit; broadcasts with `inductance`. [F]

    Returns
    -------
    slope : float or (n,) array
        df/dC = -f/(2 C), negative. [Hz/F]

    Notes
    -----
    A derivative: within 1 % for a change of C up to 1.3 %.

    References
    ----------
    Derivative of `resonance_frequency`.
    """
    return (-resonance_frequency(inductance, capacitance) / (2.0 * np.asarray(capacitance, float)))[()]


def effective_capacitance(
    capacitance: ArrayLike, series_inductance: ArrayLike, frequency: ArrayLike
) -> FloatArray:
    """Return the capacitance that a capacitor shows with the inductance of its leads.

    Parameters
    ----------
    capacitance : float or (n,) array
        Capacitance at low frequency. [F]
    series_inductance : float or (n,) array
        Inductance of leads and body. [H]
    frequency : float or (n,) array
        Frequency. [Hz]

    Returns
    -------
    capacitance : float or (n,) array
        C/(1 - w^2 Ls C); nan from its own series resonance on, where it is a capacitor no more. [F]

    Notes
    -----
    Exact for one capacitor with one inductance, from 0 Hz up to their series resonance.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2 (inductance of capacitor leads).
    """
    value = np.asarray(capacitance, float)
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    left = 1.0 - omega**2 * np.asarray(series_inductance, float) * value
    return np.where(left > 0.0, value / np.where(left > 0.0, left, 1.0), np.nan)[()]


def tank_impedance(
    frequency: ArrayLike, inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike
) -> NDArray[np.complex128]:
    """Return the impedance of a tank: lossy coil in parallel with a capacitor.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency. [Hz]
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance. [ohm]

    Returns
    -------
    impedance : complex or (n,) array
        (r + jwL)/(1 - w^2 LC + jwCr). [ohm]

    Notes
    -----
    Exact for one coil with its loss in series, at any frequency from 0 Hz on.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (parallel resonance).
    """
    s = 2j * np.pi * np.asarray(frequency, float)
    coil = np.asarray(series_resistance, float) + s * np.asarray(inductance, float)
    result: NDArray[np.complex128] = coil / (1.0 + s * np.asarray(capacitance, float) * coil)
    return result


def lossy_resonances(
    inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike
) -> LossyResonances:
    """Return the three resonances of a tank whose coil has a series resistance.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance, from 0. [ohm]

    Returns
    -------
    resonances : LossyResonances
        Unity power factor, greatest impedance, free ringing, each a float or (n,) array. [Hz]

    Notes
    -----
    With q = 1/Q^2 = r^2 C/L the ideal frequency is multiplied by sqrt(1 - q), sqrt(sqrt(1 + 2q) - q) and
    sqrt(1 - q/4). Checked against circuit simulation, tests/published/resonance_tanks.csv.
    Exact for one coil with its loss in series, at any Q; nan where one of them is not there.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3; exact roots of |Z| and of the
    characteristic equation.
    """
    ideal = resonance_frequency(inductance, capacitance)
    q = _loss_square(inductance, capacitance, series_resistance)
    with np.errstate(invalid="ignore"):
        return LossyResonances(
            unity_power_factor=(ideal * np.sqrt(1.0 - q))[()],
            greatest_impedance=(ideal * np.sqrt(np.maximum(np.sqrt(1.0 + 2.0 * q) - q, 0.0)))[()],
            ringing=(ideal * np.sqrt(np.where(q < 4.0, 1.0 - q / 4.0, np.nan)))[()],
        )


def greatest_impedance(
    inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike
) -> FloatArray:
    """Return the greatest size of a tank's impedance.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance, from 0. [ohm]

    Returns
    -------
    impedance : float or (n,) array
        |Z| at its maximum, near L/(C r); infinity without loss, r where |Z| has no maximum above 0 Hz. [ohm]

    Notes
    -----
    Exact for one coil with its loss in series; any values above 0.

    References
    ----------
    Exact maximum of |Z|; tests/published/resonance_tanks.csv.
    """
    q = _loss_square(inductance, capacitance, series_resistance)
    return (reactance(inductance, capacitance) * np.sqrt(_peak_square(q)))[()]


def half_power_frequencies(
    inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Return the frequencies at which a tank's impedance is 1/sqrt(2) of its greatest.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance, from 0. [ohm]

    Returns
    -------
    low, high : tuple of two floats or (n,) arrays
        Edges; the lower is nan where |Z| does not fall so far down to 0 Hz. [Hz]

    Notes
    -----
    With u = (f/f0)^2 and K half the greatest |Z|^2 over L/C, the edges are the roots of
    K u^2 + (K q - 2 K - 1) u + K - q = 0: exact, where f0/Q is an approximation.

    References
    ----------
    Exact roots of |Z|; tests/published/resonance_tanks.csv.
    """
    ideal = resonance_frequency(inductance, capacitance)
    q = _loss_square(inductance, capacitance, series_resistance)
    with np.errstate(divide="ignore", invalid="ignore"):
        level = 2.0 / _peak_square(q)  # 1/K, so that a tank without loss needs no special case
        above = (level - q) / 2.0  # by how much the middle of the two roots exceeds 1
        half = np.sqrt(above * (2.0 + above) + q * level)
        low, high = 1.0 + above - half, 1.0 + above + half
        return (ideal * np.sqrt(np.where(low >= 0.0, low, np.nan)))[()], (ideal * np.sqrt(high))[()]


def bandwidth(inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike) -> FloatArray:
    """Return the distance between a tank's half-power frequencies.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance, from 0. [ohm]

    Returns
    -------
    bandwidth : float or (n,) array
        Exact 3 dB width of |Z|, near f0/Q; nan where there is no lower edge. [Hz]

    Notes
    -----
    Exact for one coil with its loss in series; any Q above about 1.

    References
    ----------
    Exact roots of |Z|; tests/published/resonance_tanks.csv.
    """
    low, high = half_power_frequencies(inductance, capacitance, series_resistance)
    return high - low


def ringing_time_constant(inductance: ArrayLike, series_resistance: ArrayLike) -> FloatArray:
    """Return the time in which a ringing tank's voltage falls to 1/e.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    series_resistance : float or (n,) array
        Resistance in series with the inductance. [ohm]

    Returns
    -------
    time : float or (n,) array
        2 L/r; infinity without loss. [s]

    Notes
    -----
    Exact for one coil with its loss in series; above a Q of one half.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    with np.errstate(divide="ignore"):
        result: FloatArray = 2.0 * np.asarray(inductance, float) / np.asarray(series_resistance, float)
        return result


def ringing_cycles(inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike) -> FloatArray:
    """Return the number of cycles that a tank rings while its voltage falls to 1/e.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Capacitance in circuit. [F]
    series_resistance : float or (n,) array
        Resistance in series with the inductance. [ohm]

    Returns
    -------
    cycles : float or (n,) array
        Near Q/pi; nan for a tank that does not ring. [-]

    Notes
    -----
    Exact for one coil with its loss in series; above a Q of one half.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    free = lossy_resonances(inductance, capacitance, series_resistance).ringing
    return (free * ringing_time_constant(inductance, series_resistance))[()]


def _loss_square(inductance: ArrayLike, capacitance: ArrayLike, series_resistance: ArrayLike) -> FloatArray:
    """Return q = r^2 C/L = 1/Q^2."""
    resistance = np.asarray(series_resistance, float)
    result: FloatArray = resistance**2 * np.asarray(capacitance, float) / np.asarray(inductance, float)
    return result


def _peak_square(q: FloatArray) -> FloatArray:
    """Return the greatest |Z|^2 over L/C, in a form that keeps its digits at high Q."""
    root = np.sqrt(1.0 + 2.0 * q)
    with np.errstate(divide="ignore", invalid="ignore"):
        peak = (root + 1.0) / (q * (3.0 - root))
    return np.where(root > q, peak, q)  # else the impedance falls from 0 Hz on, where it is r
