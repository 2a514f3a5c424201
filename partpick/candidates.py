"""Every coil that the stock can wind or buy, as arrays over (coil, band).

`FORMS` is the table of winding forms: to add one, write its builder in `forms/` and put it here.
Which coils are in play for a band is decided here alone.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from partpick.forms.block import TAIL, Block, Support
from partpick.forms.bought import bought_block
from partpick.forms.measured import measured_block
from partpick.forms.multilayer import multilayer_block
from partpick.forms.pot import pot_block
from partpick.forms.ring import ring_block
from partpick.forms.rod import rod_block
from partpick.forms.screen import Screen
from partpick.forms.solenoid import solenoid_block
from partpick.parts import Catalogue
from partpick.physics.heating import bulk_surface, winding_surface
from partpick.physics.loss import dielectric_loss
from partpick.physics.self_capacitance import self_resonance_frequency
from partpick.quantities import format_quantity
from partpick.request import CoilRules, Request
from partpick.result import CoilFigures, PartLine

if TYPE_CHECKING:
    from partpick.moved.coils import MovedCoils

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

FORMS = {
    "solenoid": solenoid_block,
    "ring core": ring_block,
    "pot core": pot_block,
    "rod core": rod_block,
    "multilayer": multilayer_block,
    "bought": bought_block,
}
EASED_RESONANCE = 2.0  # times the highest frequency, for forms that are eased, where the plan states nothing
LIMIT_ROUNDING = 1e-9  # a coil exactly on a limit is inside it


@dataclass(frozen=True, kw_only=True, eq=False)
class Coils:
    """J coils at B frequencies; `support` tells which former, core or bought part each needs."""

    frequency: Floats  # (B,) Hz, of a swept band the upper end
    frequency_low: Floats  # (B,) Hz, its lower end
    supports: tuple[Support, ...]
    support: Ints  # (J,)
    blocks: tuple[Block, ...]
    turns: Ints  # (J,) 0 for a bought coil
    inductance_dc: Floats  # (J,) H
    inductance: Floats  # (J, B) H, at each band's frequency: the upper end of a swept band
    q: Floats  # (J, B) nan: unknown
    inductance_low: Floats  # (J, B) H, at the lower end of a swept band
    q_low: Floats  # (J, B)
    self_capacitance: Floats  # (J,) F
    loss_tangent: Floats  # (J,) of the self-capacitance, 0 where its loss is no cause of its own
    spread: Floats  # (J,) of the inductance, fraction: tolerances and model, uniform
    q_spread: Floats  # (J, 2) fraction below and above, nan: unknown
    self_capacitance_spread: Floats  # (J, 2) fraction below and above, nan: unknown
    tempco: Floats  # (J, B) 1/K, nan: unknown
    tempco_spread: Floats  # (J,) 1/K
    price: Floats  # (J,) nan: unknown
    volume: Floats  # (J,) m3, 0 for a bought coil
    wire_diameter: Floats  # (J,) m, 0 without wire
    effort_form: Ints  # (J,) 0 bought, 1 ring, 2 tube, 3 other
    rank: Ints  # (J,) place by content: form, former, wire, pitch, turns
    in_play: NDArray[np.bool_]  # (J, B)
    alone: Floats  # (J, B) H, as `inductance`, but without an element that moves it
    considered: int = 0  # coils that there are, those included which no band can use
    moved: MovedCoils | None = None  # a tuning element that moves inductance, at swept bands

    def __len__(self) -> int:
        return len(self.turns)

    def locate(self, coil: int) -> tuple[Block, int]:
        """Return the block that a coil is in, and its place there."""
        for block in self.blocks:
            if coil < len(block.turns):
                return block, coil
            coil -= len(block.turns)
        raise IndexError(coil)

    def band_notes(self, coil: int, band: int) -> tuple[str, ...]:
        """Return what must be said of this coil at this band."""
        support = self.supports[int(self.support[coil])]
        low, high = support.frequency_low, support.frequency_high
        frequency = float(self.frequency[band])
        block, row = self.locate(coil)
        said = block.cautions(row, frequency)
        if (low is not None and frequency < low) or (high is not None and frequency > high):
            said = (f"{support.name} is outside its useful range, {_range_words(low, high)}: Q unknown", *said)
        return said

    def loss_by_cause(self, coil: int, band: int) -> dict[str, float | None]:
        """Return what each cause in the coil takes, as its share of 1/Q; None where unknown."""
        block, row = self.locate(coil)
        names = ("skin", "proximity", "core", "former")
        if self.moved is not None and self.moved.swept[band]:  # known of the coil as wound only
            return dict.fromkeys(names)
        return {name: _known(getattr(block.losses, name)[row, band]) for name in names}

    def listed(self, inductance: float | None, *, low_frequency: bool) -> Ints:
        """Return the coils in play by content, or nearest to an inductance first."""
        inside = np.flatnonzero(self.in_play.any(axis=1))
        if inductance is None:
            return inside[np.argsort(self.rank[inside], kind="stable")]
        values = self.inductance_dc if low_frequency else self.inductance[:, 0]
        distance = np.abs(np.log(values[inside] / inductance))
        return inside[np.lexsort((self.rank[inside], np.rint(distance * 1e12)))]

    def section_row(self, coil: int, tap_turns: int | None) -> int:
        """Return the coil of as many turns as are in circuit: the coil itself, or that of its tapped section."""
        return coil if tap_turns is None else coil - (int(self.turns[coil]) - tap_turns)

    def section_self_capacitance(self, coil: Ints | int, tap_turns: Ints | int) -> Floats:
        """Return the self-capacitance that acts across a section from the earthed end, the rest open. [F]

        The idle turns swing with (L_s + M)/L_s times the section's voltage, so the whole coil's
        self-capacitance acts with the square of that across the section; M by the three inductances.
        """
        dc, turns = self.inductance_dc, self.turns[coil]
        section, rest = dc[coil - (turns - tap_turns)], dc[coil - tap_turns]
        mutual = (dc[coil] - section - rest) / 2.0
        whole: Floats = self.self_capacitance[coil] * (1.0 + mutual / section) ** 2
        return whole

    def section_loss(self, row: Ints | int, across: Floats | float, *, low_end: bool = False) -> Floats:
        """Return what the idle turns of a tapped coil add to the loss of its section in the former, (v, B).

        Parameters
        ----------
        row : (v,) array of int or int
            The coil of as many turns as are in circuit. [-]
        across : (v,) array or float
            Self-capacitance across the section, the idle turns included. [F]
        low_end : bool
            Whether at the lower end of swept bands.

        Returns
        -------
        loss : (v, B) or (B,) array
            Share of 1/Q beyond that of the coil of so many turns by itself. [-]
        """
        inductance = self.inductance_low if low_end else self.inductance
        frequency = self.frequency_low if low_end else self.frequency
        further = np.asarray(across - self.self_capacitance[row])[..., None]
        tangent = np.asarray(self.loss_tangent[row])[..., None]
        return dielectric_loss(inductance[row], further, frequency, tangent)

    def at_band(self, coil: int, band: int) -> dict[str, float | None]:
        """Return Q and series resistance at a band, None where unknown."""
        q = float(self.q[coil, band])
        if not np.isfinite(q):
            return {"q": None, "series_resistance_ohm": None}
        reactance = 2 * np.pi * float(self.frequency[band]) * float(self.inductance[coil, band])
        return {"q": q, "series_resistance_ohm": reactance / q}


def _range_words(low: float | None, high: float | None) -> str:
    ends = [format_quantity(end, "Hz") if end is not None else "any" for end in (low, high)]
    return f"{ends[0]} to {ends[1]}"


def realisable_coils(request: Request, catalogue: Catalogue) -> Coils:
    """Return every coil of the catalogue that some band might use, evaluated at each band's frequency.

    Those which the limits on inductance, proportions or self-resonance keep from every band are left out
    where a plan taps no coil and has no element that moves inductance: part of such a coil may do, or more of it.

    Parameters
    ----------
    request : Request
        Bands (their highest frequency is taken), coil rules and units.
    catalogue : Catalogue
        Formers, cores, wires and bought inductors in stock.
    """
    frequency = np.array([band.highest for band in request.bands])
    low_end = np.array([band.lowest for band in request.bands])
    swept = any(band.swept for band in request.bands)
    ends = np.concatenate([frequency, low_end]) if swept else frequency
    if request.coil.measured is not None:
        blocks = [measured_block(request.coil, ends)]
    else:
        wanted = request.coil.forms or tuple(FORMS)
        screen = _screen(request)
        blocks = [FORMS[form](catalogue, ends, request.units, screen) for form in FORMS if form in wanted]
    considered = sum(block.considered for block in blocks)
    blocks = [block for block in blocks if len(block.turns)]
    coils = replace(_joined(frequency, low_end, blocks), considered=considered)
    if _moved(request) and len(coils):
        coils = _with_element(request, coils, ends)
    return replace(coils, in_play=_in_play(request, coils))


def _with_element(request: Request, coils: Coils, ends: Floats) -> Coils:
    """Return the coils with the plan's element, which moves their inductance at swept bands."""
    from partpick.moved.coils import PlainCoils, moved_coils  # its physics asks for scipy

    assert request.tuning is not None
    plain = PlainCoils(**{name: getattr(coils, name) for name in PlainCoils.__dataclass_fields__})
    swept = np.array([band.swept for band in request.bands])
    tuned, moved = moved_coils(request.tuning, coils.blocks, plain, ends, swept)
    return replace(
        coils,
        inductance=tuned.inductance,
        inductance_low=tuned.inductance_low,
        q=tuned.q,
        q_low=tuned.q_low,
        tempco=tuned.tempco,
        moved=moved,
    )


