"""Two circuits on one gang that keep a constant distance in frequency: padder, trimmer and coil for it.

The plain circuit has a gang section and a fixed capacitance across its coil. The padded circuit runs a fixed
distance above it: gang section with a trimmer, both in series with a padder, all across its coil. In a
receiver whose oscillator runs above the signal the padded circuit is the oscillator; where the oscillator
runs below, it is the signal circuit, since the padder belongs to the circuit with the smaller ratio.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

_GRID: Final = 2001  # frequencies on which the error's extremes are found
_EXCHANGES: Final = 40


class PlainCircuit(NamedTuple):
    """A coil with a gang section and fixed capacitance across it.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil. [H]
    fixed : float or (n,) array
        Trimmer, strays and self-capacitance across it; negative: the section cannot cover the range. [F]
    """

    inductance: FloatArray
    fixed: FloatArray


class PaddedCircuit(NamedTuple):
    """A coil with a padded gang section across it.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil. [H]
    padder : float or (n,) array
        In series with section and trimmer. [F]
    trimmer : float or (n,) array
        Across the gang section. [F]
    across : float or (n,) array
        Strays and self-capacitance across the coil. [F]
    """

    inductance: FloatArray
    padder: FloatArray
    trimmer: FloatArray
    across: FloatArray


class BestTracking(NamedTuple):
    """The padded circuit with the least worst error.

    Parameters
    ----------
    circuit : PaddedCircuit
        Coil, padder and trimmer, not rounded to any series. [H, F]
    worst_error : float
        Largest distance from exact tracking over the range. [Hz]
    """

    circuit: PaddedCircuit
    worst_error: float


def plain_circuit(low: ArrayLike, high: ArrayLike, section_low: ArrayLike, section_high: ArrayLike) -> PlainCircuit:
    """Return the plain circuit that a gang section sweeps from end to end.

    Parameters
    ----------
    low : float or (n,) array
        Lowest frequency, section at its greatest. [Hz]
    high : float or (n,) array
        Highest frequency, above `low`. [Hz]
    section_low : float or (n,) array
        Least capacitance of the gang section. [F]
    section_high : float or (n,) array
        Greatest capacitance of the gang section. [F]

    Returns
    -------
    circuit : PlainCircuit
        Inductance [H] and fixed capacitance [F], each a float or (n,) array.

    Notes
    -----
    Exact without loss; for a range ratio above 1 that the section can span.

    References
    ----------
    F. Langford-Smith (ed.), Radiotron Designer's Handbook, 4th ed. 1953, chapter 25 (from memory);
    tests/published/tracking.csv.
    """
    square = (np.asarray(high, float) / np.asarray(low, float)) ** 2
    least, greatest = np.asarray(section_low, float), np.asarray(section_high, float)
    fixed = (greatest - square * least) / (square - 1.0)
    inductance = 1.0 / ((2.0 * np.pi * np.asarray(high, float)) ** 2 * (least + fixed))
    return PlainCircuit(inductance[()], fixed[()])


def section_capacitance(circuit: PlainCircuit, frequency: ArrayLike) -> FloatArray:
    """Return the capacitance of the gang section that tunes the plain circuit to a frequency.

    Parameters
    ----------
    circuit : PlainCircuit
        Inductance and fixed capacitance. [H, F]
    frequency : float or (n,) array
        Wanted; broadcasts with the circuit. [Hz]

    Returns
    -------
    capacitance : float or (n,) array
        Of the section alone. [F]

    Notes
    -----
    Exact without loss; any frequency above 0, outside the range it may be negative.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    result: FloatArray = 1.0 / (omega**2 * circuit.inductance) - circuit.fixed
    return result


def padded_frequency(circuit: PaddedCircuit, section: ArrayLike) -> FloatArray:
    """Return the resonance of the padded circuit.

    Parameters
    ----------
    circuit : PaddedCircuit
        Coil, padder, trimmer and what lies across the coil. [H, F]
    section : float or (n,) array
        Capacitance of the gang section; broadcasts with the circuit. [F]

    Returns
    -------
    frequency : float or (n,) array
        1/(2 pi sqrt(L C)), C = across + padder in series with (section + trimmer). [Hz]

    Notes
    -----
    Exact without loss; nan for a negative capacitance in circuit.

    References
    ----------
    W. Thomson, On transient electric currents, Philosophical Magazine 5 (1853) 393-405.
    """
    upper = np.asarray(section, float) + circuit.trimmer
    total = circuit.across + upper / (1.0 + upper / np.asarray(circuit.padder, float))
    with np.errstate(invalid="ignore"):
        result: FloatArray = 1.0 / (2.0 * np.pi * np.sqrt(circuit.inductance * total))
    return result


