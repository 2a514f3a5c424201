"""Figures of one band's tank beyond its resonance: loss by cause, ringing, load, damping, selectivity."""

from __future__ import annotations

import math
from dataclasses import dataclass

from partpick.circuit import Tank, network_capacitance
from partpick.errors import InternalError
from partpick.loads import attenuation, harmonics, image_rejection, link_for_load, tap_for_load
from partpick.matching import load_to_meet, q_limits
from partpick.physics.coupling import divider_load
from partpick.physics.loading import damping_resistance, loaded_q
from partpick.physics.resonance import (
    lossy_resonances,
    reactance,
    ringing_cycles,
    ringing_time_constant,
)
from partpick.preferred import nearest
from partpick.quantities import format_quantity
from partpick.request import Load
from partpick.search.divided import LOADED, NO_DEVICE

STEP = 1e-4  # of the frequency, to either side, for a slope
LEAST_DETUNING = 0.001  # of the frequency: from here it is told
AGREEMENT = 1e-6  # of the loaded Q, between search and recheck
NEAR_ENOUGH = 0.1  # of a wanted loaded Q, in ratio: a tap further off is told
DAMPING_SERIES = "E24"  # of resistors, 5 %; common practice, no source


@dataclass(frozen=True, kw_only=True)
class LoadedTank:
    """What a load or a damping resistor makes of a tank; `None`: unknown, or it does not apply."""

    q: float | None
    damping: float | None = None  # ohm, of the series
    across: float | None = None  # ohm, what the load must look like across the tank
    note: str | None = None
    detuning: float | None = None  # fraction of the frequency, by a load at a tap, on a link or a divider
    tap_turns: int | None = None  # whole turn, from the earthed end, that the load goes to
    link_turns: int | None = None  # of a link over the earthed end
    coupling: float | None = None  # of the link with the coil


def tank_figures(tank: Tank, resonance: float, names: tuple[str, ...] = ()) -> dict[str, object]:
    """Return further keys of a band.

    Parameters
    ----------
    tank : Tank
        The band as picked.
    resonance : float
        Of its inductance and capacitance; of a swept band at its upper end. [Hz]
    names : tuple of str
        References of its capacitors, in the order of its pieces.

    Returns
    -------
    figures : dict
        `loss` (shares of 1/Q by cause), ringing, the three resonances of a lossy tank, and `load` where one
        is stated; null where a loss is unknown.
    """
    q = tank.q()
    inductance, capacitance = tank.inductance(), tank.total()
    characteristic = float(reactance(inductance, capacitance))
    series = None if q is None else characteristic / q
    ringing = _ringing(inductance, capacitance, series, steepness(tank))
    figures: dict[str, object] = {"loss": loss_by_cause(tank), **ringing}
    if not tank.band.swept:
        figures["lossy_resonances"] = _resonances(inductance, capacitance, series)
    figures["selectivity"] = _selectivity(tank, resonance)
    if tank.band.load is not None:
        figures["load"] = _load_keys(tank, tank.band.load, resonance, names)
    return figures


def tank_bandwidth(tank: Tank, resonance: float) -> float | None:
    """Return the width of a tank between half-power points, with its load where one is stated. [Hz]"""
    loaded = loaded_tank(tank, resonance)
    q, unloaded = tank.q() if loaded is None else loaded.q, tank.q()
    if q is None or unloaded is None:
        return None
    return resonance / q / steepness(tank)


def steepness(tank: Tank) -> float:
    """Return by how much series inductance makes a tank narrower than its Q says, 1 where there is none.

    Capacitors with inductance in series grow with frequency, C/(1 - w^2 Ls C): the susceptance of the tank
    crosses zero steeper by (f/2C) dC/df, and so much longer it rings.
    """
    if tank.band.swept or not tank.network.parts:
        return 1.0
    leads, frequency, device = tank.request.stray.inductance, tank.frequency(), tank.device
    falling = tank.network.shape == LOADED  # a conductance over the angular frequency
    below, above = (
        network_capacitance(
            tank.capacitors,
            tank.network,
            frequency * (1 + step),
            leads,
            (device[0], device[1] / (1 + step) if falling else device[1]),
        )
        for step in (-STEP, STEP)
    )
    return 1.0 + (above - below) / (4 * STEP * tank.total())


