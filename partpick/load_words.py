"""Why no coil or divider gives a load the loaded Q that is wanted, in words."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from partpick.matching import load_to_meet
from partpick.quantities import format_percent, format_quantity
from partpick.request import Band, Request
from partpick.result import BandFigures, Candidate


def q_missed(request: Request, candidate: Candidate) -> float:
    """Return by how much the loaded Q is off the one wanted, of the worst band. [fraction of it]"""
    return max(abs(_reached(band, found, met[0]) / met[1] - 1.0) for band, found, met in _met(request, candidate))


def q_words(request: Request, candidate: Candidate) -> str:
    """Return the tolerance that would do, and of a load across the tank the reactance that gives what is wanted."""
    told = [f"{format_percent(q_missed(request, candidate), 3)} would do"]
    for band, found, (resistance, wanted) in _met(request, candidate):
        assert band.load is not None
        if band.load.connection == "divider":
            continue
        loss = 1.0 / wanted - (1.0 / found.coil_q if found.coil_q else 0.0)
        if loss <= 0:
            told.append(f"{band.name}: the coil alone has a Q of {found.coil_q:.3g}, and {wanted:.3g} is wanted")
        else:
            x = format_quantity(resistance * loss, "\u03a9", 3)
            told.append(f"{band.name}: {x} of reactance gives {wanted:.3g}, or the load by a tap, link or divider")
    return "; ".join(told)


def _met(request: Request, candidate: Candidate) -> Iterator[tuple[Band, BandFigures, tuple[float, float]]]:
    for band, found in zip(request.bands, candidate.bands, strict=True):
        met = load_to_meet(request, band)
        if met is not None:
            yield band, found, met


def _reached(band: Band, found: BandFigures, resistance: float) -> float:
    """Return the loaded Q before anything damps it further; an unknown Q counts as no loss. [-]"""
    assert band.load is not None
    told = found.extra.get("load")
    if band.load.connection == "divider" and isinstance(told, Mapping) and told["across_ohm"]:
        own = 1.0 / found.q if found.q else 0.0
        return float(1.0 / (own + found.reactance / told["across_ohm"]))
    own = 1.0 / found.coil_q if found.coil_q else 0.0
    return float(1.0 / (own + found.reactance / resistance))
