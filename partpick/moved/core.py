"""A magnetic rod that slides in a tube: how far it is pushed in sets the inductance."""

from __future__ import annotations

import numpy as np

from partpick.errors import RequestError
from partpick.forms.block import Block, Floats
from partpick.moved.ends import Curve, End, Ends, Wound, of_coils
from partpick.physics.core_tables import inductance_rises
from partpick.physics.sliding_core import core_offset
from partpick.quantities import format_quantity
from partpick.request import Tuning
from partpick.tuning import CORE_Q

CURVE_POINTS = 81


def core_ends(tuning: Tuning, block: Block, low: slice, high: slice) -> Ends:
    """Return the coils that the rod goes into, with the rod just outside and pushed in.

    Pushed in means by the travel, at most until it is centred: beyond, the inductance falls again.

    Raises
    ------
    RequestError
        The rod goes into no former in stock.
    """
    diameter, length, permeability, travel = (
        float(str(tuning.get(key))) for key in ("diameter", "length", "permeability", "travel")
    )
    bore = block.bore
    assert bore is not None
    rows = np.flatnonzero(bore >= diameter * (1 - 1e-9))
    if not len(rows):
        widest = float(np.nanmax(bore, initial=0.0))
        raise RequestError(
            f"tuning.diameter: read {format_quantity(diameter, 'm')}: goes into no former that is in use; "
            f"the widest takes {format_quantity(widest, 'm', digits=2)}"
        )
    stated_q = tuning.get("q")
    rod = _Rod(
        diameter=diameter,
        length=length,
        permeability=permeability,
        q=float(stated_q) if isinstance(stated_q, (int, float)) else CORE_Q,
        tempco=_or_nan(tuning.get("tempco")),
    )
    coil_length = block.winding_length[rows]
    pushed = np.minimum(travel, (coil_length + length) / 2)
    ends = {}
    for name, inserted, columns in (("low", pushed, low), ("high", np.zeros(len(rows)), high)):
        wound = Wound(block, rows, columns)
        ends[name] = rod.at(wound, inserted)

    def curve(place: int) -> Curve:
        inserted = np.linspace(float(pushed[place]), 0.0, CURVE_POINTS)
        one = np.full(CURVE_POINTS, rows[place])
        rise = rod.rise(Wound(block, one, high), inserted)
        own = np.full(CURVE_POINTS, block.self_capacitance[rows[place]])
        return inserted * 1e3, block.inductance[rows[place], high][0] + rise, own

    words = f"core of {format_quantity(diameter, 'm')} by {format_quantity(length, 'm')}, permeability {permeability:g}"
    return Ends(
        rows=rows,
        low=ends["low"],
        high=ends["high"],
        curve=curve,
        label=lambda place: f"{words}, pushed in by 0 to {1e3 * pushed[place]:.3g} mm",
    )


def _or_nan(value: object) -> float:
    return float(value) if isinstance(value, (int, float)) else float("nan")


class _Rod:
    """One rod."""

    def __init__(self, *, diameter: float, length: float, permeability: float, q: float, tempco: float) -> None:
        self.diameter = diameter
        self.length = length
        self.permeability = permeability
        self.q = q
        self.tempco = tempco

    def rise(self, wound: Wound, inserted: Floats) -> Floats:
        """Return what the rod adds to each coil, (m,). [H]"""
        length = wound.of("winding_length")
        return inductance_rises(
            self.diameter,
            self.length,
            self.permeability,
            wound.of("turns"),
            wound.of("mean_diameter"),
            length,
            core_offset(inserted, length, self.length),
        )

    def at(self, wound: Wound, inserted: Floats) -> End:
        """Return every coil with the rod pushed in so far.

        The copper loses what it does without a rod; the rod loses its share of the inductance over its own Q.
        """
        empty = wound.at_band("inductance")
        rise = of_coils(self.rise(wound, inserted), empty)
        inductance = empty + rise
        coil_share, core_share = empty / inductance, rise / inductance
        tempco = coil_share * wound.at_band("tempco") + core_share * self.tempco
        return End(
            setting=inserted * 1e3,
            inductance=inductance,
            loss=coil_share * wound.copper_loss() + core_share / self.q,
            self_capacitance=wound.of("self_capacitance"),
            coil_share=coil_share,
            element_share=core_share,
            tempco=tempco,
        )
