"""A coil with a contact that moves along its turns: inductance against the turns in use."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline

FloatArray = NDArray[np.float64]


def usable_turns(family: ArrayLike, least_turns: float = 3.0, continuous: bool = False) -> tuple[float, float]:
    """Return the fewest and the most turns between which the contact moves.

    Parameters
    ----------
    family : (N,) array
        Low-frequency inductance of 1 ... N turns of the same make (`solenoid.solenoid_family`). [H]
    least_turns : float
        Turns that always stay in circuit, at least 1. [-]
    continuous : bool
        Whether the contact rides on the wire; otherwise it steps from turn to turn. [-]

    Returns
    -------
    turns : tuple of two floats
        Rounded up to a whole turn at the lower end where the contact steps. [-]

    Raises
    ------
    ValueError
        If the coil has fewer turns than must stay in circuit.

    Notes
    -----
    From one turn up to the whole coil.

    References
    ----------
    Three turns at least: common practice, no source.
    """
    most = float(np.size(np.asarray(family)))
    fewest = max(1.0, least_turns if continuous else float(np.ceil(least_turns)))
    if fewest > most:
        raise ValueError(f"a coil of {most:g} turns is shorter than the least of {fewest:g} turns in use")
    return fewest, most


def section_inductance(family: ArrayLike, turns: ArrayLike, rest_shorted: bool = False) -> FloatArray:
    """Return the inductance of the turns in use, from one end of the coil to the contact.

    Parameters
    ----------
    family : (N,) array
        Low-frequency inductance of 1 ... N turns of the same make (`solenoid.solenoid_family`); the coil has
        all N turns. [H]
    turns : float or (n,) array
        Turns in use, 1 to N, whole or not. [-]
    rest_shorted : bool
        Whether the turns beyond the contact are shorted on themselves; otherwise they are open. [-]

    Returns
    -------
    inductance : float or (n,) array
        L_s with the rest open, L_s - M^2/L_r with the rest shorted; nan outside 1 to N turns. [H]

    Notes
    -----
    Exact for whole turns (coaxial rings). Between them a cubic spline through the exact values: within 0.2 %
    of a current sheet of that many turns from 3 turns on. Shorted turns are taken as without resistance; real
    ones also lower the Q.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (mutual inductance from self-inductances);
    tests/published/tapped_solenoid.csv.
    """
    of_turns = np.concatenate([[0.0], np.asarray(family, float)])
    whole = len(of_turns) - 1
    used = np.asarray(turns, float)
    used = np.where((used >= 1.0) & (used <= whole), used, np.nan)
    section = of_turns
    if rest_shorted:
        rest = of_turns[::-1]
        mutual = (of_turns[-1] - of_turns - rest) / 2.0
        section = of_turns - np.divide(mutual**2, rest, out=np.zeros_like(rest), where=rest > 0.0)
    return np.asarray(CubicSpline(np.arange(whole + 1), section)(used))[()]
