"""Start-up of one band as picked: the transconductance that it needs, the margin left, and what limits it."""

from __future__ import annotations

import math
from dataclasses import dataclass

from partpick.circuit import Tank
from partpick.errors import InternalError
from partpick.oscillating import load_conductance, oscillator_keys, tap_shares, wanted_q
from partpick.physics.oscillator import Characteristic, clapp, colpitts, hartley, threshold
from partpick.search.divided import CLAPPED, SPLIT

SETTINGS = (0.0, 0.25, 0.5, 0.75, 1.0)  # of the tuning element, from its high to its low end in equal ratios
AGREEMENT = 1e-6  # of the transconductance, between search and recheck


@dataclass(frozen=True, kw_only=True)
class StartUp:
    """What one setting of a band needs."""

    frequency: float  # Hz, of the oscillation that neither grows nor dies
    needed: float  # S
    q: float  # at worst, load included
    inductance: float  # H
    resistance: float  # ohm, all loss in series with the coil
    capacitance: float  # F, in circuit


def oscillator_figures(tank: Tank, names: tuple[str, ...]) -> dict[str, object]:
    """Return the further key `oscillator` of a band, nothing where none is asked for.

    Parameters
    ----------
    tank : Tank
        The band as picked.
    names : tuple of str
        References of its capacitors, in the order of its pieces.

    Raises
    ------
    InternalError
        It does not start, which no choice on offer may do.
    """
    keys = oscillator_keys(tank.request)
    if keys is None:
        return {}
    found = start_up(tank)
    worst = max(found, key=lambda each: each.needed)
    allowed = keys["transconductance"] / keys["margin"]
    if not worst.needed <= allowed * (1 + AGREEMENT):
        raise InternalError(
            f"internal error: band {tank.band.name} needs {worst.needed:.9g} S, {allowed:.9g} S are allowed; "
            "please report this plan"
        )
    divider = tank.network.divider
    output, control = (names[place] for place in divider) if divider else (None, None)
    return {
        "oscillator": {
            "circuit": keys["circuit"],
            "transconductance_s": keys["transconductance"],
            "needed_s": worst.needed,
            "margin": keys["transconductance"] / worst.needed if worst.needed > 0 else None,
            "margin_wanted": keys["margin"],
            "limited_at": _place(found, worst) if tank.band.swept else None,
            "frequency_hz": worst.frequency,
            "q_worst": worst.q,
            "output_capacitor": output,
            "control_capacitor": control,
            "series_capacitor": _in_series(tank, names),
            "output_capacitance_f": keys["output_capacitance"],
            "input_capacitance_f": keys["input_capacitance"],
            "common_turns": tank.common_turns,
            "settings": [
                {
                    "frequency_hz": each.frequency,
                    "needed_s": each.needed,
                    "q_worst": each.q,
                    "inductance_h": each.inductance,
                    "resistance_ohm": each.resistance,
                    "capacitance_f": each.capacitance,
                }
                for each in found
            ],
        }
    }


def _in_series(tank: Tank, names: tuple[str, ...]) -> str | None:
    """Return the reference of what is in series with the coil of a Clapp oscillator."""
    if tank.network.shape == SPLIT:
        return "T"
    return names[0] if tank.network.shape == CLAPPED else None


def _place(found: list[StartUp], worst: StartUp) -> str:
    if worst is found[0]:
        return "low end"
    return "high end" if worst is found[-1] else "between the ends"


def start_up(tank: Tank) -> list[StartUp]:
    """Return what each setting of a band needs, losses at their worst: one of a fixed band, else low end first."""
    return [_at(tank, setting) for setting in (SETTINGS if tank.band.swept else (1.0,))]


