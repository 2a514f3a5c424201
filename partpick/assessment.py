"""One choice of parts -> its figures, computed afresh from the parts alone.

Nothing here looks at what the search believed; `recheck` compares the two and refuses to go on where
they differ.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

from partpick.band_switch import closed_at, contacts_of, switch_entry
from partpick.candidates import Coils, coil_figures, coil_part_line
from partpick.circuit import Design, Network, Tank, connection_text
from partpick.errors import InternalError
from partpick.moved_figures import element_warnings, moving_lines, settings, tuned_keys
from partpick.objective import TRIMMER_Q
from partpick.oscillator_figures import oscillator_figures
from partpick.parts import Capacitor
from partpick.physics.resonance import resonance_frequency
from partpick.quantities import format_quantity
from partpick.ratings import element_rating, trimmer_rating
from partpick.request import Request
from partpick.result import BandFigures, Candidate, CoilFigures, PartLine
from partpick.search.divided import CLAPPED, DIVIDED, OWN_PARTS, SPLIT
from partpick.search.networks import PARALLEL, SHUNTED
from partpick.tank_figures import load_note, tank_bandwidth, tank_figures
from partpick.tuning import element_ends
from partpick.unstated import losses_taken

DIVIDER_ROLES = ("output to common", "control to common")
AGREEMENT = 1e-9  # of the frequency, or of the excess, between search and recheck


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
    contacts = contacts_of(request, design)
    lines = _with_roles(lines, names, design)
    bands = []
    for index in range(len(request.bands)):
        tank = Tank(request=request, coils=coils, capacitors=capacitors, design=design, index=index)
        closed = closed_at(contacts, index)
        bands.append(replace(_band_figures(tank, references[tank.coil], names[index]), contacts=closed))
    coil_list, coil_lines = _coil_lines(request, coils, design, references)
    extras = [*_trimmer_lines(request), *_tuning_lines(request, coils, design)]
    parts = (*lines, *coil_lines, *extras)
    used = design.capacitors
    errors = [abs(b.error) for b in bands if b.error is not None]
    excesses = [excess for band in bands if isinstance(excess := band.extra.get("excess"), float)]
    prices = [line.unit_price for line in parts]
    return Candidate(
        rank=None,
        on_front=False,
        worst_error=max(errors) if errors else None,
        worst_excess=max(excesses) if excesses else None,
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
        extra=switch_entry(request, contacts, bands, coil_list),
    )


def recheck(candidate: Candidate, worst_error: float, worst_excess: float) -> None:
    """Refuse a candidate whose worst error or excess is not what the search ordered it by.

    Raises
    ------
    InternalError
        The two differ by more than rounding.
    """
    own_error, own_excess = candidate.worst_error or 0.0, candidate.worst_excess or 0.0
    if abs(own_error - worst_error) > AGREEMENT or abs(own_excess - worst_excess) > AGREEMENT:
        raise InternalError(
            f"internal error: the search ordered a candidate by error {worst_error:.9g} and excess "
            f"{worst_excess:.9g}, its parts give {own_error:.9g} and {own_excess:.9g}; please report this plan"
        )


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
    if design.closed:
        return _shared_lines(request, capacitors, design)
    names: list[tuple[str, ...]] = []
    lines: list[PartLine] = []
    for band, network in zip(request.bands, design.networks, strict=True):
        own = []
        for index in network.pieces:
            reference = f"C{len(lines) + 1}"
            own.append(reference)
            lines.append(_capacitor_line(reference, capacitors[index], (band.name,)))
        names.append(tuple(own))
    return names, lines


def _with_roles(
    lines: list[PartLine], names: Sequence[tuple[str, ...]], design: Design
) -> list[PartLine]:
    """Return the lines, those of a divider saying which half they are."""
    roles: dict[str, str] = {}
    for own, network in zip(names, design.networks, strict=True):
        for place, role in zip(network.divider or (), DIVIDER_ROLES, strict=False):
            roles[own[place]] = role
        if network.shape == CLAPPED:
            roles[own[0]] = "in series with the coil"
    return [
        replace(line, description=f"{line.description}, {roles[line.reference]}") if line.reference in roles else line
        for line in lines
    ]


def _shared_lines(
    request: Request, capacitors: Sequence[Capacitor], design: Design
) -> tuple[list[tuple[str, ...]], list[PartLine]]:
    """Capacitors that several bands use: one line each, with all its bands."""
    lines = []
    for place, index in enumerate(design.members):
        bands = [b.name for b, closed in zip(request.bands, design.closed, strict=True) if place in closed]
        lines.append(_capacitor_line(f"C{place + 1}", capacitors[index], tuple(bands)))
    return [tuple(f"C{place + 1}" for place in closed) for closed in design.closed], lines


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
        q=part.q,
        q_below=part.q_below,
        series_inductance=part.series_inductance,
        voltage=part.voltage,
        rf_current=part.rf_current,
    )


def _coil_lines(
    request: Request, coils: Coils, design: Design, references: dict[int, str]
) -> tuple[tuple[CoilFigures, ...], list[PartLine]]:
    figures, lines = [], []
    for coil, reference in references.items():
        served = [i for i, c in enumerate(design.coils) if c == coil]
        lowest = min(served, key=lambda i: request.bands[i].lowest)
        figure = replace(coil_figures(coils, coil, lowest), reference=reference)
        if coils.moved is not None and any(request.bands[i].swept for i in served):
            figure = replace(figure, extra={**figure.extra, "tuned": tuned_keys(request, coils.moved, coil)})
        figures.append(figure)
        lines.append(coil_part_line(coils, coil, figure, tuple(request.bands[i].name for i in served)))
    return tuple(figures), lines


def _trimmer_lines(request: Request) -> list[PartLine]:
    lines: list[PartLine] = []
    for band in request.bands:
        if band.trimmer is None:
            continue
        trimmer = band.trimmer
        label = f"{format_quantity(trimmer.low, 'F')} to {format_quantity(trimmer.high, 'F')}"
        lines.append(
            PartLine(
                reference=f"CT{len(lines) + 1}",
                kind="trimmer",
                value=trimmer.middle,
                unit="F",
                label=label,
                description=trimmer.name or f"trimmer capacitor {label}",
                grade=None,
                tolerance=None,
                tempco=trimmer.tempco,
                bands=(band.name,),
                unit_price=trimmer.unit_price,
                source=trimmer.source,
                q=trimmer.q or TRIMMER_Q,
                voltage=trimmer_rating(trimmer),
            )
        )
    return lines


def _tuning_lines(request: Request, coils: Coils, design: Design) -> list[PartLine]:
    swept = tuple(band.name for band in request.bands if band.swept)
    if not swept:
        return []
    assert request.tuning is not None
    if coils.moved is not None:
        return moving_lines(request, coils.moved, design)
    element = element_ends(request.tuning)
    label = f"{format_quantity(element.low, 'F')} to {format_quantity(element.high, 'F')}"
    return [
        PartLine(
            reference="T",
            kind="tuning",
            value=element.high,
            unit="F",
            label=label,
            description=f"{element.words}, {label}",
            grade=None,
            tolerance=None,
            tempco=element.tempco,
            bands=swept,
            unit_price=0.0,
            source="stated in the plan",
            q=element.q,
            voltage=element_rating(request.tuning),
        )
    ]


def _band_figures(tank: Tank, reference: str, names: tuple[str, ...]) -> BandFigures:
    resonance = float(resonance_frequency(tank.inductance(), tank.total()))
    if not math.isfinite(resonance):
        raise InternalError(f"internal error: band {tank.band.name} has no resonance; please report this plan")
    band, network, q = tank.band, tank.network, tank.q()
    drift, spread = tank.drift()
    swept = band.swept
    return BandFigures(
        name=band.name,
        target=None if swept else band.highest,
        resonance=None if swept else resonance,
        error=None if swept else (resonance - band.highest) / band.highest,
        inductance=tank.inductance(),
        capacitance=None if swept else tank.total(),
        network=None if swept else tank.across(),
        stray=tank.wiring,
        self_capacitance=tank.self_capacitance,
        trimmer=tank.trimmer if band.trimmer else None,
        coil=reference,
        tap_turns=tank.tap_turns,
        contacts=(),
        capacitors=names,
        connection=_swept_connection(names, network)
        if swept and tank.coils.moved is None
        else connection_text(names, network.shape),
        reactance=2 * math.pi * band.highest * tank.inductance(),
        q=q,
        bandwidth=tank_bandwidth(tank, band.highest if swept else resonance),
        drift=drift,
        drift_spread=spread,
        hertz_per_farad=-resonance / (2 * tank.total()),
        coil_q=tank.coil_q(),
        extra={
            **(_coverage(tank, resonance) if swept else {}),
            **tank_figures(tank, resonance, names),
            **oscillator_figures(tank, names),
        },
    )


def _swept_connection(names: tuple[str, ...], network: Network) -> str:
    """Return `(T + C3) | C1`: the element with its padder, then what is across the coil."""
    if network.shape == SPLIT:
        return " | ".join([f"(T + {names[0]} + {names[1]})", *names[2:]])
    across = names if network.series is None else names[:-1]
    element = "T" if network.series is None else f"(T + {names[-1]})"
    if not across:
        return element
    text = connection_text(across, network.shape)
    open_shapes = {PARALLEL, SHUNTED, *((DIVIDED,) if len(across) > OWN_PARTS[DIVIDED] else ())}
    return (
        f"{element} | {text}" if network.shape in open_shapes or len(across) == 1 else f"{element} | ({text})"
    )


def _coverage(tank: Tank, tuned_high: float) -> dict[str, object]:
    """Return the keys of a swept band: its ends as asked and as tuned, its padders and the element."""
    band, network, element, moved = tank.band, tank.network, tank.element(), tank.coils.moved
    assert band.low is not None and band.high is not None
    tuned_low = float(resonance_frequency(tank.inductance(low_end=True), tank.total(low_end=True)))
    excess = max(band.low - tuned_low, tuned_high - band.high) / (band.high - band.low)
    return {
        "low_hz": band.low,
        "high_hz": band.high,
        "tuned_low_hz": tuned_low,
        "tuned_high_hz": tuned_high,
        "excess": excess,
        "series_padder_f": None if network.series is None else tank.capacitors[network.series].value,
        "parallel_padder_f": tank.across() if network.parts else None,
        "tuning_low_f": None if element is None else element.low,
        "tuning_high_f": None if element is None else element.high,
        "inductance_low_h": tank.inductance(low_end=True),
        "capacitance_low_f": tank.total(low_end=True),
        "capacitance_high_f": tank.total(),
        "q_low": tank.q_at(low_end=True),
        "q_high": tank.q_at(),
        "coil_q_low": tank.coil_q(low_end=True),
        **({} if moved is None else settings(tank, moved)),
    }


def _warnings(
    request: Request,
    coils: Coils,
    capacitors: Sequence[Capacitor],
    design: Design,
    bands: Sequence[BandFigures],
) -> tuple[str, ...]:
    found: dict[str, None] = {}
    for network in design.networks:
        for index in network.pieces:
            for note in capacitors[index].notes:
                found[f"{capacitors[index].label}: {note}"] = None
    for trimmer in (band.trimmer for band in request.bands if band.trimmer):
        for note in trimmer.notes:
            found[f"{trimmer.name}: {note}"] = None
    for coil in dict.fromkeys(design.coils):
        support = coils.supports[int(coils.support[coil])]
        for note in support.notes:
            found[f"{support.name}: {note}"] = None
    found.update(dict.fromkeys((*losses_taken(request), *element_warnings(request, coils, design))))
    for index, figures in enumerate(bands):
        if figures.q is None:
            found[f"{figures.name}: Q is unknown, a loss is not stated at this frequency"] = None
        if said := load_note(figures.extra):
            found[f"{figures.name}: {said}"] = None
        if not figures.capacitors and not request.bands[index].swept:
            alone = "strays alone tune it" if figures.trimmer is None else "strays and trimmer alone tune it"
            found[f"{figures.name}: no capacitor, {alone}; measure before you build"] = None
        for note in coils.band_notes(design.coils[index], index):
            found[f"{figures.name}: {note}"] = None
    return tuple(found)
