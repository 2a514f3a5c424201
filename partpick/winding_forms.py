"""The winding forms: how each turns formers, cores and wires into coils.

A builder takes the catalogue, the frequencies (B,) and how many units are built, and returns a `Block`
of J coils. No branch elsewhere knows a form's name.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from partpick.errors import RequestError
from partpick.parts import Catalogue, Former, Wire
from partpick.physics.cores import core_inductance, ring_al, ring_turns_that_fit
from partpick.physics.geometry import ring_wire_length, solenoid_wire_length
from partpick.physics.loss import bought_q, combined_q, ring_pitch, ring_resistance, solenoid_resistance
from partpick.physics.proximity import solenoid_proximity_factor
from partpick.physics.self_capacitance import ring_self_capacitance, solenoid_self_capacitance
from partpick.physics.skin import internal_inductance_ratio, skin_depth, wire_resistance
from partpick.physics.sheet import inductance_sensitivities
from partpick.physics.solenoid import high_frequency_inductance, solenoid_families
from partpick.quantities import format_quantity
from partpick.request import CoilRules, MeasuredDips

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

TAIL = 0.05  # m of wire left at each end of a winding; common practice, no source
MANDREL_LEAST_WIRE = 0.8e-3  # m, thinner wire does not stand by itself; common practice, no source
MANDREL_STIFFNESS = 12  # mandrel diameter over wire, at most; common practice, no source
MANDREL_PITCH = 1.3  # in wire diameters, at least; common practice, no source
SOLENOID_MODEL_SPREAD = 0.01  # of L at radio frequency: rings against helix 0.4 %, proximity term up to 1 %
MEASURED_SPREAD = 0.01  # a careful bridge or dip measurement; common practice, no source
FIT_ROUNDING = 1e-9  # a winding that fits exactly fits


@dataclass(frozen=True, kw_only=True)
class Support:
    """What a coil is wound on, or the coil as bought."""

    name: str
    quantity: int | None
    source: str
    notes: tuple[str, ...] = ()
    frequency_low: float | None = None  # Hz, useful range of a core
    frequency_high: float | None = None


@dataclass(frozen=True, kw_only=True, eq=False)
class Block:
    """All coils of one form; arrays are (J,), those by frequency (J, B)."""

    form: str
    effort_form: int  # 0 bought, 1 ring, 2 tube, 3 other
    eased_resonance: bool = False  # twice the highest frequency is enough unless the plan says more
    supports: tuple[Support, ...]
    wires: tuple[Wire, ...] = ()
    support: Ints
    wire: Ints  # -1: none
    turns: Ints  # 0: bought
    pitch: Floats  # m, 0: none
    mean_diameter: Floats  # m, 0: none
    winding_length: Floats  # m, 0: none
    wire_length: Floats  # m in the winding, without tails
    inductance_dc: Floats  # H
    inductance: Floats  # H, (J, B)
    q: Floats  # (J, B) nan: unknown
    self_capacitance: Floats  # F
    spread: Floats  # fraction of the inductance
    tempco: Floats  # 1/K, (J, B) nan: unknown
    tempco_spread: Floats
    price: Floats  # nan: unknown
    volume: Floats  # m3
    wire_diameter: Floats  # m bare
    proportions: Floats | None = None  # winding length / mean diameter, single layers only
    label: Callable[[int], str] = field(repr=False)


def wire_pitch(former: Former, wire: Wire) -> float | None:
    """Return the pitch at which a wire goes on a former, or None where it does not. [m]"""
    overall = wire.overall_diameter
    if former.support == "mandrel":
        stiff = wire.bare_diameter >= max(MANDREL_LEAST_WIRE, former.diameter / MANDREL_STIFFNESS) * (
            1 - FIT_ROUNDING
        )
        least = MANDREL_PITCH * overall
        if not stiff or wire.strands > 1:
            return None
        wanted = 2 * overall if former.pitch == "twin" else least if former.pitch is None else float(former.pitch)
        return wanted if wanted >= least * (1 - FIT_ROUNDING) else None
    if former.pitch is None:
        return None if wire.bare else overall
    if former.pitch == "twin":
        return 2 * overall
    groove = float(former.pitch)
    fits = overall <= groove * (1 + FIT_ROUNDING)
    shorts = wire.bare and overall >= groove * (1 - FIT_ROUNDING)
    return groove if fits and not shorts else None


def _enough(quantity: int | None, units: int) -> bool:
    return quantity is None or quantity >= units


def solenoid_block(catalogue: Catalogue, frequency: Floats, units: int) -> Block:
    """Return every whole number of turns of every wire that fits each former, in one layer."""
    formers = [former for former in catalogue.formers if _enough(former.quantity, units)]
    layouts: list[tuple[int, int, float, int]] = []  # former, wire, pitch, most turns
    for i, former in enumerate(formers):
        for w, wire in enumerate(catalogue.wires):
            pitch = wire_pitch(former, wire)
            if pitch is not None and wire.strands == 1:
                most = int(former.winding_length / pitch * (1 + FIT_ROUNDING))
                if most > 0:
                    layouts.append((i, w, pitch, most))
    former_of, wire_of, pitch_of, most_of = (np.array(x) for x in zip(*layouts, strict=True)) if layouts else (
        np.empty(0, np.int64),
        np.empty(0, np.int64),
        np.empty(0),
        np.empty(0, np.int64),
    )
    layout = np.repeat(np.arange(len(layouts)), most_of)
    turns = np.arange(len(layout)) - np.repeat(np.cumsum(most_of) - most_of, most_of) + 1
    support, wire, pitch = former_of[layout], wire_of[layout], pitch_of[layout]
    bare = np.array([w.bare_diameter for w in catalogue.wires])
    overall = np.array([w.overall_diameter for w in catalogue.wires])
    outside = np.array([f.diameter for f in formers])
    mean = outside[support] + overall[wire] if len(layouts) else np.empty(0)
    length = turns * pitch
    geometry = _SolenoidGeometry(turns, mean, pitch, bare[wire] if len(layouts) else np.empty(0), wire)
    dc = _family_inductances(most_of, outside, former_of, overall, bare, wire_of, pitch_of)
    inductance, q = geometry.at(frequency, dc, bare)
    wire_length = solenoid_wire_length(turns, mean, pitch)

    def label(row: int) -> str:
        former, used = formers[support[row]], catalogue.wires[wire[row]]
        close = former.pitch is None and former.support != "mandrel"
        lay = "close wound" if close else f"pitch {format_quantity(float(pitch[row]), 'm')}"
        return f"{turns[row]} turns of {used.name} on {former.name}, {lay}"

    return Block(
        form="solenoid",
        effort_form=2,
        supports=tuple(Support(name=f.name, quantity=f.quantity, source=f.source, notes=f.notes) for f in formers),
        wires=catalogue.wires,
        support=support.astype(np.int64),
        wire=wire.astype(np.int64),
        turns=turns.astype(np.int64),
        pitch=pitch,
        mean_diameter=mean,
        winding_length=length,
        wire_length=wire_length,
        inductance_dc=dc,
        inductance=inductance,
        q=q,
        self_capacitance=solenoid_self_capacitance(mean, length / mean),
        spread=geometry.spread(np.array([f.tolerance for f in formers])[support] if len(layouts) else np.empty(0)),
        tempco=np.repeat(_column([f.tempco for f in formers])[support][:, None], len(frequency), axis=1),
        tempco_spread=np.nan_to_num(_column([f.tempco_tolerance for f in formers])[support]),
        price=_price([f.unit_price for f in formers], support, catalogue.wires, wire, wire_length),
        volume=np.pi / 4 * (mean + overall[wire]) ** 2 * length if len(layouts) else np.empty(0),
        wire_diameter=geometry.bare,
        proportions=length / mean,
        label=label,
    )


@dataclass(frozen=True, eq=False)
class _SolenoidGeometry:
    turns: Ints
    mean: Floats
    pitch: Floats
    bare: Floats
    wire: Ints

    def at(self, frequency: Floats, dc: Floats, bare_of: Floats) -> tuple[Floats, Floats]:
        """Return inductance and Q at each frequency, (J, B) each."""
        ratio, proportion = self.bare / self.pitch, self.turns * self.pitch / self.mean
        factor = solenoid_proximity_factor(self.turns, ratio, proportion)
        resistance = wire_resistance(solenoid_wire_length(self.turns, self.mean, self.pitch), self.bare)
        inductances, qs = [], []
        for f in frequency:
            depth = float(skin_depth(f))
            per_wire = bare_of / 2 / depth
            a_over_delta = per_wire[self.wire] if len(self.wire) else np.empty(0)
            internal = internal_inductance_ratio(per_wire)[self.wire] if len(self.wire) else np.empty(0)
            inductance = high_frequency_inductance(dc, self.turns, self.mean, factor, a_over_delta, internal)
            loss = solenoid_resistance(resistance, a_over_delta, factor).total
            inductances.append(inductance)
            qs.append(2 * np.pi * f * inductance / loss)
        return np.stack(inductances, axis=1), np.stack(qs, axis=1)

    def spread(self, tolerance: Floats) -> Floats:
        """Return what the former's tolerance and the model leave on the inductance. [fraction]"""
        by_diameter = inductance_sensitivities(self.turns * self.pitch / self.mean).diameter
        return np.hypot(by_diameter * tolerance, SOLENOID_MODEL_SPREAD)


