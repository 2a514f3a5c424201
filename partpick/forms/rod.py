"""Single-layer coils wound close in the middle of a magnetic rod."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil

import numpy as np

from partpick.forms.block import (
    FIT_ROUNDING,
    OTHER,
    Block,
    Floats,
    Ints,
    Layouts,
    at_every,
    column,
    enough,
    wound_price,
)
from partpick.forms.copper import WireColumns, few_gauges
from partpick.forms.ring import core_ceiling, core_support
from partpick.forms.screen import Screen
from partpick.forms.solenoid import PITCH_TOLERANCE, SingleLayer, turns_in_words
from partpick.parts import Catalogue, Core, Wire
from partpick.physics.cores import core_inductance
from partpick.physics.rod_core import rod_coil_in_range, rod_coil_rise, rod_coil_spread
from partpick.physics.self_capacitance import solenoid_spread as self_capacitance_spread
from partpick.physics.solenoid import solenoid_families

# A coil covers a twentieth (the computed table begins there) to a third of its rod; common practice, no source.
LEAST_COVERED, MOST_COVERED = 0.05, 1.0 / 3.0
MOST_TURNS = 120  # common practice, no source
ROD_DIAMETER_TOLERANCE = 0.02  # as fired; common practice, no source
PLACE_SPREAD = 0.01  # of the inductance: a coil a few millimetres off the middle; estimate, no source
ROD_COPPER_SPREAD = 0.30  # the rod bends the field that the turns meet; estimate, no source
WIDER_CAPACITANCE = 0.50  # the rod comes near the turns from inside; estimate, no source
OUTSIDE = (
    "the rod is outside the computed range (length 3 to 32 times its diameter, permeability 50 to 1000): "
    "its inductance may be 20 % off"
)


def rod_block(catalogue: Catalogue, frequency: Floats, units: int, screen: Screen) -> Block:
    """Return close-wound coils of every whole number of turns in the middle of each rod."""
    cores = [core for core in catalogue.cores if core.shape == "rod" and enough(core.quantity, units)]
    layouts = _layouts(cores, catalogue.wires)
    layout, turns = layouts.coils()
    considered = len(turns)
    empty = _empty_coils(cores, catalogue.wires, layouts)
    rods = _Rods(cores, layouts.support[layout])
    coil = _on_rods(rods, catalogue.wires, layouts.wire[layout], turns)
    # The rod raises the inductance of the empty coil, so that those which are too large as they are go first.
    unknown = np.isfinite(rods.al)
    kept = screen.kept(
        np.where(unknown, 0.0, coil.least_inductance(empty)), np.full(considered, np.inf), coil.self_capacitance
    )
    layout, turns, empty = layout[kept], turns[kept], empty[kept]
    support, wire = layouts.support[layout], layouts.wire[layout]
    rods, coil = _Rods(cores, support), coil.take(kept)
    sizes = coil.wire
    inside = (coil.mean, coil.length, rods.diameter, rods.length, rods.permeability)
    rise = rod_coil_rise(turns, *inside)
    measured = np.isfinite(rods.al)
    low_frequency = np.where(measured, core_inductance(rods.al, turns), empty + rise)
    in_air, air_losses = coil.at(frequency, empty)
    inductance = low_frequency[:, None] - (empty[:, None] - in_air)
    ceiling = np.stack([core_ceiling(cores, float(f))[support] for f in frequency], axis=1)
    # no former: what the rod takes of the electric field is in the Q that it reaches
    losses = air_losses.in_core(in_air / inductance, ceiling)
    spread = np.where(measured, rods.tolerance, _spread(coil, rods, empty, rise, low_frequency, inside))
    below, above = self_capacitance_spread(coil.l_over_d)

    def label(row: int) -> str:
        core, used = cores[support[row]], catalogue.wires[wire[row]]
        return f"{turns_in_words(turns[row])} of {used.name} in the middle of {core.name}, close wound"

    def cautions(row: int, frequency: float) -> tuple[str, ...]:
        known = measured[row] or bool(rod_coil_in_range(*(size[row] for size in inside)))
        return (*coil.cautions(row, frequency), *(() if known else (OUTSIDE,)))

    return Block(
        form="rod core",
        effort_form=OTHER,
        considered=considered,
        supports=tuple(core_support(core) for core in cores),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=coil.pitch,
        mean_diameter=coil.mean,
        winding_length=coil.length,
        wire_length=coil.wire_length,
        inductance_dc=low_frequency,
        inductance=inductance,
        q=losses.q,
        losses=losses,
        self_capacitance=coil.self_capacitance,
        loss_tangent=np.zeros(len(turns)),
        spread=spread,
        q_spread=losses.q_spread(np.maximum(coil.copper_spread, ROD_COPPER_SPREAD)),
        self_capacitance_spread=np.maximum(np.stack([below, above], axis=1), WIDER_CAPACITANCE),
        tempco=at_every(column([core.tempco for core in cores])[support], frequency),
        tempco_spread=np.nan_to_num(column([core.tempco_tolerance for core in cores])[support]),
        price=wound_price([c.unit_price for c in cores], support, catalogue.wires, wire, coil.wire_length),
        volume=np.pi / 4 * (coil.mean + sizes.overall) ** 2 * rods.length,
        wire_diameter=sizes.bare,
        label=label,
        cautions=cautions,
    )


class _Rods:
    """The rod of each coil, (J,) each."""

    def __init__(self, cores: Sequence[Core], support: Ints) -> None:
        self.diameter = column([core.outer_diameter for core in cores])[support]
        self.length = column([core.height for core in cores])[support]
        self.permeability = column([core.permeability or 1.0 + 1e-6 for core in cores])[support]
        self.al = column([core.al for core in cores])[support]
        self.tolerance = column([core.tolerance for core in cores])[support]


def _on_rods(rods: _Rods, wires: Sequence[Wire], wire: Ints, turns: Ints) -> SingleLayer:
    """Return the windings, side by side, as they would be without their rods."""
    sizes = WireColumns.of(wires, wire)
    return SingleLayer(turns, rods.diameter + sizes.overall, sizes.overall, sizes)


def _spread(
    coil: SingleLayer,
    rods: _Rods,
    empty: Floats,
    rise: Floats,
    whole: Floats,
    sizes: tuple[Floats, Floats, Floats, Floats, Floats],
) -> Floats:
    """Return the spread of the inductance: the empty coil's and what the rod adds, each by its share."""
    diameter = coil.diameter_tolerance(rods.diameter, np.full(len(rise), ROD_DIAMETER_TOLERANCE))
    close = np.full(len(rise), PITCH_TOLERANCE["close"])
    air = coil.spread(diameter, close, empty, empty[:, None])
    added = np.hypot(rod_coil_spread(*sizes, rods.tolerance), PLACE_SPREAD)
    spread: Floats = np.hypot(air * empty, added * rise) / whole
    return spread


