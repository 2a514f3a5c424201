"""Start-up of three-point oscillators: least transconductance, frequency there, growth above it.

The device is a transconductance g from its control terminal to its output terminal, both against its common
terminal, with capacitance and conductance at each. Which terminal is earthed makes no difference. Every
circuit is the polynomial P(s) = A(s) + g B(s), whose roots are its natural modes; nothing is neglected.
"""

from __future__ import annotations

from functools import reduce
from typing import Final, NamedTuple, TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
_Number = TypeVar("_Number", np.float64, np.complex128)

_NEAR: Final = (1e-12, 1e12)  # oscillations looked for, as the square of frequency over the tank's
_NOTHING: Final = 1e-15  # share of the largest coefficient that counts as an absent part


class Characteristic(NamedTuple):
    """Characteristic polynomial of an oscillator, A(s) + g B(s), with s in units of `scale`.

    Parameters
    ----------
    passive : (..., p) array
        Coefficients of A, constant first. [S^k, common factor of no account]
    active : (..., p) array
        Coefficients of B, constant first, the same number; same factor over siemens. [-]
    scale : float or (...) array
        Angular frequency near the oscillation. [rad/s]
    """

    passive: FloatArray
    active: FloatArray
    scale: FloatArray


class Threshold(NamedTuple):
    """Where an oscillator begins.

    Parameters
    ----------
    transconductance : float or (n,) array
        Least that lets an oscillation grow; nan if none does. [S]
    frequency : float or (n,) array
        Of the oscillation that neither grows nor dies there. [Hz]
    """

    transconductance: FloatArray
    frequency: FloatArray


def colpitts(
    inductance: ArrayLike,
    series_resistance: ArrayLike,
    output_capacitance: ArrayLike,
    control_capacitance: ArrayLike,
    shunt_capacitance: ArrayLike = 0.0,
    output_conductance: ArrayLike = 0.0,
    control_conductance: ArrayLike = 0.0,
) -> Characteristic:
    """Return the characteristic polynomial of a Colpitts oscillator.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil, between output and control terminal. [H]
    series_resistance : float or (n,) array
        Of the coil at the frequency of oscillation. [ohm]
    output_capacitance : float or (n,) array
        Output to common: divider capacitor with device and strays. [F]
    control_capacitance : float or (n,) array
        Control to common: divider capacitor with device and strays. [F]
    shunt_capacitance : float or (n,) array
        Across the coil: tuning and self-capacitance, device feedback capacitance. [F]
    output_conductance : float or (n,) array
        Output to common: device and load. [S]
    control_conductance : float or (n,) array
        Control to common: device and bias resistors. [S]

    Returns
    -------
    characteristic : Characteristic
        For `threshold` and `growth_rate`.

    Notes
    -----
    Y1 Y2 Z + (1 + s C3 Z)(Y1 + Y2 + g) = 0 with Z = r + s L. Without conductances and C3 the threshold is
    exactly r (C1 + C2)/L.

    References
    ----------
    K. K. Clarke and D. T. Hess, Communication Circuits: Analysis and Design, Addison-Wesley 1971, chapter 6
    (from memory); tests/published/oscillator_colpitts.csv.
    """
    c1, c2, c3 = (np.asarray(c, float) for c in (output_capacitance, control_capacitance, shunt_capacitance))
    scale = _angular(inductance, c1 * c2 / (c1 + c2) + c3)
    coil = _polynomial(series_resistance, np.multiply(scale, inductance))
    return _three_point(coil, _polynomial(1.0), scale, c1, c2, c3, output_conductance, control_conductance)