def _family_inductances(
    most_of: Ints, outside: Floats, former_of: Ints, overall: Floats, bare: Floats, wire_of: Ints, pitch_of: Floats
) -> Floats:
    """Return the low-frequency inductance of every winding; families that differ in room alone are summed once."""
    families: dict[tuple[float, int, float], int] = {}
    keys = [
        (float(outside[f]), int(w), float(p)) for f, w, p in zip(former_of, wire_of, pitch_of, strict=True)
    ]
    for key, most in zip(keys, most_of, strict=True):
        families[key] = max(families.get(key, 0), int(most))
    if not families:
        return np.empty(0)
    most = np.array(list(families.values()))
    mean = np.array([d + overall[w] for d, w, _ in families])
    flat = solenoid_families(most, mean, np.array([bare[w] for _, w, _ in families]), np.array([p for *_, p in families]))
    start = dict(zip(families, np.cumsum(most) - most, strict=True))
    return np.concatenate([flat[start[key] : start[key] + n] for key, n in zip(keys, most_of, strict=True)])


def ring_block(catalogue: Catalogue, frequency: Floats, units: int) -> Block:
    """Return every whole number of turns of every covered wire that fits each ring, one layer on the bore."""
    cores = [core for core in catalogue.cores if core.shape == "ring" and _enough(core.quantity, units)]
    wires = [(w, wire) for w, wire in enumerate(catalogue.wires) if not wire.bare and wire.strands == 1]
    layouts = []
    for i, core in enumerate(cores):
        assert core.inner_diameter is not None
        for w, wire in wires:
            if wire.overall_diameter < core.inner_diameter:
                most = int(ring_turns_that_fit(core.inner_diameter, wire.overall_diameter))
                if most > 0:
                    layouts.append((i, w, most))
    most_of = np.array([most for *_, most in layouts], dtype=np.int64)
    layout = np.repeat(np.arange(len(layouts)), most_of)
    turns = np.arange(len(layout)) - np.repeat(np.cumsum(most_of) - most_of, most_of) + 1
    support = np.array([i for i, _, _ in layouts], dtype=np.int64)[layout]
    wire = np.array([w for _, w, _ in layouts], dtype=np.int64)[layout]
    bare = np.array([w.bare_diameter for w in catalogue.wires])[wire]
    overall = np.array([w.overall_diameter for w in catalogue.wires])[wire]
    outer, inner, height = (_column([getattr(c, n) for c in cores])[support] for n in _RING_SIZES)
    al = np.array([core.al or float(ring_al(*(getattr(core, n) for n in _RING_SIZES), core.permeability or 1.0)) for core in cores])
    inductance = core_inductance(al[support], turns) if len(turns) else np.empty(0)
    wire_length = ring_wire_length(turns, outer, inner, height, overall)
    resistance = wire_resistance(wire_length, bare)
    spacing = bare / ring_pitch(turns, outer, inner, height, overall)
    ceiling = _column([core.q for core in cores])[support]
    low, high = _column([c.frequency_low for c in cores])[support], _column([c.frequency_high for c in cores])[support]
    q = []
    for f in frequency:
        copper = 2 * np.pi * f * inductance / ring_resistance(resistance, bare / 2 / float(skin_depth(f)), spacing).total
        outside = (f < np.nan_to_num(low, nan=0.0)) | (f > np.nan_to_num(high, nan=np.inf))
        q.append(np.where(outside, np.nan, combined_q(copper, ceiling)))

    def label(row: int) -> str:
        return f"{turns[row]} turns of {catalogue.wires[wire[row]].name} on {cores[support[row]].name}"

    return Block(
        form="ring core",
        effort_form=1,
        supports=tuple(
            Support(
                name=c.name,
                quantity=c.quantity,
                source=c.source,
                notes=c.notes,
                frequency_low=c.frequency_low,
                frequency_high=c.frequency_high,
            )
            for c in cores
        ),
        wires=catalogue.wires,
        support=support,
        wire=wire,
        turns=turns.astype(np.int64),
        pitch=np.zeros(len(turns)),
        mean_diameter=np.zeros(len(turns)),
        winding_length=np.zeros(len(turns)),
        wire_length=wire_length,
        inductance_dc=inductance,
        inductance=np.repeat(inductance[:, None], len(frequency), axis=1),
        q=np.stack(q, axis=1) if q else np.empty((len(turns), 0)),
        self_capacitance=ring_self_capacitance(outer),
        spread=np.array([core.tolerance for core in cores])[support] if len(turns) else np.empty(0),
        tempco=np.repeat(_column([c.tempco for c in cores])[support][:, None], len(frequency), axis=1),
        tempco_spread=np.nan_to_num(_column([c.tempco_tolerance for c in cores])[support]),
        price=_price([c.unit_price for c in cores], support, catalogue.wires, wire, wire_length),
        volume=np.pi / 4 * outer**2 * height,
        wire_diameter=bare,
        label=label,
    )


