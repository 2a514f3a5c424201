"""A contact that moves along a single-layer coil: the turns in use set the inductance."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from partpick.errors import RequestError
from partpick.forms.block import Block, Floats, Ints
from partpick.moved.ends import Curve, End, Ends, Wound, of_coils
from partpick.request import Tuning

CURVE_POINTS = 81
_STENCIL = 4  # neighbouring whole turns between which a broken one is read


def contact_ends(tuning: Tuning, block: Block, low: slice, high: slice) -> Ends:
    """Return the coils that a contact can run on: all turns in use, and the least.

    Stranded wire has no track to run on. Covered wire has to be bared along the track.

    Raises
    ------
    RequestError
        No coil in stock has more turns than must stay in use.
    """
    least = float(str(tuning.get("least_turns")))
    continuous, shorted = tuning.get("continuous") is True, tuning.get("unused") == "shorted"
    least = least if continuous else float(math.ceil(least))
    solid = np.array([wire.strands == 1 for wire in block.wires])[block.wire]
    rows = np.flatnonzero(solid & (block.turns >= least + 1))
    if not len(rows):
        most = int(block.turns.max(initial=0))
        raise RequestError(
            f"tuning.least_turns: read {least:g}: the longest coil has {most} turns, so that no contact would move"
        )
    turns = block.turns[rows].astype(float)
    in_use = np.full(len(rows), least)
    ends = {"low": Wound(block, rows, low), "high": Wound(block, rows, high)}

    def curve(place: int) -> Curve:
        row = int(rows[place])
        most = int(block.turns[row])
        used = np.linspace(most, least, CURVE_POINTS) if continuous else np.arange(most, least - 0.5, -1.0)
        section = _section(Wound(block, np.full(len(used), row), high), used, shorted)
        return used, section.inductance[:, 0], section.self_capacitance

    how = "rides on the wire" if continuous else "steps from turn to turn"
    rest = "unused turns shorted" if shorted else "unused turns open"
    return Ends(
        rows=rows,
        low=_end(_section(ends["low"], turns, shorted), ends["low"], turns, tuning),
        high=_end(_section(ends["high"], in_use, shorted), ends["high"], in_use, tuning),
        curve=curve,
        label=lambda place: f"contact that {how}, {least:g} to {turns[place]:.0f} turns, {rest}",
    )


@dataclass(frozen=True, eq=False)
class _Section:
    """The turns in use of each coil."""

    inductance: Floats  # (m, B)
    loss: Floats  # (m, B) 1/Q without the former
    self_capacitance: Floats  # (m,)


def _section(wound: Wound, used: Floats, shorted: bool) -> _Section:
    """Return the turns from one end to the contact, the others open or shorted on themselves.

    L_s with the rest open; L_s - M^2/L_r with the rest shorted, which also brings its resistance across. The idle
    turns of an open rest swing with (L_s + M)/L_s times the voltage, and the coil's self-capacitance with them.
    """
    block, rows = wound.block, wound.rows
    whole = block.turns[rows].astype(float)
    some = whole > used
    left, part = np.where(some, np.maximum(whole - used, 1.0), 0.0), np.minimum(whole - used, 1.0)
    # less than a turn shares its part of what one whole turn does
    own_dc, rest_dc = (_at_turns(block.inductance_dc, rows, whole, turns) for turns in (whole - left, left))
    mutual = np.where(some, (block.inductance_dc[rows] - own_dc - rest_dc) / 2.0, 0.0) * part
    own = _at_turns(wound.block.inductance[:, wound.columns], rows, whole, used)
    copper = (block.losses.skin + block.losses.proximity)[:, wound.columns]
    own_loss = _at_turns(copper, rows, whole, used)
    if not shorted:
        capacitance = wound.of("self_capacitance") * (1.0 + mutual / own_dc) ** 2
        return _Section(own, own_loss, capacitance)
    ratio = np.where(some, mutual / np.where(some, rest_dc, 1.0), 0.0)[:, None]
    rest = _at_turns(block.inductance[:, wound.columns], rows, whole, np.maximum(left, 1.0))
    rest_loss = _at_turns(copper, rows, whole, np.maximum(left, 1.0))
    inductance = own - ratio * mutual[:, None]
    lost = own * own_loss + np.where(ratio > 0, ratio**2 * rest * rest_loss, 0.0)
    return _Section(inductance, lost / inductance, _at_turns(block.self_capacitance, rows, whole, used))


def _at_turns(values: Floats, rows: Ints, whole: Floats, turns: Floats) -> Floats:
    """Return a figure of a coil of the same make with other turns, 1 at least; 0 for none.

    Coils of one make follow each other by turns. Between whole turns a cubic of the logarithms is taken: of the
    inductance within 0.005 % of a spline through all turns, from three turns on.
    """
    asked = np.maximum(turns, 1.0)
    below = np.floor(asked)
    found = values[rows - (whole - below).astype(np.int64)].astype(float)
    for points, some in ((_STENCIL, whole >= _STENCIL), (2, whole < _STENCIL)):
        between = np.flatnonzero(some & (asked > below))
        if len(between):
            found[between] = _between(values, rows[between], whole[between], asked[between], points)
    found[turns <= 0] = 0.0
    return found


def _between(values: Floats, rows: Ints, whole: Floats, turns: Floats, points: int) -> Floats:
    """Return a figure at broken turns from coils of so many neighbouring whole turns (Lagrange)."""
    least = np.clip(np.floor(turns) - (points // 2 - 1), 1.0, whole - points + 1)
    total = np.zeros((len(rows), *values.shape[1:]))
    for one in range(points):
        weight = np.ones(len(rows))
        for other in range(points):
            if other != one:
                weight *= np.log(turns / (least + other)) / np.log((least + one) / (least + other))
        figure = values[rows - (whole - least - one).astype(np.int64)]
        total += weight.reshape((-1,) + (1,) * (values.ndim - 1)) * np.log(figure)
    return np.asarray(np.exp(total))


def _end(section: _Section, wound: Wound, turns: Floats, tuning: Tuning) -> End:
    ones = np.ones_like(section.inductance)
    stated = tuning.get("tempco")
    own = wound.at_band("tempco")
    return End(
        setting=turns,
        inductance=section.inductance,
        loss=section.loss,
        self_capacitance=section.self_capacitance,
        coil_share=ones,
        element_share=ones,
        tempco=of_coils(np.full(len(turns), float(stated)), own) if isinstance(stated, (int, float)) else own,
    )
