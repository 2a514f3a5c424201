"""One band's tank from its parts alone: capacitance, Q and drift at a frequency, nothing taken from the search."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TypeVar

from partpick.candidates import Coils
from partpick.objective import TRIMMER_Q
from partpick.oscillating import oscillator_keys, tap_shares
from partpick.parts import Capacitor
from partpick.physics.resonance import effective_capacitance
from partpick.request import Band, Request
from partpick.search.divided import (
    CLAPPED,
    DIVIDED,
    FIRST_OF_DIVIDER,
    LOADED,
    NO_DEVICE,
    OWN_PARTS,
    SPLIT,
    Device,
    loaded_value,
)
from partpick.search.networks import CHAINED, PARALLEL, SERIES, SHUNTED
from partpick.tuning import ElementEnds, element_ends

T = TypeVar("T", float, Fraction)


@dataclass(frozen=True, kw_only=True)
class Network:
    """The capacitors of one band across its coil: indices into the capacitors in play, in the order of the shape."""

    parts: tuple[int, ...]
    shape: int
    series: int | None = None  # the padder in series with the tuning element of a swept band

    @property
    def pieces(self) -> tuple[int, ...]:
        """All capacitors of the band, the series padder last."""
        return self.parts if self.series is None else (*self.parts, self.series)

    @property
    def divider(self) -> tuple[int, int] | None:
        """Places of a divider's two capacitors among the pieces, output first; None where there is no divider."""
        first = FIRST_OF_DIVIDER.get(self.shape)
        return None if first is None else (first, first + 1)


@dataclass(frozen=True, kw_only=True)
class Design:
    """What was picked: a coil and a network for each band, in plan order."""

    coils: tuple[int, ...]  # (B,) index into Coils
    networks: tuple[Network, ...]  # (B,)
    taps: tuple[int | None, ...] = ()  # (B,) turns of the section in use, None: the whole coil; (): no taps
    common: tuple[int | None, ...] = ()  # (B,) turns between output and common terminal of a Hartley oscillator
    members: tuple[int, ...] = ()  # the capacitors that there are, where bands share them
    closed: tuple[tuple[int, ...], ...] = ()  # (B, any) places in `members` of those in circuit at each band

    @property
    def capacitors(self) -> tuple[int, ...]:
        """Every capacitor once, whether one band uses it or several."""
        if self.closed:
            return self.members
        return tuple(part for network in self.networks for part in network.pieces)


