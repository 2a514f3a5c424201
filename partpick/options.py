"""The options that stand for keys of a plan: their names, and the tables that they fill."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, TypeVar

import click

Command = TypeVar("Command", bound=Callable[..., Any])


@dataclass(frozen=True)
class PlanOption:
    """One option, the path of its key, and how it is shown in the help."""

    flag: str
    path: str
    metavar: str
    help: str
    several: bool = False  # a comma-separated list

    @property
    def name(self) -> str:
        """Name of the command's argument that click fills."""
        return "key_" + self.path.replace(".", "__")


COIL_OPTIONS = (
    PlanOption("--forms", "coil.forms", "LIST", 'Kinds of coil, such as "solenoid,ring core".', True),
    PlanOption("--inductance", "coil.inductance", "LOW,HIGH", "Inductance, such as 2uH,6uH.", True),
    PlanOption("--reactance", "coil.reactance", "LOW,HIGH", "Reactance at resonance.", True),
    PlanOption("--measured", "coil.measured", "L", "Inductance of a coil that is already wound."),
    PlanOption("--self-capacitance", "coil.self_capacitance", "C", "Of the measured coil."),
    PlanOption("--self-resonance", "coil.self_resonance", "TIMES", "At least so many times the frequency."),
    PlanOption("--proportions", "coil.proportions", "LOW,HIGH", "Winding length to diameter.", True),
)
PAIR_OPTIONS = (
    PlanOption("--parts", "limits.parts_per_band", "N", "Capacitors, at most (2)."),
    PlanOption("--error", "limits.error", "SHARE", "Error of the frequency, at most (0.5 %)."),
    PlanOption("--values", "limits.values", "N", "Different capacitances, at most."),
    PlanOption("--q", "limits.q", "Q", "Unloaded Q, at least."),
    PlanOption("--drift", "limits.drift", "PPM", "Drift per kelvin with spread, such as 30ppm."),
    PlanOption("--price", "limits.price", "SUM", "Price, at most."),
    PlanOption("--excess", "limits.excess", "SHARE", "Of a tuned range: overshoot, at most."),
    PlanOption("--margin", "limits.margin", "SHARE", "Of a tuned range: beyond each end (3 %)."),
    *COIL_OPTIONS,
    PlanOption("--series", "capacitors.series", "NAME", "E3 to E192: values in play (E24)."),
    PlanOption("--from", "capacitors.from", "C", "Smallest capacitor."),
    PlanOption("--to", "capacitors.to", "C", "Largest capacitor."),
    PlanOption("--grades", "capacitors.grades", "LIST", "Grades, such as C0G,mica.", True),
    PlanOption("--connect", "capacitors.connect", "HOW", "parallel, or any: series and mixed too."),
    PlanOption("--stray", "stray.capacitance", "C", "Wiring, switch and device (5 pF)."),
    PlanOption("--stray-share", "stray.share", "SHARE", "Strays of all capacitance, at most (20 %)."),
    PlanOption("--stray-tempco", "stray.tempco", "PPM", "Of the strays, per kelvin (100 ppm)."),
    PlanOption("--trimmer", "trimmer", "LOW..HIGH", "A trimmer, such as 3pF..20pF; choose: one of those in stock."),
    PlanOption("--tuning", "tuning", "KIND:LOW..HIGH", 'Such as "variable capacitor:12pF..150pF".'),
    PlanOption("--load", "load.resistance", "R", "Resistance across the tank."),
    PlanOption("--loaded-q", "load.loaded_q", "Q", "Q wanted with the load."),
    PlanOption("--oscillator", "oscillator.circuit", "CIRCUIT", "colpitts, clapp or hartley: it must start."),
    PlanOption("--transconductance", "oscillator.transconductance", "GM", "Of its device, such as 5mS."),
    PlanOption("--start-margin", "oscillator.margin", "TIMES", "Over the least that lets it start (3)."),
    PlanOption("--input-capacitance", "oscillator.input_capacitance", "C", "Of the device, control to common."),
    PlanOption("--output-capacitance", "oscillator.output_capacitance", "C", "Of the device, output to common."),
)


def plan_options(options: tuple[PlanOption, ...]) -> Callable[[Command], Command]:
    """Return a decorator that adds the options to a command, first one first in its help."""

    def decorate(command: Command) -> Command:
        for option in reversed(options):
            add = click.option(option.flag, option.name, metavar=option.metavar, help=option.help)
            command = add(command)
        return command

    return decorate


def tables_of(options: tuple[PlanOption, ...], given: Mapping[str, str | None]) -> dict[str, Any]:
    """Return the tables of a plan that the given options state; absent options are absent keys."""
    tables: dict[str, Any] = {}
    for option in options:
        text = given.get(option.name)
        if text is None:
            continue
        table, _, key = option.path.partition(".")
        value = text.split(",") if option.several and "," in text else text
        if key:
            tables.setdefault(table, {})[key] = value
        else:
            tables[table] = value
    return tables


def band_of(frequency: str) -> dict[str, str]:
    """Return the band of `pair`: one frequency, or a range with two points between its ends."""
    low, points, high = frequency.partition("..")
    return {"from": low.strip(), "to": high.strip()} if points else {"at": frequency}


def option_name(path: str) -> str:
    """Return what was typed for the key of a plan at `path`, for a message."""
    flags = {option.path: option.flag for option in PAIR_OPTIONS}
    if path.startswith("band"):
        return "FREQUENCY"
    if path in flags:
        return flags[path]
    table, _, key = path.partition(".")
    return f"{flags[table]} {key}" if table in flags else path
