"""Proximity factor of single-layer windings: by how much neighbouring turns raise the wire's resistance.

The factor is that of many turns at high frequency, from measurements; `loss.py` brings it down to the
frequency in hand. Its weak corner, close winding on a short coil, is stated by `proximity_factor_spread`.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# R. G. Medhurst, "H.F. resistance and self-capacitance of single-layer solenoids", Wireless Engineer 24
# (1947) 35-43 and 80-92, table of the proximity factor; from memory, two figures uncertain in any cell.
# Rows: wire diameter / pitch 0.1 ... 1.0; columns: winding length / mean diameter.
# Cells with three decimals were not at hand. They are the mean of two monotone cubic interpolations of the
# others, of Phi along arctan(l/D) and of (Phi - 1)/(d/s)^2 along d/s (one of them at the rim); leaving out
# known cells in turn, this returns them within 1.2 % rms and 4 % at worst. Three cells of the last column
# (0.1, 0.5, 0.9) come from `_ENDLESS` below, which meets the other cells of that column within 0.3 %.
_LENGTH_RATIOS: Final = np.array([0.0, 0.2, 0.4, 0.6, 0.8, 1.0, 2.0, 4.0, 6.0, 8.0, 10.0, np.inf])
_MANY_TURNS: Final = np.array(
    [
        [1.02, 1.02, 1.03, 1.030, 1.03, 1.03, 1.035, 1.039, 1.04, 1.04, 1.04, 1.049],  # d/s = 0.1
        [1.07, 1.08, 1.100, 1.10, 1.10, 1.10, 1.126, 1.15, 1.16, 1.165, 1.164, 1.19],
        [1.16, 1.181, 1.21, 1.22, 1.23, 1.240, 1.28, 1.32, 1.34, 1.349, 1.35, 1.395],
        [1.283, 1.29, 1.33, 1.38, 1.415, 1.45, 1.50, 1.54, 1.560, 1.57, 1.58, 1.65],
        [1.44, 1.48, 1.54, 1.598, 1.64, 1.67, 1.74, 1.779, 1.80, 1.81, 1.83, 1.930],  # d/s = 0.5
        [1.74, 1.77, 1.837, 1.89, 1.92, 1.94, 1.992, 2.01, 2.03, 2.08, 2.103, 2.22],
        [2.12, 2.195, 2.28, 2.38, 2.44, 2.423, 2.32, 2.27, 2.29, 2.343, 2.37, 2.51],
        [2.746, 2.83, 2.97, 3.10, 3.154, 3.17, 2.74, 2.60, 2.597, 2.62, 2.65, 2.815],
        [3.73, 3.84, 3.99, 4.154, 4.17, 4.10, 3.36, 3.013, 2.92, 2.90, 2.93, 3.110],
        [5.31, 5.45, 5.675, 5.80, 5.80, 5.55, 4.364, 3.54, 3.31, 3.20, 3.202, 3.41],  # d/s = 1.0
    ]
)

# Endless solenoid, field on one side only, skin depth -> 0: (Phi - 1)/(d/s)^2 from periodic boundary
# elements in two dimensions (computed for this table, error below 0.1 %); d/s = 0 is the exact limit pi^2/2.
_ENDLESS_RATIO: Final = np.array(
    [0.0, 0.1, 0.15, 0.2, 0.25, 0.3, 0.4, 0.45, 0.55, 0.6, 0.7, 0.75, 0.8, 0.85, 0.9, 1.0]
)
_ENDLESS: Final = np.array(
    [1.0, 1.0487, 1.1077, 1.1872, 1.2843, 1.3959, 1.6507, 1.7884, 2.0745, 2.2205, 2.5150, 2.6632, 2.8118,
     2.9608, 3.1103, 3.4102]
)  # fmt: skip

# Mean square of the field that thin turns of a long winding meet, as (Phi - 1)/(d/s)^2 for d/s -> 0, for the
# columns of `_LENGTH_RATIOS`: own sum over coaxial rings, exact at the ends (pi^2/6 flat, pi^2/2 endless).
_THIN_WIRE: Final = np.array(
    [np.pi**2 / 6, 1.808, 2.034, 2.256, 2.462, 2.648, 3.327, 3.970, 4.254, 4.410, 4.508, np.pi**2 / 2]
)

_MANY: Final = 40  # turns from which the published table stands as it is


def proximity_factor(d_over_s: ArrayLike, l_over_d: ArrayLike) -> FloatArray:
    """Return the high-frequency proximity factor of a single-layer solenoid of many turns.

    Parameters
    ----------
    d_over_s : float or (n,) array
        Bare wire diameter over pitch, 0 to 1. [-]
    l_over_d : float or (n,) array
        Winding length over mean diameter, 0 to infinity; broadcasts with `d_over_s`. [-]

    Returns
    -------
    factor : float or (n,) array
        Resistance of the wire in the coil over that of the same wire straight; nan outside the ranges. [-]

    Notes
    -----
    Linear in both ratios between the cells of the table; from l/D = 10 to infinity linear in D/l; below
    d/s = 0.1 as (d/s)^2. For 30 turns or more. Within 10 % up to d/s = 0.5; see `proximity_factor_spread`.

    References
    ----------
    R. G. Medhurst, H.F. resistance and self-capacitance of single-layer solenoids, Wireless Engineer 24
    (1947) 35-43, 80-92, table of Phi; from memory, gaps filled by interpolation as stated in the source.
    """
    ratio, length = np.broadcast_arrays(np.asarray(d_over_s, float), np.asarray(l_over_d, float))
    good = (ratio >= 0.0) & (ratio <= 1.0) & (length >= 0.0)
    safe = np.where(good, ratio, 0.5)
    tenth = np.clip(10.0 * safe - 1.0, 0.0, 9.0)
    row = np.minimum(tenth.astype(np.intp), 8)
    column, share = _column(np.where(good, length, 1.0))
    cell = 12 * row + column
    flat = _MANY_TURNS.ravel()
    upper = flat[cell] + share * (flat[cell + 1] - flat[cell])
    lower = flat[cell + 12] + share * (flat[cell + 13] - flat[cell + 12])
    factor = upper + (tenth - row) * (lower - upper)
    factor = np.where(safe < 0.1, 1.0 + (factor - 1.0) * (safe / 0.1) ** 2, factor)
    return np.where(good, factor, np.nan)[()]


def endless_proximity_factor(d_over_s: ArrayLike) -> FloatArray:
    """Return the high-frequency proximity factor of an endless single layer, such as a full ring winding.

    Parameters
    ----------
    d_over_s : float or (n,) array
        Bare wire diameter over pitch, 0 to 1. [-]

    Returns
    -------
    factor : float or (n,) array
        Resistance of the wire in the layer over that of the same wire straight; nan outside the range. [-]

    Notes
    -----
    Skin depth -> 0, field on one side only. Interpolated within 0.2 %. Tends to 1 + (pi^2/2)(d/s)^2 for
    thin wire. A ring's turns lie closer in the bore than outside: take the pitch of `loss.ring_pitch`.

    References
    ----------
    Computed by boundary elements for this table; the thin-wire limit is that of S. Butterworth, On the
    alternating current resistance of solenoidal coils, Proc. R. Soc. A 107 (1925) 693-715.
    """
    ratio = np.asarray(d_over_s, float)
    known = _ENDLESS_RATIO[1:]
    excess = np.interp(
        ratio, _ENDLESS_RATIO, np.concatenate([[np.pi**2 / 2], (_ENDLESS[1:] - 1.0) / known**2])
    )
    good = (ratio >= 0.0) & (ratio <= 1.0)
    return np.where(good, 1.0 + excess * ratio**2, np.nan)[()]


def few_turns_factor(turns: ArrayLike) -> FloatArray:
    """Return the share of the many-turn proximity effect that a winding of few turns shows.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1; between whole turns linear. [-]

    Returns
    -------
    share : float or (n,) array
        Factor on (Phi - 1): 0 for one turn, rising to 1 for 40 or more; nan below one turn. [-]

    Notes
    -----
    Turn i of N thin parallel wires meets a field proportional to H(i-1) - H(N-i), with H the harmonic
    numbers; u is the mean square of that, and the share (u(N)/u(40))^1.3. The power is fitted to boundary
    elements for 5 to 30 turns (tests/published/proximity_few_turns.csv), where it brings the table from 9 %
    rms to 2 % (6 % at worst) for d/s up to 0.6, from 14 % to 4 % (15 %) up to 0.8. From 40 turns on the
    published table stands as it is.

    References
    ----------
    Own derivation from the field of thin parallel wires; the same sums stand in S. Butterworth, Effective
    resistance of inductance coils at radio frequency, Experimental Wireless 3 (1926) 203-210 (from memory).
    """
    number = np.asarray(turns, float)
    share = np.interp(number, np.arange(1.0, _MANY + 1.0), _FEW_TURNS)
    return np.where(number >= 1.0, share, np.nan)[()]


def solenoid_proximity_factor(turns: ArrayLike, d_over_s: ArrayLike, l_over_d: ArrayLike) -> FloatArray:
    """Return the high-frequency proximity factor of a single-layer solenoid of any number of turns.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1. [-]
    d_over_s : float or (n,) array
        Bare wire diameter over pitch, 0 to 1. [-]
    l_over_d : float or (n,) array
        Winding length (turns times pitch) over mean diameter. [-]

    Returns
    -------
    factor : float or (n,) array
        Resistance of the wire in the coil over that of the same wire straight; nan outside the ranges. [-]

    Notes
    -----
    1 + (Phi - 1) u, with Phi of `proximity_factor` and u of `few_turns_factor`. One turn: exactly 1.

    References
    ----------
    R. G. Medhurst, Wireless Engineer 24 (1947) 35-43, 80-92, for many turns; few turns by own derivation.
    """
    excess = proximity_factor(d_over_s, l_over_d) - 1.0
    return (1.0 + excess * few_turns_factor(turns))[()]


def thin_wire_proximity(l_over_d: ArrayLike) -> FloatArray:
    """Return the proximity excess of thin wire in a long winding, (Phi - 1)/(d/s)^2 as d/s -> 0.

    Parameters
    ----------
    l_over_d : float or (n,) array
        Winding length over mean diameter, 0 to infinity. [-]

    Returns
    -------
    excess : float or (n,) array
        Between pi^2/6 (flat row) and pi^2/2 (endless solenoid); nan below 0. [-]

    Notes
    -----
    Mean square of the transverse field over the turns, summed over coaxial rings, many turns. Interpolated
    within 1 %. It is what a strand of a stranded wire meets, whose own field hardly disturbs the others.

    References
    ----------
    Own sum; limits as in S. Butterworth, On the alternating current resistance of solenoidal coils, Proc.
    R. Soc. A 107 (1925) 693-715.
    """
    length = np.asarray(l_over_d, float)
    column, share = _column(np.where(length >= 0.0, length, 0.0))
    excess = _THIN_WIRE[column] + share * (_THIN_WIRE[column + 1] - _THIN_WIRE[column])
    return np.where(length >= 0.0, excess, np.nan)[()]


def proximity_factor_spread(d_over_s: ArrayLike, l_over_d: ArrayLike) -> FloatArray:
    """Return the model error of the proximity factor, as a fraction either way.

    Parameters
    ----------
    d_over_s : float or (n,) array
        Bare wire diameter over pitch. [-]
    l_over_d : float or (n,) array
        Winding length over mean diameter. [-]

    Returns
    -------
    spread : float or (n,) array
        Relative error to expect of `solenoid_proximity_factor`. [-]

    Notes
    -----
    0.10 up to d/s = 0.5; above it rises to 0.30 from d/s = 0.7 on short coils (l/D up to 1), where the
    factor depends on skin depth and number of turns and the published table leaves boundary elements by as
    much; on long coils (l/D from 2) to 0.15 at 0.7 and 0.25 at 0.9. Turns that nearly touch (d/s from 0.9) on
    a short coil may reach twice the factor once the skin is very thin; no figure covers that.

    References
    ----------
    Differences between R. G. Medhurst, Wireless Engineer 24 (1947), table of Phi, and boundary-element
    computations; tests/published/proximity_many_turns.csv.
    """
    ratio = np.asarray(d_over_s, float)
    short = np.interp(ratio, [0.5, 0.7], [0.10, 0.30])
    long = np.interp(ratio, [0.5, 0.7, 0.9], [0.10, 0.15, 0.25])
    result: FloatArray = short + (long - short) * np.clip(np.asarray(l_over_d, float) - 1.0, 0.0, 1.0)
    return result


def _column(length: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    """Return the column left of each length ratio and the way to the next, linear in D/l in the last gap."""
    column = np.clip(np.searchsorted(_LENGTH_RATIOS, length, side="right") - 1, 0, 10)
    left = _LENGTH_RATIOS[column]
    width = np.where(column < 10, np.diff(_LENGTH_RATIOS)[column], 1.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(column < 10, (length - left) / width, 1.0 - 10.0 / length)
    return column, share


def _few_turns_table() -> FloatArray:
    """Return the share for 1 ... `_MANY` turns."""
    harmonic = np.concatenate([[0.0], np.cumsum(1.0 / np.arange(1, _MANY))])
    field = np.array([np.mean((harmonic[:n] - harmonic[:n][::-1]) ** 2) for n in range(1, _MANY + 1)])
    return np.asarray((field / field[-1]) ** 1.3)


_FEW_TURNS: Final = _few_turns_table()
