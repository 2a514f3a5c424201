"""Loss of coils, kept apart by cause: skin effect, proximity of turns or strands, core, former.

Skin effect from `skin.py`, the high-frequency proximity factor from `proximity.py`; here they become the
resistance and Q of solenoids, rings and bought inductors; stranded wire and layers stand in `stranded.py`.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.proximity import endless_proximity_factor
from partpick.physics.skin import skin_ratio, transverse_loss_ratio

FloatArray = NDArray[np.float64]

# Measured Q lies 10 to 20 % below the copper's alone: former, leads, oxide (common practice, no source).
LEAST_Q_SHORTFALL: Final = 0.10
LARGEST_Q_SHORTFALL: Final = 0.20
# Enamel, paper and varnish between layers have 0.005 to 0.02 (common practice, from memory).
COVERING_LOSS_TANGENT: Final = 0.01
# Plastics of one name lose up to twice as much as each other (common practice, no source).
FORMER_LOSS_SPREAD: Final = 1.0
# Bought inductors: the Q of the data row is a working figure (common practice, no source).
BOUGHT_Q_SPREAD: Final = 0.30
# A material's reachable Q is a working figure too (common practice, no source).
CORE_LOSS_SPREAD: Final = 0.30


class CopperLoss(NamedTuple):
    """Series resistance of a winding by cause.

    Parameters
    ----------
    skin : float or (n,) array
        Resistance of the same wire pulled straight. [ohm]
    proximity : float or (n,) array
        What neighbouring turns and strands add. [ohm]
    """

    skin: FloatArray
    proximity: FloatArray

    @property
    def total(self) -> FloatArray:
        """Series resistance of the copper, in ohm."""
        return self.skin + self.proximity


def solenoid_resistance(
    dc_resistance: ArrayLike, a_over_delta: ArrayLike, proximity_factor: ArrayLike
) -> CopperLoss:
    """Return the copper resistance of a single-layer coil of solid round wire, by cause.

    Parameters
    ----------
    dc_resistance : float or (n,) array
        Direct-current resistance of the wire in the winding. [ohm]
    a_over_delta : float or (n,) array
        Wire radius over skin depth. [-]
    proximity_factor : float or (n,) array
        High-frequency factor Phi of the winding, at least 1 (`solenoid_proximity_factor`). [-]

    Returns
    -------
    loss : CopperLoss
        Skin and proximity parts, each a float or (n,) array. [ohm]

    Notes
    -----
    R_dc [H + (Phi - 1) g], H of `skin_ratio`, g of `transverse_loss_ratio`: right at low a/delta too, where
    the plain product H Phi is 22 % high (d/s = 0.5, a/delta = 2). Against exact eddy-current solutions with
    the factor known: within 5 % up to d/s = 0.5, 7 % at 0.6, 18 % at 0.7, 35 % at 0.8
    (tests/published/loss_finite_skin_depth.csv). Former, leads and radiation are left out.

    References
    ----------
    Skin part as in Terman 1943; proximity part by the field solution of Butterworth 1926 with the factor
    of R. G. Medhurst, Wireless Engineer 24 (1947) 35-43, 80-92.
    """
    dc = np.asarray(dc_resistance, float)
    excess = np.asarray(proximity_factor, float) - 1.0
    return CopperLoss(
        skin=(dc * skin_ratio(a_over_delta))[()],
        proximity=(dc * excess * transverse_loss_ratio(a_over_delta))[()],
    )


def ring_pitch(
    turns: ArrayLike,
    outer_diameter: ArrayLike,
    inner_diameter: ArrayLike,
    height: ArrayLike,
    wire_diameter: ArrayLike,
    arc: float = 330.0,
) -> FloatArray:
    """Return the pitch that stands for the unequal pitches of a single-layer ring winding.

    Parameters
    ----------
    turns : float or (n,) array
        Number of turns. [-]
    outer_diameter : float or (n,) array
        Outer diameter of the ring. [m]
    inner_diameter : float or (n,) array
        Bore of the ring. [m]
    height : float or (n,) array
        Height of the ring. [m]
    wire_diameter : float or (n,) array
        Overall wire diameter. [m]
    arc : float
        Part of the ring that the turns are spread over. [deg]

    Returns
    -------
    pitch : float or (n,) array
        Pitch whose inverse square is the mean along one turn. [m]

    Notes
    -----
    Proximity loss goes with the inverse square of the pitch: pitch = arc r/N, mean of 1/r^2 over bore,
    outside and the two faces (there 1/(r1 r2)). Exact geometry for a rectangular section.

    References
    ----------
    Own derivation from geometry.
    """
    wire = np.asarray(wire_diameter, float)
    inner = (np.asarray(inner_diameter, float) - wire) / 2.0
    outer = (np.asarray(outer_diameter, float) + wire) / 2.0
    side = np.asarray(height, float) + wire
    face = outer - inner
    inverse_square = (side / inner**2 + side / outer**2 + 2.0 * face / (inner * outer)) / (
        2.0 * (side + face)
    )
    result: FloatArray = np.deg2rad(arc) / np.asarray(turns, float) / np.sqrt(inverse_square)
    return result


def ring_resistance(dc_resistance: ArrayLike, a_over_delta: ArrayLike, d_over_s: ArrayLike) -> CopperLoss:
    """Return the copper resistance of a single layer on a ring core, by cause.

    Parameters
    ----------
    dc_resistance : float or (n,) array
        Direct-current resistance of the wire in the winding. [ohm]
    a_over_delta : float or (n,) array
        Wire radius over skin depth. [-]
    d_over_s : float or (n,) array
        Bare wire diameter over pitch (`ring_pitch`). [-]

    Returns
    -------
    loss : CopperLoss
        Skin and proximity parts, each a float or (n,) array. [ohm]

    Notes
    -----
    As `solenoid_resistance`, with the factor of an endless solenoid: a ring winding has no ends. The core's
    own loss is apart; combine with `combined_q`. Perhaps 15 % up to d/s = 0.6 (estimate, no source).

    References
    ----------
    Endless-solenoid factor: see `endless_proximity_factor`.
    """
    return solenoid_resistance(dc_resistance, a_over_delta, endless_proximity_factor(d_over_s))


def dielectric_loss(
    inductance: ArrayLike,
    capacitance: ArrayLike,
    frequency: ArrayLike,
    loss_tangent: ArrayLike,
    share: ArrayLike = 1.0,
) -> FloatArray:
    """Return what a coil's own electric field loses in its former, as its share of 1/Q.

    Parameters
    ----------
    inductance : float or (n,) array
        Inductance. [H]
    capacitance : float or (n,) array
        Self-capacitance across it. [F]
    frequency : float or (n,) array
        At which the coil is used, well below its self-resonance. [Hz]
    loss_tangent : float or (n,) array
        Of the former's material, 0 in air. [-]
    share : float or (n,) array
        Of the field's energy in that material, 0 to 1 (`dielectric_share`). [-]

    Returns
    -------
    loss : float or (n,) array
        1/Q by this cause alone, 0 in air. [-]

    Notes
    -----
    The self-capacitance C has the conductance G = w C p tan d across it; in the tank it takes
    G w L = w^2 L C p tan d of 1/Q, whatever other capacitance there is. Loss tangents are known within a
    factor of two (`FORMER_LOSS_SPREAD`).

    References
    ----------
    Definition of the loss tangent: F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2
    (from memory); the share of the field in it: own derivation.
    """
    omega = 2.0 * np.pi * np.asarray(frequency, float)
    field = np.asarray(capacitance, float) * np.asarray(share, float) * np.asarray(loss_tangent, float)
    return (omega**2 * np.asarray(inductance, float) * field)[()]


def combined_q(*q: ArrayLike) -> FloatArray:
    """Return the Q of losses that add up in one reactance, such as copper and core.

    Parameters
    ----------
    *q : float or (n,) array
        Q by each cause alone; infinity: no loss, nan: unknown. [-]

    Returns
    -------
    q : float or (n,) array
        1 / sum of 1/Q; unknown if one of them is. [-]

    Notes
    -----
    Exact where each Q is defined by the same reactance; any Q above 0.

    References
    ----------
    Definition of Q by energy: F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3.
    """
    with np.errstate(divide="ignore"):
        loss = np.asarray(0.0)
        for each in q:
            loss = loss + 1.0 / np.asarray(each, float)
        return (1.0 / loss)[()]


def bought_q(q: ArrayLike, q_frequency: ArrayLike | None, frequency: ArrayLike) -> FloatArray:
    """Return the Q of a bought inductor away from the frequency at which it is stated.

    Parameters
    ----------
    q : float or (n,) array
        Stated Q. [-]
    q_frequency : float or (n,) array or None
        Frequency of that Q; None or nan: it holds at every frequency. [Hz]
    frequency : float or (n,) array
        Frequency asked for. [Hz]

    Returns
    -------
    q : float or (n,) array
        Q sqrt(f/f_q) from f_q/10 up to f_q, Q from there to 2 f_q, nan (unknown) elsewhere. [-]

    Notes
    -----
    Below the stated frequency resistance falls as the square root of frequency; above, core and
    self-capacitance make up for the copper, and nothing is known beyond an octave. Within 30 %
    (`BOUGHT_Q_SPREAD`).

    References
    ----------
    Common practice, no source.
    """
    stated = np.asarray(q, float)
    reference = np.asarray(np.nan if q_frequency is None else q_frequency, float)
    step = np.asarray(frequency, float) / reference
    scaled = stated * np.sqrt(np.minimum(step, 1.0))
    # A hair of room, so that one tenth and twice the stated frequency are inside whatever the rounding.
    known = (step >= 0.1 * (1.0 - 1e-12)) & (step <= 2.0 * (1.0 + 1e-12))
    everywhere = np.isnan(reference) & np.isfinite(np.asarray(frequency, float))
    return np.where(everywhere, stated, np.where(known, scaled, np.nan))[()]


def q_bounds(
    skin: ArrayLike,
    proximity: ArrayLike,
    core: ArrayLike,
    former: ArrayLike,
    copper_spread: ArrayLike,
    core_spread: ArrayLike,
) -> tuple[FloatArray, FloatArray]:
    """Return the least and the greatest Q to expect of a coil whose losses were computed by cause.

    Parameters
    ----------
    skin : float or (n,) array
        Loss of the wire pulled straight, as its share of 1/Q. [-]
    proximity : float or (n,) array
        What neighbouring turns, strands and layers add. [-]
    core : float or (n,) array
        Loss of the core; 0 for an air coil. [-]
    former : float or (n,) array
        Loss of the former; 0 for a coil without one. [-]
    copper_spread : float or (n,) array
        Relative error of the copper resistance (`proximity_factor_spread`). [-]
    core_spread : float or (n,) array
        Relative error of the core's loss. [-]

    Returns
    -------
    bounds : tuple of two floats or (n,) arrays
        Least and greatest Q; nan where a loss is unknown. [-]

    Notes
    -----
    An error e of the proximity factor moves the copper's resistance by at most e, and never below the skin
    part. Measured coils are 10 to 20 % below their copper's Q, the former's loss included: the lower bound is
    the worse of 20 %, and of 10 % (leads, oxide) with twice the former's loss. The upper bound has none of
    that: a hollow former may lose next to nothing. A core's Q is a ceiling: its loss is at least the nominal.

    References
    ----------
    Common practice, no source, for the shortfall; the rest is propagation of error.
    """
    straight, heat = np.asarray(skin, float), np.asarray(core, float)
    copper, error = straight + np.asarray(proximity, float), np.asarray(copper_spread, float)
    thick, field = copper * (1.0 + error), np.asarray(former, float) * (1.0 + FORMER_LOSS_SPREAD)
    most = np.maximum(thick / (1.0 - LARGEST_Q_SHORTFALL), thick / (1.0 - LEAST_Q_SHORTFALL) + field)
    most = most + heat * (1.0 + np.asarray(core_spread, float))
    least = np.maximum(copper * (1.0 - error), straight) + heat
    return (1.0 / most)[()], (1.0 / least)[()]