@dataclass(frozen=True, kw_only=True, eq=False)
class Tank:
    """One band of a design with everything that is in circuit there."""

    request: Request
    coils: Coils
    capacitors: Sequence[Capacitor]
    design: Design
    index: int  # of the band, in plan order

    @property
    def band(self) -> Band:
        """The band as asked for."""
        return self.request.bands[self.index]

    @property
    def coil(self) -> int:
        """Index of its coil."""
        return self.design.coils[self.index]

    @property
    def tap_turns(self) -> int | None:
        """Turns of the section in use, None for the whole coil."""
        return self.design.taps[self.index] if self.design.taps else None

    @property
    def row(self) -> int:
        """Index of the coil of as many turns as are in circuit."""
        return self.coils.section_row(self.coil, self.tap_turns)

    @property
    def self_capacitance(self) -> float:
        """Across what is in circuit, of a swept band at its upper end. [F]"""
        return self.own_capacitance()

    def own_capacitance(self, *, low_end: bool = False) -> float:
        """Return the self-capacitance across what is in circuit. [F]"""
        if self.tap_turns is not None:
            return float(self.coils.section_self_capacitance(self.coil, self.tap_turns))
        own, moved = float(self.coils.self_capacitance[self.coil]), self.coils.moved
        if moved is None:
            return own
        return own + float((moved.own_low if low_end else moved.own_high)[self.coil, self.index])

    @property
    def network(self) -> Network:
        """Its capacitors."""
        return self.design.networks[self.index]

    @property
    def wiring(self) -> float:
        """Wiring and switch, and what the device acts as across the coil of a Hartley oscillator. [F]"""
        return self.band.stray + self.device_across

    @property
    def strays(self) -> float:
        """Wiring and self-capacitance, of a swept band at its upper end. [F]"""
        return self.wiring + self.self_capacitance

    @property
    def common_turns(self) -> int | None:
        """Turns between output and common terminal of a Hartley oscillator, None in any other circuit."""
        return self.design.common[self.index] if self.design.common else None

    @property
    def device(self) -> Device:
        """Capacitance of the device across the halves of a divider, output first; of a load see `divided.py`. [F]"""
        if self.network.shape == LOADED:
            load = self.band.load
            assert load is not None and load.resistance is not None
            return 0.0, 1.0 / (2 * math.pi * self.frequency() * load.resistance)
        keys = oscillator_keys(self.request)
        if keys is None or self.network.divider is None:
            return NO_DEVICE
        return keys["output_capacitance"], keys["input_capacitance"]

    @property
    def device_across(self) -> float:
        """What the device acts as across a coil with its common terminal at a tap. [F]"""
        keys, turns = oscillator_keys(self.request), self.common_turns
        if keys is None or turns is None:
            return 0.0
        output, control, mutual = tap_shares(self.coils, self.coil, turns)
        own = (output + mutual) ** 2 * keys["output_capacitance"]
        return float(own + (control + mutual) ** 2 * keys["input_capacitance"])

    def halves(self, *, low_end: bool = False) -> tuple[float, float]:
        """Return what both halves of the divider act as, the device included, output first. [F]"""
        places = self.network.divider
        assert places is not None
        output, control = (self.acting(place, low_end=low_end) for place in places)
        return output + self.device[0], control + self.device[1]

    def acting(self, place: int, *, low_end: bool = False) -> float:
        """Return what one of the band's pieces acts as. [F]"""
        part = self.capacitors[self.network.pieces[place]]
        frequency = self.frequency(low_end=low_end)
        return float(effective_capacitance(part.value, part.series_inductance or 0.0, frequency))

    @property
    def trimmer(self) -> float:
        """The trimmer at the middle of its range, 0 without one. [F]"""
        return self.band.trimmer.middle if self.band.trimmer else 0.0

    def inductance(self, *, low_end: bool = False) -> float:
        """Return the coil's inductance at the band, or at its lower end. [H]"""
        values = self.coils.inductance_low if low_end else self.coils.inductance
        return float(values[self.row, self.index])

    def frequency(self, *, low_end: bool = False) -> float:
        """Return the frequency at which figures are taken: the target, or the lower end. [Hz]"""
        return self.band.lowest if low_end else self.band.highest

    def across(self, *, low_end: bool = False) -> float:
        """Return what the band's capacitors across the coil act as. [F]"""
        leads = self.request.stray.inductance
        return network_capacitance(
            self.capacitors, self.network, self.frequency(low_end=low_end), leads, self.device
        )

    def element(self) -> ElementEnds | None:
        """Return the tuning element of a swept band, None for a fixed one or where the coil itself is tuned."""
        if not self.band.swept or self.coils.moved is not None:
            return None
        assert self.request.tuning is not None
        return element_ends(self.request.tuning)

    def tuned(self, *, low_end: bool = False) -> float:
        """Return the tuning element behind its padder, 0 in a fixed band. [F]"""
        element = self.element()
        if element is None:
            return 0.0
        own = element.high if low_end else element.low
        if self.network.shape == SPLIT:
            output, control = self.halves(low_end=low_end)
            return 1.0 / (1.0 / own + 1.0 / output + 1.0 / control)
        if self.network.series is None:
            return own
        padder = self.capacitors[self.network.series]
        acting = acting_capacitance(padder, self.frequency(low_end=low_end))
        return own * acting / (own + acting)

    def total(self, *, low_end: bool = False) -> float:
        """Return all capacitance in circuit. [F]"""
        strays = self.wiring + self.own_capacitance(low_end=low_end)
        return self.across(low_end=low_end) + self.tuned(low_end=low_end) + strays + self.trimmer

    def weights(self, total: float, *, low_end: bool = False) -> list[tuple[Capacitor, float]]:
        """Return each capacitor with d ln(total) / d ln(its own), the series padder last.

        The same figure weighs its loss and its drift: inductance in series, its own and that of the leads,
        lets more current through it than its value alone would.
        """
        chosen = [self.capacitors[i] for i in self.network.parts]
        frequency = self.frequency(low_end=low_end)
        acting = [acting_capacitance(part, frequency) for part in chosen]
        gains = [acts / part.value for part, acts in zip(chosen, acting, strict=True)]
        across = self.across(low_end=low_end)
        if self.network.shape == SPLIT:
            slopes = self._split_weights(acting, total, low_end=low_end)
        else:
            shape = self.network.shape
            shares = network_shares(acting, shape, self.device)
            whole = _combine(_beside_device(acting, shape, self.device), shape, self.device) if acting else 1.0
            slopes = [share * across / whole * across / total for share in shares]
        weighted = [(part, slope * gain) for part, slope, gain in zip(chosen, slopes, gains, strict=True)]
        if self.network.series is not None:
            padder, tuned = self.capacitors[self.network.series], self.tuned(low_end=low_end)
            weighted.append((padder, tuned / padder.value * tuned / total))
        return weighted

    def _split_weights(self, acting: list[float], total: float, *, low_end: bool) -> list[float]:
        """Return d ln(total) / d ln of each part as it acts, where the divider stands with the tuning element. [-]"""
        tuned, halves = self.tuned(low_end=low_end), self.halves(low_end=low_end)
        of_halves = [tuned**2 / half**2 * own / total for half, own in zip(halves, acting, strict=False)]
        return [*of_halves, *(each / total for each in acting[2:])]

    def element_weight(self, total: float, *, low_end: bool = False) -> float:
        """Return d ln(total) / d ln(tuning element), 0 in a fixed band. [-]"""
        element = self.element()
        if element is None:
            return 0.0
        tuned = self.tuned(low_end=low_end)
        return tuned / (element.high if low_end else element.low) * tuned / total

    def coil_q(self, *, low_end: bool = False) -> float | None:
        """Return the Q of the coil alone; None where its loss is unknown. [-]"""
        q = float((self.coils.q_low if low_end else self.coils.q)[self.row, self.index])
        if not math.isfinite(q):
            return None
        return q if self.tap_turns is None else 1.0 / (1.0 / q + self.idle_loss(low_end=low_end))

    def idle_loss(self, *, low_end: bool = False) -> float:
        """Return what the former takes of 1/Q around the idle turns of a tapped coil, 0 without a tap. [-]"""
        if self.tap_turns is None:
            return 0.0
        return float(self.coils.section_loss(self.row, self.self_capacitance, low_end=low_end)[self.index])

    def losses(self, *, low_end: bool = False) -> dict[str, float | None]:
        """Return 1/Q by cause: coil, capacitors, trimmer, tuning element; None where a loss is unknown. [-]"""
        total = self.total(low_end=low_end)
        frequency = self.frequency(low_end=low_end)
        coil_q = self.coil_q(low_end=low_end)
        capacitors: float | None = 0.0
        for part, weight in self.weights(total, low_end=low_end):
            known = part.q is not None and (part.q_below is None or frequency <= part.q_below)
            capacitors = None if capacitors is None or not known or not part.q else capacitors + weight / part.q
        trimmer, element = self.band.trimmer, self.element()
        return {
            "coil": None if coil_q is None else 1.0 / coil_q,
            "capacitors": capacitors,
            "trimmer": self.trimmer / total / (trimmer.q or TRIMMER_Q) if trimmer else 0.0,
            "tuning": self.element_weight(total, low_end=low_end) / element.q if element else 0.0,
        }

    def q(self) -> float | None:
        """Return the unloaded Q, the worse end of a swept band; None where a loss is unknown. [-]"""
        ends = [self.q_at(low_end=low_end) for low_end in ((False, True) if self.band.swept else (False,))]
        known = [q for q in ends if q is not None]
        return min(known) if len(known) == len(ends) else None

    def q_at(self, *, low_end: bool = False) -> float | None:
        """Return the unloaded Q at the target, or at the lower end; None where a loss is unknown. [-]"""
        losses = self.losses(low_end=low_end).values()
        known = [loss for loss in losses if loss is not None]
        return 1.0 / math.fsum(known) if len(known) == len(losses) else None

    def drift(self) -> tuple[float | None, float | None]:
        """Return df/f per kelvin and its spread, trimmer set on frequency; None where a tempco is unknown. [1/K]"""
        fixed = self.across() + self.tuned() + self.strays
        trimmer, trimmer_tempco = 0.0, 0.0
        if self.band.trimmer:
            wanted = 1.0 / ((2 * math.pi * self.band.highest) ** 2 * self.inductance())
            trimmer = min(max(wanted - fixed, self.band.trimmer.low), self.band.trimmer.high)
            trimmer_tempco = math.nan if self.band.trimmer.tempco is None else self.band.trimmer.tempco
        total = fixed + trimmer
        capacitance = (self.strays * self.request.stray.tempco + trimmer * trimmer_tempco) / total
        element = self.element()
        if element:
            own = math.nan if element.tempco is None else element.tempco
            capacitance += self.element_weight(total) * own
        spread = float(self.coils.tempco_spread[self.coil])
        if self.band.trimmer:
            spread += trimmer / total * (self.band.trimmer.tempco_tolerance or 0.0)
        for part, weight in self.weights(total):
            capacitance += weight * (math.nan if part.tempco is None else part.tempco)
            spread += weight * (part.tempco_tolerance or 0.0)
        nominal = -0.5 * (float(self.coils.tempco[self.row, self.index]) + capacitance)
        return (nominal, 0.5 * spread) if math.isfinite(nominal) else (None, None)


