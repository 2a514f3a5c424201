"""Where an element that moves inductance stands at each frequency, from the table that its coil brings along."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from partpick.result import BandFigures, Candidate

Floats = NDArray[np.float64]

ROUNDS = 6  # until a capacitance that depends on frequency has settled
GRAIN = 9  # decimal places of a setting: rounding at the ends


def positions(candidate: Candidate, figures: BandFigures) -> tuple[Floats, Floats, Floats]:
    """Return frequency, setting and inductance at every row of the coil's table, from the low end on.

    A little of the coil's own inductance depends on frequency: the table is stretched to what the band has at its
    ends. Of the capacitance the coil's own goes with the setting, all else with frequency.
    """
    coil = next(coil for coil in candidate.coils if coil.reference == figures.coil)
    tuned = coil.extra["tuned"]
    assert isinstance(tuned, dict)
    setting, table, own = (np.array(tuned[key], float) for key in ("setting", "inductance_h", "self_capacitance_f"))
    low, high = _number(figures, "inductance_low_h"), figures.inductance
    inductance = high + (table - table[-1]) / (table[0] - table[-1]) * (low - high)
    ends = [_number(figures, key) for key in ("tuned_low_hz", "tuned_high_hz")]
    others = [
        _number(figures, f"capacitance_{end}_f") - _number(figures, f"self_capacitance_{end}_f")
        for end in ("low", "high")
    ]
    frequency = np.linspace(ends[0], ends[1], len(setting))
    for _ in range(ROUNDS):
        capacitance = np.interp(frequency, ends, others) + own
        frequency = 1.0 / (2 * np.pi * np.sqrt(inductance * capacitance))
    frequency[[0, -1]] = ends  # rounding
    return frequency, setting, np.asarray(inductance)


def inductance_at(frequency: Floats, inductance: Floats) -> Callable[[Floats], Floats]:
    """Return the inductance that a coil must have, as a function of frequency, smooth through a rising table. [H]"""
    from scipy.interpolate import PchipInterpolator

    smooth = PchipInterpolator(frequency, inductance)
    return lambda wanted: np.asarray(smooth(np.clip(wanted, frequency[0], frequency[-1])))


def setting_for(setting: Floats, inductance: Floats) -> Callable[[Floats], Floats]:
    """Return the setting as a function of the inductance, smooth through a falling table. [mm, turn or degree]"""
    from scipy.interpolate import PchipInterpolator

    smooth = PchipInterpolator(inductance[::-1], setting[::-1])
    ends = inductance[-1], inductance[0]
    return lambda wanted: np.round(np.asarray(smooth(np.clip(wanted, *ends)), float), GRAIN)


def single_valued(frequency: Floats, inductance: Floats) -> bool:
    """Whether each frequency is tuned at one place: not so where the idle turns' capacitance outgrows the rest."""
    return bool(np.all(np.diff(frequency) > 0) and np.all(np.diff(inductance) < 0))


def _number(figures: BandFigures, key: str) -> float:
    value = figures.extra[key]
    assert isinstance(value, float)
    return value
