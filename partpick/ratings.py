"""The drive of a plan and what parts may bear under it: ratings, and how much of one is used."""

from __future__ import annotations

import math
from dataclasses import dataclass

from partpick.physics.variable_capacitor import gap_breakdown_voltage
from partpick.request import Request, Trimmer, Tuning

VOLTAGE_USE = 0.5  # of a voltage rating, at most: a margin of two; common practice, no source
CURRENT_USE = 0.7  # of a current rating, at most; common practice, no source


@dataclass(frozen=True, kw_only=True)
class DriveTable:
    """[drive] of a plan: one of power, voltage and current."""

    power: float | None = None  # W into tank and load, of the carrier
    voltage: float | None = None  # V peak, held across the tank
    current: float | None = None  # A peak of the fundamental
    supply: float | None = None  # V
    klass: str = "C"
    modulation: float = 0.0  # depth
    bias: float = 0.0  # V, direct, across the capacitors

    @property
    def crest(self) -> float:
        """Highest peak over that of the carrier: 1 + m. [-]"""
        return 1.0 + self.modulation

    @property
    def effective(self) -> float:
        """Rms value, over the period of the modulation, over that of the carrier: sqrt(1 + m^2/2). [-]

        F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 7 (amplitude modulation).
        """
        return math.sqrt(1.0 + self.modulation**2 / 2.0)


def drive_of(request: Request) -> DriveTable | None:
    """Return the drive that a plan states, None where it states none."""
    stated = dict(dict(request.extra).get("drive", ()))
    if not stated:
        return None
    stated["klass"] = stated.pop("class")
    return DriveTable(**stated)  # type: ignore[arg-type]


def uses(request: Request) -> tuple[float, float]:
    """Return how much of a voltage and of a current rating may be used. [-]"""
    return (1.0, 1.0) if request.limits.stress == "rated" else (VOLTAGE_USE, CURRENT_USE)


def trimmer_rating(trimmer: Trimmer | None) -> float | None:
    """Return the peak voltage that a trimmer bears, None: not rated. [V]"""
    return None if trimmer is None else _lower(trimmer.voltage, trimmer.spacing)


def element_rating(tuning: Tuning | None) -> float | None:
    """Return the peak voltage that a tuning element bears, None: not rated. [V]"""
    if tuning is None:
        return None
    return _lower(*(float(x) if isinstance(x := tuning.get(key), (int, float)) else None for key in _GAP))


_GAP = ("voltage", "spacing")


def _lower(voltage: float | None, spacing: float | None) -> float | None:
    """Return the lower of a stated rating and of what the air between the plates bears. [V peak]"""
    gap = None if spacing is None else float(gap_breakdown_voltage(spacing))
    known = [volts for volts in (voltage, gap) if volts is not None]
    return min(known, default=None)
