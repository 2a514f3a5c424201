"""What a drive does to each part of a tank: voltage, current, heat and rating, and the cautions that follow.

Two states are looked at: with the load as stated, and with the load off at the same drive, which is the
one that flashes over. A carrier is taken; amplitude modulation raises every peak by its depth.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from partpick.conduction import conduction_warnings
from partpick.connection import Connection, Parallel, Part, parse_connection
from partpick.physics.loading import circulating_current, peak_voltage
from partpick.physics.resonance import effective_capacitance
from partpick.request import Request
from partpick.result import BandFigures, Candidate, PartLine
from partpick.units import format_quantity

CAUTION_POWER = 1.0  # W of drive, and
CAUTION_VOLTAGE = 30.0  # V peak anywhere: from there cautions are told; common practice, no source
VOLTAGE_USE = 0.5  # of a capacitor's voltage rating, at most; common practice, no source
CURRENT_USE = 0.7  # of its radio-frequency current rating, at most; common practice, no source
# Peak voltage of the device over its supply: twice in a tuned stage; class E: N. O. Sokal and A. D. Sokal, Class E,
# IEEE J. Solid-State Circuits SC-10 (1975) 168-176 (from memory).
DEVICE_PEAK = {"A": 2.0, "B": 2.0, "C": 2.0, "E": 3.56}


LOCAL_RULES = (
    "Local law, electrical codes and the advice of a licensed or otherwise qualified person come first. A computed "
    "figure is no permission to energise anything."
)


@dataclass(frozen=True, kw_only=True)
class PartStress:
    """What one part bears at one band; peak volts, rms amperes."""

    reference: str
    kind: str
    voltage: float  # V peak, loaded
    current: float  # A rms, loaded
    voltage_load_off: float  # V peak
    current_load_off: float  # A rms
    dissipation: float | None  # W, the larger of both states; None: loss unknown
    voltage_rating: float | None = None  # V peak
    current_rating: float | None = None  # A rms

    @property
    def verdict(self) -> str:
        """Return "over", "near", "inside" or "not rated": the derated rating against the worse state."""
        if self.voltage_rating is None and self.current_rating is None:
            return "not rated"
        voltage = self.voltage_load_off / self.voltage_rating if self.voltage_rating else 0.0
        current = self.current_load_off / self.current_rating if self.current_rating else 0.0
        if voltage > 1.0 or current > 1.0:
            return "over"
        if voltage > VOLTAGE_USE or current > CURRENT_USE:
            return "near"
        return "inside" if self.voltage_rating is not None and self.current_rating is not None else "not rated"


def with_stress(request: Request, candidate: Candidate) -> Candidate:
    """Return a candidate with what the stated drive does to it; itself where no drive is stated.

    Adds `stress` to each band's further keys, `cautions` and `device_peak_v` to the candidate's, and a warning
    for each part that is over or near its rating or has none.
    """
    drive: dict[str, Any] = dict(dict(request.extra).get("drive", ()))
    if not drive:
        return candidate
    parts = {part.reference: part for part in candidate.parts}
    bands, every = [], []
    for band in candidate.bands:
        stresses = band_stress(drive, band, parts)
        every += [(band, stress) for stress in stresses or ()]
        keys = None if stresses is None else _keys(band, stresses)
        bands.append(replace(band, extra={**band.extra, "stress": keys}))
    supply = drive["supply"]
    device = None if supply is None else supply * DEVICE_PEAK[drive["class"]] * (1 + drive["modulation"])
    unknown = [band.name for band in bands if band.extra["stress"] is None]
    conducts = conduction_warnings(request.tuning, bands)
    return replace(
        candidate,
        bands=tuple(bands),
        warnings=(*candidate.warnings, *_rating_warnings(every), *_unknown_warnings(unknown), *conducts),
        extra={
            **candidate.extra,
            "device_peak_v": device,
            "cautions": _cautions(drive, every, device, bool(unknown)),
        },
    )


# ---------------------------------------------------------------- one band


def band_stress(
    drive: Mapping[str, Any], band: BandFigures, parts: Mapping[str, PartLine]
) -> tuple[PartStress, ...] | None:
    """Return what each part of a band bears; None where a Q that decides it is unknown.

    Parameters
    ----------
    drive : mapping
        Keys of the table [drive], SI: one of `power`, `voltage` and `current`, and `modulation`.
    band : BandFigures
        With its unloaded Q, and its `load` among the further keys where one is stated.
    parts : mapping
        Every part by its reference.
    """
    loaded, load_off = _tank_voltages(drive, band)
    if loaded is None or load_off is None:
        return None
    stresses = [_coil(band, parts, loaded, load_off)]
    for reference, share, value, acting in _across(band, parts):
        part = parts[reference]
        # behind its own series inductance a capacitor bears more than its terminals
        plates = share * acting / value
        per_volt = 2 * math.pi * _frequency(band) * acting * share / math.sqrt(2)
        lost = None if part.q is None or _beyond(part, band) else plates * per_volt / math.sqrt(2) / part.q
        stresses.append(
            PartStress(
                reference=reference,
                kind=part.kind,
                voltage=loaded * plates,
                current=loaded * per_volt,
                voltage_load_off=load_off * plates,
                current_load_off=load_off * per_volt,
                dissipation=None if lost is None else max(loaded, load_off) ** 2 * lost,
                voltage_rating=part.voltage,
                current_rating=part.rf_current,
            )
        )
    return tuple(stresses)


def _across(band: BandFigures, parts: Mapping[str, PartLine]) -> Iterator[tuple[str, float, float, float]]:
    """Return each part across the coil: reference, share of the voltage, capacitance, how that acts."""
    values = {reference: part.value or 0.0 for reference, part in parts.items()}
    lowest = band.extra.get("tuning_low_f")
    if isinstance(lowest, (int, float)):
        values["T"] = float(lowest)  # figures are those of the high end of the range
    acting = {
        reference: float(effective_capacitance(value, parts[reference].series_inductance or 0.0, _frequency(band)))
        for reference, value in values.items()
        if parts[reference].unit == "F"
    }
    tree = parse_connection(band.connection)
    if tree is not None:
        # leads and switch in series with the network raise the voltage on it
        rise = 1.0 if band.network is None else band.network / _acting(tree, acting)
        for reference, share in _voltage_shares(tree, acting, rise):
            yield reference, share, values[reference], acting[reference]
    trimmer = next((p for p in parts.values() if p.kind == "trimmer" and band.name in p.bands), None)
    if trimmer is not None and band.trimmer is not None:
        yield trimmer.reference, 1.0, band.trimmer, band.trimmer


def _tank_voltages(drive: Mapping[str, Any], band: BandFigures) -> tuple[float | None, float | None]:
    """Return the peak voltage across the tank, loaded and with the load off. [V]"""
    peak = 1.0 + drive["modulation"]
    if drive["voltage"] is not None:
        return drive["voltage"] * peak, drive["voltage"] * peak
    unloaded = band.q
    load = band.extra.get("load")
    loaded = load.get("loaded_q") if isinstance(load, Mapping) else unloaded
    if unloaded is None or not isinstance(loaded, (int, float)):
        return None, None
    if drive["power"] is not None:
        states = [float(peak_voltage(drive["power"], band.reactance, q)) for q in (loaded, unloaded)]
    else:
        states = [drive["current"] * q * band.reactance for q in (loaded, unloaded)]
    return states[0] * peak, states[1] * peak


def _frequency(band: BandFigures) -> float:
    """Return where the band's figures were taken. [Hz]"""
    return band.reactance / (2 * math.pi * band.inductance)