def clapp(
    inductance: ArrayLike,
    series_resistance: ArrayLike,
    series_capacitance: ArrayLike,
    output_capacitance: ArrayLike,
    control_capacitance: ArrayLike,
    shunt_capacitance: ArrayLike = 0.0,
    output_conductance: ArrayLike = 0.0,
    control_conductance: ArrayLike = 0.0,
    coil_capacitance: ArrayLike = 0.0,
) -> Characteristic:
    """Return the characteristic polynomial of a Clapp oscillator.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil, in series with the next two between output and control terminal. [H]
    series_resistance : float or (n,) array
        Of the coil at the frequency of oscillation. [ohm]
    series_capacitance : float or (n,) array
        In series with the coil: the tuning capacitor with its padders. [F]
    output_capacitance : float or (n,) array
        Output to common: divider capacitor with device and strays. [F]
    control_capacitance : float or (n,) array
        Control to common: divider capacitor with device and strays. [F]
    shunt_capacitance : float or (n,) array
        Across coil and series capacitor together: device feedback capacitance, strays. [F]
    output_conductance : float or (n,) array
        Output to common: device and load. [S]
    control_conductance : float or (n,) array
        Control to common: device and bias resistors. [S]
    coil_capacitance : float or (n,) array
        Across the coil alone: self-capacitance, strays, further capacitors. [F]

    Returns
    -------
    characteristic : Characteristic
        For `threshold` and `growth_rate`.

    Notes
    -----
    As `colpitts` with Z = (r + s L)/(1 + s Cp (r + s L)) + 1/(s C0). Without conductances, C3 and Cp the
    threshold is exactly r w^2 C1 C2, and grows fast as C0 gets smaller.

    References
    ----------
    J. K. Clapp, An inductance-capacitance oscillator of unusual frequency stability, Proc. IRE 36 (1948)
    356-358.
    """
    c0, cp = np.asarray(series_capacitance, float), np.asarray(coil_capacitance, float)
    c1, c2, c3 = (np.asarray(c, float) for c in (output_capacitance, control_capacitance, shunt_capacitance))
    around = c1 * c2 / (c1 + c2) + c3
    scale = _angular(inductance, c0 * around / (c0 + around) + cp)
    winding = _polynomial(series_resistance, np.multiply(scale, inductance))
    across = _sum(_polynomial(1.0), _product(_polynomial(0.0, scale * cp), winding))
    in_series = _polynomial(0.0, scale * c0)
    coil, over = _sum(across, _product(in_series, winding)), _product(in_series, across)
    return _three_point(coil, over, scale, c1, c2, c3, output_conductance, control_conductance)


def hartley(
    output_inductance: ArrayLike,
    control_inductance: ArrayLike,
    mutual: ArrayLike,
    output_resistance: ArrayLike,
    control_resistance: ArrayLike,
    capacitance: ArrayLike,
    output_capacitance: ArrayLike = 0.0,
    control_capacitance: ArrayLike = 0.0,
    output_conductance: ArrayLike = 0.0,
    control_conductance: ArrayLike = 0.0,
) -> Characteristic:
    """Return the characteristic polynomial of a Hartley oscillator.

    Parameters
    ----------
    output_inductance : float or (n,) array
        Part of the coil from output terminal to tap (common terminal). [H]
    control_inductance : float or (n,) array
        Part from tap to control terminal. [H]
    mutual : float or (n,) array
        Between the parts, positive where aiding as in one coil with a tap. [H]
    output_resistance : float or (n,) array
        Series resistance of the output part. [ohm]
    control_resistance : float or (n,) array
        Series resistance of the control part. [ohm]
    capacitance : float or (n,) array
        Across the whole coil, device feedback capacitance included. [F]
    output_capacitance : float or (n,) array
        Output to common, device and strays. [F]
    control_capacitance : float or (n,) array
        Control to common, device and strays. [F]
    output_conductance : float or (n,) array
        Output to common: device and load. [S]
    control_conductance : float or (n,) array
        Control to common: device and bias resistors. [S]

    Returns
    -------
    characteristic : Characteristic
        For `threshold` and `growth_rate`.

    Notes
    -----
    1 + D (Y1 Y2 + s C (Y1 + Y2 + g)) + Z2 (Y2 + s C) + Z1 (Y1 + s C) + s M (2 s C - g) = 0 with
    D = Z1 Z2 - s^2 M^2. For small losses the threshold is near (r1 + r2) C L/((L1 + M)(L2 + M)).
    Exact for the circuit as drawn, while the amplitude is small.

    References
    ----------
    K. K. Clarke and D. T. Hess, Communication Circuits: Analysis and Design, Addison-Wesley 1971, chapter 6
    (from memory); tests/published/oscillator_hartley.csv.
    """
    whole = np.asarray(output_inductance, float) + np.asarray(control_inductance, float)
    scale = _angular(whole + 2.0 * np.asarray(mutual, float), capacitance)
    z1 = _polynomial(output_resistance, np.multiply(scale, output_inductance))
    z2 = _polynomial(control_resistance, np.multiply(scale, control_inductance))
    sm, sc = _polynomial(0.0, np.multiply(scale, mutual)), _polynomial(0.0, np.multiply(scale, capacitance))
    y1 = _polynomial(output_conductance, np.multiply(scale, output_capacitance))
    y2 = _polynomial(control_conductance, np.multiply(scale, control_capacitance))
    determinant = _sum(_product(z1, z2), -_product(sm, sm))
    both = _sum(_product(y1, y2), _product(sc, _sum(y1, y2)))
    passive = _sum(
        _polynomial(1.0),
        _product(determinant, both),
        _product(z2, _sum(y2, sc)),
        _product(z1, _sum(y1, sc)),
        2.0 * _product(sm, sc),
    )
    return _characteristic(passive, _sum(_product(determinant, sc), -sm), scale)