def _moved(request: Request) -> bool:
    """Whether some bands are swept by an element that moves inductance."""
    tuning = request.tuning
    return tuning is not None and tuning.moves_inductance and any(band.swept for band in request.bands)


def _tapped_otherwise(request: Request) -> bool:
    """Whether an oscillator's common terminal or a load goes to a turn: then shorter coils say what a section is."""
    circuit = dict(dict(request.extra).get("oscillator", ())).get("circuit")
    loads = [band.load for band in request.bands if band.load is not None]
    return circuit == "hartley" or any(load.connection == "tap" for load in loads)


def _screen(request: Request) -> Screen:
    """Return the limits that decide on a coil before its loss is known."""
    rules, targets = request.coil, [band.highest for band in request.bands]
    if rules.taps or not targets or _moved(request) or _tapped_otherwise(request):
        return Screen()
    times, lowest = rules.self_resonance, min(targets)
    eased = times if times is None or rules.self_resonance_stated else EASED_RESONANCE
    return Screen(
        proportions=rules.proportions,
        inductance=rules.inductance,
        reactance=rules.reactance,
        self_resonance=None if times is None else times * lowest,
        self_resonance_eased=None if eased is None else eased * lowest,
        least=rules.least_wound,
        frequency=(lowest, max(targets)),
    )


