"""What a drive does to each part of a tank: voltage, current, heat, flux, and how much of a rating that takes.

Two states are looked at: with the load as stated, and with the load off at the same drive, which is the
one that flashes over. A swept band is looked at at both ends. Peaks are those of full modulation, rms
figures and heat hold over its period.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

from partpick.cautions import cautions_of, stress_warnings
from partpick.conduction import conduction_warnings
from partpick.connection import Connection, Parallel, Part, parse_connection
from partpick.errors import InternalError
from partpick.physics.heating import SMALL_CAPACITOR, peak_flux_density, surface_rise, usual_flux_density
from partpick.physics.loading import circulating_current, loaded_q, peak_voltage
from partpick.physics.resonance import effective_capacitance
from partpick.ratings import DriveTable, drive_of, uses
from partpick.request import Request
from partpick.result import BandFigures, Candidate, CoilFigures, PartLine
from partpick.stressed import PartStress, Stressed, stressed_parts, worse_of

# Peak voltage of the device over its supply: twice in a tuned stage; class E: N. O. Sokal and A. D. Sokal, Class E,
# IEEE J. Solid-State Circuits SC-10 (1975) 168-176 (from memory).
DEVICE_PEAK = {"A": 2.0, "B": 2.0, "C": 2.0, "E": 3.56}
AGREEMENT = 1e-6  # of a rating, between search and recheck


@dataclass(frozen=True, kw_only=True)
class End:
    """A band's tank at its frequency, or at one end of its range."""

    frequency: float  # Hz
    inductance: float  # H
    q: float | None  # unloaded
    loaded_q: float | None
    coil_q: float | None
    element: float | None = None  # F, the tuning element at its own end
    total: float | None = None  # F, all in circuit with the element at its own end

    @property
    def omega(self) -> float:
        """Angular frequency. [1/s]"""
        return 2 * math.pi * self.frequency

    @property
    def reactance(self) -> float:
        """Of the coil. [ohm]"""
        return self.omega * self.inductance


def with_stress(request: Request, candidate: Candidate) -> Candidate:
    """Return a candidate with what the stated drive does to it; itself where no drive is stated.

    Adds `stress` to each band's further keys, `cautions` and `device_peak_v` to the candidate's, and a warning
    for each part that is over or near its rating or has none.
    """
    drive = drive_of(request)
    if drive is None:
        return candidate
    bands: list[BandFigures] = []
    every: list[Stressed] = []
    for band in candidate.bands:
        found = band_stress(drive, band, candidate, request.stray.inductance)
        every += [Stressed(band.name, part) for part in found or ()]
        keys = None if found is None else _keys(drive, request, candidate, band, found)
        bands.append(replace(band, extra={**band.extra, "stress": keys}))
    device = None if drive.supply is None else drive.supply * DEVICE_PEAK[drive.klass] * drive.crest
    unknown = [band.name for band in bands if band.extra["stress"] is None]
    told = stress_warnings(every, unknown)
    return replace(
        candidate,
        bands=tuple(bands),
        warnings=(*candidate.warnings, *told, *conduction_warnings(request.tuning, bands)),
        extra={
            **candidate.extra,
            "device_peak_v": device,
            "cautions": cautions_of(drive, every, device, bool(unknown), candidate.parts),
        },
    )


def recheck_ratings(request: Request, candidate: Candidate) -> None:
    """Refuse a candidate of which a part is over what the search had to keep it to.

    Raises
    ------
    InternalError
        It is, by more than rounding.
    """
    if request.limits.stress is None:
        return
    most_voltage, most_current = uses(request)
    for band, part in stressed_parts(candidate):
        use = max((part["voltage_use"] or 0.0) / most_voltage, (part["current_use"] or 0.0) / most_current)
        if use > 1.0 + AGREEMENT:
            raise InternalError(
                f"internal error: {part['reference']} at {band} is over its rating, which the search should have "
                "kept to; please report this plan"
            )


# ---------------------------------------------------------------- one band