def _beyond(part: PartLine, band: BandFigures) -> bool:
    return part.q_below is not None and _frequency(band) > part.q_below


def _coil(band: BandFigures, parts: Mapping[str, PartLine], loaded: float, load_off: float) -> PartStress:
    amperes = [float(circulating_current(volts, band.reactance)) / math.sqrt(2) for volts in (loaded, load_off)]
    lost = None if band.coil_q is None else max(amperes) ** 2 * band.reactance / band.coil_q
    part = parts.get(band.coil)
    return PartStress(
        reference=band.coil,
        kind="coil",
        voltage=loaded,
        current=amperes[0],
        voltage_load_off=load_off,
        current_load_off=amperes[1],
        dissipation=lost,
        current_rating=part.rf_current if part else None,
    )


def _voltage_shares(tree: Connection, values: Mapping[str, float], share: float = 1.0) -> Iterator[tuple[str, float]]:
    """Return each part with its share of the voltage across the whole: in series by 1/C."""
    if isinstance(tree, Part):
        yield tree.reference, share
    elif isinstance(tree, Parallel):
        for branch in tree.branches:
            yield from _voltage_shares(branch, values, share)
    else:
        elastance = [1 / _acting(branch, values) for branch in tree.branches]
        for branch, own in zip(tree.branches, elastance, strict=True):
            yield from _voltage_shares(branch, values, share * own / math.fsum(elastance))


