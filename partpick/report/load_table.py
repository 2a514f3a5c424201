"""How the load of each band is to be joined to its tank, and what is left of it, as rows for a sheet."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from partpick.physics.loading import efficiency
from partpick.quantities import format_percent, format_quantity
from partpick.report import html
from partpick.report.text import figure
from partpick.request import Load, Request
from partpick.result import BandFigures, Candidate

OHM = "\u03a9"
HEAD = ("Band", "Load", "Looks like", "How", "Loaded Q", "To the load")
_BEGIN = (
    "Turns are for a winding whose turns are all coupled closely. Begin there and adjust until the bandwidth is right."
)


def load_table(request: Request, candidate: Candidate) -> str:
    """Return one row a band with a load, nothing where there is none."""
    loads = {asked.name: asked.load or request.load for asked in request.bands}
    rows = []
    for band in candidate.bands:
        keys, load = band.extra.get("load"), loads.get(band.name)
        if not isinstance(keys, Mapping) or load is None:
            continue
        across = keys.get("across_ohm")
        rows.append([
            band.name,
            "" if load.resistance is None else format_quantity(load.resistance, OHM),
            "" if across is None or load.connection == "across" else format_quantity(across, OHM, 3),
            joined(load, across, band, candidate),
            figure(keys.get("loaded_q")),
            _efficiency(load, keys, band),
        ])  # fmt: skip
    if not rows:
        return ""
    turns = any(load is not None and load.connection in ("tap", "link") for load in loads.values())
    return html.table(HEAD, rows, figures=(1, 2, 4, 5)) + (html.paragraph(_BEGIN, class_="soft") if turns else "")


def joined(load: Load, across: float | None, band: BandFigures, candidate: Candidate) -> str:
    """Return how a load is joined so that it looks like a resistance across the tank.

    A part n of the turns, or of the voltage, makes a load R look like R/n^2 (ideal transformer).
    """
    if load.connection == "across":
        return "across the tank"
    if load.resistance is None or across is None or load.resistance > across:
        return load.connection
    share = math.sqrt(load.resistance / across)
    coil = next(coil for coil in candidate.coils if coil.reference == band.coil)
    turns = band.tap_turns or coil.turns
    if load.connection == "divider":
        return f"divider, the capacitor across the load {figure((1 - share) / share)} times the other"
    if turns is None:
        return f"{load.connection}, {figure(share)} of the turns"
    if load.connection == "tap":
        return f"tap at turn {_whole(share * turns)} from the earthed end"
    return f"link over the earthed end, turns: {_whole(share * turns)}"


def _whole(turns: float) -> str:
    """Return a number of turns as it can be wound, with what was computed."""
    return f"{max(1, round(turns))} (computed {figure(turns, 2)})"


def _efficiency(load: Load, keys: Mapping[str, Any], band: BandFigures) -> str:
    """Return the share of the power that reaches the load: nothing where a resistor damps the tank besides."""
    loaded = keys.get("loaded_q")
    if load.resistance is None or keys.get("damping_resistor_ohm") is not None or not loaded or not band.q:
        return ""
    return "" if loaded >= band.q else format_percent(float(efficiency(band.q, loaded)), 2)