def _joined(frequency: Floats, low_end: Floats, blocks: list[Block]) -> Coils:
    supports: list[Support] = []
    support: list[Ints] = []
    for block in blocks:
        support.append(block.support + len(supports))
        supports.extend(block.supports)

    def column(name: str, width: int | None = None) -> NDArray[np.generic]:
        parts = [getattr(block, name) for block in blocks]
        empty = np.empty((0,) if width is None else (0, width))
        return np.concatenate(parts) if parts else empty

    bands = len(frequency)
    evaluated = blocks[0].inductance.shape[1] if blocks else bands
    high, low = slice(0, bands), slice(evaluated - bands, evaluated)
    inductance, q = column("inductance", evaluated).astype(float, copy=False), column("q", evaluated).astype(float)
    whole = [np.empty(0, np.int64)]
    return Coils(
        frequency=frequency,
        frequency_low=low_end,
        supports=tuple(supports),
        support=np.concatenate(support or whole),
        blocks=tuple(blocks),
        turns=column("turns").astype(np.int64, copy=False),
        inductance_dc=column("inductance_dc").astype(float, copy=False),
        inductance=inductance[:, high],
        q=q[:, high],
        inductance_low=inductance[:, low],
        q_low=q[:, low],
        self_capacitance=column("self_capacitance").astype(float, copy=False),
        loss_tangent=column("loss_tangent").astype(float, copy=False),
        spread=column("spread").astype(float, copy=False),
        q_spread=column("q_spread", 2).astype(float, copy=False),
        self_capacitance_spread=column("self_capacitance_spread", 2).astype(float, copy=False),
        tempco=column("tempco", evaluated).astype(float, copy=False)[:, high],
        tempco_spread=column("tempco_spread").astype(float, copy=False),
        price=column("price").astype(float, copy=False),
        volume=column("volume").astype(float, copy=False),
        wire_diameter=column("wire_diameter").astype(float, copy=False),
        effort_form=np.concatenate([np.full(len(b), b.effort_form) for b in blocks] or whole).astype(
            np.int64
        ),
        rank=_content_rank(blocks),
        in_play=np.ones((sum(len(b.turns) for b in blocks), bands), dtype=np.bool_),
        alone=inductance[:, high],
    )


