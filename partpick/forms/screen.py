"""Which coils no band can use whatever their loss: they are left out before it is worked out."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.forms.block import Floats, Ints
from partpick.physics.self_capacitance import self_resonance_frequency

_ROUNDING = 1e-6  # what is this near to a limit is kept: the limit itself is tested on the coil as worked out

Range = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class Screen:
    """Limits on coils that inductance and self-capacitance decide; none of them set: every coil is kept."""

    proportions: Range | None = None  # winding length / mean diameter of a single layer
    inductance: Range | None = None  # H
    reactance: Range | None = None  # ohm
    self_resonance: float | None = None  # Hz, at least
    self_resonance_eased: float | None = None  # Hz, of the forms whose own resonance may be lower
    least: float = 0.0  # H, of a wound coil
    frequency: Range = (0.0, np.inf)  # Hz, of the lowest and the highest band

    def kept(
        self,
        least: Floats,
        most: Floats,
        self_capacitance: Floats,
        *,
        proportions: Floats | None = None,
        eased: bool = False,
    ) -> Ints:
        """Return the coils that some band might use, in their order.

        Parameters
        ----------
        least, most : (J,) arrays
            Between which the inductance is at every band. [H]
        self_capacitance : (J,) array
            Self-capacitance. [F]
        proportions : (J,) array, optional
            Winding length over mean diameter of single layers. [-]
        eased : bool
            Whether the form's own resonance may be lower than that of others.
        """
        useful = most >= self.least * (1 - _ROUNDING)
        if self.inductance is not None:
            useful &= _meets(least, most, self.inductance)
        if self.reactance is not None:
            low, high = (2 * np.pi * f for f in self.frequency)
            useful &= _meets(low * least, high * most, self.reactance)
        if self.proportions is not None and proportions is not None:
            useful &= _meets(proportions, proportions, self.proportions)
        lowest = self.self_resonance_eased if eased else self.self_resonance
        if lowest is not None:
            useful &= self_resonance_frequency(least, self_capacitance) >= lowest * (1 - _ROUNDING)
        return np.flatnonzero(useful)


def _meets(least: Floats, most: Floats, limits: Range) -> NDArray[np.bool_]:
    low, high = limits
    return (most >= low * (1 - _ROUNDING)) & (least <= high * (1 + _ROUNDING))
