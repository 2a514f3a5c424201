"""Networks with a capacitive divider, as formulas: two capacitors with the device's own across them.

======== ============================== ==============================================
shape    written                        species order
======== ============================== ==============================================
DIVIDED  (a + b) | c | d                a (output), b (control), then ascending
CLAPPED  (s + (a + b)) | c | d          s, a (output), b (control), then ascending
SPLIT    (T + (a + b)) | c | d          a (output), b (control), then ascending; the
                                        value is that of c | d, T is the tuning element
LOADED   (a + b) | c | d                a (hot end), b (a load across it), then ascending
======== ============================== ==============================================

The device's output capacitance is across a, its control capacitance across b. Of LOADED the second figure is the
load's conductance over the angular frequency, and the value is what the divider acts as with its load on.
"""

from __future__ import annotations

from fractions import Fraction
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

DIVIDED, CLAPPED, SPLIT, LOADED = 4, 5, 6, 7
OWN_PARTS = {DIVIDED: 2, CLAPPED: 3, SPLIT: 2, LOADED: 2}  # before those in parallel
FIRST_OF_DIVIDER = {DIVIDED: 0, CLAPPED: 1, SPLIT: 0}  # of an oscillator: place of the capacitor at the output

T = TypeVar("T", float, Fraction, Floats)
Device = tuple[float, float]  # F, output to common and control to common; of LOADED see above
NO_DEVICE: Device = (0.0, 0.0)


def loaded_value(upper: T, lower: T, load: T | float) -> T:
    """Return what a divider with a load across its lower capacitor acts as, all in farad.

    Parameters
    ----------
    upper, lower : float, Fraction or (m,) array
        From the hot end to the load, and across the load. [F]
    load : float
        The load's conductance over the angular frequency. [F]
    """
    both = upper + lower
    return upper * (load * load + lower * both) / (load * load + both * both)  # type: ignore[return-value]


def loaded_slopes(upper: float, lower: float, load: float) -> tuple[float, float]:
    """Return c dC/dc of both capacitors of a divider with its load on. [F]"""
    both = upper + lower
    top, bottom = load * load + lower * both, load * load + both * both
    whole = top / bottom
    by_upper = whole + upper * (lower - 2 * both * whole) / bottom
    by_lower = upper * (both + lower - 2 * both * whole) / bottom
    return upper * by_upper, lower * by_lower


def load_across(upper: T, lower: T, load: T | float) -> T:
    """Return which share of a load's conductance the tank sees, through a divider; arguments as `loaded_value`. [-]"""
    both = upper + lower
    return upper * upper / (load * load + both * both)  # type: ignore[return-value]


def with_device(part: Floats, shape: int, device: Device) -> Floats:
    """Return the capacitances of networks of one shape, (m, k), with the device across its divider. [F]"""
    if device == NO_DEVICE or shape == LOADED:
        return part
    grown = part.copy()
    first = FIRST_OF_DIVIDER[shape]
    grown[:, first] += device[0]
    grown[:, first + 1] += device[1]
    return grown


def divider_values(part: Floats, shape: int, device: Device) -> Floats:
    """Return the two halves of a divider in series, the device across them, (m,). [F]"""
    grown = with_device(part, shape, device)
    first = FIRST_OF_DIVIDER[shape]
    one, two = grown[:, first], grown[:, first + 1]
    return np.asarray(one * two / (one + two))


def divided_values(part: Floats, shape: int, device: Device) -> Floats:
    """Return what networks of one shape act as across the coil, (m,). [F]"""
    beside = part[:, OWN_PARTS[shape] :].sum(axis=1)
    if shape == SPLIT:
        return np.asarray(beside)
    if shape == LOADED:
        return np.asarray(loaded_value(part[:, 0], part[:, 1], device[1]) + beside)
    divider = divider_values(part, shape, device)
    if shape == CLAPPED:
        divider = part[:, 0] * divider / (part[:, 0] + divider)
    return np.asarray(divider + beside)


def divided_weights(part: Floats, shape: int, network: Floats, device: Device) -> Floats:
    """Return d ln(network) / d ln(part), (m, k), of networks of one shape; of SPLIT its divider has none. [-]

    Of LOADED the load is off: the shares of the energy, which say what the parts lose.
    """
    grown, own = with_device(part, shape, device), OWN_PARTS[shape]
    weights = part / network[:, None]
    if shape == SPLIT:
        weights[:, :own] = 0.0
        return weights
    branch = 1.0 / (1.0 / grown[:, :own]).sum(axis=1)
    weights[:, :own] = branch[:, None] ** 2 * part[:, :own] / grown[:, :own] ** 2 / network[:, None]
    return weights