def loss_by_cause(tank: Tank) -> dict[str, float | None]:
    """Return each cause's share of 1/Q, None where unknown; of the coil as a whole and its causes too."""
    losses = tank.losses()
    known = [loss for loss in losses.values() if loss is not None]
    total = math.fsum(known) if len(known) == len(losses) else None
    causes = tank.coils.loss_by_cause(tank.row, tank.index)
    if causes["former"] is not None:
        causes["former"] += tank.idle_loss()
    return {**losses, **causes, "total": total}


def loaded_tank(tank: Tank, resonance: float) -> LoadedTank | None:
    """Return the tank with its load, None where no load is stated.

    A resistance across the tank lowers its Q at once. A wanted Q or bandwidth is met by a further resistor of
    the E24 series; a load by tap, link or divider is matched to it instead.
    """
    load, q = tank.band.load, tank.q()
    if load is None:
        return None
    x = float(reactance(tank.inductance(), tank.total()))
    if tank.network.shape == LOADED:
        return _by_divider(tank, q, x)
    if q is None:
        return LoadedTank(q=None)
    wanted = load.loaded_q if load.bandwidth is None else resonance / load.bandwidth
    direct = load.connection == "across"
    before = float(loaded_q(q, x, load.resistance)) if direct and load.resistance is not None else q
    if wanted is None:
        # by tap, link or divider the ratio decides, and nothing says what it is to be
        return LoadedTank(q=before if direct else None)
    needed = float(damping_resistance(before, x, wanted))
    if direct and load.resistance is not None and abs(math.log(before / wanted)) <= NEAR_ENOUGH and not before > wanted:
        return LoadedTank(q=before)
    if not math.isfinite(needed):
        missed = f"a Q of {_words(wanted)} is wanted, but the tank has {_words(before)} already"
        return LoadedTank(q=before, note=missed + _instead(load, q, wanted))
    if load.connection == "tap" and load.resistance is not None:
        tapped = tap_for_load(tank, resonance, load.resistance, wanted)
        if tapped is not None:
            note = _fitted("tap", "at its tap", tapped.loaded_q, wanted, tapped.detuning)
            return LoadedTank(
                q=tapped.loaded_q, across=needed, tap_turns=tapped.turn, detuning=tapped.detuning, note=note
            )
    if load.connection == "link" and load.resistance is not None:
        link = link_for_load(tank, resonance, load.resistance, wanted)
        if link is not None:
            note = _fitted("link", "on its link", link.loaded_q, wanted, link.detuning)
            return LoadedTank(
                q=link.loaded_q,
                across=needed,
                link_turns=link.turns,
                coupling=link.coupling,
                detuning=link.detuning,
                note=note,
            )
    if not direct:
        return LoadedTank(q=wanted, across=needed)
    damping = float(nearest(DAMPING_SERIES, needed))
    return LoadedTank(q=float(loaded_q(before, x, damping)), damping=damping, across=needed)


def _fitted(what: str, where: str, reached: float, wanted: float, detuning: float) -> str | None:
    """Return what must be said of a load fitted by whole turns."""
    told = []
    if abs(math.log(reached / wanted)) > NEAR_ENOUGH:
        told.append(f"the nearest {what} gives a loaded Q of {_words(reached)}, {_words(wanted)} is wanted")
    if abs(detuning) > LEAST_DETUNING:
        told.append(f"the load {where} moves the tank by {100 * detuning:+.2g} %: tune it with the load on")
    return "; ".join(told) or None


def _by_divider(tank: Tank, q: float | None, x: float) -> LoadedTank:
    """Return the tank with its load on a divider, and what the load moves it by.

    Raises
    ------
    InternalError
        Its loaded Q is outside what is wanted, which no choice on offer may be.
    """
    assert tank.band.load is not None and tank.band.load.resistance is not None
    upper, lower = (tank.acting(place) for place in range(2))
    across = float(divider_load(tank.frequency(), upper, lower, tank.band.load.resistance).resistance)
    total = tank.total()
    off = network_capacitance(tank.capacitors, tank.network, tank.frequency(), 0.0, NO_DEVICE)
    moved = math.sqrt((total - tank.across() + off) / total) - 1.0
    met = load_to_meet(tank.request, tank.band)
    loaded = float(loaded_q(q or math.inf, x, across))
    least, most = q_limits(tank.band, met[1] if met else loaded)
    if not least * (1 - AGREEMENT) <= loaded <= most * (1 + AGREEMENT):
        raise InternalError(
            f"internal error: band {tank.band.name} has a loaded Q of {loaded:.9g}; please report this plan"
        )
    return LoadedTank(q=None if q is None else loaded, across=across, detuning=moved)