def threshold(characteristic: Characteristic) -> Threshold:
    """Return the least transconductance that lets an oscillation grow, and its frequency.

    Parameters
    ----------
    characteristic : Characteristic
        From `colpitts`, `clapp` or `hartley`.

    Returns
    -------
    threshold : Threshold
        Transconductance [S] and frequency [Hz], each a float or (n,) array; nan if nothing oscillates.

    Notes
    -----
    At the threshold two roots lie on the imaginary axis: Im[A(jw) B*(jw)] = 0 is a polynomial in w^2, and
    g = -Re[A B*]/|B|^2 at its roots. The circuit is passive at g = 0, so that the least g above 0 is the
    first crossing. Exact to rounding at any Q. A design takes 2 to 5 times it (common practice, no source).

    References
    ----------
    E. J. Routh, A Treatise on the Stability of a Given State of Motion, 1877;
    tests/published/oscillator_colpitts.csv, oscillator_hartley.csv.
    """
    a_even, a_odd = _parts(characteristic.passive)
    b_even, b_odd = _parts(characteristic.active)
    square = _roots(_sum(_product(a_odd, b_even), -_product(a_even, b_odd)))
    # products of the small coefficients leave roots on the real axis with a rounding's imaginary part
    real = (np.abs(square.imag) <= 1e-7 * np.abs(square)) & (square.real > _NEAR[0]) & (square.real < _NEAR[1])
    w2 = np.where(real, square.real, np.nan)
    ae, ao, be, bo = (_at(part, w2) for part in (a_even, a_odd, b_even, b_odd))
    needed = -(ae * be + w2 * ao * bo) / (be**2 + w2 * bo**2)
    needed = np.where(needed >= -1e-15, np.maximum(needed, 0.0), np.inf)
    needed = np.where(np.isnan(needed), np.inf, needed)
    first = np.argmin(needed, axis=-1)[..., None]
    least = np.take_along_axis(needed, first, axis=-1)[..., 0]
    omega = characteristic.scale * np.sqrt(np.take_along_axis(w2, first, axis=-1)[..., 0])
    found = np.isfinite(least)
    return Threshold(np.where(found, least, np.nan)[()], np.where(found, omega / (2 * np.pi), np.nan)[()])


