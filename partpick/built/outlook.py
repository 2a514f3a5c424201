"""The outlook of one candidate: everything about its built units, as further keys of its figures.

Called once a candidate. Ranges come by propagation, except for the candidate that ranks first, whose builds
are many enough to count; the whole unit and its alignment are counted always.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from partpick.built.alignment import Alignment, BandAlignment, Setting, adjustable_coils, alignment
from partpick.built.of_design import references, variation
from partpick.built.refit import Swap, swaps
from partpick.built.sensitivity import Contribution, WorthImproving, sensitivity, worth_improving
from partpick.built.series import Series, series
from partpick.built.settings import SpreadSettings, spread_settings
from partpick.built.spread import BandSpread, SweptSpread, UnitSpread, spread
from partpick.built.steps import steps
from partpick.built.variation import Variation, deviation_of
from partpick.built.warming import BandDrift, band_drift
from partpick.candidates import Coils
from partpick.circuit import Design
from partpick.parts import Capacitor
from partpick.request import Request
from partpick.result import BandFigures, Candidate
from partpick.unstated import unknown_drifts

Entry = dict[str, object]


@dataclass(frozen=True, kw_only=True)
class Outlook:
    """What is known of the built units of one candidate."""

    settings: SpreadSettings
    spread: UnitSpread
    alignment: Alignment | None
    sensitivity: tuple[Contribution, ...]
    worth_improving: WorthImproving | None
    temperature: tuple[float, float] | None  # degree Celsius
    drift: tuple[BandDrift | None, ...]  # empty: no range is stated
    refit: tuple[Swap, ...]
    series: Series | None  # None: one unit
    notes: tuple[str, ...]  # defaults taken, in words


def outlook(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    design: Design,
    candidate: Candidate,
    *,
    first: bool,
    pool: Sequence[Capacitor] = (),
) -> Outlook:
    """Return what the built units of a design will do.

    Parameters
    ----------
    request : Request
        Its error limit, strays, units and the tables [spread] and [temperature].
    coils : Coils
        Every coil in play.
    capacitors : sequence of Capacitor
        Every capacitor in play.
    design : Design
        What was picked.
    candidate : Candidate
        The same design assessed.
    first : bool
        Whether it ranks first, so that its builds are many and its ranges counted.
    pool : sequence of Capacitor
        What a refit may choose from.
    """
    varying = variation(request, coils, capacitors, design, candidate)
    settings = spread_settings(request, first=first)
    builds = varying.draw(settings.builds, settings.seed, settings.parts, settings.batch)
    spreads = spread(varying, request.limits, settings, builds, counted=first)
    aligned = alignment(varying, _adjust(varying, coils, design, candidate), request.limits.error, builds)
    temperature = dict(dict(request.extra).get("temperature", ()))
    low, high = (_number(temperature, key) for key in ("from", "to"))
    measured = _number(temperature, "measured_drift")
    refit, notes = () if measured is None else _refit(varying, measured, pool), list(varying.notes)
    if low is not None:
        notes += unknown_drifts(request)
    if measured is not None:
        notes += [
            f"{tank.name}: no capacitor in circuit and in stock can be swapped against the measured drift"
            for tank in varying.tanks
            if all(swap.band != tank.name for swap in refit)
        ]
    return Outlook(
        settings=settings,
        spread=spreads,
        alignment=aligned,
        sensitivity=sensitivity(varying, deviation_of(settings.parts)),
        worth_improving=worth_improving(varying, deviation_of(settings.parts)),
        temperature=(low, high) if low is not None and high is not None else None,
        drift=()
        if low is None or high is None
        else tuple(band_drift(varying, tank, high - low) for tank in varying.tanks),
        refit=refit,
        series=None
        if request.units == 1
        else series(
            candidate,
            request.units,
            aligned.share if aligned is not None else spreads.inside,
            _stock(request, capacitors, coils, design, candidate),
        ),
        notes=tuple(notes),
    )


def _refit(varying: Variation, measured: float, pool: Sequence[Capacitor]) -> tuple[Swap, ...]:
    return tuple(swap for tank in varying.tanks for swap in swaps(varying, tank, measured, pool))


def _number(table: Mapping[str, object], key: str) -> float | None:
    value = table.get(key)
    return float(value) if isinstance(value, (int, float)) else None


def _adjust(varying: Variation, coils: Coils, design: Design, candidate: Candidate) -> dict[int, float]:
    """Return how far each adjustable coil goes either way, by its place among the sources."""
    pairs = zip(candidate.bands, design.coils, strict=True)
    return adjustable_coils(
        varying, {band.coil: coils.supports[int(coils.support[coil])].adjust for band, coil in pairs}
    )


def _stock(
    request: Request, capacitors: Sequence[Capacitor], coils: Coils, design: Design, candidate: Candidate
) -> dict[str, int | None]:
    """Return how many pieces there are of each reference."""
    stock: dict[str, int | None] = {}
    for index, (band, coil) in enumerate(zip(candidate.bands, design.coils, strict=True)):
        stock[band.coil] = coils.supports[int(coils.support[coil])].quantity
        for reference, part in references(design, index, band.capacitors):
            stock[reference] = capacitors[part].quantity
    trimmers = {band.name: band.trimmer for band in request.bands if band.trimmer}
    for line in candidate.parts:
        if line.kind == "trimmer":
            stock[line.reference] = trimmers[line.bands[0]].quantity
    return stock


# ---------------------------------------------------------------- as further keys of the figures


def with_outlook(candidate: Candidate, known: Outlook) -> Candidate:
    """Return the candidate with the outlook in the further keys of its bands and its own."""
    bands = tuple(_with_band(band, place, known) for place, band in enumerate(candidate.bands))
    extra: Entry = {"spread": _unit_spread(known)}
    if known.alignment is not None:
        extra["alignment"] = _alignment(known.alignment, candidate)
    extra["sensitivity"] = [_contribution(each) for each in known.sensitivity]
    extra["worth_improving"] = _worth_improving(known.worth_improving)
    if known.temperature is not None:
        extra["temperature"] = {"from_c": known.temperature[0], "to_c": known.temperature[1]}
    if known.refit:
        extra["refit"] = [_swap(each) for each in known.refit]
    if known.series is not None:
        extra["series"] = _series(known.series)
    warnings = tuple(dict.fromkeys((*candidate.warnings, *known.notes)))
    return replace(candidate, bands=bands, warnings=warnings, extra={**candidate.extra, **extra})


def _with_band(band: BandFigures, place: int, known: Outlook) -> BandFigures:
    own = known.spread.bands[place]
    extra: Entry = {"spread": _swept_spread(own) if isinstance(own, SweptSpread) else _band_spread(own)}
    if known.alignment is not None:
        extra["alignment"] = _band_alignment(known.alignment.bands[place])
    if known.drift:
        extra["temperature"] = _band_drift(known.drift[place])
    return replace(band, extra={**band.extra, **extra})


def _unit_spread(known: Outlook) -> Entry:
    settings = known.settings
    return {
        "builds": settings.builds,
        "seed": settings.seed,
        "parts": settings.parts,
        "batch_correlation": settings.batch,
        "share_inside": known.spread.inside,
    }


def _band_spread(own: BandSpread) -> Entry:
    return {
        "standard_deviation": own.deviation,
        "error_5_percent": own.low,
        "error_95_percent": own.high,
        "error_least": own.worst_low,
        "error_most": own.worst_high,
        "share_inside": own.inside,
        "method": "counted" if own.counted else "propagated",
    }


def _swept_spread(own: SweptSpread) -> Entry:
    return {
        "tuned_low_95_percent_hz": own.low,
        "tuned_high_5_percent_hz": own.high,
        "tuned_low_most_hz": own.worst_low,
        "tuned_high_least_hz": own.worst_high,
        "share_covering": own.covers,
        "method": "counted",
    }


def _setting(setting: Setting) -> Entry:
    return {
        "travel": setting.nominal,
        "travel_5_percent": setting.low,
        "travel_95_percent": setting.high,
    }


def _band_alignment(own: BandAlignment) -> Entry:
    trimmer = own.trimmer
    return {
        "share_aligned": own.share,
        "trimmer": None if trimmer is None else {"set_to_f": trimmer.value, **_setting(trimmer)},
        "hertz_per_farad": own.hertz_per_farad,
        "hertz_per_percent_inductance": own.hertz_per_percent,
    }


def _alignment(own: Alignment, candidate: Candidate) -> Entry:
    return {
        "share_aligned": own.share,
        "share_over_full_travel": own.share_full,
        "worst_case_aligned": own.worst_case,
        "coils": [
            {"reference": coil.reference, "inductance_over_nominal": coil.value, **_setting(coil)}
            for coil in own.coils
        ],
        "steps": [
            {"adjust": step.adjust, "band": step.band, "to_hz": step.frequency, "why": step.why}
            for step in steps(own, candidate)
        ],
    }


def _contribution(own: Contribution) -> Entry:
    return {
        "reference": own.reference,
        "kind": own.kind,
        "band": own.band,
        "tolerance": own.tolerance,
        "hertz_per_percent": own.hertz_per_percent,
        "largest_shift_hz": own.largest_shift,
        "share_of_variance": own.share_of_variance,
        "drift_per_k": own.drift,
        "drift_spread_per_k": own.drift_spread,
    }


def _worth_improving(own: WorthImproving | None) -> Entry | None:
    if own is None:
        return None
    return {
        "reference": own.reference,
        "kind": own.kind,
        "tolerance": own.tolerance,
        "better_tolerance": own.better,
        "band": own.band,
        "standard_deviation": own.deviation,
        "standard_deviation_then": own.deviation_then,
    }


def _band_drift(own: BandDrift | None) -> Entry | None:
    if own is None:
        return None
    return {
        "drift_per_k": own.nominal,
        "drift_5_percent_per_k": own.low,
        "drift_95_percent_per_k": own.high,
        "drift_spread_per_k": own.spread,
        "shift_hz": own.shift,
        "shift_5_percent_hz": own.shift_low,
        "shift_95_percent_hz": own.shift_high,
        "shift_spread_hz": own.shift_spread,
    }


def _swap(own: Swap) -> Entry:
    return {
        "band": own.band,
        "replaces": own.replaces,
        "label": own.label,
        "by": list(own.by),
        "drift_per_k": own.drift,
        "drift_spread_per_k": own.drift_spread,
        "capacitance_change_f": own.capacitance_change,
    }


def _series(own: Series) -> Entry:
    return {
        "units": own.units,
        "yield": own.share_right,
        "sets": own.sets,
        "price": own.price,
        "pieces": [
            {
                "references": list(piece.references),
                "kind": piece.kind,
                "description": piece.description,
                "per_unit": piece.per_unit,
                "needed": piece.needed,
                "spares": piece.spares,
                "stock": piece.stock,
                "price": piece.price,
            }
            for piece in own.pieces
        ],
    }
