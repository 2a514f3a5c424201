"""One choice of parts -> its figures, computed afresh from the parts alone.

Nothing here looks at what the search believed; `recheck` compares the two and refuses to go on where
they differ.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import TypeVar

from partpick.candidates import Coils, coil_figures, coil_part_line
from partpick.errors import InternalError
from partpick.objective import TRIMMER_Q
from partpick.parts import Capacitor
from partpick.physics.resonance import effective_capacitance, resonance_frequency
from partpick.quantities import format_quantity
from partpick.request import Band, Request
from partpick.result import BandFigures, Candidate, CoilFigures, PartLine
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED

AGREEMENT = 1e-9  # of the frequency, between search and recheck

T = TypeVar("T", float, Fraction)


@dataclass(frozen=True, kw_only=True)
class Network:
    """The capacitors of one band: indices into the capacitors in play, in the order of the shape."""

    parts: tuple[int, ...]
    shape: int


@dataclass(frozen=True, kw_only=True)
class Design:
    """What was picked: a coil and a network for each band, in plan order."""

    coils: tuple[int, ...]  # (B,) index into Coils
    networks: tuple[Network, ...]  # (B,)


def assess(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    design: Design,
    alternatives: int | None = None,
) -> Candidate:
    """Return every figure of one design; rank and front are filled in by the caller.

    Raises
    ------
    InternalError
        A figure is not finite, which no design on offer may have.
    """
    references = _coil_references(request, design)
    names, lines = _capacitor_lines(request, capacitors, design)
    bands = []
    for index, band in enumerate(request.bands):
        bands.append(_band_figures(request, coils, capacitors, design, index, band, references, names[index]))
    coil_list, coil_lines = _coil_lines(request, coils, design, references)
    extras = _trimmer_lines(request)
    parts = (*lines, *coil_lines, *extras)
    used = [i for network in design.networks for i in network.parts]
    errors = [abs(b.error) for b in bands if b.error is not None]
    prices = [line.unit_price for line in (*lines, *coil_lines)]
    return Candidate(
        rank=None,
        on_front=False,
        worst_error=max(errors) if errors else None,
        worst_excess=None,
        part_count=len(used),
        inductor_count=len(coil_list),
        piece_count=len(used) + len(coil_list),
        value_count=len({capacitors[i].exact for i in used}),
        price=None if any(p is None for p in prices) else math.fsum(p for p in prices if p is not None),
        alternatives=alternatives,
        bands=tuple(bands),
        coils=coil_list,
        parts=parts,
        warnings=_warnings(request, coils, capacitors, design, bands),
    )


def recheck(candidate: Candidate, worst_error: float) -> None:
    """Refuse a candidate whose worst error is not what the search ordered it by.

    Raises
    ------
    InternalError
        The two differ by more than rounding.
    """
    if candidate.worst_error is None or abs(candidate.worst_error - worst_error) > AGREEMENT:
        raise InternalError(
            f"internal error: the search ordered a candidate by an error of {worst_error:.9g}, "
            f"its parts give {candidate.worst_error}; please report this plan"
        )


def network_capacitance(
    capacitors: Sequence[Capacitor], network: Network, frequency: float, leads: float
) -> float:
    """Return how a band's network acts at a frequency, series inductances included. [F]"""
    chosen = [capacitors[i] for i in network.parts]
    if not chosen:
        return 0.0
    if any(part.series_inductance for part in chosen):
        acting = [
            float(effective_capacitance(part.value, part.series_inductance or 0.0, frequency))
            for part in chosen
        ]
        whole = _combine(acting, network.shape)
    else:
        whole = float(_combine([part.exact for part in chosen], network.shape))
    return float(effective_capacitance(whole, leads, frequency)) if leads else whole


def _combine(c: list[T], shape: int) -> T:
    if shape == PARALLEL or len(c) == 1:
        total = c[0]
        for value in c[1:]:
            total = total + value
        return total
    if shape == SERIES:
        total = c[0]
        for value in c[1:]:
            total = total * value / (total + value)
        return total
    if shape == SHUNTED:
        return c[0] + c[1] * c[2] / (c[1] + c[2])
    assert shape == CHAINED
    pair = c[1] + c[2]
    return c[0] * pair / (c[0] + pair)


