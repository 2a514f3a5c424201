"""Copper and the skin effect of a round wire, exact at every frequency.

Formulas take numbers or arrays; each Bessel function is evaluated once per distinct argument, because
thousands of windings share a few dozen wires.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.special import bessel_quotients, distinct_values

FloatArray = NDArray[np.float64]

MU_0: Final = 4e-7 * np.pi  # H/m; CODATA 2022 differs by 1.3e-10
COPPER_RESISTIVITY: Final = 1.0 / 58e6  # ohm m at 20 degC; IEC 60028:1925, from memory
COPPER_TEMPERATURE_COEFFICIENT: Final = 0.00393  # 1/K at 20 degC, constant mass; IEC 60028, from memory

_SERIES_BELOW: Final = 0.05  # radius / skin depth under which the power series are exact to 1e-11
_ASYMPTOTIC_ABOVE: Final = 1000.0  # and over which the asymptotic ones are better than 1e-9


def copper_resistivity(temperature: ArrayLike = 20.0) -> FloatArray:
    """Return the resistivity of annealed copper.

    Parameters
    ----------
    temperature : float or (n,) array
        Wire temperature. [degC]

    Returns
    -------
    resistivity : float or (n,) array
        Resistivity, linear in temperature. [ohm m]

    Notes
    -----
    For about -50 to 150 degC.
    Within 1 % in that range.

    References
    ----------
    IEC 60028:1925, 1/58 ohm mm2/m and 0.00393 1/K at 20 degC; from memory.
    """
    rise = np.asarray(temperature, float) - 20.0
    return (COPPER_RESISTIVITY * (1.0 + COPPER_TEMPERATURE_COEFFICIENT * rise))[()]


def skin_depth(frequency: ArrayLike, temperature: ArrayLike = 20.0) -> FloatArray:
    """Return the skin depth in copper.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency, above 0. [Hz]
    temperature : float or (n,) array
        Wire temperature; broadcasts with `frequency`. [degC]

    Returns
    -------
    depth : float or (n,) array
        Depth at which the current density has fallen to 1/e. [m]

    Notes
    -----
    Exact for a plane surface, at any frequency above 0 that is used in tuned circuits.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2 (skin effect).
    """
    return np.sqrt(copper_resistivity(temperature) / (np.pi * MU_0 * np.asarray(frequency, float)))[()]


def wire_resistance(
    length: ArrayLike, diameter: ArrayLike, temperature: ArrayLike = 20.0, strands: ArrayLike = 1
) -> FloatArray:
    """Return the direct-current resistance of a copper wire.

    Parameters
    ----------
    length : float or (n,) array
        Length of the wire. [m]
    diameter : float or (n,) array
        Bare diameter of the wire, or of one strand. [m]
    temperature : float or (n,) array
        Wire temperature. [degC]
    strands : int or (n,) array
        Number of strands side by side; their lay is not added to the length. [-]

    Returns
    -------
    resistance : float or (n,) array
        Resistance to direct current. [ohm]

    Notes
    -----
    Exact for a uniform round wire; any sizes above 0.

    References
    ----------
    IEC 60028:1925; from memory.
    """
    section = np.asarray(strands, float) * np.pi * np.asarray(diameter, float) ** 2 / 4.0
    result: FloatArray = copper_resistivity(temperature) * np.asarray(length, float) / section
    return result


def skin_ratio(a_over_delta: ArrayLike) -> FloatArray:
    """Return the resistance of a straight round wire over its direct-current resistance.

    Parameters
    ----------
    a_over_delta : float or (n,) array
        Wire radius over skin depth, from 0. [-]

    Returns
    -------
    ratio : float or (n,) array
        Skin-effect ratio, at least 1; nan for a negative argument. [-]

    Notes
    -----
    Re[(z/2) J0(z)/J1(z)] with z = (1 - j) a/delta: exact for a lone wire. Tends to 1 + (a/delta)^4/48 and
    to a/(2 delta) + 1/4; scaled Bessel functions keep it finite for thick wire.

    References
    ----------
    Lord Kelvin 1889; F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2;
    tests/published/loss_skin_effect.csv.
    """
    return _per_distinct(_skin_ratio, a_over_delta)


def internal_inductance_ratio(a_over_delta: ArrayLike) -> FloatArray:
    """Return the internal inductance of a straight round wire over its low-frequency value.

    Parameters
    ----------
    a_over_delta : float or (n,) array
        Wire radius over skin depth, from 0. [-]

    Returns
    -------
    ratio : float or (n,) array
        Fraction of mu0/(8 pi) per metre that is left, at most 1; nan for a negative argument. [-]

    Notes
    -----
    Im[(z/2) J0(z)/J1(z)] / ((a/delta)^2/4) with z = (1 - j) a/delta. Tends to 2 delta/a.
    Exact for a straight round wire, any a/delta from 0 on.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2;
    tests/published/loss_skin_effect.csv.
    """
    return _per_distinct(_internal_inductance_ratio, a_over_delta)


def transverse_loss_ratio(a_over_delta: ArrayLike) -> FloatArray:
    """Return how the loss of a round wire in a transverse field grows with frequency.

    Parameters
    ----------
    a_over_delta : float or (n,) array
        Wire radius over skin depth, from 0. [-]

    Returns
    -------
    ratio : float or (n,) array
        g, by which direct-current resistance times 2 (pi d H/I)^2 is multiplied; nan below 0. [-]

    Notes
    -----
    g = |Re[z J1(z)/J0(z)]|/2 with z = (1 - j) a/delta; tends to (a/delta)^4/8 and to a/(2 delta) - 1/4.
    It is the proximity counterpart of `skin_ratio` and equals twice the function G of older tables.

    References
    ----------
    S. Butterworth, Effective resistance of inductance coils at radio frequency, Experimental Wireless 3
    (1926) 203-210, 309-316, 417-424, 483-492 (from memory); exact solution for a wire in a uniform field.
    """
    return _per_distinct(_transverse_loss_ratio, a_over_delta)


def _per_distinct(function: Callable[[FloatArray], FloatArray], argument: ArrayLike) -> FloatArray:
    """Evaluate a costly function once per distinct value: thousands of windings share a few dozen wires."""
    values = np.asarray(argument, float)
    if values.size < 2:
        return function(np.atleast_1d(values)).reshape(values.shape)[()]
    distinct, where = distinct_values(values)
    return function(distinct)[where]


def _bessel_quotient(x: FloatArray) -> NDArray[np.complex128]:
    """Return J0(z)/J1(z) for z = (1 - j) x, x within the range of neither series."""
    z = (1.0 - 1.0j) * np.clip(np.nan_to_num(x), _SERIES_BELOW, _ASYMPTOTIC_ABOVE)
    return np.asarray(1.0 / bessel_quotients(z)[0], complex)


def _choose(x: FloatArray, small: FloatArray, exact: FloatArray, large: FloatArray) -> FloatArray:
    """Take the power series, the exact value or the asymptotic series, nan for a negative argument."""
    chosen = np.where(x < _SERIES_BELOW, small, np.where(x > _ASYMPTOTIC_ABOVE, large, exact))
    return np.where(x >= 0.0, chosen, np.nan)


def _skin_ratio(x: FloatArray) -> FloatArray:
    exact = np.real((0.5 - 0.5j) * x * _bessel_quotient(x))
    return _choose(x, 1.0 + x**4 / 48.0, exact, x / 2.0 + 0.25 + 3.0 / (32.0 * np.maximum(x, 1.0)))


def _internal_inductance_ratio(x: FloatArray) -> FloatArray:
    above = np.maximum(x, _SERIES_BELOW)
    exact = np.imag((0.5 - 0.5j) * above * _bessel_quotient(x)) / (above**2 / 4.0)
    return _choose(x, 1.0 - x**4 / 96.0, exact, 2.0 / above - 0.375 / above**3)


def _transverse_loss_ratio(x: FloatArray) -> FloatArray:
    exact = np.abs(np.real((1.0 - 1.0j) * x / _bessel_quotient(x))) / 2.0
    small = x**4 / 8.0 - 11.0 * x**8 / 768.0
    return _choose(x, small, exact, x / 2.0 - 0.25 - 1.0 / (32.0 * np.maximum(x, 1.0)))
