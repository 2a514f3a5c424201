"""The order, the floor and the limits, as numbers that the search takes.

Here every figure by which candidates are compared is defined once; `search/` only minimises them.
Rules marked "common practice" have no source.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from fractions import Fraction
from typing import Any

import numpy as np

from partpick.candidates import Coils
from partpick.parts import Capacitor
from partpick.physics.resonance import effective_capacitance
from partpick.preferred import commonness
from partpick.ratings import drive_of, element_rating, trimmer_rating, uses
from partpick.request import CHOSEN_ALIGNS, Band, Request, Trimmer
from partpick.search.drive import Drive
from partpick.search.problem import NEVER, PLENTY, Bools, Floats, Ints, Problem
from partpick.tuning import element_ends, element_tolerance, most_share

LEAST_FLOOR = 0.001
TRIMMER_Q = 400.0  # film and ceramic trimmers, common practice, no source
MOST_TRIM = 0.5  # a trimmer that is chosen: range over what is in circuit; it trims, it does not tune
MOST_ADJUST = 0.95  # of the inductance either way
NEAR_OWN_RESONANCE = 0.25  # of 1 in w^2 Ls C: nobody counts on a capacitor within half of it

# Enough unloaded Q and the usual reactance by frequency, from the highest down; common practice.
ENOUGH_Q = ((1e6, 150.0), (200e3, 80.0), (0.0, 60.0))
USUAL_REACTANCE = (
    (30e6, (30.0, 150.0)),
    (1e6, (60.0, 400.0)),
    (300e3, (200.0, 1500.0)),
    (0.0, (500.0, 5000.0)),
)


def enough_q(frequency: float, limit: float | None) -> float:
    """Return the unloaded Q that is enough at a frequency: the limit where one is set. [-]"""
    if limit:
        return limit
    return next(q for above, q in ENOUGH_Q if frequency > above or above == 0.0)


def usual_reactance(frequency: float) -> tuple[float, float]:
    """Return the usual window of tank reactance at a frequency. [ohm]"""
    for lowest, window in USUAL_REACTANCE:
        if frequency > lowest if lowest == 30e6 else frequency >= lowest:
            return window
    raise AssertionError("the last window starts at 0 Hz")


def reactance_class(reactance: Floats, frequency: float) -> Ints:
    """Return the octaves, begun ones counted, by which a reactance is outside the usual window. [-]"""
    low, high = usual_reactance(frequency)
    with np.errstate(divide="ignore"):
        octaves = np.maximum(np.log2(low / reactance), np.log2(reactance / high))
    return np.ceil(np.clip(octaves, 0.0, 50.0) - 1e-12).astype(np.int64)


def effort(coils: Coils) -> Ints:
    """Return what winding takes, (J, 3): class of form, wire outside 0.3 to 1.0 mm, volume in 25 % steps."""
    turns = coils.turns
    form = np.select(
        [
            coils.effort_form == 0,
            (coils.effort_form == 1) & (turns <= 30),
            (coils.effort_form == 2) & (turns <= 40),
        ],
        [0, 1, 2],
        3,
    )
    wound = coils.wire_diameter > 0
    unusual = wound & ((coils.wire_diameter < 0.3e-3 * (1 - 1e-9)) | (coils.wire_diameter > 1.0e-3 * (1 + 1e-9)))
    cubic_mm = np.maximum(coils.volume * 1e9, 1.0)
    steps = np.rint(np.log(cubic_mm) / np.log(1.25))
    return np.stack([form, unusual.astype(np.int64), steps.astype(np.int64)], axis=1).astype(np.int64)


def tolerance_floor(coils: Coils, capacitors: tuple[Capacitor, ...], error_limit: float | None) -> float:
    """Return the error below which differences are noise, one number a request. [fraction of f]

    Half the standard uncertainty of the frequency with the closest coil and capacitors in play, at
    least 0.1 %, at most the error limit. A tolerance is taken as uniform: standard uncertainty is
    tolerance / sqrt(3) (JCGM 100:2008, 4.3.7); f goes with 1/sqrt(LC).
    """
    inside = coils.in_play.any(axis=1) if coils.in_play.size else np.zeros(0, dtype=bool)
    coil = float(coils.spread[inside].min()) if inside.any() else 0.0
    capacitor = min((part.tolerance for part in capacitors), default=0.0)
    frequency = 0.5 * float(np.hypot(coil, capacitor)) / np.sqrt(3.0)
    floor = max(LEAST_FLOOR, 0.5 * frequency)
    return float(floor if error_limit is None else min(floor, error_limit))


def _hundredths(price: float | None) -> int:
    return NEVER if price is None else round(price * 100)


def _price_limit(request: Request) -> int:
    limit = request.limits.price
    return NEVER if limit is None else int(np.floor(limit * 100 + 1e-6))


def _affordable(request: Request, coil_price: Ints, part_price: Ints) -> Bools:
    """Return which coils leave enough of the price limit for the cheapest capacitor where one is needed, (J,)."""
    limit = _price_limit(request)
    if limit >= NEVER:
        return np.ones(len(coil_price), dtype=np.bool_)
    cheapest = int(part_price.min(initial=NEVER)) if request.command == "pair" else 0
    return coil_price <= limit - cheapest


def _search_order(request: Request, coil_price: Ints, part_price: Ints) -> str:
    """Return the order of the search: where no plan has a price, by price is by build, which is bounded better."""
    no_coil = bool((coil_price >= NEVER).all())
    no_part = request.command == "pair" and bool((part_price >= NEVER).all())
    return "build" if request.by == "price" and (no_coil or no_part) else request.by


def _stock(quantity: int | None, units: int) -> int:
    return PLENTY if quantity is None else quantity // units


def _error_limit(request: Request, band: Band) -> float:
    limits = request.limits
    if limits.error is None or (band.trimmer is not None and not limits.error_stated):
        return float("inf")
    return limits.error


def _species(capacitors: tuple[Capacitor, ...]) -> tuple[list[tuple[int, ...]], list[Capacitor]]:
    """Group parts that act alike at every frequency: same capacitance, same series inductance."""
    groups: dict[tuple[Fraction, float], list[int]] = {}
    for index, part in enumerate(capacitors):
        groups.setdefault((part.exact, part.series_inductance or 0.0), []).append(index)
    ordered = sorted(groups.items(), key=lambda item: item[0])
    return [tuple(members) for _, members in ordered], [capacitors[members[0]] for _, members in ordered]


def _part_rank(capacitors: tuple[Capacitor, ...]) -> Ints:
    """Return each part's place by content: value, grade, tolerance, label."""
    order = sorted(
        range(len(capacitors)),
        key=lambda i: (
            capacitors[i].exact,
            capacitors[i].grade,
            capacitors[i].tolerance,
            capacitors[i].label,
        ),
    )
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = np.arange(len(order))
    return rank


