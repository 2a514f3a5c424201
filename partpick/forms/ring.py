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
    enough,
    stacked,
    wound_price,
)
from partpick.parts import Catalogue, Core, Wire
from partpick.physics.cores import core_inductance, ring_al, ring_turns_that_fit
from partpick.physics.geometry import ring_wire_length
from partpick.physics.loss import combined_q, ring_pitch, ring_resistance
from partpick.physics.self_capacitance import ring_self_capacitance
from partpick.physics.skin import skin_depth, wire_resistance


def ring_block(catalogue: Catalogue, frequency: Floats, units: int) -> Block:
    """Return every whole number of turns of every covered wire that fits each ring, one layer on the bore."""
    cores = [core for core in catalogue.cores if core.shape == "ring" and enough(core.quantity, units)]
    layouts = _layouts(cores, catalogue.wires)
    layout, turns = layouts.coils()
    support, wire = layouts.support[layout], layouts.wire[layout]
    bare = np.array([w.bare_diameter for w in catalogue.wires])[wire]
    overall = np.array([w.overall_diameter for w in catalogue.wires])[wire]
    outer = column([core.outer_diameter for core in cores])[support]
    inner = column([core.inner_diameter for core in cores])[support]
    height = column([core.height for core in cores])[support]
    inductance = core_inductance(column([_al(core) for core in cores])[support], turns)
    wire_length = ring_wire_length(turns, outer, inner, height, overall)
    none = np.zeros(len(turns))

    def label(row: int) -> str:
        return f"{turns[row]} turns of {catalogue.wires[wire[row]].name} on {cores[support[row]].name}"

    return Block(
        form="ring core",
        effort_form=RING,
        supports=tuple(core_support(core) for core in cores),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=none,
        mean_diameter=none,
        winding_length=none,
        wire_length=wire_length,
        inductance_dc=inductance,
        inductance=at_every(inductance, frequency),
        q=stacked(
            [
                combined_q(
                    _copper_q(
                        float(f),
                        inductance,
                        wire_length,
                        bare,
                        ring_pitch(turns, outer, inner, height, overall),
                    ),
                    core_ceiling(cores, float(f))[support],
                )
                for f in frequency
            ],
            len(turns),
        ),
        self_capacitance=ring_self_capacitance(outer),
        spread=column([core.tolerance for core in cores])[support],
        tempco=at_every(column([core.tempco for core in cores])[support], frequency),
        tempco_spread=np.nan_to_num(column([core.tempco_tolerance for core in cores])[support]),
        price=wound_price([core.unit_price for core in cores], support, catalogue.wires, wire, wire_length),
        volume=np.pi / 4 * outer**2 * height,
        wire_diameter=bare,
        label=label,
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


def _layouts(cores: list[Core], wires: tuple[Wire, ...]) -> Layouts:
    rows = []
    for i, core in enumerate(cores):
        for w, wire in enumerate(wires):
            assert core.inner_diameter is not None
            if wire.bare or wire.strands > 1 or wire.overall_diameter >= core.inner_diameter:
                continue
            most = int(ring_turns_that_fit(core.inner_diameter, wire.overall_diameter))
            if most > 0:
                rows.append((i, w, 0.0, most))
    return Layouts.of(rows)


def _copper_q(f: float, inductance: Floats, wire_length: Floats, bare: Floats, pitch: Floats) -> Floats:
    a_over_delta = bare / 2 / float(skin_depth(f))
    resistance = ring_resistance(wire_resistance(wire_length, bare), a_over_delta, bare / pitch).total
    return 2 * np.pi * f * inductance / resistance
