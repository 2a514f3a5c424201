"""A design to what varies in it, by the references of its assessed candidate."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from partpick.built.tank import Moved, Swept, VaryingTank
from partpick.built.variation import CAPACITOR, COIL, SELF_CAPACITANCE, TUNING, WIRING, Source, Variation
from partpick.candidates import Coils
from partpick.circuit import Design, Tank
from partpick.parts import Capacitor
from partpick.request import Request
from partpick.result import BandFigures, Candidate
from partpick.tuning import TOLERANCE_OF, element_tolerance


def variation(
    request: Request, coils: Coils, capacitors: Sequence[Capacitor], design: Design, candidate: Candidate
) -> Variation:
    """Return what varies in a design, by the references of its assessed candidate.

    Parameters
    ----------
    request : Request
        Its strays and their tolerance.
    coils : Coils
        Every coil in play.
    capacitors : sequence of Capacitor
        Every capacitor in play.
    design : Design
        What was picked.
    candidate : Candidate
        The same design assessed: pieces that two bands share have one reference there.
    """
    sources = _Sources()
    tanks: list[VaryingTank] = []
    for index, figures in enumerate(candidate.bands):
        tank = Tank(request=request, coils=coils, capacitors=capacitors, design=design, index=index)
        upper = _varying(tank, figures, candidate, sources, low_end=False)
        if tank.band.swept:
            upper = replace(upper, low_end=_varying(tank, figures, candidate, sources, low_end=True))
        tanks.append(upper)
    return Variation(sources=tuple(sources.found), tanks=tuple(tanks), notes=_notes(request))


@dataclass(frozen=True)
class _Sources:
    """The sources met so far, one for each reference."""

    found: list[Source] = field(default_factory=list)
    places: dict[str, int] = field(default_factory=dict)

    def place(self, source: Source) -> int:
        """Return the place of a source, a new one at the end."""
        if source.reference not in self.places:
            self.places[source.reference] = len(self.found)
            self.found.append(source)
        return self.places[source.reference]


def references(design: Design, index: int, names: Sequence[str]) -> list[tuple[str, int]]:
    """Return reference and capacitor of each piece of a band, in the order of its network.

    Parameters
    ----------
    design : Design
        What was picked.
    index : int
        The band, in plan order.
    names : sequence of str
        References of the pieces in circuit there; where bands share pieces, in the order of the set.
    """
    pieces = design.networks[index].pieces
    named = [design.members[place] for place in design.closed[index]] if design.closed else list(pieces)
    left = list(zip(names, named, strict=True))
    found = []
    for piece in pieces:
        pair = next(each for each in left if each[1] == piece)
        left.remove(pair)
        found.append(pair)
    return found


def _varying(
    tank: Tank, figures: BandFigures, candidate: Candidate, sources: _Sources, *, low_end: bool
) -> VaryingTank:
    """Return one band at one end of its range; a fixed band has its upper end only."""
    request, band = tank.request, tank.band
    coil = sources.place(_coil_source(tank, figures.coil, candidate))
    pieces = [
        sources.place(_capacitor_source(reference, part, tank.capacitors[part]))
        for reference, part in references(tank.design, tank.index, figures.capacitors)
    ]
    chosen = [tank.capacitors[part] for part in tank.network.parts]
    return VaryingTank(
        name=band.name,
        frequency=tank.frequency(low_end=low_end),
        inductance=tank.inductance(low_end=low_end),
        coil=coil,
        coil_tempco=float(tank.coils.tempco[tank.coil, tank.index]),
        parts=tuple(pieces[: len(chosen)]),
        values=tuple(part.value for part in chosen),
        series_inductances=tuple(part.series_inductance or 0.0 for part in chosen),
        shape=tank.network.shape,
        leads=request.stray.inductance,
        wiring=sources.place(_stray_source(request, WIRING, band.name)),
        wiring_capacitance=tank.wiring,
        winding=sources.place(_stray_source(request, SELF_CAPACITANCE, figures.coil)),
        winding_capacitance=tank.own_capacitance(low_end=low_end),
        moved=_moved(tank, figures.coil, sources, low_end=low_end),
        trimmer=band.trimmer,
        swept=_swept(tank, pieces, sources, low_end=low_end),
        device=tank.device,
    )


def _swept(tank: Tank, pieces: Sequence[int], sources: _Sources, *, low_end: bool) -> Swept | None:
    element = tank.element()
    if element is None or tank.request.tuning is None:
        return None
    series = tank.network.series
    padder = None if series is None else tank.capacitors[series]
    return Swept(
        source=sources.place(
            Source(
                reference="T",
                kind=TUNING,
                label=element.words,
                size=element_tolerance(tank.request.tuning),
                tempco=element.tempco,
            )
        ),
        capacitance=element.high if low_end else element.low,
        padder=None if padder is None else pieces[-1],
        padder_capacitance=0.0 if padder is None else padder.value,
        padder_inductance=0.0 if padder is None else padder.series_inductance or 0.0,
    )


def _moved(tank: Tank, coil: str, sources: _Sources, *, low_end: bool) -> Moved | None:
    """Return how an element that moves inductance shares in the deviations of a swept band's coil."""
    moved, tuning = tank.coils.moved, tank.request.tuning
    if moved is None or tuning is None or not tank.band.swept:
        return None
    own, element = (
        (moved.share_low, moved.element_share_low) if low_end else (moved.share_high, moved.element_share_high)
    )
    reference = "T" if tuning.sections == 1 else f"T of {coil}"
    source = Source(reference=reference, kind=TUNING, label=tuning.kind, size=element_tolerance(tuning), tempco=0.0)
    return Moved(
        source=sources.place(source),
        coil_share=float(own[tank.coil, tank.index]),
        element_share=float(element[tank.coil, tank.index]),
    )


def _notes(request: Request) -> tuple[str, ...]:
    tuning = request.tuning
    if tuning is None or tuning.get("tolerance") is not None or not any(band.swept for band in request.bands):
        return ()
    taken = element_tolerance(tuning) * 100
    return (f"tuning.tolerance not stated: {taken:g} % of {TOLERANCE_OF[tuning.kind]} taken (common practice)",)


def _coil_source(tank: Tank, reference: str, candidate: Candidate) -> Source:
    label = next(coil.label for coil in candidate.coils if coil.reference == reference)
    return Source(
        reference=reference,
        kind=COIL,
        label=label,
        size=float(tank.coils.spread[tank.coil]),
        tempco_size=float(tank.coils.tempco_spread[tank.coil]),
    )


def _capacitor_source(reference: str, index: int, part: Capacitor) -> Source:
    return Source(
        reference=reference,
        kind=CAPACITOR,
        label=part.label,
        size=part.tolerance,
        batch=index,
        tempco=part.tempco,
        tempco_size=part.tempco_tolerance or 0.0,
    )


def _stray_source(request: Request, kind: str, of: str) -> Source:
    stray = request.stray  # its tolerance and tempco hold for wiring and self-capacitance alike
    return Source(reference=f"{kind} of {of}", kind=kind, label=kind, size=stray.tolerance, tempco=stray.tempco)