def _nan(value: float | None) -> float:
    return float("nan") if value is None else value


def _part_loss(part: Capacitor, frequency: float) -> float:
    known = part.q is not None and (part.q_below is None or frequency <= part.q_below)
    return 1.0 / part.q if known and part.q else float("nan")


def build_problem(request: Request, coils: Coils, capacitors: tuple[Capacitor, ...], floor: float) -> Problem:
    """Return the request as the arrays of one search.

    Parameters
    ----------
    request : Request
        Fixed bands only.
    coils : Coils
        Every coil in play.
    capacitors : tuple of Capacitor
        Every capacitor in play.
    floor : float
        The tolerance floor. [fraction of f]
    """
    bands, limits, stray = request.bands, request.limits, request.stray
    frequency = np.array([band.highest for band in bands])
    groups, first = _species(capacitors)
    species = np.array([_effective(first, float(f)) for f in frequency]).reshape(len(bands), len(first))
    omega = 2 * np.pi * frequency
    trimmers = [band.trimmer for band in bands]
    drift_set = limits.drift is not None
    unpriced = np.isnan(coils.price)
    coil_price = np.where(unpriced, NEVER, np.rint(np.where(unpriced, 0.0, coils.price) * 100)).astype(np.int64)
    part_price = np.array([_hundredths(c.unit_price) for c in capacitors], dtype=np.int64)
    return Problem(
        frequency=frequency,
        error_limit=np.array([_error_limit(request, band) for band in bands]),
        q_limit=np.array([band.q or 0.0 for band in bands]),
        q_enough=np.array([enough_q(band.highest, band.q) for band in bands]),
        stray=np.array([band.stray for band in bands]),
        trimmer_low=np.array([t.low if t else 0.0 for t in trimmers]),
        trimmer_high=np.array([t.high if t else 0.0 for t in trimmers]),
        trimmer_loss=np.array([1.0 / (t.q or TRIMMER_Q) if t else 0.0 for t in trimmers]),
        trimmer_tempco=np.array([_nan(t.tempco) if t else 0.0 for t in trimmers]),
        wanted=1.0 / (omega[None, :] ** 2 * coils.inductance),
        self_capacitance=coils.self_capacitance,
        in_play=coils.in_play
        & _affordable(request, coil_price, part_price)[:, None]
        & _layout_has_contacts(request),
        coil_loss=1.0 / coils.q,
        reactance_class=np.stack(
            [reactance_class(omega[b] * coils.inductance[:, b], frequency[b]) for b in range(len(bands))],
            axis=1,
        ).reshape(coils.inductance.shape),
        effort=effort(coils),
        coil_price=coil_price,
        support=coils.support,
        support_stock=np.array([_stock(s.quantity, request.units) for s in coils.supports], dtype=np.int64),
        coil_rank=coils.rank,
        coil_tempco=coils.tempco,
        coil_tempco_spread=coils.tempco_spread,
        species=species,
        commonness=commonness([part.value for part in first]).astype(np.int64),
        options=tuple(groups),
        part_loss=np.array([[_part_loss(c, float(f)) for c in capacitors] for f in frequency]).reshape(
            len(bands), len(capacitors)
        ),
        part_tempco=np.array([_nan(c.tempco) for c in capacitors]),
        part_tempco_spread=np.array([c.tempco_tolerance or 0.0 for c in capacitors]),
        part_price=part_price,
        part_stock=np.array([_stock(c.quantity, request.units) for c in capacitors], dtype=np.int64),
        part_rank=_part_rank(capacitors),
        part_value=tuple(c.exact for c in capacitors),
        least_parts=1 if request.command == "pair" else 0,
        most_parts=limits.parts_per_band,
        connect_any=request.capacitors.connect == "any",
        lead_inductance=stray.inductance,
        share=float("inf") if stray.share is None else stray.share,
        stray_tempco=stray.tempco,
        drift_limit=limits.drift if drift_set and limits.drift is not None else float("inf"),
        parts_limit=_parts_limit(request),
        values_limit=NEVER if limits.values is None else limits.values,
        contacts_limit=NEVER if limits.contacts is None else limits.contacts,
        price_limit=_price_limit(request),
        inductors=limits.inductors,
        floor=floor,
        by=_search_order(request, coil_price, part_price),
        margin=limits.margin,
        excess_limit=float("inf") if limits.excess is None else limits.excess,
        alignable=alignable_share(request),
        aligned=aligned_bands(request),
        coil_spread=coils.spread,
        coil_adjust=np.array([min(s.adjust or 0.0, MOST_ADJUST) for s in coils.supports], dtype=float)[coils.support],
        part_tolerance=np.array([c.tolerance for c in capacitors]),
        stray_tolerance=stray.tolerance,
        drive=_drive(request, coils, capacitors),
        **_swept_figures(request, coils, capacitors, first),
    )