def _content_rank(blocks: list[Block]) -> Ints:
    """Order coils by form, former, wire and turns; never by their row.

    A wire goes on a former at one pitch only, so that the pitch adds nothing.
    """
    if not blocks:
        return np.empty(0, np.int64)
    forms = _place([block.form for block in blocks])
    keys = []
    for form, block in zip(forms, blocks, strict=True):
        former = _place([support.name for support in block.supports])[block.support]
        wire = _place(["", *(wire.name for wire in block.wires)])[block.wire + 1]
        keys.append((((int(form) << 20 | former) << 16 | wire) << 20) | block.turns)
    order = np.argsort(np.concatenate(keys), kind="stable")
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = np.arange(len(order))
    return rank


def _place(names: list[str]) -> Ints:
    """Return each name's place among the different names, sorted."""
    ordered = {name: place for place, name in enumerate(sorted(set(names)))}
    return np.array([ordered[name] for name in names], dtype=np.int64)


def _in_play(request: Request, coils: Coils) -> NDArray[np.bool_]:
    """Return which coils are inside every limit on coils alone, (J, B)."""
    inside = inside_as_wound(request, coils)
    every = np.arange(len(coils))
    alone = inside_in_circuit(request, coils, every, every, coils.self_capacitance)
    if coils.moved is None:
        return inside & alone
    return inside & np.where(coils.moved.swept[None, :], _inside_at_both_ends(request, coils, coils.moved), alone)


def _inside_at_both_ends(request: Request, coils: Coils, moved: MovedCoils) -> NDArray[np.bool_]:
    """Return which coils are inside the limits with the element at either end of its travel, (J, B).

    Their own resonance has to stand clear of the band's highest frequency where the inductance is most, too.
    """
    rules = request.coil
    highest = np.array([band.highest for band in request.bands])
    lowest = np.array([band.lowest for band in request.bands])
    inside = np.repeat(moved.able[:, None], len(highest), axis=1)
    ends = ((coils.inductance, moved.own_high, highest), (coils.inductance_low, moved.own_low, lowest))
    for inductance, further, frequency in ends:
        inside &= _within(inductance, rules.inductance)
        inside &= inductance >= rules.least_wound * (1 - LIMIT_ROUNDING)
        inside &= _within(2 * np.pi * frequency[None, :] * inductance, rules.reactance)
        if rules.self_resonance is not None:
            with np.errstate(divide="ignore"):
                own = self_resonance_frequency(inductance, coils.self_capacitance[:, None] + further)
            inside &= own >= _resonance_times(rules, coils)[:, None] * highest[None, :] * (1 - LIMIT_ROUNDING)
    for index, band in enumerate(request.bands):
        if band.q:
            inside[:, index] &= np.minimum(coils.q, coils.q_low)[:, index] >= band.q * (1 - LIMIT_ROUNDING)
    return inside


def inside_as_wound(request: Request, coils: Coils) -> NDArray[np.bool_]:
    """Return which coils are inside the limits on the winding itself: proportions, and form at each band, (J, B)."""
    rules = request.coil
    inside = np.ones(coils.inductance.shape, dtype=np.bool_)
    start = 0
    for block in coils.blocks:
        rows = slice(start, start + len(block.turns))
        start += len(block.turns)
        if rules.proportions is not None and block.proportions is not None:
            inside[rows] &= _within(block.proportions, rules.proportions)[:, None]
        for band_index, band in enumerate(request.bands):
            if band.forms is not None and block.form not in (*band.forms, "measured"):
                inside[rows, band_index] = False
    return inside


def inside_in_circuit(
    request: Request, coils: Coils, whole: Ints, row: Ints, self_capacitance: Floats
) -> NDArray[np.bool_]:
    """Return which coils, or sections of them, are inside the limits on what is in circuit, (v, B).

    Parameters
    ----------
    request : Request
        Its coil rules and bands.
    coils : Coils
        Every coil.
    whole : (v,) array of int
        The coil. [-]
    row : (v,) array of int
        The coil of as many turns as are in circuit: the coil itself, or that of a section. [-]
    self_capacitance : (v,) array
        Across what is in circuit. [F]

    Notes
    -----
    Of a section, the whole coil's own resonance counts too: its idle turns hang on, and near it they act as
    more capacitance than at low frequency.
    """
    rules, inductance = request.coil, coils.inductance[row]
    inside = np.isfinite(inductance) & (inductance > 0)
    wound = coils.turns[whole] > 0
    inside &= ~wound[:, None] | (inductance >= rules.least_wound * (1 - LIMIT_ROUNDING))
    inside &= _within(inductance, rules.inductance)
    inside &= _within(2 * np.pi * coils.frequency[None, :] * inductance, rules.reactance)
    if rules.self_resonance is not None:
        with np.errstate(divide="ignore"):
            own = self_resonance_frequency(inductance, self_capacitance[:, None])
            if whole is not row:
                entire = self_resonance_frequency(coils.inductance[whole], coils.self_capacitance[whole, None])
                own = np.minimum(own, entire)
        highest = np.array([band.highest for band in request.bands])
        inside &= own >= _resonance_times(rules, coils)[whole, None] * highest[None, :] * (1 - LIMIT_ROUNDING)
    for band_index, band in enumerate(request.bands):
        if band.q:
            inside[:, band_index] &= coils.q[row, band_index] >= band.q * (1 - LIMIT_ROUNDING)
    return inside


