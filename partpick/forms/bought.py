"""Inductors as bought."""

from __future__ import annotations

import numpy as np

from partpick.forms.block import (
    BOUGHT,
    Block,
    Floats,
    Support,
    at_every,
    column,
    either_way,
    enough,
    no_losses,
    stacked,
)
from partpick.forms.screen import Screen
from partpick.parts import Catalogue, Inductor
from partpick.physics.loss import BOUGHT_Q_SPREAD, bought_q

CAPACITANCE_SPREAD = 0.30  # of a stated self-capacitance; common practice, no source


def bought_block(catalogue: Catalogue, frequency: Floats, units: int, _: Screen) -> Block:
    """Return every inductor as bought; its inductance holds at every frequency below its own resonance."""
    parts = [part for part in catalogue.inductors if enough(part.quantity, units)]
    count = len(parts)
    value = column([part.value for part in parts])
    q, q_frequency = column([part.q for part in parts]), column([part.q_frequency for part in parts])
    none = np.zeros(count)

    def label(row: int) -> str:
        return f"{parts[row].label}, bought"

    return Block(
        form="bought",
        effort_form=BOUGHT,
        eased_resonance=True,
        considered=count,
        supports=tuple(_support(part) for part in parts),
        support=np.arange(count, dtype=np.int64),
        wire=np.full(count, -1, dtype=np.int64),
        turns=np.zeros(count, dtype=np.int64),
        pitch=none,
        mean_diameter=none,
        winding_length=none,
        wire_length=none,
        inductance_dc=value,
        inductance=at_every(value, frequency),
        q=stacked([bought_q(q, q_frequency, f) for f in frequency], count),
        losses=no_losses(count, len(frequency)),
        self_capacitance=column([part.self_capacitance or 0.0 for part in parts]),
        loss_tangent=none,  # its Q is known as a whole
        spread=column([part.tolerance for part in parts]),
        q_spread=either_way(np.where(np.isfinite(q), BOUGHT_Q_SPREAD, np.nan)),
        self_capacitance_spread=either_way(
            np.array([np.nan if part.self_capacitance is None else CAPACITANCE_SPREAD for part in parts])
        ),
        tempco=at_every(column([part.tempco for part in parts]), frequency),
        tempco_spread=np.nan_to_num(column([part.tempco_tolerance for part in parts])),
        price=column([part.unit_price for part in parts]),
        volume=none,
        wire_diameter=none,
        label=label,
    )


def _support(part: Inductor) -> Support:
    notes = part.notes
    if part.self_capacitance is None:
        notes = (*notes, "self-capacitance not stated, taken as 0")
    return Support(
        name=part.label,
        quantity=part.quantity,
        source=part.source,
        notes=notes,
        adjust=part.adjust,
        current=part.current,
    )
