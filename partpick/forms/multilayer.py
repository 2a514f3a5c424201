"""Coils of many layers on small tubes, wound between two rings of card or paper."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from math import ceil

import numpy as np

from partpick.forms.block import (
    OTHER,
    Block,
    Floats,
    Ints,
    Layouts,
    Losses,
    at_every,
    column,
    either_way,
    enough,
    wound_price,
)
from partpick.forms.copper import ABOVE_STRANDED, WireColumns, few_gauges, losses_of
from partpick.forms.screen import Screen
from partpick.forms.solenoid import former_support, turns_in_words
from partpick.parts import Catalogue, Former, Wire
from partpick.physics.geometry import layered_wire_length
from partpick.physics.loss import COVERING_LOSS_TANGENT, dielectric_loss
from partpick.physics.multilayer import (
    OUTSIDE_SPREAD,
    multilayer_inductance,
    multilayer_sensitivities,
    multilayer_spread,
)
from partpick.physics.self_capacitance import LAYERED_SPREAD, layer_distance, layered_self_capacitance
from partpick.physics.stranded import LAYERED_RESISTANCE_SPREAD, STRANDED_HIGHEST, section_field
from partpick.quantities import format_quantity

# On plain tubes up to this diameter, as long as half of it and up to 0.4 of it deep: there the published
# formula is at its best and the layers stand without cheeks. Common practice, no source.
LARGEST_TUBE = 12e-3
LENGTH_OF_DIAMETER = 0.5
MOST_DEPTH, LEAST_DEPTH = 0.4, 0.1
MOST_TURNS = 400
LENGTH_TOLERANCE, DEPTH_TOLERANCE = 0.05, 0.10  # of a winding laid by hand; common practice, no source
OUTSIDE = (
    "many layers outside the formula's range (radius, length and depth of one order): the inductance may be "
    "20 % off"
)


def multilayer_block(catalogue: Catalogue, frequency: Floats, units: int, screen: Screen) -> Block:
    """Return coils of two layers and more, every whole number of turns, on each plain tube that is small."""
    formers = [f for f in catalogue.formers if _takes_layers(f) and enough(f.quantity, units)]
    layouts = _layouts(formers, catalogue.wires)
    layout, turns = layouts.coils()
    every = _section(formers, catalogue.wires, layouts, layout, turns)
    kept = screen.kept(every.inductance, every.inductance, every.self_capacitance, eased=True)
    coil = every
    if len(kept) < len(turns):
        layout, turns = layout[kept], turns[kept]
        coil = _section(formers, catalogue.wires, layouts, layout, turns)
    support, wire, sizes, length = layouts.support[layout], layouts.wire[layout], coil.wire, coil.length
    inductance = at_every(coil.inductance, frequency)
    self_capacitance = coil.self_capacitance
    # The field stands between the layers, in the covering of the wire; hardly any of it is in the tube.
    losses = coil.losses(frequency, inductance).with_former(
        dielectric_loss(inductance, self_capacitance[:, None], frequency[None, :], COVERING_LOSS_TANGENT)
    )

    def label(row: int) -> str:
        former, used = formers[support[row]], catalogue.wires[wire[row]]
        wide = format_quantity(float(length[row]), "m")
        layers = int(coil.layers[row])
        return f"{turns_in_words(turns[row])} of {used.name} on {former.name}, {layers} layers {wide} long"

    return Block(
        form="multilayer",
        effort_form=OTHER,
        eased_resonance=True,
        considered=len(every.turns),
        supports=tuple(former_support(former) for former in formers),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=np.zeros(len(turns)),
        mean_diameter=coil.mean,
        winding_length=length,
        wire_length=coil.wire_length,
        inductance_dc=coil.inductance,
        inductance=inductance,
        q=losses.q,
        losses=losses,
        self_capacitance=self_capacitance,
        loss_tangent=np.full(len(turns), COVERING_LOSS_TANGENT),
        spread=coil.spread(column([former.tolerance for former in formers])[support]),
        q_spread=losses.q_spread(np.full(len(turns), LAYERED_RESISTANCE_SPREAD)),
        self_capacitance_spread=either_way(np.full(len(turns), LAYERED_SPREAD)),
        tempco=at_every(column([former.tempco for former in formers])[support], frequency),
        tempco_spread=np.nan_to_num(column([former.tempco_tolerance for former in formers])[support]),
        price=wound_price([f.unit_price for f in formers], support, catalogue.wires, wire, coil.wire_length),
        volume=np.pi / 4 * (coil.mean + coil.depth) ** 2 * length,
        wire_diameter=sizes.bare,
        label=label,
        cautions=coil.cautions,
    )


@dataclass(frozen=True, eq=False)
class _Section:
    """Windings of many layers as physics sees them, (J,) each."""

    turns: Ints
    tube: Floats
    length: Floats
    wire: WireColumns

    @cached_property
    def layers(self) -> Floats:
        a_layer = np.floor(self.length / self.wire.overall * (1 + 1e-9))
        return np.ceil(self.turns / a_layer)

    @cached_property
    def depth(self) -> Floats:
        """Radial depth, the last layer counted by what lies in it. [m]"""
        return self.turns * self.wire.overall**2 / self.length

    @cached_property
    def mean(self) -> Floats:
        """Mean diameter. [m]"""
        return self.tube + self.depth

    @cached_property
    def wire_length(self) -> Floats:
        return layered_wire_length(self.turns, self.tube, self.depth)

    @cached_property
    def inductance(self) -> Floats:
        return multilayer_inductance(self.turns, self.mean, self.length, self.depth)

    @cached_property
    def self_capacitance(self) -> Floats:
        distance = layer_distance(self.wire.bare, self.wire.overall)
        return layered_self_capacitance(self.mean, self.length, self.layers, distance)

    def losses(self, frequency: Floats, inductance: Floats) -> Losses:
        field = section_field(self.turns, self.mean, self.length, self.depth)
        resistance = self.wire.dc_resistance(self.wire_length)
        copper = [self.wire.many_layers(resistance, float(f), field) for f in frequency]
        return losses_of(frequency, inductance, copper)

    def spread(self, tube_tolerance: Floats) -> Floats:
        """Return what model, tube and the lay of the turns leave on the inductance. [fraction]"""
        model = multilayer_spread(self.mean, self.length, self.depth)
        model = np.where(np.isnan(model), OUTSIDE_SPREAD, model)
        by_diameter, by_length, by_depth = multilayer_sensitivities(self.mean, self.length, self.depth)
        diameter = by_diameter * np.hypot(tube_tolerance * self.tube, DEPTH_TOLERANCE * self.depth) / self.mean
        lay = np.hypot(by_length * LENGTH_TOLERANCE, by_depth * DEPTH_TOLERANCE)
        spread: Floats = np.sqrt(model**2 + diameter**2 + lay**2)
        return spread

    def cautions(self, row: int, frequency: float) -> tuple[str, ...]:
        said = []
        if self.wire.strands[row] > 1 and frequency > STRANDED_HIGHEST:
            said.append(ABOVE_STRANDED)
        if np.isnan(multilayer_spread(self.mean[row], self.length[row], self.depth[row])):
            said.append(OUTSIDE)
        return tuple(said)


def _section(
    formers: Sequence[Former], wires: tuple[Wire, ...], layouts: Layouts, layout: Ints, turns: Ints
) -> _Section:
    support = layouts.support[layout]
    tube = column([former.diameter for former in formers])[support]
    length = column([_length(former) for former in formers])[support]
    return _Section(turns, tube, length, WireColumns.of(wires, layouts.wire[layout]))


def _takes_layers(former: Former) -> bool:
    small = former.diameter <= LARGEST_TUBE * (1 + 1e-9)
    return former.support == "tube" and former.pitch is None and small


def _length(former: Former) -> float:
    return min(former.winding_length, LENGTH_OF_DIAMETER * former.diameter)


def _layouts(formers: Sequence[Former], wires: tuple[Wire, ...]) -> Layouts:
    rows: list[tuple[int, int, float, int]] = []
    least: list[int] = []
    for i, former in enumerate(formers):
        length = _length(former)
        for w in few_gauges(wires):
            overall = wires[w].overall_diameter
            a_layer = int(length / overall * (1 + 1e-9))
            if not a_layer:
                continue
            first = max(a_layer + 1, ceil(LEAST_DEPTH * former.diameter * length / overall**2))
            most = min(a_layer * int(MOST_DEPTH * former.diameter / overall), MOST_TURNS)
            if most >= first:
                rows.append((i, w, 0.0, most))
                least.append(first)
    return Layouts.of(rows, least)