def divider_threshold(
    inductance: ArrayLike,
    series_resistance: ArrayLike,
    output_capacitance: ArrayLike,
    control_capacitance: ArrayLike,
    coil_capacitance: ArrayLike = 0.0,
    series_capacitance: ArrayLike = np.inf,
) -> Threshold:
    """Return the threshold of a Colpitts or Clapp oscillator without conductances, in closed form.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil. [H]
    series_resistance : float or (n,) array
        Of the coil at the frequency of oscillation. [ohm]
    output_capacitance : float or (n,) array
        Output to common, device included. [F]
    control_capacitance : float or (n,) array
        Control to common, device included. [F]
    coil_capacitance : float or (n,) array
        Across the coil. [F]
    series_capacitance : float or (n,) array
        Between coil and divider; infinity: a wire, as in the Colpitts circuit. [F]

    Returns
    -------
    threshold : Threshold
        As from `threshold`, many times as fast; nan if nothing oscillates.

    Notes
    -----
    Between output and control the coil with what is across and behind it shows R + jX. The divider wants
    X = 1/(wD) with D its halves in series, a quadratic in w^2 of which the lower root counts, and then
    g = w^2 C1 C2 R. Exact to rounding at any Q of this circuit.

    References
    ----------
    As `colpitts` and `clapp`; held against `threshold` in tests/test_physics_oscillator.py.
    """
    coil, loss, c1, c2, cp, c0 = (
        np.asarray(given, float)
        for given in (
            inductance,
            series_resistance,
            output_capacitance,
            control_capacitance,
            coil_capacitance,
            series_capacitance,
        )
    )
    behind = 1.0 / (1.0 / c1 + 1.0 / c2 + 1.0 / c0)
    linear = coil * (behind + 2.0 * cp) - cp * (behind + cp) * loss**2
    root = linear**2 - 4.0 * coil**2 * cp * (cp + behind)
    found = (root >= 0.0) & (linear > 0.0)
    square = 2.0 / np.where(found, linear + np.sqrt(np.where(found, root, 0.0)), np.nan)
    shown = loss / ((1.0 - square * coil * cp) ** 2 + square * (cp * loss) ** 2)
    return Threshold((square * c1 * c2 * shown)[()], (np.sqrt(square) / (2 * np.pi))[()])


def growth_rate(characteristic: Characteristic, transconductance: ArrayLike) -> FloatArray:
    """Return how fast the amplitude grows while it is small.

    Parameters
    ----------
    characteristic : Characteristic
        From `colpitts`, `clapp` or `hartley`.
    transconductance : float or (n,) array
        Of the device; broadcasts with the circuit. [S]

    Returns
    -------
    rate : float or (n,) array
        Largest real part of the natural modes of oscillation: amplitude goes as exp(rate t); negative: it
        dies out. [1/s]

    Notes
    -----
    Exact while the amplitude is small, for any transconductance; nothing is said of where it ends.

    References
    ----------
    Roots of the characteristic polynomial; ngspice transients in tests/published/oscillator_colpitts.csv.
    """
    gain = np.asarray(transconductance, float)[..., None]
    modes = _roots(characteristic.passive + gain * characteristic.active)
    swinging = np.abs(modes.imag) > 1e-9
    return (np.max(np.where(swinging, modes.real, -np.inf), axis=-1) * characteristic.scale)[()]


def _three_point(
    coil: FloatArray,
    over: FloatArray,
    scale: FloatArray,
    c1: ArrayLike,
    c2: ArrayLike,
    c3: ArrayLike,
    g1: ArrayLike,
    g2: ArrayLike,
) -> Characteristic:
    """Return the polynomial of a divider with the branch coil/over between its ends."""
    y1, y2, y3 = (_polynomial(g, np.multiply(scale, c)) for g, c in ((g1, c1), (g2, c2), (0.0, c3)))
    around = _sum(over, _product(y3, coil))
    passive = _sum(_product(_product(y1, y2), coil), _product(around, _sum(y1, y2)))
    return _characteristic(passive, around, scale)


