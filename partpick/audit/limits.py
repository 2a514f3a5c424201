"""The limits of the request, held against the figures that are told."""

from __future__ import annotations

import math
from collections.abc import Iterator

from partpick.request import Band, Request
from partpick.result import BandFigures, Candidate, CoilFigures

ROUNDING = 1e-9  # by which a figure may lie outside a limit
EASED_RESONANCE = 2.0  # bought and multilayer coils, where the plan states none


def limit_faults(candidate: Candidate, request: Request) -> Iterator[str]:
    """Yield each limit of the request that a candidate breaks, in words."""
    yield from _counts(candidate, request)
    yield from _grades(candidate, request)
    coils = {coil.reference: coil for coil in candidate.coils}
    for band, wanted in zip(candidate.bands, request.bands, strict=False):
        for fault in (
            *_tuning(band, wanted, request),
            *_losses(band, wanted, request),
            *_strays(band, request),
            *_coil(band, wanted, coils.get(band.coil), request),
        ):
            yield f"{band.name}: {fault}"


def _over(value: float, limit: float | None) -> bool:
    return limit is not None and value > limit * (1 + ROUNDING)


def _under(value: float, limit: float | None) -> bool:
    return limit is not None and value < limit * (1 - ROUNDING)


def _counts(candidate: Candidate, request: Request) -> Iterator[str]:
    limits = request.limits
    for what, count, most in (
        ("capacitors", candidate.part_count, limits.parts),
        ("different values", candidate.value_count, limits.values),
        ("coils", candidate.inductor_count, limits.inductors),
    ):
        if most is not None and count > most:
            yield f"{count} {what}, {most} are allowed"
    if limits.price is not None and (candidate.price is None or _over(candidate.price, limits.price)):
        yield f"a price of {candidate.price}, {limits.price:g} is allowed"
    if request.switching == "separate":
        for band in candidate.bands:
            if len(band.capacitors) > limits.parts_per_band:
                yield f"{band.name}: {len(band.capacitors)} capacitors, {limits.parts_per_band} are allowed"


def _grades(candidate: Candidate, request: Request) -> Iterator[str]:
    rules = request.capacitors
    for line in candidate.parts:
        if line.kind != "capacitor" or line.value is None:
            continue
        if _under(line.value, rules.low) or _over(line.value, rules.high):
            yield f"{line.reference} of {line.value:g} F is outside the values allowed"
        if rules.grades is not None and line.grade not in rules.grades:
            yield f"{line.reference} is of grade {line.grade}, allowed are {', '.join(rules.grades)}"


def _tuning(band: BandFigures, wanted: Band, request: Request) -> Iterator[str]:
    if band.error is None:
        excess = None if "follows" in band.extra else band.extra.get("excess")
        if isinstance(excess, float) and _over(excess, request.limits.excess):
            yield f"an excess of {excess:.9g}, {request.limits.excess:g} is allowed"
        return
    if band.target != wanted.at:
        yield f"tuned to {band.target}, asked for is {wanted.at}"
    told = request.limits.error_stated or wanted.trimmer is None
    if told and request.limits.error is not None and abs(band.error) > request.limits.error + ROUNDING:
        yield f"an error of {band.error:.9g}, {request.limits.error:g} is allowed"


def _losses(band: BandFigures, wanted: Band, request: Request) -> Iterator[str]:
    if wanted.q is not None and (band.q is None or _under(band.q, wanted.q)):
        yield f"a Q of {band.q}, {wanted.q:g} is wanted"
    most = request.limits.drift
    if most is None:
        return
    if band.drift is None or _over(abs(band.drift) + (band.drift_spread or 0.0), most):
        yield f"a drift of {band.drift} with {band.drift_spread} of spread, {most:g} is allowed"


def _strays(band: BandFigures, request: Request) -> Iterator[str]:
    total = band.capacitance if band.capacitance is not None else band.extra.get("capacitance_high_f")
    if not band.capacitors or not isinstance(total, float):
        return
    share = (band.stray + band.self_capacitance) / total
    if _over(share, request.stray.share):
        yield f"strays of {share:.9g} of the capacitance, {request.stray.share:g} is allowed"


def _coil(band: BandFigures, wanted: Band, coil: CoilFigures | None, request: Request) -> Iterator[str]:
    rules = request.coil
    if coil is None:
        yield f"its coil {band.coil} is not listed"
        return
    for what, value, window in (
        ("an inductance", band.inductance, rules.inductance),
        ("a reactance", band.reactance, rules.reactance),
    ):
        if window is not None and (_under(value, window[0]) or _over(value, window[1])):
            yield f"{what} of {value:.9g}, outside {window[0]:g} to {window[1]:g}"
    for allowed in (rules.forms, wanted.forms):
        if allowed is not None and coil.form not in (*allowed, "measured"):
            yield f"a coil of form {coil.form}, allowed are {', '.join(allowed)}"
    if rules.proportions is not None and coil.form == "solenoid" and coil.winding_length and coil.mean_diameter:
        shape = coil.winding_length / coil.mean_diameter
        if _under(shape, rules.proportions[0]) or _over(shape, rules.proportions[1]):
            yield f"a coil {shape:.4g} times as long as wide, outside the proportions allowed"
    yield from _own_resonance(band, wanted, request)


def _own_resonance(band: BandFigures, wanted: Band, request: Request) -> Iterator[str]:
    times = request.coil.self_resonance
    if times is None or band.self_capacitance <= 0:
        return
    if not request.coil.self_resonance_stated:
        times = min(times, EASED_RESONANCE)
    own = 1.0 / (2 * math.pi * math.sqrt(band.inductance * band.self_capacitance))
    if _under(own, times * wanted.highest):
        yield f"its coil resonates by itself at {own:.6g} Hz, {times:g} times the band is wanted"