def _layouts(cores: Sequence[Core], wires: tuple[Wire, ...]) -> Layouts:
    rows: list[tuple[int, int, float, int]] = []
    least: list[int] = []
    for i, core in enumerate(cores):
        assert core.height is not None
        for w in few_gauges(wires):
            overall = wires[w].overall_diameter
            first = max(1, ceil(core.height * LEAST_COVERED / overall * (1 - FIT_ROUNDING)))
            most = min(int(core.height * MOST_COVERED / overall * (1 + FIT_ROUNDING)), MOST_TURNS)
            if most >= first:
                rows.append((i, w, overall, most))
                least.append(first)
    return Layouts.of(rows, least)


def _empty_coils(cores: Sequence[Core], wires: tuple[Wire, ...], layouts: Layouts) -> Floats:
    """Return the low-frequency inductance of every coil without its rod."""
    if not len(layouts.most):
        return np.empty(0)
    overall = np.array([wires[w].overall_diameter for w in layouts.wire])
    bare = np.array([wires[w].bare_diameter for w in layouts.wire])
    mean = column([core.outer_diameter for core in cores])[layouts.support] + overall
    flat = solenoid_families(layouts.most, mean, bare, layouts.pitch)
    start = np.cumsum(layouts.most) - layouts.most
    return np.concatenate(
        [flat[s + first - 1 : s + most] for s, first, most in zip(start, layouts.least, layouts.most, strict=True)]
    )