def acting_capacitance(part: Capacitor, frequency: float) -> float:
    """Return how a capacitor acts at a frequency, its series inductance included. [F]"""
    return float(effective_capacitance(part.value, part.series_inductance or 0.0, frequency))


def network_capacitance(
    capacitors: Sequence[Capacitor],
    network: Network,
    frequency: float,
    leads: float,
    device: Device = NO_DEVICE,
) -> float:
    """Return how a band's network acts at a frequency, series inductances included. [F]"""
    chosen = [capacitors[i] for i in network.parts]
    if not chosen:
        return 0.0
    if any(part.series_inductance for part in chosen):
        acting = [acting_capacitance(part, frequency) for part in chosen]
        whole = _combine(_beside_device(acting, network.shape, device), network.shape, device)
    else:
        exact = _beside_device([part.exact for part in chosen], network.shape, device)
        whole = float(_combine(exact, network.shape, device))
    return float(effective_capacitance(whole, leads, frequency)) if leads else whole


def _beside_device(c: list[T], shape: int, device: Device) -> list[T]:
    """Return the parts of a network with the device across the halves of its divider. [F]"""
    first = FIRST_OF_DIVIDER.get(shape)
    if first is None or device == NO_DEVICE:
        return c
    grown = list(c)
    for place, own in enumerate(device, first):
        grown[place] = grown[place] + type(grown[place])(own)
    return grown


