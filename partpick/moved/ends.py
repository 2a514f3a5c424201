"""What every element that moves inductance hands over: its coils at both ends of the travel, as arrays."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from partpick.forms.block import Block, Floats, Ints

Curve = tuple[Floats, Floats, Floats]  # settings, inductances, self-capacitances


@dataclass(frozen=True, kw_only=True, eq=False)
class End:
    """m coils with the element at one end of its travel, at B frequencies."""

    setting: Floats  # (m,) mm, turns or degrees
    inductance: Floats  # (m, B) H, nan: not to be combined after all
    loss: Floats  # (m, B) 1/Q without that of the former, nan: unknown
    self_capacitance: Floats  # (m,) F across what is in circuit
    coil_share: Floats  # (m, B) d ln L / d ln of the coil as wound
    element_share: Floats  # (m, B) d ln L / d ln of what the element has a tolerance of
    tempco: Floats  # (m, B) 1/K, nan: unknown


@dataclass(frozen=True, kw_only=True, eq=False)
class Ends:
    """The coils of a block that an element can be combined with, (m,) of them."""

    rows: Ints  # (m,) of the block
    low: End  # where the inductance is most: the low end of a band
    high: End
    curve: Callable[[int], Curve] = field(repr=False)  # of one of the m: from the low end's setting to the high end's
    label: Callable[[int], str] = field(repr=False)  # the element on one of the m, in words


@dataclass(frozen=True, eq=False)
class Wound:
    """Some coils of a block at the frequencies of one end of the bands."""

    block: Block
    rows: Ints  # (m,)
    columns: slice  # of the frequencies that the block was evaluated at

    def of(self, name: str) -> Floats:
        """Return figures of each coil, (m,)."""
        values: Floats = getattr(self.block, name)[self.rows]
        return values

    def copper_loss(self, rows: Ints | None = None) -> Floats:
        """Return 1/Q of each coil without that of its former, at each frequency, (m, B)."""
        losses, which = self.block.losses, self.rows if rows is None else rows
        return (losses.skin + losses.proximity + losses.core)[which][:, self.columns]

    def at_band(self, name: str, rows: Ints | None = None) -> Floats:
        """Return figures of each coil, or of others of the block, at each frequency, (m, B)."""
        values: Floats = getattr(self.block, name)[self.rows if rows is None else rows][:, self.columns]
        return values


def of_coils(values: Floats, like: Floats) -> Floats:
    """Return (m,) figures as (m, B)."""
    return np.broadcast_to(values[:, None], like.shape)