def _within(values: Floats, limits: tuple[float, float] | None) -> NDArray[np.bool_]:
    if limits is None:
        return np.ones(values.shape, dtype=np.bool_)
    low, high = limits
    return (values >= low * (1 - LIMIT_ROUNDING)) & (values <= high * (1 + LIMIT_ROUNDING))


def _resonance_times(rules: CoilRules, coils: Coils) -> Floats:
    """Return how many times a band's highest frequency each coil's own resonance must be, (J,)."""
    times = np.full(len(coils), rules.self_resonance, dtype=float)
    if not rules.self_resonance_stated:
        eased = np.concatenate([np.full(len(b), b.eased_resonance) for b in coils.blocks] or [np.empty(0)])
        times = np.where(eased > 0, EASED_RESONANCE, times)
    return times


def coil_figures(coils: Coils, coil: int, band: int) -> CoilFigures:
    """Return one coil's figures at a band, without its reference."""
    block, row = coils.locate(coil)
    support = coils.supports[int(coils.support[coil])]
    wire = block.wires[block.wire[row]] if block.wire[row] >= 0 else None
    length = float(block.winding_length[row])
    wire_length = float(block.wire_length[row])
    turns = int(block.turns[row])
    return CoilFigures(
        reference="",
        form=block.form,
        label=block.label(row),
        turns=turns or None,
        former=support.name if turns else None,
        wire=wire.name if wire else None,
        winding_length=length if length > 0 else None,
        wire_length=wire_length + 2 * TAIL if wire_length > 0 else None,
        inductance=float(coils.alone[coil, band]),
        inductance_dc=_known(coils.inductance_dc[coil]),
        self_capacitance=_known(coils.self_capacitance[coil]),
        pitch=_positive(block.pitch[row]),
        mean_diameter=_positive(block.mean_diameter[row]),
        extra={
            "inductance_spread": float(coils.spread[coil]),
            "q_spread": _below_and_above(coils.q_spread[coil]),
            "self_capacitance_spread": _below_and_above(coils.self_capacitance_spread[coil]),
            "adjust": support.adjust,
            "surface_m2": _surface(coils, coil, block, row),
            "core_area_m2": None if block.core_area is None else _known(block.core_area[row]),
        },
    )


def _surface(coils: Coils, coil: int, block: Block, row: int) -> float | None:
    """Return the surface by which a coil cools, None where its size is unknown. [m2]"""
    diameter, length = float(block.mean_diameter[row]), float(block.winding_length[row])
    if diameter > 0 and length > 0:
        return float(winding_surface(diameter, length))
    return _positive(float(bulk_surface(coils.volume[coil])))


def coil_part_line(coils: Coils, coil: int, figures: CoilFigures, bands: tuple[str, ...]) -> PartLine:
    """Return a coil as a piece to buy or wind."""
    block, row = coils.locate(coil)
    support = coils.supports[int(coils.support[coil])]
    wire = block.wires[block.wire[row]] if block.wire[row] >= 0 else None
    price = float(coils.price[coil])
    return PartLine(
        reference=figures.reference,
        kind="coil",
        value=figures.inductance,
        unit="H",
        label=figures.label,
        description=figures.label,
        grade=None,
        tolerance=float(coils.spread[coil]),
        tempco=_known(coils.tempco[coil, 0]),
        bands=bands,
        unit_price=None if np.isnan(price) else price,
        source=support.source,
        wire=wire.name if wire else None,
        wire_length=figures.wire_length if wire else None,
        wire_price_per_m=wire.price_per_m if wire else None,
        rf_current=support.current,
    )


def _below_and_above(spread: Floats) -> dict[str, float | None]:
    return {"below": _known(spread[0]), "above": _known(spread[1])}


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _positive(value: float) -> float | None:
    return float(value) if value > 0 else None
