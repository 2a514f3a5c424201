"""The order of adjustment on the bench.

An adjustable coil comes first, on its lowest band with the trimmer in the middle, for it moves all of its bands;
then the trimmers, lowest band first: each is in circuit on its own band only, in every switching layout, and
disturbs nobody. A swept band has its low end set by the coil and its high end by the trimmer, in turn until both
stay.
"""

from __future__ import annotations

from dataclasses import dataclass

from partpick.built.alignment import Alignment
from partpick.result import BandFigures, Candidate


@dataclass(frozen=True, kw_only=True)
class Step:
    """One adjustment; `adjust` is None for a band that is only measured."""

    adjust: str | None  # reference
    band: str
    frequency: float  # Hz
    why: str  # one of the words below
    travel: float | None = None  # expected, with nominal parts
    value: float | None = None  # F, of a trimmer


COIL_FIRST, EVENLY, OWN_TRIMMER, NOTHING = "coil first", "spread evenly", "own trimmer", "nothing to adjust"
LOW_END, HIGH_END = "low end by the coil", "high end by the trimmer"


def steps(own: Alignment, candidate: Candidate) -> tuple[Step, ...]:
    """Return the adjustments in order, lowest band of the first coil first, for every switching layout."""
    trimmers = {part.bands[0]: part.reference for part in candidate.parts if part.kind == "trimmer"}
    coils = {coil.reference: coil for coil in own.coils}
    figures = dict(zip((band.name for band in candidate.bands), own.bands, strict=True))
    found: list[Step] = []
    for reference in dict.fromkeys(coil.reference for coil in candidate.coils):
        served = sorted(
            (band for band in candidate.bands if band.coil == reference),
            key=_frequency,
        )
        if reference in coils and served:
            on, why = _coil_band(served, trimmers)
            why = why if on.target is not None else LOW_END
            found.append(_step(reference, on, why, travel=coils[reference].nominal))
            done = on.name if on.name not in trimmers else None
        else:
            done = None
        for band in served:
            aligned = figures[band.name]
            setting = aligned.trimmer
            if setting is not None:
                trimmer = trimmers.get(band.name, setting.reference)
                why = OWN_TRIMMER if band.target is not None else HIGH_END
                found.append(_step(trimmer, band, why, setting.nominal, setting.value))
            elif band.name != done:
                found.append(_step(None, band, NOTHING))
    return tuple(found)


def _coil_band(served: list[BandFigures], trimmers: dict[str, str]) -> tuple[BandFigures, str]:
    """Return the band on which a coil is set: one without trimmer where there is one, else the lowest."""
    plain = [band for band in served if band.name not in trimmers and band.target is not None]
    if len(plain) > 1:
        return plain[0], EVENLY
    return (plain or served)[0], COIL_FIRST


def _step(
    adjust: str | None, band: BandFigures, why: str, travel: float | None = None, value: float | None = None
) -> Step:
    at = "high_hz" if why == HIGH_END else "low_hz"
    frequency = _frequency(band, at)
    return Step(adjust=adjust, band=band.name, frequency=frequency, why=why, travel=travel, value=value)


def _frequency(band: BandFigures, at: str = "low_hz") -> float:
    """Return the target, of a swept band one end of the range asked for. [Hz]"""
    if band.target is not None:
        return band.target
    end = band.extra[at]
    assert isinstance(end, (int, float))
    return float(end)