def contacts_of_layout(request: Request) -> int:
    """Return the contacts that a stack or a shared set on one whole coil needs beside those of a set's capacitors. [-]

    A stack has one for each band but the highest; each trimmer has its own, since it is in circuit at one band.
    """
    if len(request.bands) < 2 or request.switching == "separate":
        return 0
    trimmers = sum(band.trimmer is not None for band in request.bands)
    return trimmers + (len(request.bands) - 1 if request.switching == "stacked" else 0)


def _layout_has_contacts(request: Request) -> bool:
    """Whether the layout alone keeps to the limit on contacts."""
    limit = request.limits.contacts
    return limit is None or contacts_of_layout(request) <= limit


def _parts_limit(request: Request) -> int:
    """Return the most capacitors: each of a shared set has a contact of its own."""
    limit = NEVER if request.limits.parts is None else request.limits.parts
    if request.switching != "shared" or request.limits.contacts is None or len(request.bands) < 2:
        return limit
    return min(limit, max(0, request.limits.contacts - contacts_of_layout(request)))


def _drive(request: Request, coils: Coils, capacitors: tuple[Capacitor, ...]) -> Drive | None:
    """Return what parts must bear, None where nothing is driven or ratings are no limit."""
    table = drive_of(request)
    if table is None or request.limits.stress is None:
        return None
    kind, amount = next((k, a) for k in ("power", "voltage", "current") if (a := getattr(table, k)) is not None)
    _, of_current = uses(request)

    def volts(ratings: Iterable[float | None]) -> Floats:
        return _volts(request, ratings)

    def amperes(ratings: Iterable[float | None]) -> Floats:
        return np.array([np.inf if a is None else a * of_current for a in ratings])

    return Drive(
        kind=kind,
        amount=amount,
        crest=table.crest,
        effective=table.effective / np.sqrt(2.0),
        part_voltage=np.append(volts(part.voltage for part in capacitors), np.inf),
        part_current=np.append(amperes(part.rf_current for part in capacitors), np.inf),
        part_capacitance=np.append([part.value for part in capacitors], 1.0),
        coil_current=amperes(support.current for support in coils.supports)[coils.support],
        trimmer_voltage=volts(trimmer_rating(band.trimmer) for band in request.bands),
        element_voltage=float(volts([element_rating(request.tuning)])[0]),
    )


