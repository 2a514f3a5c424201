"""How an oscillator starts, in words and in a table."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from partpick.report import html
from partpick.report.text import figure, quantity
from partpick.result import BandFigures, Candidate

HEAD = ("Band", "Circuit", "Output to common", "Control to common", "Needs", "Margin", "Limited at", "Q at worst")


def oscillator_of(band: BandFigures) -> Mapping[str, Any] | None:
    """Return the figures of a band's oscillator, None where there is none."""
    keys = band.extra.get("oscillator")
    return keys if isinstance(keys, Mapping) else None


def oscillator_in_words(band: BandFigures) -> list[str]:
    """Return what the oscillator of a band needs to start, and which part does what."""
    keys = oscillator_of(band)
    if keys is None:
        return []
    told = [f"{keys['circuit']}: starts with {quantity(keys['needed_s'], 'S', 3)}{_where(keys)}"]
    if keys["margin"] is not None:
        told.append(f"{figure(keys['margin'], 3)} times that is there")
    if keys["output_capacitor"] is not None:
        told.append(f"{keys['output_capacitor']} output to common, {keys['control_capacitor']} control to common")
    if keys["common_turns"] is not None:
        told.append(f"common terminal at turn {keys['common_turns']} from the output end")
    return told


def _where(keys: Mapping[str, Any]) -> str:
    return "" if keys["limited_at"] is None else f", the most at {_place(keys)}"


def _place(keys: Mapping[str, Any]) -> str:
    where: str = keys["limited_at"]
    return where if where == "between the ends" else f"the {where}"


def common_terminal(band: BandFigures) -> str:
    """Return where the coil of a Hartley oscillator is tapped, such as ", common at turn 4"; else nothing."""
    keys = oscillator_of(band)
    turns = None if keys is None else keys["common_turns"]
    return "" if turns is None else f", common terminal at turn {turns} from the output end"


def start_table(candidate: Candidate) -> str:
    """Return one row a band with an oscillator, nothing where there is none."""
    rows = []
    for band in candidate.bands:
        keys = oscillator_of(band)
        if keys is None:
            continue
        turns = keys["common_turns"]
        output, control = keys["output_capacitor"], keys["control_capacitor"]
        rows.append([
            band.name,
            keys["circuit"],
            output if turns is None else f"turns 1 to {turns}",
            control if turns is None else f"turns from {turns} on",
            quantity(keys["needed_s"], "S", 3),
            "" if keys["margin"] is None else figure(keys["margin"], 3),
            "" if keys["limited_at"] is None else _place(keys),
            figure(keys["q_worst"]),
        ])  # fmt: skip
    return html.table(HEAD, rows, figures=(4, 5, 7)) if rows else ""
