"""Temperature: coefficients of coils and capacitor networks, and the drift that they make.

All coefficients are fractions per kelvin; a spread is a size that adds to the nominal by size.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import jve

from partpick.physics.skin import (
    COPPER_TEMPERATURE_COEFFICIENT,
    internal_inductance_ratio,
    skin_ratio,
)

FloatArray = NDArray[np.float64]

COPPER_EXPANSION: Final = 16.6e-6  # 1/K near 20 degC, handbook value; IEC 60028 rounds to 17e-6


def coil_tempco(
    expansion: ArrayLike = COPPER_EXPANSION,
    copper_q: ArrayLike = np.inf,
    a_over_delta: ArrayLike = np.inf,
) -> FloatArray:
    """Return the temperature coefficient of a coil's inductance from its construction.

    Parameters
    ----------
    expansion : float or (n,) array
        Part from geometry or core: the linear expansion of a self-supporting copper coil, else that of a
        coil wound on the former or core. [1/K]
    copper_q : float or (n,) array
        Q by copper loss alone. [-]
    a_over_delta : float or (n,) array
        Wire radius over skin depth. [-]

    Returns
    -------
    tempco : float or (n,) array
        (1/L) dL/dT. [1/K]

    Notes
    -----
    Heat drives the current deeper into the copper: at high frequency internal reactance equals resistance,
    so that part of L is 1/Q and follows the root of resistivity, 0.00393/(2 Q). Its fading at low a/delta
    is that of `internal_share`, exact for a lone wire: 0.93 at 8, 0.85 at 4, 0.32 at 2, 0.01 at 1. A former
    whose stated coefficient was measured with the coil on it holds this part already.

    References
    ----------
    H. A. Wheeler, Formulas for the skin effect, Proc. IRE 30 (1942) 412-424 (incremental-inductance rule);
    copper by IEC 60028, from memory; tests/published/temperature_coil.csv.
    """
    with np.errstate(divide="ignore"):
        copper = COPPER_TEMPERATURE_COEFFICIENT / (2.0 * np.asarray(copper_q, float))
    return (np.asarray(expansion, float) + copper * internal_share(a_over_delta))[()]


def internal_share(a_over_delta: ArrayLike) -> FloatArray:
    """Return how much of the high-frequency temperature effect of copper on inductance is there.

    Parameters
    ----------
    a_over_delta : float or (n,) array
        Wire radius over skin depth, from 0. [-]

    Returns
    -------
    share : float or (n,) array
        1 at high frequency, 0 at low. [-]

    Notes
    -----
    (X_i/R)(-d ln L_i/d ln x) with x = a/delta, for a straight round wire.
    For any a/delta from 0 on.

    References
    ----------
    Derivative of the exact skin effect, F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2.
    """
    x = np.asarray(a_over_delta, float)
    # Below 0.05 the share is under 1e-9; above 300 the asymptotic form is better than 1e-5.
    inner = np.clip(np.nan_to_num(x, nan=1.0), 0.05, 300.0)
    z = (1.0 - 1.0j) * inner
    quotient = jve(0, z) / jve(1, z)
    # d/dx of (z/2) J0/J1, by J0' = -J1 and J1' = J0 - J1/z.
    slope = np.imag((1.0 - 1.0j) * (quotient - (z / 2.0) * (1.0 + quotient**2)))
    reactance = internal_inductance_ratio(inner) * inner**2 / 4.0
    share = (2.0 * reactance - inner * slope) / skin_ratio(inner)
    return np.where(x >= 0.0, np.where(x > 300.0, 1.0 - 0.5 / np.maximum(x, 1.0), share), np.nan)[()]


def parallel_tempco(capacitances: ArrayLike, tempcos: ArrayLike) -> FloatArray:
    """Return the temperature coefficient of capacitors in parallel.

    Parameters
    ----------
    capacitances : (..., k) array
        Capacitances, strays among them; the last axis is summed over. [F]
    tempcos : (..., k) array
        Coefficient of each, or its spread by size for the spread of the sum. [1/K]

    Returns
    -------
    tempco : float or (...) array
        sum(C_i a_i)/sum(C_i). [1/K]

    Notes
    -----
    Exact to first order; any capacitances above 0.

    References
    ----------
    Derivative of the sum; tests/published/temperature_drift.csv.
    """
    value = np.asarray(capacitances, float)
    result: FloatArray = (value * np.asarray(tempcos, float)).sum(axis=-1) / value.sum(axis=-1)
    return result


def series_tempco(capacitances: ArrayLike, tempcos: ArrayLike) -> FloatArray:
    """Return the temperature coefficient of capacitors in series.

    Parameters
    ----------
    capacitances : (..., k) array
        Capacitances; the last axis is summed over. [F]
    tempcos : (..., k) array
        Coefficient of each, or its spread by size for the spread of the whole. [1/K]

    Returns
    -------
    tempco : float or (...) array
        C sum(a_i/C_i) with C that of the network. [1/K]

    Notes
    -----
    Exact to first order; any capacitances above 0.

    References
    ----------
    Derivative of the series formula; tests/published/temperature_drift.csv.
    """
    elastance = 1.0 / np.asarray(capacitances, float)
    result: FloatArray = (elastance * np.asarray(tempcos, float)).sum(axis=-1) / elastance.sum(axis=-1)
    return result


def frequency_drift(inductance_tempco: ArrayLike, capacitance_tempco: ArrayLike) -> FloatArray:
    """Return the temperature coefficient of a resonance.

    Parameters
    ----------
    inductance_tempco : float or (n,) array
        Coefficient of the inductance. [1/K]
    capacitance_tempco : float or (n,) array
        Coefficient of all capacitance in circuit. [1/K]

    Returns
    -------
    drift : float or (n,) array
        (1/f) df/dT = -(a_L + a_C)/2. [1/K]

    Notes
    -----
    To first order: exact for small changes, within 0.1 % of itself up to 1000 ppm.

    References
    ----------
    Logarithmic derivative of 1/(2 pi sqrt(L C)); tests/published/temperature_drift.csv.
    """
    result: FloatArray = -(np.asarray(inductance_tempco, float) + np.asarray(capacitance_tempco, float)) / 2.0
    return result


def drift_spread(inductance_spread: ArrayLike, capacitance_spread: ArrayLike) -> FloatArray:
    """Return the spread of a resonance's temperature coefficient, all parts at their ends the same way.

    Parameters
    ----------
    inductance_spread : float or (n,) array
        Spread of the inductance's coefficient, either sign. [1/K]
    capacitance_spread : float or (n,) array
        Spread of the coefficient of all capacitance in circuit, either sign. [1/K]

    Returns
    -------
    spread : float or (n,) array
        Half the sum of the sizes. [1/K]

    Notes
    -----
    The worst case, to first order; independent parts stay within it.

    References
    ----------
    Logarithmic derivative of 1/(2 pi sqrt(L C)), worst case.
    """
    sizes = np.abs(np.asarray(inductance_spread, float)) + np.abs(np.asarray(capacitance_spread, float))
    result: FloatArray = sizes / 2.0
    return result


def compensating_share(
    inductance_tempco: ArrayLike, main_tempco: ArrayLike, compensating_tempco: ArrayLike
) -> FloatArray:
    """Return the share of capacitance that a compensating grade must have for no drift, all in parallel.

    Parameters
    ----------
    inductance_tempco : float or (n,) array
        Coefficient of the inductance. [1/K]
    main_tempco : float or (n,) array
        Coefficient of the other capacitance. [1/K]
    compensating_tempco : float or (n,) array
        Coefficient of the compensating grade. [1/K]

    Returns
    -------
    share : float or (n,) array
        Fraction of all capacitance; nan where no share from 0 to 1 does it. [-]

    Notes
    -----
    To first order in temperature, as the coefficients are; shares from 0 to 1.

    References
    ----------
    -(a_L + a_C)/2 = 0 solved for the share; tests/published/temperature_drift.csv.
    """
    main = np.asarray(main_tempco, float)
    with np.errstate(divide="ignore", invalid="ignore"):
        need = np.asarray(inductance_tempco, float) + main
        share = need / (main - np.asarray(compensating_tempco, float))
        return np.where((share >= 0.0) & (share <= 1.0), share, np.nan)[()]