def network_shares(c: list[float], shape: int) -> list[float]:
    """Return d ln(network) / d ln(part) of each part of a network of plain capacitances. [-]"""
    net = _combine(c, shape) if c else 0.0
    if shape == PARALLEL or len(c) == 1:
        return [value / net for value in c]
    if shape == SERIES:
        return [net / value for value in c]
    if shape == SHUNTED:
        pair = c[1] * c[2] / (c[1] + c[2])
        return [c[0] / net, pair**2 / c[1] / net, pair**2 / c[2] / net]
    pair = c[1] + c[2]
    return [net / c[0], net * c[1] / pair**2, net * c[2] / pair**2]


def connection_text(names: Sequence[str], shape: int) -> str:
    """Return a network in words of references: `C1 | (C2 + C3)`; parallel `|`, series `+`."""
    if not names:
        return ""
    if shape == SHUNTED:
        return f"{names[0]} | ({names[1]} + {names[2]})"
    if shape == CHAINED:
        return f"{names[0]} + ({names[1]} | {names[2]})"
    return (" | " if shape == PARALLEL else " + ").join(names)


def _coil_references(request: Request, design: Design) -> dict[int, str]:
    """L1 serves the lowest band."""
    lowest: dict[int, float] = {}
    for coil, band in zip(design.coils, request.bands, strict=True):
        lowest[coil] = min(lowest.get(coil, math.inf), band.lowest)
    ordered = sorted(lowest, key=lambda coil: (lowest[coil], coil))
    return {coil: f"L{place}" for place, coil in enumerate(ordered, 1)}


def _capacitor_lines(
    request: Request, capacitors: Sequence[Capacitor], design: Design
) -> tuple[list[tuple[str, ...]], list[PartLine]]:
    names: list[tuple[str, ...]] = []
    lines: list[PartLine] = []
    for band, network in zip(request.bands, design.networks, strict=True):
        own = []
        for index in network.parts:
            reference = f"C{len(lines) + 1}"
            own.append(reference)
            lines.append(_capacitor_line(reference, capacitors[index], (band.name,)))
        names.append(tuple(own))
    return names, lines


def _capacitor_line(reference: str, part: Capacitor, bands: tuple[str, ...]) -> PartLine:
    value = format_quantity(part.value, "F", digits=4)
    return PartLine(
        reference=reference,
        kind="capacitor",
        value=part.value,
        unit="F",
        label=value,
        description=part.label or value,
        grade=part.grade or None,
        tolerance=part.tolerance,
        tempco=part.tempco,
        bands=bands,
        unit_price=part.unit_price,
        source=part.source,
    )


def _coil_lines(
    request: Request, coils: Coils, design: Design, references: dict[int, str]
) -> tuple[tuple[CoilFigures, ...], list[PartLine]]:
    figures, lines = [], []
    for coil, reference in references.items():
        served = [i for i, c in enumerate(design.coils) if c == coil]
        lowest = min(served, key=lambda i: request.bands[i].lowest)
        figure = replace(coil_figures(coils, coil, lowest), reference=reference)
        figures.append(figure)
        lines.append(coil_part_line(coils, coil, figure, tuple(request.bands[i].name for i in served)))
    return tuple(figures), lines


def _trimmer_lines(request: Request) -> list[PartLine]:
    lines: list[PartLine] = []
    for band in request.bands:
        if band.trimmer is None:
            continue
        label = f"{format_quantity(band.trimmer.low, 'F')} to {format_quantity(band.trimmer.high, 'F')}"
        lines.append(
            PartLine(
                reference=f"CT{len(lines) + 1}",
                kind="trimmer",
                value=band.trimmer.middle,
                unit="F",
                label=label,
                description=f"trimmer capacitor {label}",
                grade=None,
                tolerance=None,
                tempco=band.trimmer.tempco,
                bands=(band.name,),
                unit_price=0.0,
                source="stated in the plan",
            )
        )
    return lines


