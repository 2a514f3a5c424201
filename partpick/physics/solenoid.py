"""Single-layer coils summed turn by turn, and what radio frequency leaves of their inductance.

Coils of one family share wire, diameter and pitch and differ in turns alone: two cumulative sums over the
mutual inductances of rings give all of them at once. `sheet.py` has the closed form.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.filaments import loop_inductance, mutual_inductance
from partpick.physics.skin import MU_0
from partpick.physics.special import bessel_quotients, distinct_values

FloatArray = NDArray[np.float64]

_ASYMPTOTIC_ABOVE: Final = 1000.0  # radius / skin depth from which 1 - 1/x is right to 1e-9

TABLE_STEP: Final = 0.1  # largest step of d/s in the table of proximity, which is read along straight lines


def solenoid_family(max_turns: int, diameter: float, wire_diameter: float, pitch: float) -> FloatArray:
    """Return the low-frequency inductance of a single-layer coil of 1, 2, ... turns.

    Parameters
    ----------
    max_turns : int
        Most turns, at least 0. [-]
    diameter : float
        Mean diameter, centre of wire to centre of wire. [m]
    wire_diameter : float
        Bare wire diameter. [m]
    pitch : float
        Distance of neighbouring turns, at least the wire diameter. [m]

    Returns
    -------
    inductance : (max_turns,) array
        Inductance of 1 ... `max_turns` turns. [H]

    Notes
    -----
    As `solenoid_families`.
    Its range and accuracy are the same.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (summation over coaxial rings);
    tests/published/solenoid_round_wire.csv.
    """
    return solenoid_families([max_turns], [diameter], [wire_diameter], [pitch])


def solenoid_families(
    max_turns: ArrayLike, diameter: ArrayLike, wire_diameter: ArrayLike, pitch: ArrayLike
) -> FloatArray:
    """Return the low-frequency inductances of many families of single-layer coils, end to end.

    Parameters
    ----------
    max_turns : (f,) array of int
        Most turns of each family, at least 0; the sizes broadcast with it. [-]
    diameter : (f,) array
        Mean diameter, centre of wire to centre of wire. [m]
    wire_diameter : (f,) array
        Bare wire diameter. [m]
    pitch : (f,) array
        Distance of neighbouring turns, at least the wire diameter. [m]

    Returns
    -------
    inductance : (sum of max_turns,) array
        Inductances of 1 ... max_turns[0] turns of the first family, then those of the second, ... [H]

    Notes
    -----
    L(N) = N L_1 + 2 sum (N - m) M_m, with M_m of two rings m pitches apart and L_1 of one round turn. A
    figure does not depend, to the last bit, on the other families computed with it. Five turns and more, ten wires
    wide and more, read up to 0.4 % above a true helix (see `spread.solenoid_model_spread`); leads are not counted.

    References
    ----------
    E. B. Rosa and F. W. Grover, Bull. Bur. Stand. 8 (1912) 1-237 (summation over coaxial rings);
    tests/published/solenoid_round_wire.csv.
    """
    most, *sizes = np.broadcast_arrays(np.asarray(max_turns, np.intp), diameter, wire_diameter, pitch)
    wide, wire, spacing = (np.asarray(size, float) for size in sizes)
    ends = np.cumsum(most)
    starts = ends - most
    apart = np.arange(int(most.sum())) - np.repeat(starts, most)
    # Twice the mutual inductance of two turns `apart` pitches from each other, or one turn's own inductance.
    step = np.empty(len(apart))
    other = apart > 0
    radius = np.repeat(wide / 2.0, most)[other]
    step[other] = 2.0 * mutual_inductance(radius, radius, (apart * np.repeat(spacing, most))[other])
    step[starts[most > 0]] = loop_inductance(wide, wire)[most > 0]
    # Turn N + 1 adds its own inductance and twice its mutual ones; sums stay inside a family, so that no
    # figure carries the rounding of its neighbours.
    for start, end in zip(starts.tolist(), ends.tolist(), strict=True):
        piece = step[start:end]
        np.add.accumulate(np.add.accumulate(piece), out=piece)
    return step


def high_frequency_inductance(
    dc_inductance: ArrayLike,
    turns: ArrayLike,
    diameter: ArrayLike,
    proximity_factor: ArrayLike,
    a_over_delta: ArrayLike,
    internal_ratio: ArrayLike,
) -> FloatArray:
    """Return the inductance of a single-layer coil at radio frequency, below its self-resonance.

    Parameters
    ----------
    dc_inductance : float or (n,) array
        Low-frequency inductance. [H]
    turns : float or (n,) array
        Number of turns. [-]
    diameter : float or (n,) array
        Mean diameter, centre of wire to centre of wire. [m]
    proximity_factor : float or (n,) array
        High-frequency proximity factor Phi of the winding, at least 1. [-]
    a_over_delta : float or (n,) array
        Wire radius over skin depth. [-]
    internal_ratio : float or (n,) array
        Internal inductance of the wire over its low-frequency value, 0 to 1. [-]

    Returns
    -------
    inductance : float or (n,) array
        Inductance at that frequency, self-capacitance left out. [H]

    Notes
    -----
    L - mu0 N D [(1 - internal)/8 + s (Phi - 1)/4]: the current leaves the inside of the wire, and the wires
    push back the field of their neighbours; s is `reaction_ratio`. Against boundary elements at vanishing
    skin depth 0 to 2 % high (5 to 30 turns, d/s 0.2 to 0.8, l/D 0.5 to 4) when the factor is right. Any a/delta.

    References
    ----------
    Own derivation in the dipole limit; tests/published/high_frequency_inductance.csv.
    """
    internal = (1.0 - np.asarray(internal_ratio, float)) / 8.0
    reaction = reaction_ratio(a_over_delta) * (np.asarray(proximity_factor, float) - 1.0) / 4.0
    lost = MU_0 * np.asarray(turns, float) * np.asarray(diameter, float) * (internal + reaction)
    result: FloatArray = (np.asarray(dc_inductance, float) - lost)[()]
    return result


def least_high_frequency_inductance(
    dc_inductance: ArrayLike, turns: ArrayLike, diameter: ArrayLike, d_over_s: ArrayLike
) -> FloatArray:
    """Return an inductance that a single-layer coil keeps at every frequency.

    Parameters
    ----------
    dc_inductance : float or (n,) array
        Low-frequency inductance. [H]
    turns : float or (n,) array
        Number of turns. [-]
    diameter : float or (n,) array
        Mean diameter. [m]
    d_over_s : float or (n,) array
        Bare wire diameter over pitch, 0 to 1. [-]

    Returns
    -------
    inductance : float or (n,) array
        A lower bound of `high_frequency_inductance`, at least 0. [H]

    Notes
    -----
    L - mu0 N D [1/8 + pi^2/8 (d/s)^2]: all current on the skin, and the proximity factor at most
    1 + (pi^2/2)(d/s)^2, that of thin wire in an endless winding, within which the published table lies. A
    straight line between two entries of a parabola h apart is above it by h^2/4 of its factor at most.

    References
    ----------
    As `high_frequency_inductance`; the limit is that of S. Butterworth, Proc. R. Soc. A 107 (1925) 693-715.
    """
    dense = np.pi**2 / 8.0 * (np.asarray(d_over_s, float) ** 2 + TABLE_STEP**2 / 4.0)
    lost = MU_0 * np.asarray(turns, float) * np.asarray(diameter, float) * (0.125 + dense)
    return np.maximum(np.asarray(dc_inductance, float) - lost, 0.0)[()]


def reaction_ratio(a_over_delta: ArrayLike) -> FloatArray:
    """Return how strongly a round wire pushes back a transverse field, compared with a perfect conductor.

    Parameters
    ----------
    a_over_delta : float or (n,) array
        Wire radius over skin depth, from 0. [-]

    Returns
    -------
    ratio : float or (n,) array
        0 at low frequency to 1 where the skin is thin; nan below 0. [-]

    Notes
    -----
    Re[-J2(z)/J0(z)] with z = (1 - j) a/delta. Tends to (a/delta)^4/12 and to 1 - delta/a.

    References
    ----------
    W. R. Smythe, Static and Dynamic Electricity, McGraw-Hill 1950, chapter 11 (cylinder in a transverse
    alternating field; from memory).
    """
    values = np.asarray(a_over_delta, float)
    distinct, where = distinct_values(values)  # thousands of windings share a few wires
    z = (1.0 - 1.0j) * np.clip(np.nan_to_num(distinct), 0.0, _ASYMPTOTIC_ABOVE)
    thick = np.maximum(distinct, 1.0)
    first, second = bessel_quotients(z)
    ratio = np.where(distinct > _ASYMPTOTIC_ABOVE, 1.0 - 1.0 / thick, np.real(-second * first))
    return np.where(distinct >= 0.0, ratio, np.nan)[where][()]