_RING_SIZES = ("outer_diameter", "inner_diameter", "height")


def bought_block(catalogue: Catalogue, frequency: Floats, units: int) -> Block:
    """Return every inductor as bought; its inductance holds at every frequency below its own resonance."""
    parts = [part for part in catalogue.inductors if _enough(part.quantity, units)]
    count = len(parts)
    value = np.array([part.value for part in parts])
    zeros = np.zeros(count)
    q = [bought_q(_column([p.q for p in parts]), _column([p.q_frequency for p in parts]), f) for f in frequency]
    supports = []
    for part in parts:
        notes = part.notes
        if part.self_capacitance is None:
            notes = (*notes, "self-capacitance not stated, taken as 0")
        supports.append(Support(name=part.label, quantity=part.quantity, source=part.source, notes=notes))

    def label(row: int) -> str:
        return f"{parts[row].label}, bought"

    return Block(
        form="bought",
        effort_form=0,
        eased_resonance=True,
        supports=tuple(supports),
        support=np.arange(count, dtype=np.int64),
        wire=np.full(count, -1, dtype=np.int64),
        turns=np.zeros(count, dtype=np.int64),
        pitch=zeros,
        mean_diameter=zeros,
        winding_length=zeros,
        wire_length=zeros,
        inductance_dc=value,
        inductance=np.repeat(value[:, None], len(frequency), axis=1),
        q=np.stack(q, axis=1).reshape(count, len(frequency)) if q else np.empty((count, 0)),
        self_capacitance=np.array([part.self_capacitance or 0.0 for part in parts]),
        spread=np.array([part.tolerance for part in parts]),
        tempco=np.repeat(_column([p.tempco for p in parts])[:, None], len(frequency), axis=1),
        tempco_spread=np.nan_to_num(_column([p.tempco_tolerance for p in parts])),
        price=_column([p.unit_price for p in parts]),
        volume=zeros,
        wire_diameter=zeros,
        label=label,
    )