def band_stress(
    drive: DriveTable, band: BandFigures, candidate: Candidate, leads: float = 0.0
) -> tuple[PartStress, ...] | None:
    """Return what each part of a band bears, the worse end of a range; None where a Q that decides it is unknown.

    Parameters
    ----------
    drive : DriveTable
        [drive] of the plan.
    band : BandFigures
        With its unloaded Q, and its `load` among the further keys where one is stated.
    candidate : Candidate
        Its parts and coils.
    leads : float
        Inductance in series with the network across the coil. [H]
    """
    worst: dict[str, PartStress] = {}
    for end in ends_of(band):
        found = _at_end(drive, band, candidate, leads, end)
        if found is None:
            return None
        for part in found:
            known = worst.get(part.reference)
            worst[part.reference] = part if known is None else worse_of(known, part)
    return tuple(worst.values())


def ends_of(band: BandFigures) -> tuple[End, ...]:
    """Return a band's tank at its frequency, or at the lower and the upper end of its range."""
    frequency = band.reactance / (2 * math.pi * band.inductance)
    load = band.extra.get("load")
    # without a load the loaded state is the unloaded one; with one whose ratio nothing states it is unknown
    loaded = load.get("loaded_q") if isinstance(load, Mapping) else band.q
    if "low_hz" not in band.extra:
        return (
            End(
                frequency=frequency,
                inductance=band.inductance,
                q=band.q,
                loaded_q=_known(loaded),
                coil_q=band.coil_q,
            ),
        )
    across = _resistance_across(band.q, _known(loaded), band.reactance) if isinstance(load, Mapping) else math.inf
    made = []
    for low in (True, False):
        inductance = _known(band.extra["inductance_low_h"]) if low else band.inductance
        hertz = _known(band.extra["low_hz"]) if low else frequency
        q = _known(band.extra["q_low" if low else "q_high"])
        assert inductance is not None and hertz is not None
        reactance = 2 * math.pi * hertz * inductance
        made.append(
            End(
                frequency=hertz,
                inductance=inductance,
                q=q,
                loaded_q=None if q is None or across is None else float(loaded_q(q, reactance, across)),
                coil_q=_known(band.extra["coil_q_low"]) if low else band.coil_q,
                element=_known(band.extra.get("tuning_high_f" if low else "tuning_low_f")),
                total=_known(band.extra.get("capacitance_low_f" if low else "capacitance_high_f")),
            )
        )
    return tuple(made)


def _resistance_across(q: float | None, loaded: float | None, reactance: float) -> float | None:
    """Return the resistance across the tank that takes its Q down to the loaded one, None where unknown. [ohm]"""
    if q is None or loaded is None:
        return None
    return reactance / (1 / loaded - 1 / q) if loaded < q else math.inf


def _known(value: object) -> float | None:
    return float(value) if isinstance(value, (int, float)) else None


def carriers(drive: DriveTable, end: End) -> tuple[float | None, float | None]:
    """Return the peak voltage of the carrier across the tank, loaded and with the load off; None: unknown. [V]"""
    if drive.voltage is not None:
        return drive.voltage, drive.voltage

    def volts(q: float | None) -> float | None:
        if q is None:
            return None
        if drive.power is not None:
            return float(peak_voltage(drive.power, end.reactance, q))
        assert drive.current is not None
        return drive.current * q * end.reactance

    return volts(end.loaded_q), volts(end.q)


def _at_end(
    drive: DriveTable, band: BandFigures, candidate: Candidate, leads: float, end: End
) -> list[PartStress] | None:
    loaded, load_off = carriers(drive, end)
    if load_off is None:
        return None
    parts = {part.reference: part for part in candidate.parts}
    coil = next((coil for coil in candidate.coils if coil.reference == band.coil), None)
    stresses = [_coil(drive, band, coil, parts, end, loaded, load_off)]
    for reference, share, value, acting in _across(band, parts, leads, end):
        part = parts[reference]
        # behind its own series inductance a capacitor bears more than its terminals
        plates = share * acting / value
        per_volt = end.omega * acting * share / math.sqrt(2) * drive.effective
        known = part.q is not None and (part.q_below is None or end.frequency <= part.q_below)
        resistance = plates / (end.omega * acting * share) / part.q if known and part.q and share else None

        def rms(volts: float | None, per_volt: float = per_volt) -> float | None:
            return None if volts is None else volts * per_volt

        def heat(volts: float | None, amperes: float = per_volt, ohm: float | None = resistance) -> float | None:
            return None if volts is None or ohm is None else (volts * amperes) ** 2 * ohm

        stresses.append(
            PartStress(
                reference=reference,
                kind=part.kind,
                frequency=end.frequency,
                voltage=None if loaded is None else loaded * drive.crest * plates,
                current=rms(loaded),
                voltage_load_off=load_off * drive.crest * plates,
                current_load_off=load_off * per_volt,
                heat=heat(loaded),
                heat_load_off=heat(load_off),
                kelvin_per_watt=SMALL_CAPACITOR if part.kind == "capacitor" else None,
                bias=drive.bias,
                voltage_rating=part.voltage,
                current_rating=part.rf_current,
            )
        )
    return stresses


