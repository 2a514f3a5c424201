"""Networks with a capacitive divider, as formulas: two capacitors with the device's own across them.

======== ============================== ==============================================
shape    written                        species order
======== ============================== ==============================================
DIVIDED  (a + b) | c | d                a (output), b (control), then ascending
CLAPPED  (s + (a + b)) | c | d          s, a (output), b (control), then ascending
SPLIT    (T + (a + b)) | c | d          a (output), b (control), then ascending; the
                                        value is that of c | d, T is the tuning element
======== ============================== ==============================================

The device's output capacitance is across a, its control capacitance across b.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

DIVIDED, CLAPPED, SPLIT = 4, 5, 6
OWN_PARTS = {DIVIDED: 2, CLAPPED: 3, SPLIT: 2}  # before those in parallel
FIRST_OF_DIVIDER = {DIVIDED: 0, CLAPPED: 1, SPLIT: 0}  # place of the capacitor at the output

Device = tuple[float, float]  # F, output to common and control to common
NO_DEVICE: Device = (0.0, 0.0)


def with_device(part: Floats, shape: int, device: Device) -> Floats:
    """Return the capacitances of networks of one shape, (m, k), with the device across its divider. [F]"""
    if device == NO_DEVICE:
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
    divider = divider_values(part, shape, device)
    if shape == CLAPPED:
        divider = part[:, 0] * divider / (part[:, 0] + divider)
    return np.asarray(divider + beside)


def divided_weights(part: Floats, shape: int, network: Floats, device: Device) -> Floats:
    """Return d ln(network) / d ln(part), (m, k), of networks of one shape; of SPLIT its divider has none. [-]"""
    grown, own = with_device(part, shape, device), OWN_PARTS[shape]
    weights = part / network[:, None]
    if shape == SPLIT:
        weights[:, :own] = 0.0
        return weights
    branch = 1.0 / (1.0 / grown[:, :own]).sum(axis=1)
    weights[:, :own] = branch[:, None] ** 2 * part[:, :own] / grown[:, :own] ** 2 / network[:, None]
    return weights
