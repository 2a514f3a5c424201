"""A load at a tap of the coil or on a link over it, and what the tank with its load keeps out."""

from __future__ import annotations

import math
from dataclasses import dataclass

from partpick.circuit import Tank
from partpick.oscillating import load_conductance, tap_shares
from partpick.physics.coupled_tanks import Tank as LoadedCircuit
from partpick.physics.coupled_tanks import tank_attenuation
from partpick.physics.coupling import link_load, tap_load
from partpick.physics.link import links_over_solenoid
from partpick.physics.loading import loaded_q
from partpick.receiver import is_receiver, offset_of

HARMONICS = (2, 3)


@dataclass(frozen=True)
class LoadTap:
    """Where a load goes on a coil, and what it does there."""

    turn: int  # whole turn, counted from the earthed end
    loaded_q: float
    detuning: float  # fraction of the frequency: what the load's leakage does to the coil


def tap_for_load(tank: Tank, resonance: float, resistance: float, wanted: float) -> LoadTap | None:
    """Return the turn at which a load comes nearest to a loaded Q.

    Every turn of the coil is tried, the last too; nearest is meant in ratio, of equal ones the fewest turns.
    None where the coil cannot be tapped, or its Q is unknown.
    """
    q, turns = tank.q(), int(tank.coils.turns[tank.coil])
    block, _ = tank.coils.locate(tank.coil)
    if q is None or tank.tap_turns is not None or not block.tappable or turns < 2:
        return None
    inductance = tank.inductance()
    reactance = math.sqrt(inductance / tank.total())
    best: tuple[float, int, float, float] | None = None
    for turn in range(1, turns + 1):
        across, with_load = resistance, inductance
        if turn < turns:
            section, _, mutual = (float(share) * inductance for share in tap_shares(tank.coils, tank.coil, turn))
            seen = tap_load(resonance, inductance, section, mutual, resistance)
            across, with_load = float(seen.resistance), float(seen.inductance)
        reached = float(loaded_q(q, reactance, across))
        detuning = math.sqrt(inductance / with_load) - 1.0
        place = (round(abs(math.log(reached / wanted)) * 1e12), turn, reached, detuning)
        best = place if best is None else min(best, place)
    assert best is not None
    return LoadTap(*best[1:])


@dataclass(frozen=True)
class LoadLink:
    """A link winding for a load, and what the load does there."""

    turns: int
    loaded_q: float
    detuning: float  # fraction of the frequency
    coupling: float  # M over the geometric mean of both inductances


def link_for_load(tank: Tank, resonance: float, resistance: float, wanted: float) -> LoadLink | None:
    """Return the whole turns of a link over the earthed end with which a load comes nearest to a loaded Q.

    From one turn to as many as the coil has; nearest is meant in ratio, of equal ones the fewest turns. None where
    no link is known for the coil, or its Q is unknown.
    """
    q, links = tank.q(), _links(tank)
    if q is None or links is None:
        return None
    inductance = tank.inductance()
    reactance = math.sqrt(inductance / tank.total())
    best: tuple[float, int, float, float, float] | None = None
    for turns, (own, mutual) in enumerate(links, 1):
        seen = link_load(resonance, inductance, own, mutual, resistance)
        reached = float(loaded_q(q, reactance, float(seen.resistance)))
        detuning = math.sqrt(inductance / float(seen.inductance)) - 1.0
        coupling = mutual / math.sqrt(inductance * own)
        place = (round(abs(math.log(reached / wanted)) * 1e12), turns, reached, detuning, coupling)
        best = place if best is None else min(best, place)
    return None if best is None else LoadLink(*best[1:])


def _links(tank: Tank) -> list[tuple[float, float]] | None:
    """Return inductance and mutual inductance of links of 1, 2, ... turns, None where they are not known. [H]"""
    block, row = tank.coils.locate(tank.coil)
    turns = int(block.turns[row])
    if tank.tap_turns is not None or not block.tappable or turns < 1:
        return None
    inductance = tank.inductance()
    if block.form != "solenoid":  # a ring: all flux in common
        shares = [turn / turns for turn in range(1, turns + 1)]
        return [(inductance * share**2, inductance * share) for share in shares]
    diameter, pitch, wire = float(block.mean_diameter[row]), float(block.pitch[row]), block.wires[int(block.wire[row])]
    over = diameter + 2 * wire.overall_diameter
    links = links_over_solenoid(turns, diameter, over, wire.bare_diameter, pitch)
    return list(zip(links.inductance.tolist(), links.mutual.tolist(), strict=True))


def attenuation(tank: Tank, frequency: float, resonance: float, loaded: float | None) -> float | None:
    """Return by how much the tank with its load puts down a frequency against its resonance. [dB]

    The loss of the tank alone is in series with its coil, what the load adds lies across it; None where a Q is
    unknown or the frequency is not above 0.
    """
    q = tank.q()
    if q is None or loaded is None or frequency <= 0:
        return None
    inductance, capacitance = tank.inductance(), tank.total()
    characteristic = math.sqrt(inductance / capacitance)
    added = max(1.0 / loaded - 1.0 / q, 0.0)
    circuit = LoadedCircuit(inductance, capacitance, characteristic / q, added / characteristic)
    return float(tank_attenuation(frequency, resonance, circuit))


def image_rejection(tank: Tank) -> list[dict[str, float | None]] | None:
    """Return what the signal circuit of a receiver does to its image at both ends; None for any other tank.

    The image lies twice the intermediate frequency from the signal, on the oscillator's side.
    """
    if not is_receiver(tank.request) or not tank.band.swept or tank.index % 2:
        return None
    found: list[dict[str, float | None]] = []
    for low_end in (True, False):
        inductance, capacitance = tank.inductance(low_end=low_end), tank.total(low_end=low_end)
        q = tank.q_at(low_end=low_end)
        at = 1.0 / (2 * math.pi * math.sqrt(inductance * capacitance))
        image = abs(at + 2 * offset_of(tank.request))
        circuit = LoadedCircuit(
            inductance,
            capacitance,
            math.sqrt(inductance / capacitance) / (q or math.inf),
            load_conductance(tank.band.load),
        )
        size = None if q is None or image == 0 else float(tank_attenuation(image, at, circuit))
        found.append({"at_hz": at, "image_hz": image, "rejection_db": size})
    return found


def harmonics(tank: Tank, resonance: float, loaded: float | None) -> dict[str, float | None]:
    """Return what the tank alone does to the second and third harmonic, by their number. [dB]"""
    return {str(order): attenuation(tank, order * resonance, resonance, loaded) for order in HARMONICS}