def _coil(
    drive: DriveTable,
    band: BandFigures,
    coil: CoilFigures | None,
    parts: Mapping[str, PartLine],
    end: End,
    loaded: float | None,
    load_off: float,
) -> PartStress:
    def rms(volts: float | None) -> float | None:
        if volts is None:
            return None
        return float(circulating_current(volts, end.reactance)) / math.sqrt(2) * drive.effective

    def heat(amperes: float | None) -> float | None:
        return None if amperes is None or end.coil_q is None else amperes**2 * end.reactance / end.coil_q

    figures = {} if coil is None else coil.extra
    surface, area = _known(figures.get("surface_m2")), _known(figures.get("core_area_m2"))
    turns = band.tap_turns or (coil.turns if coil else None)
    peak = load_off * drive.crest
    flux = None
    if area is not None and turns:
        flux = float(peak_flux_density(peak, end.frequency, turns, area))
    part = parts.get(band.coil)
    return PartStress(
        reference=band.coil,
        kind="coil",
        frequency=end.frequency,
        voltage=None if loaded is None else loaded * drive.crest,
        current=rms(loaded),
        voltage_load_off=peak,
        current_load_off=rms(load_off) or 0.0,
        heat=heat(rms(loaded)),
        heat_load_off=heat(rms(load_off)),
        kelvin_per_watt=None if surface is None else float(surface_rise(1.0, surface)),
        flux_density=flux,
        usual_flux_density=None if flux is None else float(usual_flux_density(end.frequency)),
        current_rating=part.rf_current if part else None,
    )


def _across(
    band: BandFigures, parts: Mapping[str, PartLine], leads: float, end: End
) -> Iterator[tuple[str, float, float, float]]:
    """Return each part across the coil: reference, share of the voltage, capacitance, how that acts."""
    values = {reference: part.value or 0.0 for reference, part in parts.items()}
    acting = {
        reference: float(effective_capacitance(value, parts[reference].series_inductance or 0.0, end.frequency))
        for reference, value in values.items()
        if parts[reference].unit == "F"
    }
    tree = parse_connection(band.connection)
    if tree is not None and _holds(tree, "T") and end.element is not None and end.total is not None:
        values["T"] = acting["T"] = _set_element(tree, acting, end, end.element, end.total)
    for branch in () if tree is None else _beside_element(tree):
        network = _acting(branch, acting)
        # leads and switch in series with the network raise the voltage on it; the element has none
        rise = 1.0 if _holds(branch, "T") else float(effective_capacitance(network, leads, end.frequency)) / network
        for reference, share in _voltage_shares(branch, acting, rise):
            yield reference, share, values[reference], acting[reference]
    trimmer = next((p for p in parts.values() if p.kind == "trimmer" and band.name in p.bands), None)
    if trimmer is not None and band.trimmer is not None:
        yield trimmer.reference, 1.0, band.trimmer, band.trimmer


def _set_element(tree: Connection, acting: Mapping[str, float], end: End, element: float, total: float) -> float:
    """Return the tuning element where the tank resonates at the end of the band, short of its own end. [F]"""
    branch = next(b for b in _beside_element(tree) if _holds(b, "T"))
    wanted = 1.0 / (end.omega * end.reactance)
    if isinstance(branch, Part):
        return element + wanted - total
    padder = _acting(next(b for b in branch.branches if not _holds(b, "T")), acting)
    tuned = element * padder / (element + padder) + wanted - total
    return tuned * padder / (padder - tuned)


def _beside_element(tree: Connection) -> tuple[Connection, ...]:
    """Return what lies across the coil: the tuning element's branch apart from the rest, which shares its leads."""
    if not isinstance(tree, Parallel) or not any(_holds(branch, "T") for branch in tree.branches):
        return (tree,)
    element = tuple(branch for branch in tree.branches if _holds(branch, "T"))
    rest = tuple(branch for branch in tree.branches if not _holds(branch, "T"))
    return (*element, rest[0] if len(rest) == 1 else Parallel(rest))


