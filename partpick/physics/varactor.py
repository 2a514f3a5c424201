"""Varactors: junction capacitance against bias, several junctions, temperature, and rf voltage on them."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Fall of the junction potential of silicon; common practice, no source.
POTENTIAL_TEMPCO: Final = -2e-3  # V/K
_QUADRATURE: Final = 64  # points over half a cycle of rf


def junction_capacitance(bias: ArrayLike, zero_bias: ArrayLike, potential: ArrayLike, grading: ArrayLike) -> FloatArray:
    """Return the capacitance of one reverse-biased junction.

    Parameters
    ----------
    bias : float or (n,) array
        Reverse voltage, 0 or more. [V]
    zero_bias : float or (n,) array
        Capacitance without bias; broadcasts with `bias`. [F]
    potential : float or (n,) array
        Junction potential. [V]
    grading : float or (n,) array
        Exponent: 1/3 graded, 1/2 abrupt, above 1/2 hyperabrupt. [-]

    Returns
    -------
    capacitance : float or (n,) array
        C0/(1 + V/phi)^g; nan below 0 V, where the junction begins to conduct. [F]

    Notes
    -----
    From 0 V up to breakdown, for small signals.

    References
    ----------
    S. M. Sze, Physics of Semiconductor Devices, 2nd ed. 1981, chapter 2 (depletion capacitance);
    tests/published/varactor.csv.
    """
    voltage = np.asarray(bias, float)
    depleted = 1.0 + np.where(voltage >= 0.0, voltage, np.nan) / np.asarray(potential, float)
    return (np.asarray(zero_bias, float) * depleted ** -np.asarray(grading, float))[()]


def bias_for(capacitance: ArrayLike, zero_bias: ArrayLike, potential: ArrayLike, grading: ArrayLike) -> FloatArray:
    """Return the reverse voltage at which one junction has a capacitance.

    Parameters
    ----------
    capacitance : float or (n,) array
        Wanted, at most `zero_bias`. [F]
    zero_bias : float or (n,) array
        Capacitance without bias; broadcasts with `capacitance`. [F]
    potential : float or (n,) array
        Junction potential. [V]
    grading : float or (n,) array
        Exponent of the law. [-]

    Returns
    -------
    bias : float or (n,) array
        phi ((C0/C)^(1/g) - 1); nan above the capacitance without bias. [V]

    Notes
    -----
    Within the range of `junction_capacitance`, whose inverse it is, exactly.

    References
    ----------
    As `junction_capacitance`, solved for the voltage.
    """
    ratio = np.asarray(zero_bias, float) / np.asarray(capacitance, float)
    ratio = np.where(ratio >= 1.0, ratio, np.nan)
    return (np.asarray(potential, float) * (ratio ** (1.0 / np.asarray(grading, float)) - 1.0))[()]


def bias_sensitivity(bias: ArrayLike, potential: ArrayLike, grading: ArrayLike) -> FloatArray:
    """Return the relative change of one junction's capacitance with bias.

    Parameters
    ----------
    bias : float or (n,) array
        Reverse voltage. [V]
    potential : float or (n,) array
        Junction potential; broadcasts with `bias`. [V]
    grading : float or (n,) array
        Exponent of the law. [-]

    Returns
    -------
    sensitivity : float or (n,) array
        d ln C/dV = -g/(phi + V); the frequency moves by minus half of it where C is the only one. [1/V]

    Notes
    -----
    A derivative: within 1 % for a change of bias up to 1 % of (phi + V).

    References
    ----------
    Derivative of `junction_capacitance`; tests/published/varactor.csv.
    """
    across = np.asarray(potential, float) + np.asarray(bias, float)
    return (-np.asarray(grading, float) / across)[()]


def network_capacitance(
    junction: ArrayLike, count: ArrayLike = 1, back_to_back: bool = False, series: ArrayLike = np.inf
) -> FloatArray:
    """Return the capacitance of several equal junctions with a series capacitor.

    Parameters
    ----------
    junction : float or (n,) array
        Capacitance of one junction at its bias. [F]
    count : int or (n,) array
        Branches in parallel: single junctions, or pairs where `back_to_back`. [-]
    back_to_back : bool
        Whether a branch is a pair in opposition, in series for the rf. [-]
    series : float or (n,) array
        Capacitor in series with the whole; infinity: none. [F]

    Returns
    -------
    capacitance : float or (n,) array
        Of the whole; broadcast of all. [F]

    Notes
    -----
    Exact for equal junctions; any values above 0.

    References
    ----------
    Capacitances in parallel add, in series their reciprocals do.
    """
    whole = np.asarray(junction, float) * np.asarray(count, float) / (2.0 if back_to_back else 1.0)
    return (whole / (1.0 + whole / np.asarray(series, float)))[()]


def junction_for_network(
    capacitance: ArrayLike, count: ArrayLike = 1, back_to_back: bool = False, series: ArrayLike = np.inf
) -> FloatArray:
    """Return the capacitance that each junction needs; the inverse of `network_capacitance`.

    Parameters
    ----------
    capacitance : float or (n,) array
        Wanted of the whole, below `series`. [F]
    count : int or (n,) array
        Branches in parallel: single junctions, or pairs where `back_to_back`. [-]
    back_to_back : bool
        Whether a branch is a pair in opposition. [-]
    series : float or (n,) array
        Capacitor in series with the whole; infinity: none. [F]

    Returns
    -------
    junction : float or (n,) array
        Of one junction; nan where the series capacitor is too small. [F]

    Notes
    -----
    Exact for equal junctions, any capacitance below the series capacitor.

    References
    ----------
    As `network_capacitance`.
    """
    value = np.asarray(capacitance, float)
    left = 1.0 - value / np.asarray(series, float)
    whole = value / np.where(left > 0.0, left, np.nan)
    return (whole * (2.0 if back_to_back else 1.0) / np.asarray(count, float))[()]


def junction_tempco(
    bias: ArrayLike, potential: ArrayLike, grading: ArrayLike, potential_tempco: ArrayLike = POTENTIAL_TEMPCO
) -> FloatArray:
    """Return the temperature coefficient of one junction's capacitance at a bias.

    Parameters
    ----------
    bias : float or (n,) array
        Reverse voltage, held constant. [V]
    potential : float or (n,) array
        Junction potential; broadcasts with `bias`. [V]
    grading : float or (n,) array
        Exponent of the law. [-]
    potential_tempco : float or (n,) array
        Change of the potential with temperature, negative in silicon. [V/K]

    Returns
    -------
    tempco : float or (n,) array
        -g (dphi/dT)/(phi + V): positive, largest at low bias. [1/K]

    Notes
    -----
    The capacitance depends on phi + V alone, so C0 phi^g stays as it is. The small tempco of the
    material's permittivity and of the package is left out.
    To first order in temperature.

    References
    ----------
    Derivative of `junction_capacitance` (S. M. Sze, Physics of Semiconductor Devices, 2nd ed. 1981,
    chapter 2); 2 mV/K: common practice, no source.
    """
    return (bias_sensitivity(bias, potential, grading) * np.asarray(potential_tempco, float))[()]


def network_tempco(
    tempco: ArrayLike, whole_junctions: ArrayLike, series: ArrayLike = np.inf, series_tempco: ArrayLike = 0.0
) -> FloatArray:
    """Return the temperature coefficient of junctions with a series capacitor.

    Parameters
    ----------
    tempco : float or (n,) array
        Of the junctions, from `junction_tempco`. [1/K]
    whole_junctions : float or (n,) array
        Capacitance of all junctions together, without the series capacitor. [F]
    series : float or (n,) array
        Capacitor in series with them; infinity: none. [F]
    series_tempco : float or (n,) array
        Of that capacitor. [1/K]

    Returns
    -------
    tempco : float or (n,) array
        Each weighted by its share of the reactance. [1/K]

    Notes
    -----
    Exact to first order; any values above 0.

    References
    ----------
    Derivative of 1/C = 1/C1 + 1/C2.
    """
    whole, padder = np.asarray(whole_junctions, float), np.asarray(series, float)
    share = 1.0 / (1.0 + whole / padder)  # of the reactance, in the junctions
    result: FloatArray = share * np.asarray(tempco, float) + (1.0 - share) * np.asarray(series_tempco, float)
    return result


def junction_rf_peak(
    tank_peak: ArrayLike, whole_junctions: ArrayLike, series: ArrayLike = np.inf, back_to_back: bool = False
) -> FloatArray:
    """Return the peak rf voltage across each junction.

    Parameters
    ----------
    tank_peak : float or (n,) array
        Peak voltage across the tank. [V]
    whole_junctions : float or (n,) array
        Capacitance of all junctions together, without the series capacitor. [F]
    series : float or (n,) array
        Capacitor in series with them; infinity: none. [F]
    back_to_back : bool
        Whether each branch is a pair in opposition, which halves the voltage on each. [-]

    Returns
    -------
    peak : float or (n,) array
        Peak voltage across one junction. [V]

    Notes
    -----
    Exact for small signals: capacitances at rest share the voltage.

    References
    ----------
    Capacitive voltage division.
    """
    share = 1.0 / (1.0 + np.asarray(whole_junctions, float) / np.asarray(series, float))
    return (np.asarray(tank_peak, float) * share / (2.0 if back_to_back else 1.0))[()]


def least_bias(junction_peak: ArrayLike, reserve: ArrayLike = 1.0) -> FloatArray:
    """Return the least reverse voltage at which the rf does not drive a junction into conduction.

    Parameters
    ----------
    junction_peak : float or (n,) array
        Peak rf voltage across one junction. [V]
    reserve : float or (n,) array
        Kept between the peak and zero. [V]

    Returns
    -------
    bias : float or (n,) array
        Their sum. [V]

    Notes
    -----
    Exact for small signals; any peak from 0 on.

    References
    ----------
    Common practice, no source.
    """
    return (np.asarray(junction_peak, float) + np.asarray(reserve, float))[()]


def capacitance_under_rf(
    bias: ArrayLike, rf_peak: ArrayLike, zero_bias: ArrayLike, potential: ArrayLike, grading: ArrayLike
) -> FloatArray:
    """Return the capacitance of one junction at the fundamental, under a large rf voltage.

    Parameters
    ----------
    bias : float or (n,) array
        Reverse voltage. [V]
    rf_peak : float or (n,) array
        Peak of a sinusoidal voltage across the junction, at most `bias`; broadcasts with it. [V]
    zero_bias : float or (n,) array
        Capacitance without bias. [F]
    potential : float or (n,) array
        Junction potential. [V]
    grading : float or (n,) array
        Exponent of the law. [-]

    Returns
    -------
    capacitance : float or (n,) array
        (2/pi) times the integral of C(V + v cos t) sin^2 t over half a cycle; nan where the peak exceeds
        the bias. [F]

    Notes
    -----
    For a small peak v it is C (1 + g (g + 1)/8 (v/(phi + V))^2): the rf pulls the frequency down.
    Exact for a sine that never drives the junction below its potential.

    References
    ----------
    Describing function of a nonlinear capacitance: K. K. Clarke and D. T. Hess, Communication Circuits:
    Analysis and Design, Addison-Wesley 1971 (method; from memory).
    """
    step = np.pi / (_QUADRATURE + 1)
    angle = step * np.arange(1, _QUADRATURE + 1)  # Gauss-Chebyshev points of the second kind
    weight = 2.0 / np.pi * step * np.sin(angle) ** 2
    swing = np.asarray(bias, float)[..., None] + np.asarray(rf_peak, float)[..., None] * np.cos(angle)
    others = (np.asarray(x, float)[..., None] for x in (zero_bias, potential, grading))
    safe = np.asarray(rf_peak, float) <= np.asarray(bias, float)
    return np.where(safe, junction_capacitance(np.maximum(swing, 0.0), *others) @ weight, np.nan)[()]