def measured_block(rules: CoilRules, frequency: Floats) -> Block:
    """Return the one coil that was wound and measured."""
    assert rules.measured is not None
    if isinstance(rules.measured, MeasuredDips):
        inductance, self_capacitance = coil_from_dips(rules.measured.at, rules.measured.with_capacitance)
    else:
        inductance, self_capacitance = rules.measured, rules.self_capacitance or 0.0
    one, none = np.ones(1), np.zeros(1)
    unknown = np.full((1, len(frequency)), np.nan)

    def label(_: int) -> str:
        return f"the coil as measured, {format_quantity(inductance, 'H')}"

    return Block(
        form="measured",
        effort_form=0,
        eased_resonance=True,
        supports=(Support(name="measured coil", quantity=1 << 30, source="measured, stated in the plan"),),
        support=np.zeros(1, dtype=np.int64),
        wire=np.full(1, -1, dtype=np.int64),
        turns=np.zeros(1, dtype=np.int64),
        pitch=none,
        mean_diameter=none,
        winding_length=none,
        wire_length=none,
        inductance_dc=inductance * one,
        inductance=np.full((1, len(frequency)), inductance),
        q=unknown,
        self_capacitance=self_capacitance * one,
        spread=MEASURED_SPREAD * one,
        tempco=unknown,
        tempco_spread=none,
        price=none,
        volume=none,
        wire_diameter=none,
        label=label,
    )