def tracking_error(plain: PlainCircuit, padded: PaddedCircuit, frequency: ArrayLike, distance: ArrayLike) -> FloatArray:
    """Return by how much the padded circuit misses its distance from the plain one.

    Parameters
    ----------
    plain : PlainCircuit
        The circuit without a padder. [H, F]
    padded : PaddedCircuit
        The circuit with one, on an equal gang section. [H, F]
    frequency : float or (n,) array
        To which the plain circuit is tuned; broadcasts with the circuits. [Hz]
    distance : float or (n,) array
        Wanted, padded above plain: the intermediate frequency. [Hz]

    Returns
    -------
    error : float or (n,) array
        Positive where the padded circuit is too high. [Hz]

    Notes
    -----
    Exact without loss, at any frequency that the section reaches.

    References
    ----------
    Definition; tests/published/tracking.csv.
    """
    tuned = padded_frequency(padded, section_capacitance(plain, frequency))
    result: FloatArray = tuned - np.asarray(frequency, float) - np.asarray(distance, float)
    return result


def tracking_points(low: ArrayLike, high: ArrayLike) -> FloatArray:
    """Return the three frequencies at which a padded circuit is usually aligned.

    Parameters
    ----------
    low : float or (n,) array
        Lower end of the plain circuit's range. [Hz]
    high : float or (n,) array
        Upper end; broadcasts with `low`. [Hz]

    Returns
    -------
    points : (3,) or (n, 3) array
        Zeros of the third Chebyshev polynomial stretched over the range, rising. [Hz]

    Notes
    -----
    Exact as zeros; that the errors between them are equal holds nearly, the better the narrower the range.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 9 (tracking; from memory);
    tests/published/tracking.csv.
    """
    middle = (np.asarray(high, float) + np.asarray(low, float))[..., None] / 2.0
    half = (np.asarray(high, float) - np.asarray(low, float))[..., None] / 2.0
    result: FloatArray = middle + half * np.cos(np.pi * np.array([5.0, 3.0, 1.0]) / 6.0)
    return result


def three_point_circuit(section: ArrayLike, frequency: ArrayLike, across: ArrayLike = 0.0) -> PaddedCircuit:
    """Return the padded circuit that passes through three points exactly.

    Parameters
    ----------
    section : (3,) or (n, 3) array
        Capacitance of the gang section at three settings. [F]
    frequency : (3,) or (n, 3) array
        Resonance wanted at each. [Hz]
    across : float or (n,) array
        Strays and self-capacitance across the coil, chosen beforehand. [F]

    Returns
    -------
    circuit : PaddedCircuit
        Each a float or (n,) array; nan where no padder above zero does it: the wanted ratio is larger than
        the section gives, and the padder belongs to the other circuit. A trimmer below zero means that the
        strays already in circuit are too many. [H, F]

    Raises
    ------
    LinAlgError
        If two of the settings are alike.

    Notes
    -----
    1/w^2 = a - b/(C + c) with a = L (across + P), b = L P^2, c = T + P: linear in a, c and a c - b, so that
    three points give them without iteration.

    References
    ----------
    Own derivation; same figures as the equations solved numerically in tests/published/tracking.csv.
    """
    value = np.asarray(section, float)
    y = 1.0 / (2.0 * np.pi * np.asarray(frequency, float)) ** 2
    # in units of the first point, so that the equations are well scaled
    unit_c, unit_y = np.max(value, axis=-1, keepdims=True), np.max(y, axis=-1, keepdims=True)
    value, y = value / unit_c, y / unit_y
    equations = np.stack(np.broadcast_arrays(value, -y, np.ones_like(y)), axis=-1)
    solved = np.linalg.solve(equations, (y * value)[..., None])[..., 0]
    scale_c, scale_y = unit_c[..., 0], unit_y[..., 0]
    return _from_fractions(solved, scale_c, scale_y, np.asarray(across, float))


def _from_fractions(solved: FloatArray, unit_c: FloatArray, unit_y: FloatArray, across: FloatArray) -> PaddedCircuit:
    """Return the circuit from a, c and a c - b in units of a capacitance and of 1/w^2."""
    a, c = solved[..., 0] * unit_y, solved[..., 1] * unit_c
    b = a * c - solved[..., 2] * unit_y * unit_c
    ratio = np.where((b > 0.0) & (a > 0.0), b / np.where(a == 0.0, 1.0, a), np.nan)
    padder = (ratio + np.sqrt(ratio**2 + 4.0 * ratio * across)) / 2.0
    return PaddedCircuit((b / padder**2)[()], padder[()], (c - padder)[()], across[()])


def best_tracking(plain: PlainCircuit, low: float, high: float, distance: float, across: float = 0.0) -> BestTracking:
    """Return the padded circuit whose worst tracking error over a range is least.

    Parameters
    ----------
    plain : PlainCircuit
        The circuit without a padder (floats). [H, F]
    low : float
        Lower end of the plain circuit's range. [Hz]
    high : float
        Upper end. [Hz]
    distance : float
        Wanted, padded above plain, above 0. [Hz]
    across : float
        Strays and self-capacitance across the coil of the padded circuit. [F]

    Returns
    -------
    best : BestTracking
        Circuit and worst error; nan where no padder above zero does it. [H, F, Hz]

    Notes
    -----
    The least worst error swings to both sides four times with equal size. Found by exchange: solve for that
    on four frequencies, move them to the extremes of the error, repeat (a few rounds).

    References
    ----------
    E. Ya. Remez, Comptes Rendus Acad. Sci. Paris 198 (1934) 2063 (exchange method; from memory); confirmed
    against a general minimiser in tests/test_physics_tracking.py.
    """
    grid = np.linspace(low, high, _GRID)
    return best_padded_circuit(section_capacitance(plain, grid), grid + distance, across)


