"""An element that moves inductance on every coil of a catalogue: the coils' figures at both ends of swept bands."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from partpick.errors import RequestError
from partpick.forms.block import Block, Floats
from partpick.moved.contact import contact_ends
from partpick.moved.core import core_ends
from partpick.moved.ends import Curve, End, Ends
from partpick.moved.rotor import rotor_ends
from partpick.physics.loss import dielectric_loss
from partpick.request import Tuning

FORM = "solenoid"  # the one form that these elements go with


@dataclass(frozen=True, kw_only=True, eq=False)
class MovedCoils:
    """What an element makes of J coils at B bands; everything is of swept bands only."""

    swept: NDArray[np.bool_]  # (B,)
    able: NDArray[np.bool_]  # (J,) can be combined with the element
    own_low: Floats  # (J, B) F, added to the coil's own self-capacitance at the low end
    own_high: Floats  # (J, B) F
    share_low: Floats  # (J, B) d ln L / d ln of the coil as wound
    share_high: Floats
    element_share_low: Floats  # (J, B) d ln L / d ln of what the element has a tolerance of
    element_share_high: Floats
    ends: Ends
    first: int  # coil of the first row of the block

    def place(self, coil: int) -> int:
        """Return the place of a coil among those of the element."""
        return int(np.searchsorted(self.ends.rows, coil - self.first))

    def setting(self, coil: int, *, low_end: bool) -> float:
        """Return where the element stands at an end: mm, turns or degrees."""
        end = self.ends.low if low_end else self.ends.high
        return float(end.setting[self.place(coil)])

    def curve(self, coil: int) -> Curve:
        """Return settings and inductances of one coil, from the low end's setting to the high end's."""
        return self.ends.curve(self.place(coil))

    def label(self, coil: int) -> str:
        """Return the element on one coil, in words."""
        return self.ends.label(self.place(coil))


@dataclass(frozen=True, kw_only=True, eq=False)
class PlainCoils:
    """The figures of J coils as wound that an element changes, (J, B) each."""

    inductance: Floats
    inductance_low: Floats
    q: Floats
    q_low: Floats
    tempco: Floats
    self_capacitance: Floats  # (J,)


def moved_coils(
    tuning: Tuning, blocks: Sequence[Block], plain: PlainCoils, frequency: Floats, swept: NDArray[np.bool_]
) -> tuple[PlainCoils, MovedCoils]:
    """Return the coils' figures with the element at the ends of swept bands, and what else it changes.

    Parameters
    ----------
    tuning : Tuning
        A sliding core, a moving contact or a variometer.
    blocks : sequence of Block
        Every coil in use, evaluated at the upper ends of the bands and then at the lower ends.
    plain : PlainCoils
        Their figures as wound. At a fixed band a coil is taken so: core drawn out, contact at its end, rotor off.
    frequency : (2 B,) array
        Of the ends. [Hz]
    swept : (B,) array
        Which bands are swept.

    Raises
    ------
    RequestError
        No coil goes with the element.
    """
    first = 0
    for block in blocks:
        if block.form == FORM:
            break
        first += len(block)
    else:
        raise RequestError(
            f"tuning.kind: a {tuning.kind} goes with single-layer coils, and none is in use; "
            f'coil.forms has to have "{FORM}"'
        )
    bands = len(swept)
    high, low = slice(0, bands), slice(bands, 2 * bands)
    if tuning.kind == "sliding core":
        ends = core_ends(tuning, block, low, high)
    elif tuning.kind == "moving contact":
        ends = contact_ends(tuning, block, low, high)
    else:
        ends = rotor_ends(tuning, block, low, high, frequency)
    coils = _Scatter(ends, first, swept)
    able = np.zeros(len(plain.self_capacitance), dtype=np.bool_)
    sound = np.all(np.isfinite(ends.low.inductance) & np.isfinite(ends.high.inductance), axis=1)
    able[first + ends.rows[sound]] = True
    tuned = PlainCoils(
        inductance=coils.into(plain.inductance, ends.high.inductance),
        inductance_low=coils.into(plain.inductance_low, ends.low.inductance),
        q=coils.into(plain.q, coils.q(block, ends.high, frequency[high])),
        q_low=coils.into(plain.q_low, coils.q(block, ends.low, frequency[low])),
        tempco=coils.into(plain.tempco, ends.high.tempco),
        self_capacitance=plain.self_capacitance,
    )
    nothing, one = np.zeros(plain.inductance.shape), np.ones(plain.inductance.shape)
    own = plain.self_capacitance[first + ends.rows]
    return tuned, MovedCoils(
        swept=swept,
        able=able,
        own_low=coils.into(nothing, _further(ends.low, own)),
        own_high=coils.into(nothing, _further(ends.high, own)),
        share_low=coils.into(one, ends.low.coil_share),
        share_high=coils.into(one, ends.high.coil_share),
        element_share_low=coils.into(nothing, ends.low.element_share),
        element_share_high=coils.into(nothing, ends.high.element_share),
        ends=ends,
        first=first,
    )


def _further(end: End, own: Floats) -> Floats:
    return np.broadcast_to((end.self_capacitance - own)[:, None], end.inductance.shape)


@dataclass(frozen=True, eq=False)
class _Scatter:
    """Puts figures of the element's coils among those of all coils, at swept bands."""

    ends: Ends
    first: int
    swept: NDArray[np.bool_]

    def q(self, block: Block, end: End, frequency: Floats) -> Floats:
        """Return Q with what the coil's own field loses in its former, (m, B)."""
        tangent = block.loss_tangent[self.ends.rows][:, None]
        former = dielectric_loss(end.inductance, end.self_capacitance[:, None], frequency[None, :], tangent)
        return np.asarray(1.0 / (end.loss + former))

    def into(self, plain: Floats, tuned: Floats) -> Floats:
        result = plain.copy()
        rows = self.first + self.ends.rows
        here = result[rows]
        here[:, self.swept] = np.where(np.isnan(tuned), here, tuned)[:, self.swept]
        result[rows] = here
        return result
