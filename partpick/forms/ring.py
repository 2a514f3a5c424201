"""Single-layer windings on ring cores."""

from __future__ import annotations

import numpy as np

from partpick.forms.block import (
    RING,
    Block,
    Floats,
    Layouts,
    Support,
    at_every,
    column,
    either_way,
    enough,
    wound_price,
)
from partpick.forms.copper import ABOVE_STRANDED, WireColumns, covered, losses_of
from partpick.forms.screen import Screen
from partpick.forms.solenoid import turns_in_words
from partpick.parts import Catalogue, Core, Wire
from partpick.physics.cores import core_inductance, ring_al, ring_leak, ring_turns_that_fit
from partpick.physics.geometry import ring_wire_length
from partpick.physics.loss import ring_pitch
from partpick.physics.proximity import endless_proximity_factor
from partpick.physics.self_capacitance import RING_SPREAD, ring_self_capacitance
from partpick.physics.spread import ring_spread
from partpick.physics.stranded import STRANDED_HIGHEST, STRANDED_RESISTANCE_SPREAD
from partpick.quantities import format_percent

RING_COPPER_SPREAD = 0.15  # of a layer without ends, up to d/s = 0.6; estimate, no source
LEAKY = 0.10  # a leak that is worth a word


def ring_block(catalogue: Catalogue, frequency: Floats, units: int, screen: Screen) -> Block:
    """Return every whole number of turns of every covered wire that fits each ring, one layer on the bore."""
    cores = [core for core in catalogue.cores if core.shape == "ring" and enough(core.quantity, units)]
    layouts = _layouts(cores, catalogue.wires)
    layout, turns = layouts.coils()
    considered = len(turns)
    low_frequency = core_inductance(column([_al(core) for core in cores])[layouts.support][layout], turns)
    own = ring_self_capacitance(column([core.outer_diameter for core in cores]))[layouts.support][layout]
    kept = screen.kept(low_frequency, low_frequency, own)
    layout, turns, low_frequency, own = layout[kept], turns[kept], low_frequency[kept], own[kept]
    support, wire = layouts.support[layout], layouts.wire[layout]
    sizes = WireColumns.of(catalogue.wires, wire)
    outer = column([core.outer_diameter for core in cores])[support]
    inner = column([core.inner_diameter for core in cores])[support]
    height = column([core.height for core in cores])[support]
    inductance = at_every(low_frequency, frequency)
    wire_length = ring_wire_length(turns, outer, inner, height, sizes.overall)
    pitch = ring_pitch(turns, outer, inner, height, sizes.overall)
    factor = endless_proximity_factor(sizes.bare / pitch)
    resistance = sizes.dc_resistance(wire_length)
    endless, many = np.full(len(turns), np.inf), np.ones(len(turns))
    # no former: what the ring's own material takes of the electric field is in the Q that it reaches
    losses = losses_of(
        frequency,
        inductance,
        [sizes.single_layer(resistance, float(f), factor, pitch, endless, many) for f in frequency],
        [core_ceiling(cores, float(f))[support] for f in frequency],
    )
    permeability = column([_leaking_permeability(core) for core in cores])[support]
    leak = ring_leak(turns, outer, inner, height, permeability, sizes.overall)
    magnetic = np.array([_magnetic(core) for core in cores], np.bool_)[support]
    none = np.zeros(len(turns))

    def label(row: int) -> str:
        return f"{turns_in_words(turns[row])} of {catalogue.wires[wire[row]].name} on {cores[support[row]].name}"

    def cautions(row: int, frequency: float) -> tuple[str, ...]:
        said = []
        if sizes.strands[row] > 1 and frequency > STRANDED_HIGHEST:
            said.append(ABOVE_STRANDED)
        if leak[row] >= LEAKY:
            said.append(
                f"{cores[support[row]].name} leaks: with {turns_in_words(turns[row])} expect up to "
                f"{format_percent(leak[row], 2)} more inductance"
            )
        return tuple(said)

    return Block(
        form="ring core",
        tappable=True,
        effort_form=RING,
        considered=considered,
        supports=tuple(core_support(core) for core in cores),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=none,
        mean_diameter=none,
        winding_length=none,
        wire_length=wire_length,
        inductance_dc=low_frequency,
        inductance=inductance,
        q=losses.q,
        losses=losses,
        self_capacitance=own,
        loss_tangent=none,
        spread=ring_spread(column([core.tolerance for core in cores])[support], permeability, leak),
        q_spread=losses.q_spread(
            np.where(sizes.stranded, STRANDED_RESISTANCE_SPREAD, RING_COPPER_SPREAD)
        ),
        self_capacitance_spread=either_way(np.full(len(turns), RING_SPREAD)),
        tempco=at_every(column([core.tempco for core in cores])[support], frequency),
        tempco_spread=np.nan_to_num(column([core.tempco_tolerance for core in cores])[support]),
        price=wound_price([core.unit_price for core in cores], support, catalogue.wires, wire, wire_length),
        volume=np.pi / 4 * outer**2 * height,
        wire_diameter=sizes.bare,
        core_area=np.where(magnetic, (outer - inner) / 2 * height, np.nan),
        label=label,
        cautions=cautions,
    )


def core_support(core: Core) -> Support:
    """Return a core as what a coil is wound on."""
    return Support(
        name=core.name,
        quantity=core.quantity,
        source=core.source,
        notes=core.notes,
        frequency_low=core.frequency_low,
        frequency_high=core.frequency_high,
        adjust=core.adjust,
    )


def core_ceiling(cores: list[Core], frequency: float) -> Floats:
    """Return the Q that each core's material allows, nan where unknown or outside its useful range. [-]"""
    low = np.nan_to_num(column([core.frequency_low for core in cores]), nan=0.0)
    high = np.nan_to_num(column([core.frequency_high for core in cores]), nan=np.inf)
    useful = (frequency >= low) & (frequency <= high)
    return np.where(useful, column([core.q for core in cores]), np.nan)


def _al(core: Core) -> float:
    if core.al is not None:
        return core.al
    assert core.inner_diameter is not None and core.height is not None
    return float(ring_al(core.outer_diameter, core.inner_diameter, core.height, core.permeability or 1.0))


def _magnetic(core: Core) -> bool:
    """Return whether a ring is more than a plastic former."""
    return core.permeability is None or core.permeability > 1.0


def _leaking_permeability(core: Core) -> float:
    """Return the permeability that decides on the leak; an AL that was measured holds its leak already."""
    if core.al is not None or core.permeability is None:
        return np.inf
    return core.permeability


def _layouts(cores: list[Core], wires: tuple[Wire, ...]) -> Layouts:
    rows = []
    places = covered(wires)
    overall = np.array([wires[w].overall_diameter for w in places])
    for i, core in enumerate(cores):
        assert core.inner_diameter is not None
        for w, most in zip(places, ring_turns_that_fit(core.inner_diameter, overall), strict=True):
            if most > 0 and not (wires[w].strands > 1 and _above_stranded(core)):
                rows.append((i, w, 0.0, int(most)))
    return Layouts.of(rows)


def _above_stranded(core: Core) -> bool:
    """Return whether a core begins where stranded wire ends."""
    return core.frequency_low is not None and core.frequency_low >= STRANDED_HIGHEST