def _characteristic(passive: FloatArray, active: FloatArray, scale: FloatArray) -> Characteristic:
    """Return both polynomials with the same number of coefficients."""
    nothing = np.zeros(max(passive.shape[-1], active.shape[-1]))
    return Characteristic(_sum(passive, nothing), _sum(active, nothing), scale)


def _angular(inductance: ArrayLike, capacitance: ArrayLike) -> FloatArray:
    """Return the angular frequency of the circuit without loss."""
    return np.asarray(1.0 / np.sqrt(np.asarray(inductance, float) * np.asarray(capacitance, float)))


def _polynomial(*coefficients: ArrayLike) -> FloatArray:
    """Return coefficients, constant first, along a new last axis."""
    return np.stack(np.broadcast_arrays(*(np.asarray(c, float) for c in coefficients)), axis=-1)


def _sum(*terms: FloatArray) -> FloatArray:
    """Return the sum of polynomials of any lengths."""
    size = max(term.shape[-1] for term in terms)
    padded = (np.pad(t, [(0, 0)] * (t.ndim - 1) + [(0, size - t.shape[-1])]) for t in terms)
    return np.asarray(reduce(np.add, padded))


def _product(one: FloatArray, two: FloatArray) -> FloatArray:
    """Return the product of two polynomials."""
    shape = np.broadcast_shapes(one.shape[:-1], two.shape[:-1])
    result = np.zeros((*shape, one.shape[-1] + two.shape[-1] - 1))
    for k in range(one.shape[-1]):
        result[..., k : k + two.shape[-1]] += one[..., k, None] * two
    return result


def _parts(polynomial: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return E and O in w^2 of P(jw) = E(w^2) + j w O(w^2)."""
    sign = np.where(np.arange(polynomial.shape[-1]) % 4 < 2, 1.0, -1.0)
    signed = polynomial * sign
    return signed[..., 0::2], signed[..., 1::2]


def _at(polynomial: FloatArray, x: NDArray[_Number]) -> NDArray[_Number]:
    """Return each polynomial at its own row of places."""
    result = np.zeros_like(x)
    for k in range(polynomial.shape[-1] - 1, -1, -1):
        result = result * x + polynomial[..., None, k]
    return result


def _roots(polynomial: FloatArray) -> NDArray[np.complex128]:
    """Return all roots of polynomials with constant first; nan where there are fewer than the degree.

    Coefficients that are nothing at either end (an absent part) would make the companion matrix singular or
    endless; rows of one pattern are solved together without them.
    """
    flat = polynomial.reshape(-1, polynomial.shape[-1])
    roots = np.full((len(flat), flat.shape[1] - 1), np.nan, dtype=complex)
    present = np.abs(flat) > _NOTHING * np.max(np.abs(flat), axis=1, keepdims=True)
    first = np.argmax(present, axis=1)
    last = flat.shape[1] - 1 - np.argmax(present[:, ::-1], axis=1)
    for low, high in sorted(set(zip(first.tolist(), last.tolist(), strict=True))):
        rows = np.flatnonzero((first == low) & (last == high))
        degree = high - low
        if degree == 0:
            continue
        companion = np.zeros((len(rows), degree, degree))
        companion[:, np.arange(1, degree), np.arange(degree - 1)] = 1.0
        companion[:, :, -1] = -flat[rows, low:high] / flat[rows, high, None]
        roots[rows, :degree] = _polished(flat[rows, low : high + 1], np.linalg.eigvals(companion).astype(complex))
    return roots.reshape(*polynomial.shape[:-1], -1)


def _polished(polynomial: FloatArray, roots: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """Return the roots after Newton steps: eigenvalues of unlike size cost one another digits."""
    order = np.arange(1, polynomial.shape[-1])
    for _ in range(3):
        slope = _at(polynomial[..., 1:] * order, roots)
        step = _at(polynomial, roots) / np.where(slope == 0.0, np.inf, slope)
        roots = np.where(np.abs(step) < 0.1 * np.abs(roots), roots - step, roots)
    return roots
