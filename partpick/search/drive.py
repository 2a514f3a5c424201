"""What a drive puts across a tank, and what each part may bear, as the search sees them."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from partpick.physics.loading import peak_voltage

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_ROUNDING = 1e-12


@dataclass(frozen=True, kw_only=True, eq=False)
class Drive:
    """A drive with the load off, which is the worse state, and the ratings, derated; inf: not rated.

    The arrays of parts are one longer than there are parts: -1 stands for no part.
    """

    kind: str  # "power" [W], "voltage" [V peak], "current" [A peak]
    amount: float
    crest: float  # highest peak over that of the carrier
    effective: float  # rms value over the peak of the carrier
    part_voltage: Floats  # (P + 1,) V peak
    part_current: Floats  # (P + 1,) A rms
    part_capacitance: Floats  # (P + 1,) F, as written
    coil_current: Floats  # (J,) A rms
    trimmer_voltage: Floats  # (B,) V peak
    element_voltage: float = float("inf")  # V peak

    def carrier(self, reactance: Floats | float, loss: Floats) -> Floats:
        """Return the peak voltage of the carrier across a tank of a reactance [ohm] and a loss 1/Q; nan: unknown."""
        if self.kind == "voltage":
            return np.full(np.shape(loss), self.amount)
        with np.errstate(divide="ignore"):
            q = 1.0 / np.asarray(loss)
        return peak_voltage(self.amount, reactance, q) if self.kind == "power" else self.amount * reactance * q

    def on_parts(self, omega: Floats | float, acting: Floats, share: Floats, parts: NDArray[np.integer]) -> Floats:
        """Return the carrier across the tank up to which every part keeps to its ratings, (m,). [V peak]

        Parameters
        ----------
        omega : float or (m, 1) array
            Angular frequency. [1/s]
        acting : (m, k) array
            Each part as it acts there, its series inductance included. [F]
        share : (m, k) array
            Of the tank's voltage across its terminals. [-]
        parts : (m, k) array of int
            The parts, -1 for none. [-]
        """
        with np.errstate(divide="ignore", invalid="ignore"):
            # behind its own series inductance a capacitor bears more than its terminals
            plates = share * acting / self.part_capacitance[parts]
            by_voltage = self.part_voltage[parts] / (self.crest * plates)
            by_current = self.part_current[parts] / (self.effective * omega * acting * share)
        whole = np.where(parts >= 0, np.minimum(by_voltage, by_current), np.inf)
        result: Floats = whole.min(axis=1, initial=np.inf)
        return result

    def on_coil(self, reactance: Floats | float, coil: Ints | int) -> Floats:
        """Return the carrier up to which coils keep to their current rating. [V peak]"""
        most: Floats = self.coil_current[coil] * reactance / self.effective
        return most

    def on_trimmer(self, band: Ints | int) -> Floats:
        """Return the carrier up to which the trimmer keeps to its voltage rating. [V peak]"""
        most: Floats = self.trimmer_voltage[band] / self.crest
        return most

    def of_coils(self, coils: Ints) -> Drive:
        """Return the same for other coils, given as the coil that each is wound as. [-]"""
        return replace(self, coil_current=self.coil_current[coils])


def borne(carrier: Floats, *most: Floats | float) -> NDArray[np.bool_]:
    """Return where a carrier is inside every limit; an unknown one is, where nothing is rated, and there alone."""
    result = np.ones(np.shape(carrier), dtype=np.bool_)
    for limit in most:
        result &= (carrier <= limit * (1 + _ROUNDING)) | np.isposinf(limit)
    return result
