"""[receiver]: signal circuits and oscillator on one gang, as the search plans them.

Every band of a receiver becomes two: its signal circuit, and an oscillator of the same gang whose range is
the band moved by the intermediate frequency. Each has one section of the gang, a coil and capacitors.
"""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from typing import TYPE_CHECKING

from partpick.errors import RequestError
from partpick.physics.tracking import best_tracking, plain_circuit
from partpick.quantities import format_quantity
from partpick.request import Band, Request, Tuning

if TYPE_CHECKING:
    from partpick.search.tracking import ReceiverBand

GANGED = ("variable capacitor", "varactor")
LEAST_SHARE = 0.005  # of the band's lower end: a tracking error that no signal circuit notices; common practice
ROOM = 2.0  # times the least error of parts not rounded
CLOSE = 0.02  # of the signal: closer than this no signal circuit holds the oscillator back; common practice
LARGEST_SHARE = 0.2  # of the oscillator's lowest frequency, for a stated limit
OSCILLATOR = " oscillator"  # behind the name of the band


def is_receiver(request: Request) -> bool:
    """Whether a request has signal circuits and an oscillator on one gang."""
    return "receiver" in dict(request.extra)


def offset_of(request: Request) -> float:
    """Return by how much the oscillator is above the signal, below where negative. [Hz]"""
    table = dict(dict(request.extra)["receiver"])
    intermediate = table["intermediate"]
    assert isinstance(intermediate, float)
    return -intermediate if table["side"] == "below" else intermediate


def of_one_section(request: Request) -> Request:
    """Return a receiver's request with one section of the gang for each circuit.

    Raises
    ------
    RequestError
        The gang, the layout or the intermediate frequency do not make a receiver.
    """
    _check_plan(request)
    _check_gang(request)
    for band in request.bands:
        _check_band(request, band)
    tuning, limits = request.tuning, request.limits
    assert tuning is not None
    keys = {**dict(tuning.keys), "sections": 1, "gang": tuning.get("sections")}
    limits = replace(limits, inductors=2 * len(request.bands))
    return replace(request, tuning=Tuning(kind=tuning.kind, keys=tuple(keys.items())), limits=limits)


def with_oscillators(request: Request) -> Request:
    """Return a receiver's request with an oscillator as a band of its own behind each band."""
    offset = offset_of(request)
    bands: list[Band] = []
    for band in request.bands:
        assert band.low is not None and band.high is not None
        moved = replace(
            band, name=band.name + OSCILLATOR, low=band.low + offset, high=band.high + offset, load=None
        )
        bands += [band, moved]
    return replace(request, bands=tuple(bands))


def receiver_bands(request: Request) -> tuple[ReceiverBand, ...]:
    """Return which bands of a request with oscillators belong together, and how far each may be off."""
    from partpick.search.tracking import ReceiverBand  # imported where a receiver is planned

    return tuple(
        ReceiverBand(
            signal=place,
            oscillator=place + 1,
            offset=offset_of(request),
            limit=tracking_limit(request, request.bands[place]),
            hint=least_error(request.bands[place].lowest, request.bands[place].highest, offset_of(request)),
        )
        for place in range(0, len(request.bands), 2)
    )


def tracking_limit(request: Request, band: Band) -> float:
    """Return the largest tracking error: as stated, else twice that of unrounded parts, at least 0.5 %. [Hz]"""
    stated = dict(dict(request.extra)["receiver"]).get("tracking")
    if isinstance(stated, float):
        return stated
    assert band.low is not None and band.high is not None
    return max(LEAST_SHARE * band.low, ROOM * least_error(band.low, band.high, offset_of(request)))


def oscillators_alone(request: Request) -> Request:
    """Return the oscillators of a receiver as bands, as narrow as the tracking limit allows, without a margin."""
    bands = []
    for signal, band in zip(request.bands, with_oscillators(request).bands[1::2], strict=True):
        assert band.low is not None and band.high is not None
        limit = min(tracking_limit(request, signal), 0.45 * (band.high - band.low))
        bands.append(replace(band, low=band.low + limit, high=band.high - limit))
    return replace(request, bands=tuple(bands), limits=replace(request.limits, margin=0.0))


def with_widest_tracking(request: Request) -> Request:
    """Return a receiver's request with the largest tracking error that any plan may state."""
    offset = min(offset_of(request), 0.0)
    widest = min(LARGEST_SHARE * (band.lowest + offset) for band in request.bands)
    extra = dict(request.extra)
    extra["receiver"] = tuple({**dict(extra["receiver"]), "tracking": widest}.items())
    return replace(request, extra=tuple(extra.items()))


