"""The one coil that was wound and measured: only the capacitors are picked."""

from __future__ import annotations

import numpy as np

from partpick.errors import RequestError
from partpick.forms.block import BOUGHT, Block, Floats, Support, at_every, either_way, no_losses
from partpick.quantities import format_quantity
from partpick.request import CoilRules, MeasuredDips

MEASURED_SPREAD = 0.01  # a careful bridge or dip measurement; common practice, no source


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
        considered=1,
        effort_form=BOUGHT,
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
        inductance=at_every(inductance * one, frequency),
        q=unknown,
        losses=no_losses(1, len(frequency)),
        self_capacitance=self_capacitance * one,
        loss_tangent=none,
        spread=MEASURED_SPREAD * one,
        q_spread=either_way(np.full(1, np.nan)),
        self_capacitance_spread=either_way(np.full(1, np.nan)),
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
