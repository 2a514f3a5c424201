"""Preferred numbers of IEC 60063: the series E3 to E192, and how common a value is.

Members are three-figure whole numbers (100 is 1.00); values are exact fractions, so that a capacitor
family made here adds up exactly. References: IEC 60063, lists of E3 to E24 from memory; E48 to E192
are the powers 10^(i/n) rounded to three figures, with the one exception 9.20 in E192.
"""

from __future__ import annotations

from bisect import bisect_left
from fractions import Fraction
from functools import cache
from math import ceil, floor
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import ArrayLike, NDArray

_E24 = (100, 110, 120, 130, 150, 160, 180, 200, 220, 240, 270, 300,
        330, 360, 390, 430, 470, 510, 560, 620, 680, 750, 820, 910)  # fmt: skip
# 10^(185/192) rounds to 9.19; the standard lists 9.20.
_E192 = tuple(920 if i == 185 else round(100 * 10 ** (i / 192)) for i in range(192))

SERIES: dict[str, tuple[int, ...]] = {
    "E3": _E24[::8],
    "E6": _E24[::4],
    "E12": _E24[::2],
    "E24": _E24,
    "E48": _E192[::4],
    "E96": _E192[::2],
    "E192": _E192,
}
COMMONNESS_ORDER = ("E6", "E12", "E24", "E48", "E96", "E192")


def _exact(value: float | Fraction) -> Fraction:
    """Return the decimal number that a float is written as: 1e-12 is one millionth of a millionth."""
    return value if isinstance(value, Fraction) else Fraction(repr(float(value)))


def _decade_below(value: Fraction) -> int:
    """Return the largest d with 10^d <= value, exactly."""
    digits = len(str(value.numerator)) - len(str(value.denominator))
    return digits if Fraction(10) ** digits <= value else digits - 1


def neighbours(name: str, value: float | Fraction) -> tuple[Fraction, Fraction]:
    """Return the members of a series at or just below, and at or just above, a positive value."""
    exact = _exact(value)
    decade = Fraction(10) ** (_decade_below(exact) - 2)
    members = (*SERIES[name], 1000)
    position = bisect_left(members, exact / decade)
    above = members[position] * decade
    return (above if above == exact else members[position - 1] * decade), above


def nearest(name: str, value: float | Fraction) -> Fraction:
    """Return the member nearest to a positive value by ratio; the lower of two equally near."""
    below, above = neighbours(name, value)
    return below if _exact(value) ** 2 <= below * above else above


def series_values(name: str, low: float | Fraction, high: float | Fraction) -> tuple[Fraction, ...]:
    """Return the members of a series from `low` to `high`, both included.

    Parameters
    ----------
    name : str
        Name of the series, a key of `SERIES`.
    low, high : float or Fraction
        Ends of the range, positive, in any one unit; a float stands for its shortest decimal. [any]

    Returns
    -------
    values : tuple of Fraction
        Rising, in the unit of the ends. [any]
    """
    bottom, top = _exact(low), _exact(high)
    values: list[Fraction] = []
    for decade in range(_decade_below(bottom), _decade_below(top) + 1):
        scale = Fraction(10) ** (decade - 2)
        least, most = ceil(bottom / scale), floor(top / scale)  # the figures are whole numbers
        values.extend(figures * scale for figures in SERIES[name] if least <= figures <= most)
    return tuple(values)


@cache
def _classes() -> NDArray[np.int8]:
    """Return the class of each three-figure number 0 to 1000; 1000 is 100 of the next decade."""
    import numpy as np

    classes = np.full(1001, len(COMMONNESS_ORDER), dtype=np.int8)
    for rank, name in reversed(list(enumerate(COMMONNESS_ORDER))):
        classes[list(SERIES[name])] = rank
    classes[1000] = classes[100]
    return classes


def commonness(values: ArrayLike) -> NDArray[np.int8]:
    """Return how common values are: the coarsest series that holds each.

    Parameters
    ----------
    values : float or array
        Positive values in any unit. [any]

    Returns
    -------
    classes : array of int8
        0 for E6, then 1 E12, 2 E24, 3 E48, 4 E96, 5 E192; 6 for a value in none. The shape of `values`. [-]

    Notes
    -----
    A value belongs to a series where it is within 1e-6 of a member, which a double always is.
    """
    import numpy as np

    positive = np.asarray(values, dtype=float)
    figures = positive * 10.0 ** (2 - np.floor(np.log10(positive)))
    whole = np.rint(figures).astype(np.int64)
    member = np.abs(figures - whole) <= 1e-6 * figures
    return np.where(member, _classes()[np.clip(whole, 0, 1000)], len(COMMONNESS_ORDER)).astype(np.int8)
