"""What one part bears at one band, and how much of its rating that takes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, fields
from typing import Any

from partpick.ratings import CURRENT_USE, VOLTAGE_USE
from partpick.result import Candidate


@dataclass(frozen=True, kw_only=True)
class PartStress:
    """Peak volts, rms amperes and heat of one part; `None`: unknown, or it does not apply."""

    reference: str
    kind: str
    frequency: float  # Hz
    voltage: float | None  # V peak, loaded
    current: float | None  # A rms, loaded
    voltage_load_off: float  # V peak
    current_load_off: float  # A rms
    heat: float | None = None  # W, loaded
    heat_load_off: float | None = None  # W
    kelvin_per_watt: float | None = None  # estimate, within a factor of two
    flux_density: float | None = None  # T peak, load off
    usual_flux_density: float | None = None  # T peak
    bias: float = 0.0  # V, direct, on a capacitor besides
    voltage_rating: float | None = None  # V peak
    current_rating: float | None = None  # A rms

    @property
    def voltage_use(self) -> float | None:
        """Voltage in the worse state over its rating, None: not rated. [-]"""
        if self.voltage_rating is None:
            return None
        return (max(self.voltage or 0.0, self.voltage_load_off) + self.bias) / self.voltage_rating

    @property
    def current_use(self) -> float | None:
        """Current in the worse state over its rating, None: not rated. [-]"""
        if self.current_rating is None:
            return None
        return max(self.current or 0.0, self.current_load_off) / self.current_rating

    @property
    def verdict(self) -> str:
        """Return "over", "near", "inside" or "not rated": the rating against the worse state.

        "near" is past the usual derating. A coil is rated in current alone, a tuning element or trimmer in
        voltage alone.
        """
        voltage, current = self.voltage_use, self.current_use
        if (voltage or 0.0) > 1.0 or (current or 0.0) > 1.0:
            return "over"
        if (voltage or 0.0) > VOLTAGE_USE * (1 + 1e-9) or (current or 0.0) > CURRENT_USE * (1 + 1e-9):
            return "near"
        needed = {"coil": (current,), "capacitor": (voltage, current)}.get(self.kind, (voltage,))
        return "not rated" if None in needed else "inside"

    def rise(self, heat: float | None) -> float | None:
        """Return the temperature rise that a heat makes, an estimate within a factor of two. [K]"""
        return None if heat is None or self.kelvin_per_watt is None else heat * self.kelvin_per_watt

    def keys(self) -> dict[str, object]:
        """Return the figures as JSON keys."""
        known = [heat for heat in (self.heat, self.heat_load_off) if heat is not None]
        return {
            "reference": self.reference,
            "kind": self.kind,
            "voltage_peak_v": self.voltage,
            "current_rms_a": self.current,
            "voltage_load_off_peak_v": self.voltage_load_off,
            "current_load_off_rms_a": self.current_load_off,
            "dissipation_w": max(known, default=None),
            "dissipation_loaded_w": self.heat,
            "dissipation_load_off_w": self.heat_load_off,
            "temperature_rise_k": self.rise(self.heat),
            "temperature_rise_load_off_k": self.rise(self.heat_load_off),
            "flux_density_t": self.flux_density,
            "usual_flux_density_t": self.usual_flux_density,
            "voltage_rating_v": self.voltage_rating,
            "current_rating_a": self.current_rating,
            "voltage_use": self.voltage_use,
            "current_use": self.current_use,
            "verdict": self.verdict,
        }


@dataclass(frozen=True)
class Stressed:
    """A part at a band."""

    band: str  # its name
    part: PartStress


_WORSE = ("voltage", "current", "voltage_load_off", "current_load_off", "heat", "heat_load_off")


def worse_of(one: PartStress, other: PartStress) -> PartStress:
    """Return the larger of each figure of one part at two frequencies; a figure unknown at either is unknown."""
    load_off = max(one, other, key=lambda part: part.voltage_load_off)
    flux = max(one, other, key=lambda part: (part.flux_density or 0.0) / (part.usual_flux_density or 1.0))
    figures = {field.name: getattr(load_off, field.name) for field in fields(PartStress)}
    for name in _WORSE:
        both = (getattr(one, name), getattr(other, name))
        figures[name] = None if None in both else max(both)
    figures["flux_density"], figures["usual_flux_density"] = flux.flux_density, flux.usual_flux_density
    return PartStress(**figures)


def stressed_parts(candidate: Candidate) -> Iterator[tuple[str, Mapping[str, Any]]]:
    """Yield each part at each band of a candidate that has its stress: name of the band, JSON keys of the part."""
    for band in candidate.bands:
        stress = band.extra.get("stress")
        for part in stress["parts"] if isinstance(stress, Mapping) else ():
            yield band.name, part
