"""The wire of each coil: its sizes, which gauges are wound, and its loss in one layer or many."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from partpick.forms.block import Floats, Ints, Losses, stacked
from partpick.parts import Wire
from partpick.physics.loss import CopperLoss, solenoid_resistance
from partpick.physics.skin import skin_depth, wire_resistance
from partpick.physics.stranded import STRANDED_HIGHEST, layered_resistance, stranded_resistance

MANY_GAUGES = 12  # of one kind: beyond, not every one is wound in coils of many turns
GAUGE_STEP = 1.4  # between those that are; every second or third of the usual sizes; common practice, no source

ABOVE_STRANDED = "stranded wire is no better than solid above 3 MHz: Q unknown"


@dataclass(frozen=True, eq=False)
class WireColumns:
    """The wire of each coil, (J,) each; solid wire is one strand."""

    bare: Floats  # m, of a bundle without its covering
    overall: Floats  # m
    strands: Ints
    strand: Floats  # m, bare

    @staticmethod
    def of(wires: Sequence[Wire], wire: Ints) -> WireColumns:
        """Return the sizes of the wire that each coil takes."""
        return WireColumns(
            bare=np.array([w.bare_diameter for w in wires])[wire],
            overall=np.array([w.overall_diameter for w in wires])[wire],
            strands=np.array([w.strands for w in wires], dtype=np.int64)[wire],
            strand=np.array([_strand(w) for w in wires])[wire],
        )

    def take(self, rows: Ints) -> WireColumns:
        """Return the wire of some coils."""
        return WireColumns(self.bare[rows], self.overall[rows], self.strands[rows], self.strand[rows])

    @property
    def stranded(self) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
        """Which coils are of stranded wire."""
        return self.strands > 1

    def dc_resistance(self, length: Floats) -> Floats:
        """Return the direct-current resistance of so much wire, strands side by side. [ohm]"""
        return wire_resistance(length, self.strand, strands=self.strands)

    def a_over_delta(self, frequency: float) -> Floats:
        """Return the radius of wire or strand over skin depth. [-]"""
        return self.strand / 2 / float(skin_depth(frequency))

    def single_layer(
        self,
        dc: Floats,
        frequency: float,
        proximity_factor: Floats,
        pitch: Floats,
        l_over_d: Floats,
        few_turns: Floats,
    ) -> CopperLoss:
        """Return the resistance in one layer; nan for stranded wire above its range. [ohm]"""
        x = self.a_over_delta(frequency)
        solid = solenoid_resistance(dc, x, proximity_factor)
        rows = np.flatnonzero(self.stranded)
        if not len(rows):
            return solid
        skin, proximity = solid.skin.copy(), solid.proximity.copy()
        if frequency > STRANDED_HIGHEST:
            skin[rows] = proximity[rows] = np.nan
            return CopperLoss(skin, proximity)
        bundle = stranded_resistance(
            dc[rows],
            x[rows],
            self.strands[rows],
            self.strand[rows],
            self.bare[rows],
            pitch[rows],
            l_over_d[rows],
            few_turns[rows],
        )
        skin[rows], proximity[rows] = bundle.skin, bundle.proximity
        return CopperLoss(skin, proximity)

    def many_layers(self, dc: Floats, frequency: float, field: Floats) -> CopperLoss:
        """Return the resistance in layers where one ampere makes a mean field; as `single_layer`. [ohm]"""
        loss = layered_resistance(
            dc, self.a_over_delta(frequency), self.strands, self.strand, self.bare, field
        )
        if frequency <= STRANDED_HIGHEST:
            return loss
        known = np.where(self.stranded, np.nan, 1.0)
        return CopperLoss(loss.skin * known, loss.proximity * known)


def losses_of(
    frequency: Floats,
    inductance: Floats,
    copper: Sequence[CopperLoss],
    core_q: Sequence[Floats] | None = None,
    former: Floats | None = None,
) -> Losses:
    """Return losses as shares of 1/Q, (J, B), from resistance and the core's own Q at each frequency.

    Without a core or a `former` to lose anything those parts are 0.
    """
    reactance = 2 * np.pi * frequency[None, :] * inductance
    coils = len(inductance)
    core = np.zeros(reactance.shape)
    if core_q is not None:
        core = 1.0 / stacked(list(core_q), coils)
    return Losses(
        skin=stacked([loss.skin for loss in copper], coils) / reactance,
        proximity=stacked([loss.proximity for loss in copper], coils) / reactance,
        core=core,
        former=np.zeros(reactance.shape) if former is None else former,
    )


def covered(wires: Sequence[Wire]) -> list[int]:
    """Return the places of the wires whose turns may touch."""
    return [place for place, wire in enumerate(wires) if not wire.bare]


def few_gauges(wires: Sequence[Wire]) -> list[int]:
    """Return the covered wires that coils of many turns are wound with, thinnest first, solid before stranded.

    Of a kind (solid, stranded) with more than `MANY_GAUGES` gauges, those that follow one another in steps
    of `GAUGE_STEP` at least: gauges between them would give hundreds of coils that measure alike.
    """
    chosen: list[int] = []
    for stranded in (False, True):
        kind = [place for place in covered(wires) if (wires[place].strands > 1) == stranded]
        kind.sort(key=lambda place: (wires[place].overall_diameter, wires[place].name))
        if len(kind) > MANY_GAUGES:
            kind = _in_steps(wires, kind)
        chosen += kind
    return chosen


def _in_steps(wires: Sequence[Wire], kind: list[int]) -> list[int]:
    taken = [kind[0]]
    for place in kind[1:]:
        if wires[place].overall_diameter >= GAUGE_STEP * wires[taken[-1]].overall_diameter:
            taken.append(place)
    return taken


def _strand(wire: Wire) -> float:
    return wire.bare_diameter if wire.strand_diameter is None or wire.strands == 1 else wire.strand_diameter