def best_padded_circuit(section: ArrayLike, wanted: ArrayLike, across: float = 0.0) -> BestTracking:
    """Return the padded circuit whose resonance stays closest to wanted frequencies, worst error counted.

    Parameters
    ----------
    section : (n,) array
        Capacitance of the gang section at rising frequency, strictly falling; some tens of settings at least. [F]
    wanted : (n,) array
        Resonance wanted at each. [Hz]
    across : float
        Strays and self-capacitance across the coil. [F]

    Returns
    -------
    best : BestTracking
        Circuit and worst error; nan where no padder above zero does it. [H, F, Hz]

    Notes
    -----
    As `best_tracking`, for any other circuit on the gang, a padded one too.

    References
    ----------
    E. Ya. Remez, Comptes Rendus Acad. Sci. Paris 198 (1934) 2063 (exchange method; from memory).
    """
    x, target = np.asarray(section, float), np.asarray(wanted, float)
    last = len(target) - 1
    chosen = np.array([0, last // 4, last - last // 4, last])
    best = BestTracking(PaddedCircuit(*(np.array(np.nan),) * 3, np.asarray(across, float)), np.inf)
    for _ in range(_EXCHANGES):
        circuit = _equal_swings(x[chosen], target[chosen], across)
        error = padded_frequency(circuit, x) - target
        worst = float(np.max(np.abs(error)))
        if not worst < best.worst_error * (1.0 - 1e-9):
            break
        best = BestTracking(circuit, worst)
        extremes = _extremes(error)
        if len(extremes) != len(chosen):
            break
        chosen = extremes
    return best if np.isfinite(best.worst_error) else best._replace(worst_error=float("nan"))


def _equal_swings(section: FloatArray, target: FloatArray, across: float) -> PaddedCircuit:
    """Return the circuit whose error at four frequencies is +e, -e, +e, -e for some e."""
    sign = np.array([1.0, -1.0, 1.0, -1.0])

    def circuit_for(swing: float) -> PaddedCircuit:
        return three_point_circuit(section[:3], (target + sign * swing)[:3], across)

    def miss(swing: float) -> float:
        return float(padded_frequency(circuit_for(swing), section[3]) - target[3] - sign[3] * swing)

    before, after = 0.0, 1e-4 * float(target[-1] - target[0])
    miss_before = miss(before)
    for _ in range(30):  # secant: nearly linear in the swing
        miss_after = miss(after)
        if not abs(miss_after) > 1e-12 * target[-1] or miss_after == miss_before:
            break
        before, after, miss_before = (
            after,
            after - miss_after * (after - before) / (miss_after - miss_before),
            miss_after,
        )
    return circuit_for(after)


def _extremes(error: FloatArray) -> NDArray[np.intp]:
    """Return where the error is greatest between its changes of sign."""
    ends = np.flatnonzero(np.diff(np.sign(error)) != 0.0) + 1
    pieces = np.split(np.abs(error), ends)
    starts = np.concatenate([[0], ends])
    return np.array([start + int(np.argmax(piece)) for start, piece in zip(starts, pieces, strict=True)])


def best_scale(shape: ArrayLike, target: ArrayLike) -> FloatArray:
    """Return the factor that brings one set of frequencies closest to another, worst error counted.

    Parameters
    ----------
    shape : (n,) or (m, n) array
        Frequencies of a circuit with any one coil, along the last axis. [Hz]
    target : (n,) or (m, n) array
        Frequencies wanted. [Hz]

    Returns
    -------
    scale : float or (m,) array
        Frequencies go with it and the coil with its inverse square: L = L_any/scale^2. [-]

    Notes
    -----
    The worst error is convex in the scale; golden-section steps to 1e-9.

    References
    ----------
    J. Kiefer, Sequential minimax search for a maximum, Proc. AMS 4 (1953) 502-506.
    """
    g, t = np.asarray(shape, float), np.asarray(target, float)
    ratio = t / g
    low, high = ratio.min(axis=-1), ratio.max(axis=-1)
    golden = (np.sqrt(5.0) - 1.0) / 2.0

    def worst(scale: FloatArray) -> FloatArray:
        return np.asarray(np.max(np.abs(scale[..., None] * g - t), axis=-1))

    for _ in range(44):
        inner, outer = high - golden * (high - low), low + golden * (high - low)
        keep_low = worst(inner) <= worst(outer)
        low, high = np.where(keep_low, low, inner), np.where(keep_low, outer, high)
    return ((low + high) / 2.0)[()]