def _band_figures(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    design: Design,
    index: int,
    band: Band,
    references: dict[int, str],
    names: tuple[str, ...],
) -> BandFigures:
    coil, network = design.coils[index], design.networks[index]
    target = band.highest
    inductance = float(coils.inductance[coil, index])
    self_capacitance = float(coils.self_capacitance[coil])
    own = network_capacitance(capacitors, network, target, request.stray.inductance)
    trimmer = band.trimmer.middle if band.trimmer else None
    total = own + band.stray + self_capacitance + (trimmer or 0.0)
    resonance = float(resonance_frequency(inductance, total))
    if not math.isfinite(resonance):
        raise InternalError(f"internal error: band {band.name} has no resonance; please report this plan")
    q = _tank_q(coils, capacitors, network, band, coil, index, own, total)
    drift, spread = _drift(request, coils, capacitors, network, band, coil, index, own)
    return BandFigures(
        name=band.name,
        target=target,
        resonance=resonance,
        error=(resonance - target) / target,
        inductance=inductance,
        capacitance=total,
        network=own,
        stray=band.stray,
        self_capacitance=self_capacitance,
        trimmer=trimmer,
        coil=references[coil],
        tap_turns=None,
        contacts=(f"S{index + 1}",) if len(request.bands) > 1 else (),
        capacitors=names,
        connection=connection_text(names, network.shape),
        reactance=2 * math.pi * target * inductance,
        q=q,
        bandwidth=None if q is None else resonance / q,
        drift=drift,
        drift_spread=spread,
        hertz_per_farad=-resonance / (2 * total),
        extra={},
    )


def _tank_q(
    coils: Coils,
    capacitors: Sequence[Capacitor],
    network: Network,
    band: Band,
    coil: int,
    index: int,
    own: float,
    total: float,
) -> float | None:
    """Return 1 / (coil loss + each capacitor's loss by its share); None where a loss is unknown. [-]"""
    coil_q = float(coils.q[coil, index])
    if not math.isfinite(coil_q):
        return None
    loss = 1.0 / coil_q
    chosen = [capacitors[i] for i in network.parts]
    for part, share in zip(chosen, network_shares([c.value for c in chosen], network.shape), strict=True):
        if part.q is None or (part.q_below is not None and band.highest > part.q_below):
            return None
        loss += share * own / total / part.q
    if band.trimmer:
        loss += band.trimmer.middle / total / (band.trimmer.q or TRIMMER_Q)
    return 1.0 / loss


def _drift(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    network: Network,
    band: Band,
    coil: int,
    index: int,
    own: float,
) -> tuple[float | None, float | None]:
    """Return df/f per kelvin and its spread, trimmer set on frequency; None where a tempco is unknown. [1/K]"""
    strays = band.stray + float(coils.self_capacitance[coil])
    wanted = 1.0 / ((2 * math.pi * band.highest) ** 2 * float(coils.inductance[coil, index]))
    trimmer, trimmer_tempco = 0.0, 0.0
    if band.trimmer:
        trimmer = min(max(wanted - own - strays, band.trimmer.low), band.trimmer.high)
        trimmer_tempco = band.trimmer.tempco if band.trimmer.tempco is not None else math.nan
    total = own + strays + trimmer
    capacitance = (strays * request.stray.tempco + trimmer * trimmer_tempco) / total
    spread = float(coils.tempco_spread[coil])
    chosen = [capacitors[i] for i in network.parts]
    for part, share in zip(chosen, network_shares([c.value for c in chosen], network.shape), strict=True):
        capacitance += share * own / total * (math.nan if part.tempco is None else part.tempco)
        spread += share * own / total * (part.tempco_tolerance or 0.0)
    nominal = -0.5 * (float(coils.tempco[coil, index]) + capacitance)
    return (nominal, 0.5 * spread) if math.isfinite(nominal) else (None, None)


def _warnings(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    design: Design,
    bands: Sequence[BandFigures],
) -> tuple[str, ...]:
    found: dict[str, None] = {}
    for network in design.networks:
        for index in network.parts:
            for note in capacitors[index].notes:
                found[f"{capacitors[index].label}: {note}"] = None
    for coil in dict.fromkeys(design.coils):
        support = coils.supports[int(coils.support[coil])]
        for note in support.notes:
            found[f"{support.name}: {note}"] = None
    for index, figures in enumerate(bands):
        if figures.q is None:
            found[f"{figures.name}: Q is unknown, a loss is not stated at this frequency"] = None
        for note in coils.band_notes(design.coils[index], index):
            found[f"{figures.name}: {note}"] = None
    return tuple(found)