def _volts(request: Request, ratings: Iterable[float | None]) -> Floats:
    """Return what parts may bear of radio frequency, derated and less the direct voltage across them. [V peak]"""
    table = drive_of(request)
    bias = 0.0 if table is None else table.bias
    of_voltage, _ = uses(request)
    return np.array([np.inf if v is None else max(v * of_voltage - bias, 0.0) for v in ratings])


def alignable_share(request: Request) -> float:
    """Return the share of builds that must come on frequency: 1 at all corners, 0 where none is asked for."""
    limit = request.limits.alignable
    if limit is None and request.limits.alignable_off:
        return 0.0
    if limit is None:
        return CHOSEN_ALIGNS if any(_chooses(band) for band in request.bands) else 0.0
    return 1.0 if isinstance(limit, str) else float(limit)


def aligned_bands(request: Request) -> Bools:
    """Return for which bands that is asked, (B,): all, or where the plan sets no limit those that choose a trimmer."""
    stated = request.limits.alignable_off or request.limits.alignable is not None
    return np.array([stated or _chooses(band) for band in request.bands], dtype=np.bool_)


def _chooses(band: Band) -> bool:
    return band.trimmer is not None and (band.trimmer.to_choose or band.trimmer.name is not None)


def with_trimmer(request: Request, problem: Problem, trimmer: Trimmer, *, others: bool) -> Problem:
    """Return the problem with one trimmer in every band that chooses; `others`: the other bands are in play too."""
    choosing = np.array([band.trimmer is not None and band.trimmer.to_choose for band in request.bands])
    drive = problem.drive
    if drive is not None:
        volts = _volts(request, [trimmer_rating(trimmer)])[0]
        drive = replace(drive, trimmer_voltage=np.where(choosing, volts, drive.trimmer_voltage))

    def here(value: float, elsewhere: Floats) -> Floats:
        return np.where(choosing, value, elsewhere)

    return replace(
        problem,
        drive=drive,
        trimmer_low=here(trimmer.low, problem.trimmer_low),
        trimmer_high=here(trimmer.high, problem.trimmer_high),
        trimmer_loss=here(1.0 / (trimmer.q or TRIMMER_Q), problem.trimmer_loss),
        trimmer_tempco=here(_nan(trimmer.tempco), problem.trimmer_tempco),
        trimmer_tempco_spread=here(trimmer.tempco_tolerance or 0.0, problem.trimmer_tempco_spread),
        trim_share=here(MOST_TRIM, problem.trim_share),
        in_play=problem.in_play & (choosing | others)[None, :],
    )


def _swept_figures(
    request: Request, coils: Coils, capacitors: tuple[Capacitor, ...], first: list[Capacitor]
) -> dict[str, Any]:
    """Return what the search needs of bands with a range; nothing where there are none."""
    swept = np.array([band.swept for band in request.bands])
    if not swept.any():
        return {}
    assert request.tuning is not None
    element = element_ends(request.tuning)
    moved = coils.moved
    tempco = 0.0 if moved is not None else _nan(element.tempco)  # else the coils have it
    low_end = np.array([band.lowest for band in request.bands])
    return {
        "swept": swept,
        "low_end": low_end,
        "tuning_low": np.where(swept, element.low, 0.0),
        "tuning_high": np.where(swept, element.high, 0.0),
        "tuning_loss": np.where(swept, 1.0 / element.q, 0.0),
        "tuning_tempco": np.where(swept, tempco, 0.0),
        "tuning_share": most_share(request.tuning, dict(dict(request.extra).get("drive", ()))),
        "tuning_tolerance": element_tolerance(request.tuning),
        **({} if moved is None else {"moved_own_low": moved.own_low, "moved_own_high": moved.own_high}),
        "inductance_low": coils.inductance_low,
        "coil_loss_low": 1.0 / coils.q_low,
        "species_low": np.array([_effective(first, float(f)) for f in low_end]).reshape(len(low_end), len(first)),
        "part_loss_low": np.array([[_part_loss(c, float(f)) for c in capacitors] for f in low_end]).reshape(
            len(low_end), len(capacitors)
        ),
    }


def _effective(parts: list[Capacitor], frequency: float) -> Floats:
    """Return how each capacitor acts at a frequency; inf where it is near its own resonance. [F]"""
    value = np.array([part.value for part in parts])
    inductance = np.array([part.series_inductance or 0.0 for part in parts])
    near = (2 * np.pi * frequency) ** 2 * inductance * value > NEAR_OWN_RESONANCE
    return np.where(near, np.inf, effective_capacitance(value, inductance, frequency))