def coil_from_dips(at: tuple[float, float], with_capacitance: tuple[float, float]) -> tuple[float, float]:
    """Return inductance and self-capacitance from two dips of one coil with known capacitors across it.

    Parameters
    ----------
    at : (float, float)
        The two frequencies. [Hz]
    with_capacitance : (float, float)
        The capacitor across the coil at each. [F]

    Raises
    ------
    RequestError
        The dips contradict each other: the same capacitor twice, or the larger one at the higher frequency,
        or a self-capacitance below zero.
    """
    inverse = [1.0 / (2 * np.pi * f) ** 2 for f in at]
    difference = with_capacitance[0] - with_capacitance[1]
    inductance = (inverse[0] - inverse[1]) / difference if difference else float("nan")
    if not inductance > 0:
        raise RequestError(
            "coil.measured: the two dips contradict each other: the larger capacitor must dip lower in frequency"
        )
    self_capacitance = inverse[0] / inductance - with_capacitance[0]
    if self_capacitance < 0:
        raise RequestError(
            f"coil.measured: the two dips give a self-capacitance of {self_capacitance * 1e12:.3g} pF, below zero; "
            "measure the capacitors, strays included, and the frequencies again"
        )
    return float(inductance), float(self_capacitance)


def _column(values: list[float | None]) -> Floats:
    return np.array([np.nan if value is None else value for value in values], dtype=float)


def _price(
    unit_prices: list[float | None], support: Ints, wires: tuple[Wire, ...], wire: Ints, length: Floats
) -> Floats:
    """Return the price of each wound coil, its wire with tails included; nan where either is unknown."""
    per_metre = _column([w.price_per_m for w in wires])
    if not len(support):
        return np.empty(0)
    return _column(unit_prices)[support] + per_metre[wire] * (length + 2 * TAIL)
