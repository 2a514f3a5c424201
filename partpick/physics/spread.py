"""How far a coil as wound may lie from its computed inductance: model errors and tolerances together.

All are fractions of the inductance, either way. A model error is the largest seen in comparisons; its source
stands beside it.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.sheet import inductance_sensitivities

FloatArray = NDArray[np.float64]

# The dipole formula for the radio-frequency shift is up to 0.2 of the shift off against boundary elements,
# and a proximity factor known to 10 % moves it by a quarter: a third of the shift covers both.
_SHIFT_ERROR: Final = 1.0 / 3.0


def solenoid_model_spread(turns: ArrayLike, pitch_over_diameter: ArrayLike, shift: ArrayLike = 0.0) -> FloatArray:
    """Return the model error of a single-layer coil's inductance.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns, at least 1. [-]
    pitch_over_diameter : float or (n,) array
        Pitch over mean diameter. [-]
    shift : float or (n,) array
        Part of the low-frequency inductance lost at radio frequency, 1 - L/L_dc; 0 for low frequency. [-]

    Returns
    -------
    spread : float or (n,) array
        Relative error to expect of the summed turns, with the loss at radio frequency. [-]

    Notes
    -----
    Rings read above a true helix by up to hypot(0.09 p/(N D), 0.03 (p/D)^2): envelope of 160 coils of 3 to 20
    turns, 3 to 30 wires wide, pitch 1.05 to 3 wires. To that, in quadrature, a third of the shift. Leads are
    not counted: about 1 nH per mm.

    References
    ----------
    Own Neumann integrals over a helix, which meet the published ones of
    tests/published/solenoid_round_wire.csv; boundary elements of
    tests/published/high_frequency_inductance.csv.
    """
    ratio = np.asarray(pitch_over_diameter, float)
    rings = np.hypot(0.09 * ratio / np.asarray(turns, float), 0.03 * ratio**2)
    result: FloatArray = np.hypot(rings, _SHIFT_ERROR * np.abs(np.asarray(shift, float)))[()]
    return result


def solenoid_spread(
    length_over_diameter: ArrayLike,
    diameter_tolerance: ArrayLike,
    length_tolerance: ArrayLike,
    model_spread: ArrayLike,
) -> FloatArray:
    """Return the spread of a single-layer coil's inductance from its sizes and the model.

    Parameters
    ----------
    length_over_diameter : float or (n,) array
        Winding length over mean diameter, above 0. [-]
    diameter_tolerance : float or (n,) array
        Tolerance of the mean diameter, a fraction either way. [-]
    length_tolerance : float or (n,) array
        Tolerance of the winding length or pitch, a fraction either way. [-]
    model_spread : float or (n,) array
        Model error (`solenoid_model_spread`). [-]

    Returns
    -------
    spread : float or (n,) array
        Root of the sum of squares, a fraction either way. [-]

    Notes
    -----
    First order in each tolerance: good to a tenth of itself up to 10 %. Turns are counted, not measured.

    References
    ----------
    Propagation of independent errors; sensitivities by tests/published/sheet_sensitivity.csv.
    """
    by = inductance_sensitivities(length_over_diameter)
    diameter = by.diameter * np.asarray(diameter_tolerance, float)
    length = by.length * np.asarray(length_tolerance, float)
    result: FloatArray = np.sqrt(diameter**2 + length**2 + np.asarray(model_spread, float) ** 2)[()]
    return result


def ring_spread(al_tolerance: ArrayLike, permeability: ArrayLike, leak: ArrayLike) -> FloatArray:
    """Return the spread of a ring's inductance AL N^2, from its material and what runs outside the core.

    Parameters
    ----------
    al_tolerance : float or (n,) array
        Tolerance of AL or of the permeability, a fraction either way. [-]
    permeability : float or (n,) array
        Relative permeability of the material. [-]
    leak : float or (n,) array
        Inductance outside the core over AL N^2 (`cores.ring_leak`), not counted in the nominal. [-]

    Returns
    -------
    spread : float or (n,) array
        Root of the sum of squares, a fraction of AL N^2. [-]

    Notes
    -----
    The leak is uncertain by half of itself for permeability 1, by all of itself above (`cores.ring_leak`):
    up to 1.5 or 2 times the leak may come on top.

    References
    ----------
    Propagation of independent errors.
    """
    outside = np.asarray(leak, float)
    doubt = np.where(np.asarray(permeability, float) > 1.0, 1.0, 0.5)
    return np.hypot(np.asarray(al_tolerance, float), outside * (1.0 + doubt))[()]