@cache
def least_error(low: float, high: float, offset: float) -> float:
    """Return the worst tracking error with any coils and capacitors, one of the two circuits padded. [Hz]

    It does not depend on the gang: the circuit without a padder may have any coil and any fixed capacitance,
    and those of the other make up for both. With the oscillator below, the signal circuit has the padder.
    """
    if offset < 0:
        low, high = low + offset, high + offset
    plain = plain_circuit(low, high, 1e-11, 1e-9)
    return best_tracking(plain, low, high, abs(offset)).worst_error


# ---------------------------------------------------------------- what makes no receiver


def _check_plan(request: Request) -> None:
    extra = dict(request.extra)
    unplanned = (
        (request.switching != "separate", f'switching = "{request.switching}"', 'switching = "separate"'),
        (request.coil.taps, "coil.taps = true", "a coil for each circuit"),
        (request.capacitors.connect == "any", 'capacitors.connect = "any"', 'capacitors.connect = "parallel"'),
        (request.limits.alignable is not None, "limits.alignable", "a plan of each circuit by itself"),
        (request.limits.contacts is not None, "limits.contacts", "no limit"),
        (request.by == "price", "the order by price", "build or error"),
        *((name in extra, f"the table [{name}]", "a plan of its own") for name in ("cover", "oscillator", "drive")),
    )
    for asked, what, instead in unplanned:
        if asked:
            raise RequestError(f"receiver: {what} is not planned together with it; {instead} would do")
    fixed = [band.name for band in request.bands if not band.swept]
    if fixed:
        raise RequestError(f"receiver: band {fixed[0]} has one frequency; from and to are wanted for each band")
    coils, stated = 2 * len(request.bands), request.limits.inductors
    if request.limits.inductors_stated and stated < coils:
        raise RequestError(
            f"limits.inductors: read {stated}: a receiver needs a signal coil and an oscillator coil for each band, "
            f"{coils} in all"
        )


def _check_gang(request: Request) -> None:
    tuning = request.tuning
    assert tuning is not None  # a band with from and to has one
    if tuning.kind not in GANGED:
        raise RequestError(
            f'receiver: tuning.kind "{tuning.kind}" moves one inductance; one of {" and ".join(GANGED)} with two equal '
            "sections is wanted"
        )
    sections = tuning.get("sections")
    if sections != 2:
        raise RequestError(
            f"tuning.sections: read {sections}: a receiver has one section for the signal and an equal one for the "
            "oscillator; 2 is wanted (further signal circuits are built like the first)"
        )
    if tuning.get("parallel") not in (None, 1):
        raise RequestError("tuning.parallel: each section of a receiver tunes a circuit of its own; leave it out")


def _check_band(request: Request, band: Band) -> None:
    assert band.low is not None and band.high is not None
    offset = offset_of(request)
    intermediate = abs(offset)
    low, high = (format_quantity(f, "Hz", 6) for f in (band.low, band.high))
    read = f"receiver.intermediate: read {format_quantity(intermediate, 'Hz', 6)}:"
    if band.low + offset <= 0:
        lowest = format_quantity(band.low + offset, "Hz", 6)
        raise RequestError(
            f'{read} below the signal it puts the oscillator of band {band.name} at {lowest}; side = "above", or an '
            f"intermediate frequency below {low} is wanted"
        )
    if band.low <= intermediate <= band.high:
        raise RequestError(
            f"{read} it lies inside band {band.name}, {low} to {high}; one below {low} or above {high} is wanted"
        )
    least = CLOSE * band.high
    if intermediate < min(least, band.high - band.low):
        raise RequestError(
            f"{read} it puts the oscillator inside band {band.name}, {low} to {high}, next to the signal; one above "
            f"{format_quantity(least, 'Hz', 6)} is wanted"
        )
    stated = dict(dict(request.extra)["receiver"]).get("tracking")
    most = LARGEST_SHARE * (band.low + min(offset, 0.0))
    if isinstance(stated, float) and stated > most:
        raise RequestError(
            f"receiver.tracking: read {format_quantity(stated, 'Hz', 6)}: at most {format_quantity(most, 'Hz', 6)} "
            f"is accepted for band {band.name}"
        )


def notes_of(request: Request) -> tuple[str, ...]:
    """Return what is worth knowing of a receiver before it is built; of a request with oscillators."""
    offset, notes = offset_of(request), []
    for band in request.bands[::2]:
        assert band.low is not None and band.high is not None
        inside = max(band.low, band.low + offset), min(band.high, band.high + offset)
        if inside[0] < inside[1]:
            low, high = (format_quantity(f, "Hz", 4) for f in inside)
            notes.append(f"{band.name}: the oscillator runs in the band from {low} to {high}; keep it off the aerial")
    return tuple(notes)
