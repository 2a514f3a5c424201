"""Single-layer coils on tubes, grooved formers and mandrels."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from partpick.forms.block import (
    FIT_ROUNDING,
    TUBE,
    Block,
    Floats,
    Ints,
    Layouts,
    Losses,
    Support,
    at_every,
    column,
    enough,
    stacked,
    wound_price,
)
from partpick.forms.copper import ABOVE_STRANDED, WireColumns, losses_of
from partpick.forms.screen import Screen
from partpick.parts import Catalogue, Former, Wire
from partpick.physics.geometry import solenoid_wire_length
from partpick.physics.loss import dielectric_loss
from partpick.physics.proximity import few_turns_factor, proximity_factor_spread, solenoid_proximity_factor
from partpick.physics.self_capacitance import dielectric_share, solenoid_self_capacitance
from partpick.physics.self_capacitance import solenoid_spread as self_capacitance_spread
from partpick.physics.skin import internal_inductance_ratio
from partpick.physics.solenoid import (
    high_frequency_inductance,
    least_high_frequency_inductance,
    solenoid_families,
)
from partpick.physics.spread import solenoid_model_spread, solenoid_spread
from partpick.physics.stranded import STRANDED_HIGHEST, STRANDED_RESISTANCE_SPREAD

MANDREL_LEAST_WIRE = 0.8e-3  # m, thinner wire does not stand by itself; common practice, no source
MANDREL_STIFFNESS = 12  # mandrel diameter over wire, at most; common practice, no source
MANDREL_PITCH = 1.3  # in wire diameters, at least; common practice, no source
# How far pitch and diameter stray from what is meant, fractions: common practice, no source.
PITCH_TOLERANCE = {"close": 0.03, "twin": 0.03, "groove": 0.005, "mandrel": 0.05}
SPRINGBACK = 0.02  # a coil opens when it leaves its mandrel
BORE = 0.9  # of the outside diameter of a tube or ribbed former: common practice, no source
WIRE_TOLERANCE = 0.02  # of the overall diameter: the largest of the grade stands in the tables
# Where the published proximity table is doubtful: turns that nearly touch, on a short coil.
DOUBTFUL_D_OVER_S, DOUBTFUL_L_OVER_D = 0.7, 1.0
DOUBTFUL = "close winding on a short coil: the table of proximity is doubtful there, Q may be 30 % off"


def wire_pitch(former: Former, wire: Wire) -> float | None:
    """Return the pitch at which a wire goes on a former, or None where it does not. [m]"""
    overall = wire.overall_diameter
    if former.support == "mandrel":
        return _mandrel_pitch(former, wire)
    if former.pitch is None:
        return None if wire.bare else overall
    if former.pitch == "twin":
        return 2 * overall
    groove = float(former.pitch)
    fits = overall <= groove * (1 + FIT_ROUNDING)
    shorts = wire.bare and overall >= groove * (1 - FIT_ROUNDING)
    return groove if fits and not shorts else None


def _mandrel_pitch(former: Former, wire: Wire) -> float | None:
    stiff = max(MANDREL_LEAST_WIRE, former.diameter / MANDREL_STIFFNESS)
    if wire.strands > 1 or wire.bare_diameter < stiff * (1 - FIT_ROUNDING):
        return None
    least = MANDREL_PITCH * wire.overall_diameter
    if former.pitch is None:
        return least
    wanted = 2 * wire.overall_diameter if former.pitch == "twin" else float(former.pitch)
    return wanted if wanted >= least * (1 - FIT_ROUNDING) else None


def solenoid_block(catalogue: Catalogue, frequency: Floats, units: int, screen: Screen) -> Block:
    """Return every whole number of turns of every wire that fits each former, in one layer."""
    formers = [former for former in catalogue.formers if enough(former.quantity, units)]
    layouts = _layouts(formers, catalogue.wires)
    layout, turns = layouts.coils()
    dc = _family_inductances(formers, catalogue.wires, layouts)
    every = _single_layers(formers, catalogue.wires, layouts, layout, turns)
    kept = screen.kept(
        every.least_inductance(dc), dc, every.self_capacitance, proportions=every.l_over_d
    )
    coil, dc, layout, turns = every.take(kept), dc[kept], layout[kept], turns[kept]
    support, wire, pitch, sizes = layouts.support[layout], layouts.wire[layout], coil.pitch, coil.wire
    outside = column([former.diameter for former in formers])[support]
    inductance, copper = coil.at(frequency, dc)
    self_capacitance = coil.self_capacitance
    held = dielectric_share(coil.l_over_d) * column([former.loss_tangent for former in formers])[support]
    losses = copper.with_former(
        dielectric_loss(inductance, self_capacitance[:, None], frequency[None, :], held[:, None])
    )
    lays = [_lay(former) for former in formers]
    springback = np.array([SPRINGBACK if lay == "mandrel" else 0.0 for lay in lays])[support]
    tolerance = np.hypot(column([former.tolerance for former in formers])[support], springback)
    pitch_tolerance = column([PITCH_TOLERANCE[lay] for lay in lays])[support]

    def label(row: int) -> str:
        former, used = formers[support[row]], catalogue.wires[wire[row]]
        close = lays[support[row]] == "close"
        lay = "close wound" if close else f"pitch {1e3 * pitch[row]:.3g} mm"
        return f"{turns_in_words(turns[row])} of {used.name} on {former.name}, {lay}"

    return Block(
        form="solenoid",
        tappable=True,
        effort_form=TUBE,
        considered=len(every.turns),
        supports=tuple(former_support(former) for former in formers),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=pitch,
        mean_diameter=coil.mean,
        winding_length=coil.length,
        wire_length=coil.wire_length,
        inductance_dc=dc,
        inductance=inductance,
        q=losses.q,
        losses=losses,
        self_capacitance=self_capacitance,
        loss_tangent=held,
        spread=coil.spread(coil.diameter_tolerance(outside, tolerance), pitch_tolerance, dc, inductance),
        q_spread=losses.q_spread(coil.copper_spread),
        self_capacitance_spread=np.stack(self_capacitance_spread(coil.l_over_d), axis=1),
        tempco=at_every(column([former.tempco for former in formers])[support], frequency),
        tempco_spread=np.nan_to_num(column([former.tempco_tolerance for former in formers])[support]),
        price=wound_price([f.unit_price for f in formers], support, catalogue.wires, wire, coil.wire_length),
        volume=np.pi / 4 * (coil.mean + sizes.overall) ** 2 * coil.length,
        wire_diameter=sizes.bare,
        proportions=coil.l_over_d,
        bore=column([_bore(former) for former in formers])[support],
        label=label,
        cautions=coil.cautions,
    )


def former_support(former: Former) -> Support:
    """Return a former as what a coil is wound on."""
    return Support(
        name=former.name,
        quantity=former.quantity,
        source=former.source,
        notes=former.notes,
        adjust=former.adjust,
    )


def turns_in_words(turns: int) -> str:
    """Return a count of turns, such as "1 turn", "2 turns"."""
    return "1 turn" if turns == 1 else f"{turns} turns"


def _lay(former: Former) -> str:
    """Return how the turns lie: what holds them at their pitch."""
    if former.support == "mandrel":
        return "mandrel"
    if former.pitch is None:
        return "close"
    return "twin" if former.pitch == "twin" else "groove"


def _single_layers(
    formers: list[Former], wires: tuple[Wire, ...], layouts: Layouts, layout: Ints, turns: Ints
) -> SingleLayer:
    sizes = WireColumns.of(wires, layouts.wire)
    mean = column([former.diameter for former in formers])[layouts.support] + sizes.overall
    return SingleLayer(turns, mean[layout], layouts.pitch[layout], sizes.take(layout))


def _bore(former: Former) -> float | None:
    """Return the inside diameter of a former, None for a mandrel, which is drawn out or solid. [m]"""
    return None if former.support == "mandrel" else BORE * former.diameter


def _layouts(formers: list[Former], wires: tuple[Wire, ...]) -> Layouts:
    rows = []
    for i, former in enumerate(formers):
        for w, wire in enumerate(wires):
            pitch = wire_pitch(former, wire)
            if pitch is not None:
                most = int(former.winding_length / pitch * (1 + FIT_ROUNDING))
                if most > 0:
                    rows.append((i, w, pitch, most))
    return Layouts.of(rows)


def _family_inductances(formers: list[Former], wires: tuple[Wire, ...], layouts: Layouts) -> Floats:
    """Return the low-frequency inductance of every coil; layouts that differ in room alone are summed once."""
    keys = [
        (formers[f].diameter, int(w), float(p))
        for f, w, p in zip(layouts.support, layouts.wire, layouts.pitch, strict=True)
    ]
    families: dict[tuple[float, int, float], int] = {}
    for key, turns in zip(keys, layouts.most, strict=True):
        families[key] = max(families.get(key, 0), int(turns))
    if not families:
        return np.empty(0)
    most = np.array(list(families.values()))
    mean = np.array([diameter + wires[w].overall_diameter for diameter, w, _ in families])
    bare = np.array([wires[w].bare_diameter for _, w, _ in families])
    flat = solenoid_families(most, mean, bare, np.array([pitch for _, _, pitch in families]))
    start = dict(zip(families, np.cumsum(most) - most, strict=True))
    return np.concatenate(
        [flat[start[key] : start[key] + turns] for key, turns in zip(keys, layouts.most, strict=True)]
    )


@dataclass(frozen=True, eq=False)
class SingleLayer:
    """Windings of one layer as physics sees them, (J,) each."""

    turns: Ints
    mean: Floats
    pitch: Floats
    wire: WireColumns

    def take(self, rows: Ints) -> SingleLayer:
        """Return some of them."""
        if len(rows) == len(self.turns):
            return self
        return SingleLayer(self.turns[rows], self.mean[rows], self.pitch[rows], self.wire.take(rows))

    @cached_property
    def length(self) -> Floats:
        """Winding length. [m]"""
        return self.turns * self.pitch

    @cached_property
    def l_over_d(self) -> Floats:
        """Winding length over mean diameter. [-]"""
        return self.length / self.mean

    @cached_property
    def self_capacitance(self) -> Floats:
        """Self-capacitance with one end earthed. [F]"""
        return solenoid_self_capacitance(self.mean, self.l_over_d)

    def least_inductance(self, dc: Floats) -> Floats:
        """Return what is left of the low-frequency inductance at any frequency, at least. [H]"""
        solid = least_high_frequency_inductance(dc, self.turns, self.mean, self.wire.bare / self.pitch)
        return np.where(self.wire.stranded, dc, solid)

    @cached_property
    def wire_length(self) -> Floats:
        """Length of the wire in the winding. [m]"""
        return solenoid_wire_length(self.turns, self.mean, self.pitch)

    def at(self, frequency: Floats, dc: Floats) -> tuple[Floats, Losses]:
        """Return inductance, (J, B), and losses in the wire at each frequency."""
        factor = solenoid_proximity_factor(self.turns, self.wire.bare / self.pitch, self.l_over_d)
        few = few_turns_factor(self.turns)
        resistance = self.wire.dc_resistance(self.wire_length)
        solid = ~self.wire.stranded
        inductances, copper = [], []
        for f in frequency:
            x = self.wire.a_over_delta(float(f))
            shifted = high_frequency_inductance(
                dc, self.turns, self.mean, factor, x, internal_inductance_ratio(x)
            )
            # strands carry their current evenly: nothing is lost of their low-frequency inductance
            inductances.append(np.where(solid, shifted, dc))
            copper.append(
                self.wire.single_layer(resistance, float(f), factor, self.pitch, self.l_over_d, few)
            )
        inductance = stacked(inductances, len(self.turns))
        return inductance, losses_of(frequency, inductance, copper)

    def diameter_tolerance(self, outside: Floats, tolerance: Floats) -> Floats:
        """Return the tolerance of the mean diameter from that of what is wound on and of the wire."""
        spread: Floats = np.hypot(outside * tolerance, self.wire.overall * WIRE_TOLERANCE) / self.mean
        return spread

    def spread(self, diameter: Floats, pitch: Floats, dc: Floats, inductance: Floats) -> Floats:
        """Return what tolerances of diameter and pitch and the model leave on the inductance. [fraction]"""
        shift = 1.0 - inductance.min(axis=1, initial=np.inf) / dc if inductance.size else np.zeros(len(dc))
        model = solenoid_model_spread(self.turns, self.pitch / self.mean, shift)
        return solenoid_spread(self.l_over_d, diameter, pitch, model)

    @property
    def copper_spread(self) -> Floats:
        """Return the relative error of the copper's resistance. [fraction]"""
        solid = proximity_factor_spread(self.wire.bare / self.pitch, self.l_over_d)
        return np.where(self.wire.stranded, STRANDED_RESISTANCE_SPREAD, solid)

    def cautions(self, row: int, frequency: float) -> tuple[str, ...]:
        """Return what must be said of one coil at a frequency."""
        if self.wire.strands[row] > 1:
            return (ABOVE_STRANDED,) if frequency > STRANDED_HIGHEST else ()
        touching = self.wire.bare[row] >= DOUBTFUL_D_OVER_S * self.pitch[row]
        short = self.length[row] <= DOUBTFUL_L_OVER_D * self.mean[row]
        return (DOUBTFUL,) if touching and short and self.turns[row] > 1 else ()
