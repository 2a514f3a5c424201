"""Windings in gapped pot cores, layer on layer, of solid and stranded wire."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property

import numpy as np

from partpick.forms.block import (
    OTHER,
    Block,
    Floats,
    Ints,
    Layouts,
    at_every,
    column,
    either_way,
    enough,
    wound_price,
)
from partpick.forms.copper import ABOVE_STRANDED, WireColumns, few_gauges, losses_of
from partpick.forms.ring import core_ceiling, core_support
from partpick.forms.screen import Screen
from partpick.forms.solenoid import turns_in_words
from partpick.parts import Catalogue, Core, Wire
from partpick.physics.cores import core_inductance
from partpick.physics.geometry import layered_wire_length, window_turns_that_fit
from partpick.physics.loss import COVERING_LOSS_TANGENT, dielectric_loss
from partpick.physics.pot_core import pot_window
from partpick.physics.self_capacitance import (
    LAYERED_SPREAD,
    layer_distance,
    layered_self_capacitance,
    ring_self_capacitance,
)
from partpick.physics.stranded import LAYERED_RESISTANCE_SPREAD, STRANDED_HIGHEST, window_field

MOST_TURNS = 200  # more, nobody winds by hand; common practice, no source
WIRES_A_COUNT = 2  # so many of the thickest wires of a kind that a number of turns leaves room for


def pot_block(catalogue: Catalogue, frequency: Floats, units: int, screen: Screen) -> Block:
    """Return every whole number of turns that fits each pot core, of the wires that fill its window best.

    Of each kind, solid and stranded, a number of turns takes the two thickest gauges with room for it: they
    have the least resistance, and the thinner of them less loss by proximity.
    """
    cores = [c for c in catalogue.cores if c.shape == "pot" and c.al is not None and enough(c.quantity, units)]
    layouts = _layouts(cores, catalogue.wires)
    layout, turns = layouts.coils()
    every = _Filled(cores, catalogue.wires, layouts, layout, turns)
    kept = screen.kept(every.low_frequency, every.low_frequency, every.self_capacitance)
    coil = every
    if len(kept) < len(turns):
        coil = _Filled(cores, catalogue.wires, layouts, layout[kept], turns[kept])
    turns, support, wire, sizes = coil.turns, coil.support, coil.wire, coil.sizes
    outer, height, self_capacitance = coil.outer, coil.height, coil.self_capacitance
    wire_length = layered_wire_length(turns, coil.window.inner_diameter, coil.depth)
    inductance = at_every(coil.low_frequency, frequency)
    field = window_field(turns, coil.window.width, coil.layers)
    resistance = sizes.dc_resistance(wire_length)
    # the core's Q has the field of a single layer
    covering = np.where(coil.layers >= 2, COVERING_LOSS_TANGENT, 0.0)
    losses = losses_of(
        frequency,
        inductance,
        [sizes.many_layers(resistance, float(f), field) for f in frequency],
        [core_ceiling(cores, float(f))[support] for f in frequency],
        dielectric_loss(inductance, self_capacitance[:, None], frequency[None, :], covering[:, None]),
    )
    none = np.zeros(len(turns))

    def label(row: int) -> str:
        core, used = cores[support[row]], catalogue.wires[wire[row]]
        return f"{turns_in_words(turns[row])} of {used.name} in {core.name}"

    def cautions(row: int, frequency: float) -> tuple[str, ...]:
        return (ABOVE_STRANDED,) if sizes.strands[row] > 1 and frequency > STRANDED_HIGHEST else ()

    return Block(
        form="pot core",
        effort_form=OTHER,
        considered=len(every.turns),
        supports=tuple(core_support(core) for core in cores),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=none,
        mean_diameter=coil.mean,
        winding_length=none,
        wire_length=wire_length,
        inductance_dc=coil.low_frequency,
        inductance=inductance,
        q=losses.q,
        losses=losses,
        self_capacitance=self_capacitance,
        loss_tangent=covering,
        spread=column([core.tolerance for core in cores])[support],
        q_spread=losses.q_spread(np.full(len(turns), LAYERED_RESISTANCE_SPREAD)),
        self_capacitance_spread=either_way(np.full(len(turns), LAYERED_SPREAD)),
        tempco=at_every(column([core.tempco for core in cores])[support], frequency),
        tempco_spread=np.nan_to_num(column([core.tempco_tolerance for core in cores])[support]),
        price=wound_price([core.unit_price for core in cores], support, catalogue.wires, wire, wire_length),
        volume=np.pi / 4 * outer**2 * height,
        wire_diameter=sizes.bare,
        label=label,
        cautions=cautions,
    )


class _Filled:
    """Windings in their cores, (J,) each."""

    def __init__(
        self, cores: Sequence[Core], wires: tuple[Wire, ...], layouts: Layouts, layout: Ints, turns: Ints
    ) -> None:
        self.turns, self.support, self.wire = turns, layouts.support[layout], layouts.wire[layout]
        self.sizes = WireColumns.of(wires, layouts.wire).take(layout)
        self.outer = column([core.outer_diameter for core in cores])[self.support]
        self.height = column([core.height for core in cores])[self.support]
        self.low_frequency = core_inductance(column([core.al for core in cores])[self.support], turns)
        self.window = pot_window(self.outer, self.height)
        overall = self.sizes.overall
        self.layers = np.ceil(turns / np.maximum(window_turns_that_fit(self.window.width, overall, overall), 1))
        self.depth = self.layers * overall
        self.mean = self.window.inner_diameter + self.depth

    @cached_property
    def self_capacitance(self) -> Floats:
        distance = layer_distance(self.sizes.bare, self.sizes.overall)
        layered = layered_self_capacitance(self.mean, self.window.width, self.layers, distance)
        return np.where(self.layers >= 2, layered, ring_self_capacitance(self.outer))


def _layouts(cores: Sequence[Core], wires: tuple[Wire, ...]) -> Layouts:
    rows: list[tuple[int, int, float, int]] = []
    least: list[int] = []
    gauges = few_gauges(wires)
    for i, core in enumerate(cores):
        for stranded in (False, True):
            kind = [w for w in gauges if (wires[w].strands > 1) == stranded]
            for w, first, most in _best_filling(core, wires, kind):
                rows.append((i, w, 0.0, most))
                least.append(first)
    return Layouts.of(rows, least)


def _best_filling(core: Core, wires: tuple[Wire, ...], kind: Sequence[int]) -> list[tuple[int, int, int]]:
    """Return (wire, least, most turns): thinner wire serves where thicker does not fit any more."""
    assert core.height is not None
    window = pot_window(core.outer_diameter, core.height)
    fits = [
        min(int(window_turns_that_fit(window.width, window.depth, wires[w].overall_diameter)), MOST_TURNS)
        for w in reversed(kind)
    ]
    found = []
    for place, (w, most) in enumerate(zip(reversed(kind), fits, strict=True)):
        beyond = fits[place - WIRES_A_COUNT] if place >= WIRES_A_COUNT else 0
        if most > beyond:
            found.append((w, beyond + 1, most))
    return found