def _holds(tree: Connection, reference: str) -> bool:
    if isinstance(tree, Part):
        return tree.reference == reference
    return any(_holds(branch, reference) for branch in tree.branches)


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


# ---------------------------------------------------------------- keys of the result


def _keys(
    drive: DriveTable, request: Request, candidate: Candidate, band: BandFigures, stresses: Sequence[PartStress]
) -> dict[str, object]:
    """Return a band's stress as further JSON keys."""
    coil = stresses[0]
    contacts = _contacts(request, candidate, band, stresses)
    return {
        "voltage_peak_v": coil.voltage,
        "current_peak_a": _crest(drive, coil.current),
        "voltage_load_off_peak_v": coil.voltage_load_off,
        "current_load_off_peak_a": _crest(drive, coil.current_load_off),
        "contact_rms_a": max((rms for rms in contacts.values()), default=None),
        "contact_open_peak_v": coil.voltage_load_off if contacts else None,
        "contacts": [{"contact": name, "load_off_rms_a": rms} for name, rms in contacts.items()],
        "ends": [
            {
                "at_hz": end.frequency,
                "voltage_peak_v": None if volts[0] is None else volts[0] * drive.crest,
                "voltage_load_off_peak_v": None if volts[1] is None else volts[1] * drive.crest,
            }
            for end in ends_of(band)
            for volts in (carriers(drive, end),)
        ],
        "parts": [stress.keys() for stress in stresses],
    }


def _crest(drive: DriveTable, rms: float | None) -> float | None:
    """Return the highest peak of a current from its rms value over the modulation. [A]"""
    return None if rms is None else rms * math.sqrt(2) / drive.effective * drive.crest


def _contacts(
    request: Request, candidate: Candidate, band: BandFigures, stresses: Sequence[PartStress]
) -> dict[str, float]:
    """Return the rms current that each closed contact carries, load off: that of what it switches. [A]

    Contacts are named as by `band_switch`. Of a series network it is the current of one part.
    """
    amperes = {stress.reference: stress.current_load_off for stress in stresses}
    trimmers = {stress.reference for stress in stresses if stress.kind == "trimmer"}
    tree = parse_connection(band.connection)
    across = [branch for branch in (() if tree is None else _beside_element(tree)) if not _holds(branch, "T")]
    carried: dict[str, float] = {}
    for name in band.contacts:
        if name.startswith("SL"):
            carried[name] = amperes[band.coil]
        elif name.startswith("SV"):
            carried[name] = amperes.get("T", 0.0)
        elif name.startswith("ST"):
            carried[name] = math.fsum(amperes[trimmer] for trimmer in trimmers)
        else:
            switched = _switched(request, candidate, band, name)
            own = math.fsum(_into(branch, amperes, switched) for branch in across)
            if request.switching == "separate":  # its trimmer is on the same contact
                own += math.fsum(amperes[trimmer] for trimmer in trimmers)
            carried[name] = own
    return {name: rms for name, rms in carried.items() if rms > 0.0}


def _switched(request: Request, candidate: Candidate, band: BandFigures, name: str) -> set[str]:
    """Return the capacitors of a band on one contact: in a stack those that the contact's band adds."""
    if request.switching == "shared":
        return {name.replace("S", "C", 1)} & set(band.capacitors)
    height = {own.name: own.lowest for own in request.bands}
    served = {p.reference: max(p.bands, key=lambda b: height.get(b, 0.0)) for p in candidate.parts if p.bands}
    number = {own.name: f"S{place + 1}" for place, own in enumerate(candidate.bands)}
    return {reference for reference in band.capacitors if number.get(served[reference]) == name}


def _into(tree: Connection, amperes: Mapping[str, float], switched: set[str]) -> float:
    """Return the current into the part of a network that is switched. [A]"""
    if isinstance(tree, Part):
        return amperes.get(tree.reference, 0.0) if tree.reference in switched else 0.0
    own = [_into(branch, amperes, switched) for branch in tree.branches]
    return math.fsum(own) if isinstance(tree, Parallel) else max(own)