def _acting(tree: Connection, values: Mapping[str, float]) -> float:
    if isinstance(tree, Part):
        return values[tree.reference]
    own = [_acting(branch, values) for branch in tree.branches]
    return math.fsum(own) if isinstance(tree, Parallel) else 1 / math.fsum(1 / value for value in own)


def _keys(band: BandFigures, stresses: Sequence[PartStress]) -> dict[str, object]:
    """Return a band's stress as further JSON keys; the contact carries what all of its capacitors do."""
    coil = stresses[0]
    in_contact = [s for s in stresses[1:] if s.kind == "capacitor"]
    network = band.network or 0.0
    omega = 2 * math.pi * _frequency(band)
    return {
        "voltage_peak_v": coil.voltage,
        "current_peak_a": coil.current * math.sqrt(2),
        "voltage_load_off_peak_v": coil.voltage_load_off,
        "current_load_off_peak_a": coil.current_load_off * math.sqrt(2),
        "contact_rms_a": coil.voltage_load_off * omega * network / math.sqrt(2) if in_contact else None,
        "parts": [
            {
                "reference": stress.reference,
                "voltage_peak_v": stress.voltage,
                "current_rms_a": stress.current,
                "voltage_load_off_peak_v": stress.voltage_load_off,
                "current_load_off_rms_a": stress.current_load_off,
                "dissipation_w": stress.dissipation,
                "voltage_rating_v": stress.voltage_rating,
                "current_rating_a": stress.current_rating,
                "verdict": stress.verdict,
            }
            for stress in stresses
        ],
    }


# ---------------------------------------------------------------- warnings and cautions

_VERDICTS = {
    "over": "over the rating",
    "near": "inside the rating, but past half of its voltage or 0.7 of its current (common practice)",
    "not rated": "not rated, so that nothing says that it is fine",
}


def _rating_warnings(every: Sequence[tuple[BandFigures, PartStress]]) -> Iterator[str]:
    """Return one warning a verdict; no coil that is wound has a rating, and its heat is told instead."""
    for verdict, words in _VERDICTS.items():
        found = [
            f"{stress.reference} at {band.name}"
            for band, stress in every
            if stress.verdict == verdict and not (stress.kind == "coil" and verdict == "not rated")
        ]
        if found:
            yield f"at the stated drive, load off, {words}: {', '.join(found)}"


def _unknown_warnings(names: Sequence[str]) -> Iterator[str]:
    for name in names:
        yield f"{name}: stress is unknown, because a Q is; take it for dangerous"


def _cautions(
    drive: Mapping[str, Any], every: Sequence[tuple[BandFigures, PartStress]], device: float | None, unknown: bool
) -> list[str]:
    """Return the cautions that apply, each with the figure that triggered it; no option turns them off."""
    power = drive["power"] or 0.0
    band, worst = max(every, key=lambda pair: pair[1].voltage_load_off, default=(None, None))
    volts = worst.voltage_load_off if worst else 0.0
    volts = max(volts, device or 0.0)
    if power < CAUTION_POWER and volts < CAUTION_VOLTAGE and not unknown:
        return []
    high = "a voltage that is not known"
    if band is not None and worst is not None:
        high = f"{format_quantity(worst.voltage_load_off, 'V')} peak on {worst.reference} at {band.name}"
    drawn = format_quantity(power, "W") if power else high
    told = [
        LOCAL_RULES,
        f"Radio-frequency burns and flash-over: {high} with the load off. Never touch or tune the live tank by hand; "
        "use insulated tools and shafts, and leave room between plates and turns.",
        f"Supplies and capacitors hold charge after switching off ({_device(device, drawn)}): unplug, discharge "
        "through a resistor, measure before touching.",
        f"Transmitting needs a licence nearly everywhere ({drawn}): test into a shielded dummy load, keep to local "
        "exposure limits, keep wearers of medical devices away.",
        "Class 2 ceramic and electrolytic capacitors are no tank capacitors: at this drive they heat and can burst.",
    ]
    hottest = max(((s.dissipation or 0.0, b.name, s.reference) for b, s in every), default=(0.0, "", ""))
    if hottest[0] > 0:
        told.append(
            f"Heat: {format_quantity(hottest[0], 'W')} in {hottest[2]} at {hottest[1]}. Keep formers and wire off what "
            "burns or softens."
        )
    return told


def _device(device: float | None, drawn: str) -> str:
    return drawn if device is None else f"the device sees about {format_quantity(device, 'V')} peak"
