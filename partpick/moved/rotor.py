"""A variometer: a coil that turns inside another, in series or in parallel with it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from partpick.errors import RequestError
from partpick.forms.block import Block, Floats, Ints
from partpick.forms.copper import WireColumns
from partpick.forms.solenoid import SingleLayer
from partpick.moved.ends import Curve, End, Ends, Wound, of_coils
from partpick.physics.self_capacitance import solenoid_self_capacitance
from partpick.physics.solenoid import solenoid_families
from partpick.physics.variometer_families import family_mutual_inductance
from partpick.quantities import format_quantity
from partpick.request import Tuning

CURVE_POINTS = 181
AIR = 0.5e-3  # m between the turning coil and the inside of the former; common practice, no source


def rotor_ends(tuning: Tuning, block: Block, low: slice, high: slice, frequency: Floats) -> Ends:
    """Return the coils that the rotor turns in, with the axes at both angles.

    The rotor is wound of the stator's wire at the stator's pitch, unless the plan says its turns with as many as
    the stator has, or as turn inside it.

    Raises
    ------
    RequestError
        The rotor turns inside no former in stock.
    """
    diameter = float(str(tuning.get("rotor")))
    angles = np.array([float(str(tuning.get(key))) for key in ("from", "to")])
    rows, turns = _fitting(tuning, block, diameter)
    pair = _Pair.of(block, rows, turns, diameter, frequency)
    parallel = tuning.get("connection") == "parallel"
    mutual = pair.mutual(angles)
    single = mutual[:, 0] <= np.minimum(block.inductance_dc[rows], pair.dc)  # beyond, the dial would turn back
    ends = {}
    for place, (name, columns) in enumerate((("low", low), ("high", high))):
        wound = Wound(block, rows, columns)
        own = (pair.inductance[:, columns], pair.loss[:, columns])
        end = _joined(wound, *own, pair.self_capacitance, mutual[:, place], parallel, float(angles[place]))
        if parallel:
            end.inductance[~single] = np.nan
        ends[name] = _with_tempco(end, tuning)

    def curve(place: int) -> Curve:
        setting = np.linspace(angles[0], angles[1], CURVE_POINTS)
        shared = pair.mutual(setting, place)[0]
        first = np.full(CURVE_POINTS, block.inductance[rows[place], high][0])
        second = np.full(CURVE_POINTS, pair.inductance[place, high][0])
        whole = _whole(first, second, shared, parallel)
        own = float(block.self_capacitance[rows[place]]), float(pair.self_capacitance[place])
        return setting, whole, _capacitance(own[0], own[1], (first + shared) / whole, parallel)

    def label(place: int) -> str:
        wire = block.wires[block.wire[rows[place]]].name
        many = "1 turn" if turns[place] == 1 else f"{turns[place]} turns"
        return (
            f"rotor of {many} of {wire} at the same pitch, mean diameter {1e3 * diameter:.3g} mm, in "
            f"{'parallel' if parallel else 'series'}, {angles[0]:g} to {angles[1]:g} degrees"
        )

    return Ends(rows=rows, low=ends["low"], high=ends["high"], curve=curve, label=label)


def _fitting(tuning: Tuning, block: Block, diameter: float) -> tuple[Ints, Ints]:
    """Return the coils in whose bore the rotor turns, and its turns in each."""
    bore = block.bore
    assert bore is not None
    overall = np.array([wire.overall_diameter for wire in block.wires])[block.wire]
    with np.errstate(invalid="ignore"):
        reach = (bore - overall) / 2 - AIR  # of the middle of the rotor's wire, from the pivot
        height = np.sqrt(reach**2 - (diameter / 2) ** 2)
        most = np.where(np.isnan(height), 0, 1 + 2 * np.nan_to_num(height) / block.pitch * (1 + 1e-9)).astype(np.int64)
    stated = tuning.get("turns")
    wanted = np.full(len(most), stated, dtype=np.int64) if isinstance(stated, int) else np.minimum(block.turns, most)
    rows = np.flatnonzero((most >= 1) & (wanted <= most) & (wanted >= 1))
    if not len(rows):
        widest = float(np.nanmax(bore, initial=0.0))
        many = f" with {stated} turns" if isinstance(stated, int) else ""
        raise RequestError(
            f"tuning.rotor: read {format_quantity(diameter, 'm')}: does not turn{many} inside any former that is in "
            f"use; the widest has a bore of {format_quantity(widest, 'm', digits=2)}"
        )
    return rows, wanted[rows]


@dataclass(frozen=True, eq=False)
class _Pair:
    """The rotor in each stator."""

    block: Block
    rows: Ints
    turns: Ints
    diameter: float
    dc: Floats  # (m,) H of the rotor
    inductance: Floats  # (m, F) H of the rotor
    loss: Floats  # (m, F) 1/Q of the rotor
    self_capacitance: Floats  # (m,)

    @staticmethod
    def of(block: Block, rows: Ints, turns: Ints, diameter: float, frequency: Floats) -> _Pair:
        """Return the rotors with what they are by themselves."""
        pitch = block.pitch[rows]
        sizes = WireColumns.of(block.wires, block.wire[rows])
        mean = np.full(len(rows), diameter)
        dc = _inductances(turns, diameter, sizes.bare, pitch)
        coil = SingleLayer(turns, mean, pitch, sizes)
        inductance, losses = coil.at(frequency, dc)
        own = solenoid_self_capacitance(mean, coil.l_over_d)
        return _Pair(block, rows, turns, diameter, dc, inductance, 1.0 / losses.q, own)

    def mutual(self, angle: Floats, place: int | None = None) -> Floats:
        """Return the mutual inductance of each pair, or of one, at each angle, (m, k). [H]"""
        some = slice(None) if place is None else slice(place, place + 1)
        rows, block = self.rows[some], self.block
        return family_mutual_inductance(
            block.turns[rows],
            block.mean_diameter[rows],
            block.pitch[rows],
            self.turns[some],
            self.diameter,
            block.pitch[rows],
            angle,
        )


def _inductances(turns: Ints, diameter: float, wire: Floats, pitch: Floats) -> Floats:
    """Return the low-frequency inductance of each rotor, families summed once. [H]"""
    makes, which = np.unique(np.stack([wire, pitch], axis=1), axis=0, return_inverse=True)
    which = np.ravel(which)
    most = np.zeros(len(makes), dtype=np.int64)
    np.maximum.at(most, which, turns)
    flat = solenoid_families(most, np.full(len(makes), diameter), makes[:, 0], makes[:, 1])
    return flat[(np.cumsum(most) - most)[which] + turns - 1]


def _whole(first: Floats, second: Floats, mutual: Floats, parallel: bool) -> Floats:
    if parallel:
        return (first * second - mutual**2) / (first + second - 2.0 * mutual)
    return first + second + 2.0 * mutual


def _capacitance(stator: Floats | float, rotor: Floats | float, share: Floats, parallel: bool) -> Floats:
    """Return the self-capacitance across both coils; `share`: of the voltage that the stator bears in series. [F]"""
    if parallel:
        return np.asarray(stator + rotor + 0.0 * share)
    return np.asarray(stator * share**2 + rotor * (1.0 - share) ** 2)


def _joined(
    wound: Wound,
    rotor: Floats,
    rotor_loss: Floats,
    rotor_capacitance: Floats,
    mutual: Floats,
    parallel: bool,
    angle: float,
) -> End:
    """Return stator and rotor together with their axes at one angle.

    In parallel the current divides by a = (L_2 - M)/(L_1 + L_2 - 2 M); inductance and loss go with the squares.
    In series the voltage divides by (L_1 + M)/L, and each coil's own capacitance acts with the square.
    """
    stator = wound.at_band("inductance")
    shared = of_coils(mutual, stator)
    inductance = _whole(stator, rotor, shared, parallel)
    if parallel:
        one = (rotor - shared) / (stator + rotor - 2.0 * shared)
        two = 1.0 - one
    else:
        one = two = np.ones_like(stator)
    share = (stator + shared)[:, 0] / inductance[:, 0]
    capacitance = _capacitance(wound.of("self_capacitance"), rotor_capacitance, share, parallel)
    lost = one**2 * stator * wound.copper_loss() + two**2 * rotor * rotor_loss
    return End(
        setting=np.full(len(mutual), angle),
        inductance=inductance,
        loss=lost / inductance,
        self_capacitance=capacitance,
        coil_share=(one**2 * stator + two**2 * rotor) / inductance,
        element_share=2.0 * np.abs(one * two * shared) / inductance,
        tempco=wound.at_band("tempco"),
    )


def _with_tempco(end: End, tuning: Tuning) -> End:
    stated = tuning.get("tempco")
    if not isinstance(stated, (int, float)):
        return end
    kept = {name: getattr(end, name) for name in End.__dataclass_fields__}
    return End(**{**kept, "tempco": np.full_like(end.tempco, float(stated))})
