"""Complete elliptic integrals and quotients of Bessel functions.

scipy has all of them, but to import it takes longer than a whole search for one pair.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

IntArray = NDArray[np.intp]

_CLOSE = 1e-9  # of the two means; one step more and they are alike to the last digit
_EXTRA_ORDERS = 30  # of the Bessel functions above |z|, where they fall faster than any power


def distinct_values(values: ArrayLike) -> tuple[FloatArray, IntArray]:
    """Return the different values of an array whose neighbours are mostly equal, such as the wires of windings.

    Parameters
    ----------
    values : array
        Any shape. [any]

    Returns
    -------
    distinct : (m,) array
        Rising, nan last. [any]
    where : array of int
        The place of each value among them, in the shape of `values`. [-]

    Notes
    -----
    Exact, any values; runs of equal neighbours are sorted as one, which is what makes it fast.

    References
    ----------
    Definition; numpy.unique does the same value by value.
    """
    whole = np.asarray(values, float)
    flat = whole.ravel()
    begins = np.ones(flat.shape, dtype=np.bool_)
    begins[1:] = flat[1:] != flat[:-1]
    starts = np.flatnonzero(begins)
    distinct, place = np.unique(flat[starts], return_inverse=True)
    where = np.repeat(place.ravel(), np.diff(np.append(starts, len(flat))))
    return distinct, where.reshape(whole.shape)


def elliptic_integrals(complement: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return the complete elliptic integrals of the first and the second kind, K(m) and E(m).

    Parameters
    ----------
    complement : float or (n,) array
        1 - m, from 0 to 1, so that nothing is lost where m is near 1. [-]

    Returns
    -------
    first, second : float or (n,) array
        K, infinite at m = 1, and E; nan for a complement below 0. [-]

    Notes
    -----
    By the arithmetic-geometric mean of 1 and sqrt(1 - m): K = pi/2 / mean, and E = K (1 - sum of
    2^(n-1) c_n^2) with c_n half the difference of the means; about 15 digits.

    References
    ----------
    M. Abramowitz and I. A. Stegun, Handbook of Mathematical Functions, 1964, 17.6.
    """
    given = np.asarray(complement, float)
    end = given == 0.0
    with np.errstate(invalid="ignore"):
        high, low = np.ones_like(given), np.sqrt(np.where(end, 1.0, given))
    weight, total = 1.0, 0.5 * (1.0 - low * low)
    while True:
        half = 0.5 * (high - low)
        total = total + weight * half * half
        high, low = 0.5 * (high + low), np.sqrt(high * low)
        weight *= 2.0
        if not np.any(np.abs(half) > _CLOSE * high):
            break
    first = np.pi / (high + low)
    second = first * (1.0 - total)
    return np.where(end, np.inf, first)[()], np.where(end, 1.0, second)[()]


def bessel_quotients(z: ArrayLike) -> tuple[ComplexArray, ComplexArray]:
    """Return J1(z)/J0(z) and J2(z)/J1(z) off the real axis, where no denominator is zero.

    Parameters
    ----------
    z : complex or (n,) array
        Argument, up to some thousands in size. [-]

    Returns
    -------
    first, second : complex or (n,) array
        The two quotients. [-]

    Notes
    -----
    By the recurrence J(n)/J(n-1) = 1/(2 n/z - J(n+1)/J(n)) from orders well above |z| downwards, the
    direction in which it is stable; about 14 digits.

    References
    ----------
    M. Abramowitz and I. A. Stegun, Handbook of Mathematical Functions, 1964, 9.1.27 and 9.12.
    """
    argument = np.asarray(z, complex)
    zero = argument == 0.0
    inverse = 1.0 / np.where(zero, 1.0, argument)
    top = int(np.max(np.abs(argument), initial=0.0)) + _EXTRA_ORDERS
    above = quotient = np.zeros_like(inverse)
    for order in range(top, 0, -1):
        above, quotient = quotient, 1.0 / (2.0 * order * inverse - quotient)
    return np.where(zero, 0.0, quotient)[()], np.where(zero, 0.0, above)[()]