def _instead(load: Load, q: float, wanted: float) -> str:
    """Return what would do where a load across the tank leaves less Q than is wanted."""
    if load.connection != "across" or load.resistance is None:
        return f"; a coil of more than {_words(wanted)} would do" if q <= wanted else ""
    if q <= wanted:
        return f"; the tank alone has {_words(q)}, and more than {_words(wanted)} is needed"
    most = load.resistance * (1 / wanted - 1 / q)
    return f"; a reactance of at most {format_quantity(most, 'Ω', 3)} would do, or the load at a tap"


def _words(q: float) -> str:
    return f"{q:.0f}" if q >= 100 else f"{q:.3g}"


def load_note(figures: dict[str, object]) -> str | None:
    """Return what must be said of the load of a band, from its further keys."""
    load = figures.get("load")
    if not isinstance(load, dict):
        return None
    harmonic = load.get("harmonics_db") or {}
    told = [load["note"]] if isinstance(load.get("note"), str) else []
    if isinstance(second := harmonic.get("2"), float):
        told.append(f"the tank alone puts the second harmonic down by {second:.0f} dB: a low-pass is still needed")
    return "; ".join(told) or None


def _load_keys(tank: Tank, load: Load, resonance: float, names: tuple[str, ...]) -> dict[str, object]:
    loaded = loaded_tank(tank, resonance)
    assert loaded is not None
    q = loaded.q
    width = tank_bandwidth(tank, resonance)
    keys: dict[str, object] = {
        "loaded_q": q,
        "bandwidth_hz": width,
        "damping_resistor_ohm": loaded.damping,
        "across_ohm": loaded.across,
        "ringing_time_s": None if width is None else 1 / (math.pi * width),
        "note": loaded.note,
        "tap_turns": loaded.tap_turns,
        "link_turns": loaded.link_turns,
        "link_coupling": loaded.coupling,
        "divider": list(names[:2]) if tank.network.shape == LOADED else None,  # hot end, then across the load
        "detuning": loaded.detuning,
    }
    if "drive" in dict(tank.request.extra):
        keys["harmonics_db"] = harmonics(tank, resonance, q)
    if load.offset is not None:
        keys["offset_hz"] = load.offset
        keys["rejection_db"] = {
            "below": attenuation(tank, resonance - load.offset, resonance, q),
            "above": attenuation(tank, resonance + load.offset, resonance, q),
        }
    return keys


def _selectivity(tank: Tank, resonance: float) -> dict[str, object]:
    """Return what a tank with its load keeps out: harmonics at a fixed band, the image of a receiver."""
    loaded = loaded_tank(tank, resonance)
    q = tank.q() if loaded is None else loaded.q
    return {
        "harmonics_db": None if tank.band.swept else harmonics(tank, resonance, q),
        "image": image_rejection(tank),
    }


def _ringing(inductance: float, capacitance: float, series: float | None, steep: float) -> dict[str, object]:
    if series is None:
        return {"ringing_time_s": None, "ringing_cycles": None}
    cycles = float(ringing_cycles(inductance, capacitance, series)) * steep
    return {
        "ringing_time_s": float(ringing_time_constant(inductance, series)) * steep,
        "ringing_cycles": cycles if math.isfinite(cycles) else None,
    }


def _resonances(inductance: float, capacitance: float, series: float | None) -> dict[str, float] | None:
    if series is None:
        return None
    names = ("unity_power_factor_hz", "greatest_impedance_hz", "ringing_hz")
    return {
        name: float(value)
        for name, value in zip(names, lossy_resonances(inductance, capacitance, series), strict=True)
    }
