"""How a receiver as picked tracks, from the figures of its bands alone, and what rounding to the stock cost."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from partpick.errors import InternalError
from partpick.physics.resonance import effective_capacitance
from partpick.physics.tracking import best_padded_circuit
from partpick.receiver import least_error, notes_of, offset_of, receiver_bands
from partpick.request import Request
from partpick.result import BandFigures, Candidate
from partpick.search.sections import Circuits, band_points

Floats = NDArray[np.float64]

AGREEMENT = 1e-6  # of the limit, between search and recheck


@dataclass(frozen=True, kw_only=True)
class TrackingCurve:
    """The tracking error of one band, (n,) each."""

    band: str
    oscillator: str
    limit: float  # Hz
    signal: Floats  # Hz, to which the signal circuit is tuned, rising
    section: Floats  # F, of each section there
    wanted: Floats  # Hz, of the oscillator
    tuned: Floats  # Hz

    @property
    def error(self) -> Floats:
        """Oscillator as tuned less oscillator as wanted. [Hz]"""
        return np.asarray(self.tuned - self.wanted)

    @property
    def worst(self) -> float:
        """Largest size of the error. [Hz]"""
        return float(np.abs(self.error).max())


def tracking_curves(request: Request, candidate: Candidate) -> tuple[TrackingCurve, ...]:
    """Return the tracking error of each band of a candidate, the bands of a request with oscillators."""
    curves = []
    for pair in receiver_bands(request):
        signal, oscillator = candidate.bands[pair.signal], candidate.bands[pair.oscillator]
        points = band_points(_number(signal, "low_hz"), _number(signal, "high_hz"))
        section = _circuit(candidate, signal).section(points)
        wanted = points + pair.offset
        tuned = _circuit(candidate, oscillator).tuned(section, wanted[None, :])
        curves.append(
            TrackingCurve(
                band=signal.name,
                oscillator=oscillator.name,
                limit=pair.limit,
                signal=points,
                section=section[0],
                wanted=wanted,
                tuned=tuned[0],
            )
        )
    return tuple(curves)


def with_tracking(request: Request, candidate: Candidate, shares: float) -> Candidate:
    """Return a candidate with how it tracks.

    Parameters
    ----------
    request : Request
        With oscillators.
    candidate : Candidate
        Assessed from its parts.
    shares : float
        What the search ordered it by: the sum over its bands of worst error / limit. [-]

    Raises
    ------
    InternalError
        Its parts do not track as the search believed.
    """
    curves = tracking_curves(request, candidate)
    own = sum(curve.worst / curve.limit for curve in curves)
    if abs(own - shares) > AGREEMENT * len(curves):
        raise InternalError(
            f"internal error: the search ordered a candidate by tracking {shares:.9g}, its parts give {own:.9g}; "
            "please report this plan"
        )
    entries = [_entry(request, candidate, curve) for curve in curves]
    worst = max(curve.worst for curve in curves)
    extra = {**candidate.extra, "worst_tracking_hz": worst, "tracking": entries}
    signals = {curve.oscillator: curve.band for curve in curves}
    bands = tuple(
        replace(band, extra={**band.extra, "follows": signals[band.name]}) if band.name in signals else band
        for band in candidate.bands
    )
    warnings = (*candidate.warnings, *notes_of(request))
    return replace(candidate, bands=bands, extra=extra, warnings=warnings)


def _entry(request: Request, candidate: Candidate, curve: TrackingCurve) -> dict[str, object]:
    """Return the figures of one band as the result file has them."""
    offset = offset_of(request)
    best = best_padded_circuit(curve.section, curve.wanted)
    circuit, least, unrounded = best.circuit, best.worst_error, None
    if np.isfinite(least):
        # a trimmer across the section does what more padder and more across the coil do
        padder = float(circuit.padder + circuit.trimmer)
        inductance = float(circuit.inductance * (circuit.padder / padder) ** 2)
        across = float(circuit.inductance * circuit.padder / inductance - padder)
        unrounded = {"inductance_h": inductance, "series_padder_f": padder, "across_f": across}
    else:  # the padder belongs to the signal circuit
        least = least_error(float(curve.signal[0]), float(curve.signal[-1]), offset)
    size = np.abs(curve.error)
    return {
        "band": curve.band,
        "oscillator": curve.oscillator,
        "intermediate_hz": abs(offset),
        "side": "below" if offset < 0 else "above",
        "worst_error_hz": curve.worst,
        "worst_at_hz": float(curve.signal[int(np.argmax(size))]),
        "limit_hz": curve.limit,
        "unrounded_error_hz": least,
        "rounding_cost_hz": curve.worst - least,
        "unrounded_oscillator": unrounded,
    }


def _circuit(candidate: Candidate, figures: BandFigures) -> Circuits:
    """Return one band as picked, a single circuit: all but section and padder is taken as across the coil."""
    ends = np.array([_number(figures, key) for key in ("low_hz", "high_hz")])
    element = np.array([_number(figures, key) for key in ("tuning_high_f", "tuning_low_f")])  # low end first
    total = np.array([_number(figures, key) for key in ("capacitance_low_f", "capacitance_high_f")])
    padder = np.full(2, np.inf)
    if figures.extra["series_padder_f"] is not None:
        part = next(line for line in candidate.parts if line.reference == figures.capacitors[-1])
        padder = effective_capacitance(_number(figures, "series_padder_f"), part.series_inductance or 0.0, ends)
    across = total - element / (1.0 + element / padder)
    return Circuits(
        low=float(ends[0]),
        high=float(ends[1]),
        inductance_low=np.array([_number(figures, "inductance_low_h")]),
        inductance_high=np.array([figures.inductance]),
        fixed=np.zeros(1),
        across_low=across[:1],
        across_high=across[1:],
        padder_low=padder[:1],
        padder_high=padder[1:],
    )


def _number(figures: BandFigures, key: str) -> float:
    value = figures.extra[key]
    assert isinstance(value, float)
    return value