def _at(tank: Tank, setting: float) -> StartUp:
    inductance = _between(tank.inductance(low_end=True), tank.inductance(), setting)
    element = tank.element()
    own = 0.0 if element is None else _between(element.high, element.low, setting)
    halves = _halves(tank, setting)
    tuned = _tuned(tank, own, halves, setting)
    across = _across(tank, setting)
    total = across + tuned + tank.strays + tank.trimmer
    loss = _coil_loss(tank, setting) + _further_loss(tank, setting)
    loss += math.sqrt(inductance / total) * load_conductance(tank.band.load)
    if wanted := wanted_q(tank.band.load, tank.band.lowest):
        loss = max(loss, 1.0 / wanted)
    resistance = math.sqrt(inductance / total) * loss
    series = own if tank.network.shape == SPLIT else _first(tank, setting)
    circuit = _characteristic(tank, inductance, resistance, total, halves, series)
    found = threshold(circuit)
    return StartUp(
        frequency=float(found.frequency),
        needed=float(found.transconductance),
        q=1.0 / loss,
        inductance=inductance,
        resistance=resistance,
        capacitance=total,
    )


def _characteristic(
    tank: Tank,
    inductance: float,
    resistance: float,
    total: float,
    halves: tuple[float, float] | None,
    series: float,
) -> Characteristic:
    keys, turns = oscillator_keys(tank.request), tank.common_turns
    assert keys is not None
    if halves is None:
        assert turns is not None
        output, control, mutual = (
            float(share) * inductance for share in tap_shares(tank.coils, tank.coil, turns)
        )
        share = turns / float(tank.coils.turns[tank.coil])
        whole = total - tank.device_across
        device = keys["output_capacitance"], keys["input_capacitance"]
        return hartley(
            output, control, mutual, resistance * share, resistance * (1 - share), whole, *device
        )
    if keys["circuit"] == "colpitts":
        beside = total - 1.0 / (1.0 / halves[0] + 1.0 / halves[1])
        return colpitts(inductance, resistance, *halves, max(beside, 0.0))
    beside = total - 1.0 / (1.0 / series + 1.0 / halves[0] + 1.0 / halves[1])
    return clapp(inductance, resistance, series, *halves, coil_capacitance=max(beside, 0.0))


def _between(low_end: float, high_end: float, setting: float) -> float:
    """Return what lies between two ends in ratios."""
    if low_end == high_end or low_end <= 0.0:
        return low_end
    return low_end * (high_end / low_end) ** setting


def _halves(tank: Tank, setting: float) -> tuple[float, float] | None:
    if tank.network.divider is None:
        return None
    ends = zip(tank.halves(low_end=True), tank.halves(), tank.device, strict=True)
    own = [_between(low - device, high - device, setting) + device for low, high, device in ends]
    return own[0], own[1]


def _first(tank: Tank, setting: float) -> float:
    """Return how a band's first capacitor acts, alone. [F]"""
    if not tank.network.parts:
        return math.inf
    return _between(tank.acting(0, low_end=True), tank.acting(0), setting)


def _across(tank: Tank, setting: float) -> float:
    return _between(tank.across(low_end=True), tank.across(), setting)


def _tuned(tank: Tank, own: float, halves: tuple[float, float] | None, setting: float) -> float:
    """Return the tuning element behind what is in series with it. [F]"""
    if own == 0.0:
        return 0.0
    if tank.network.shape == SPLIT:
        assert halves is not None
        return 1.0 / (1.0 / own + 1.0 / halves[0] + 1.0 / halves[1])
    if tank.network.series is None:
        return own
    place = len(tank.network.parts)
    padder = _between(tank.acting(place, low_end=True), tank.acting(place), setting)
    return 1.0 / (1.0 / own + 1.0 / padder)


def _coil_loss(tank: Tank, setting: float) -> float:
    """Return 1/Q of the coil at the low side of its spread. [-]"""
    spread = float(tank.coils.q_spread[tank.coil, 0])
    left = 1.0 if math.isnan(spread) else 1.0 - spread
    low, high = tank.coil_q(low_end=True), tank.coil_q()
    assert low is not None and high is not None, "a coil of unknown Q is not on offer"
    return _between(1.0 / (low * left), 1.0 / (high * left), setting)


def _further_loss(tank: Tank, setting: float) -> float:
    """Return 1/Q of all but the coil. [-]"""
    ends = []
    for low_end in (True, False):
        losses = tank.losses(low_end=low_end)
        ends.append(math.fsum(loss for cause, loss in losses.items() if cause != "coil" and loss is not None))
        assert None not in losses.values(), "a part of unknown Q is not on offer"
    return (1 - setting) * ends[0] + setting * ends[1]