def _combine(c: list[T], shape: int, device: Device = NO_DEVICE) -> T:
    if shape in OWN_PARTS:
        own, zero = OWN_PARTS[shape], type(c[0])(0)
        beside = sum(c[own:], zero)
        if shape == LOADED:
            return loaded_value(c[0], c[1], type(c[0])(device[1])) + beside
        return beside if shape == SPLIT else _combine(c[:own], SERIES) + beside
    if shape == PARALLEL or len(c) == 1:
        total = c[0]
        for value in c[1:]:
            total = total + value
        return total
    if shape == SERIES:
        total = c[0]
        for value in c[1:]:
            total = total * value / (total + value)
        return total
    if shape == SHUNTED:
        return c[0] + c[1] * c[2] / (c[1] + c[2])
    assert shape == CHAINED
    pair = c[1] + c[2]
    return c[0] * pair / (c[0] + pair)


def network_shares(c: list[float], shape: int, device: Device = NO_DEVICE) -> list[float]:
    """Return d ln(network) / d ln(part) of each part of a network of plain capacitances. [-]"""
    grown = _beside_device(c, shape, device)
    net = _combine(grown, shape, device) if c else 0.0
    if shape in OWN_PARTS:
        own = OWN_PARTS[shape]
        beside = [value / net for value in c[own:]]
        if shape == SPLIT:
            return [0.0] * own + beside
        branch = _combine(grown[:own], SERIES)
        return [branch**2 * c[i] / grown[i] ** 2 / net for i in range(own)] + beside
    if shape == PARALLEL or len(c) == 1:
        return [value / net for value in c]
    if shape == SERIES:
        return [net / value for value in c]
    if shape == SHUNTED:
        pair = c[1] * c[2] / (c[1] + c[2])
        return [c[0] / net, pair**2 / c[1] / net, pair**2 / c[2] / net]
    pair = c[1] + c[2]
    return [net / c[0], net * c[1] / pair**2, net * c[2] / pair**2]


def _in_brackets(names: Sequence[str], needed: bool) -> str:
    text = " + ".join(names)
    return f"({text})" if needed else text


def connection_text(names: Sequence[str], shape: int) -> str:
    """Return a network in words of references: `C1 | (C2 + C3)`; parallel `|`, series `+`."""
    if not names:
        return ""
    if shape == SHUNTED:
        return f"{names[0]} | ({names[1]} + {names[2]})"
    if shape == CHAINED:
        return f"{names[0]} + ({names[1]} | {names[2]})"
    if shape in (DIVIDED, CLAPPED, LOADED):
        own = OWN_PARTS[shape]
        return " | ".join([_in_brackets(names[:own], len(names) > own), *names[own:]])
    return (" | " if shape == PARALLEL else " + ").join(names)
