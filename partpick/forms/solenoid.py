"""Single-layer coils on tubes, grooved formers and mandrels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.forms.block import (
    FIT_ROUNDING,
    TUBE,
    Block,
    Floats,
    Ints,
    Layouts,
    Support,
    at_every,
    column,
    enough,
    stacked,
    wound_price,
)
from partpick.parts import Catalogue, Former, Wire
from partpick.physics.geometry import solenoid_wire_length
from partpick.physics.loss import solenoid_resistance
from partpick.physics.proximity import solenoid_proximity_factor
from partpick.physics.self_capacitance import solenoid_self_capacitance
from partpick.physics.sheet import inductance_sensitivities
from partpick.physics.skin import internal_inductance_ratio, skin_depth, wire_resistance
from partpick.physics.solenoid import high_frequency_inductance, solenoid_families
from partpick.quantities import format_quantity

MANDREL_LEAST_WIRE = 0.8e-3  # m, thinner wire does not stand by itself; common practice, no source
MANDREL_STIFFNESS = 12  # mandrel diameter over wire, at most; common practice, no source
MANDREL_PITCH = 1.3  # in wire diameters, at least; common practice, no source
MODEL_SPREAD = 0.01  # of L at radio frequency: rings against helix 0.4 %, proximity term up to 1 %


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


def solenoid_block(catalogue: Catalogue, frequency: Floats, units: int) -> Block:
    """Return every whole number of turns of every solid wire that fits each former, in one layer."""
    formers = [former for former in catalogue.formers if enough(former.quantity, units)]
    layouts = _layouts(formers, catalogue.wires)
    layout, turns = layouts.coils()
    support, wire, pitch = layouts.support[layout], layouts.wire[layout], layouts.pitch[layout]
    bare = np.array([w.bare_diameter for w in catalogue.wires])[wire]
    overall = np.array([w.overall_diameter for w in catalogue.wires])[wire]
    mean = np.array([former.diameter for former in formers])[support] + overall
    length = turns * pitch
    dc = _family_inductances(formers, catalogue.wires, layouts)
    coil = _Turns(turns, mean, pitch, bare)
    inductance, q = coil.at(frequency, dc)
    tolerance = column([former.tolerance for former in formers])[support]

    def label(row: int) -> str:
        former, used = formers[support[row]], catalogue.wires[wire[row]]
        close = former.pitch is None and former.support != "mandrel"
        lay = "close wound" if close else f"pitch {format_quantity(float(pitch[row]), 'm')}"
        return f"{turns[row]} turns of {used.name} on {former.name}, {lay}"

    return Block(
        form="solenoid",
        effort_form=TUBE,
        supports=tuple(
            Support(name=f.name, quantity=f.quantity, source=f.source, notes=f.notes) for f in formers
        ),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns,
        pitch=pitch,
        mean_diameter=mean,
        winding_length=length,
        wire_length=coil.wire_length,
        inductance_dc=dc,
        inductance=inductance,
        q=q,
        self_capacitance=solenoid_self_capacitance(mean, length / mean),
        spread=coil.spread(tolerance),
        tempco=at_every(column([former.tempco for former in formers])[support], frequency),
        tempco_spread=np.nan_to_num(column([former.tempco_tolerance for former in formers])[support]),
        price=wound_price([f.unit_price for f in formers], support, catalogue.wires, wire, coil.wire_length),
        volume=np.pi / 4 * (mean + overall) ** 2 * length,
        wire_diameter=bare,
        proportions=length / mean,
        label=label,
    )


def _layouts(formers: list[Former], wires: tuple[Wire, ...]) -> Layouts:
    rows = []
    for i, former in enumerate(formers):
        for w, wire in enumerate(wires):
            pitch = wire_pitch(former, wire) if wire.strands == 1 else None
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
class _Turns:
    """The windings as physics sees them, (J,) each."""

    turns: Ints
    mean: Floats
    pitch: Floats
    bare: Floats

    @property
    def wire_length(self) -> Floats:
        return solenoid_wire_length(self.turns, self.mean, self.pitch)

    def at(self, frequency: Floats, dc: Floats) -> tuple[Floats, Floats]:
        """Return inductance and Q at each frequency, (J, B) each."""
        factor = solenoid_proximity_factor(
            self.turns, self.bare / self.pitch, self.turns * self.pitch / self.mean
        )
        resistance = wire_resistance(self.wire_length, self.bare)
        inductances, qs = [], []
        for f in frequency:
            a_over_delta = self.bare / 2 / float(skin_depth(f))
            internal = internal_inductance_ratio(a_over_delta)
            inductance = high_frequency_inductance(dc, self.turns, self.mean, factor, a_over_delta, internal)
            inductances.append(inductance)
            qs.append(
                2 * np.pi * f * inductance / solenoid_resistance(resistance, a_over_delta, factor).total
            )
        return stacked(inductances, len(self.turns)), stacked(qs, len(self.turns))

    def spread(self, tolerance: Floats) -> Floats:
        """Return what the former's tolerance and the model leave on the inductance. [fraction]"""
        by_diameter = inductance_sensitivities(self.turns * self.pitch / self.mean).diameter
        return np.hypot(by_diameter * tolerance, MODEL_SPREAD)
