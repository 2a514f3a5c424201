"""Whether an oscillator starts: the transconductance that each choice of parts needs, losses at their worst.

All loss of the tank is taken as a resistance in series with its coil, which makes an error of the order of
1/Q^2. Between the ends of a swept band the loss of the coil is taken as a power of the frequency, that of all
else as rising or falling evenly with the setting of the element.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from partpick.physics.oscillator import Characteristic, divider_threshold, hartley, threshold
from partpick.search.divided import CLAPPED, FIRST_OF_DIVIDER, SPLIT, divided_values, with_device
from partpick.search.networks import Rows
from partpick.search.problem import Bools, Floats, Oscillator, Problem

SETTINGS = (0.0, 0.25, 0.5, 0.75, 1.0)  # of the element: share of the way from its high to its low end, in ratios
_ROUNDING = 1e-12


@dataclass(frozen=True, eq=False)
class Tanks:
    """Tanks of one coil at one setting, (m,) each or one figure for all."""

    inductance: float  # H
    total: Floats  # F, all across the coil
    branch: Floats  # F, of it the branch that holds the divider; 0 without one
    series: Floats  # F, in series with coil and divider; inf: nothing
    halves: Floats  # (m, 2) F, output and control half of the divider, device included
    loss: Floats  # 1/Q at worst, load included


def starts(
    problem: Problem,
    coil: int,
    band: int,
    values: Floats,
    shape: NDArray[np.int8],
    total: Floats,
    loss: Floats,
    keep: Bools,
) -> Bools:
    """Return which networks of one coil and fixed band are to be kept and start, (m,).

    Parameters
    ----------
    problem : Problem
        With its oscillator.
    coil, band : int
        Which coil and band. [-]
    values : (m, k) array
        Capacitance of each part as it acts at the band. [F]
    shape : (m,) array of int
        Shape of each network. [-]
    total : (m,) array
        All capacitance in circuit. [F]
    loss : (m,) array
        1/Q, the coil at its nominal Q. [-]
    keep : (m,) array of bool
        Which are asked for. [-]
    """
    oscillator = problem.oscillator
    assert oscillator is not None
    result = np.zeros(len(keep), dtype=np.bool_)
    worst = loss - problem.coil_loss[coil, band] + oscillator.coil_loss[coil, band]
    rows = np.flatnonzero(keep & np.isfinite(worst))  # of unknown loss nothing says that it starts
    if not len(rows):
        return result
    kind, worst = int(shape[rows[0]]), worst[rows]
    inductance = float(problem.inductance_high[coil, band])
    worst = _loaded(oscillator, band, worst, inductance, total[rows])
    tanks = _tanks(inductance, total[rows], values[rows], kind, problem.device, worst)
    needed = _needed(oscillator, coil, tanks)
    result[rows] = needed <= oscillator.allowed * (1 + _ROUNDING)  # nan: never
    return result


def starts_when_swept(
    problem: Problem,
    coil: int,
    band: int,
    rows: Rows,
    *,
    padders: tuple[Floats, Floats],
    networks: tuple[Floats, Floats],
    further: tuple[Floats, Floats],
) -> Bools:
    """Return which choices of one coil start all over a swept band, (m,).

    Parameters
    ----------
    problem : Problem
        With its oscillator.
    coil, band : int
        Which coil and band. [-]
    rows : Rows
        The capacitors of each choice; of a divider its halves come first. [-]
    padders : pair of (m,) arrays
        What is in series with the element at the low and at the high end; inf: nothing. [F]
    networks : pair of (m,) arrays
        What the capacitors across the coil act as at both ends. [F]
    further : pair of (m,) arrays
        1/Q of all but the coil at both ends. [-]
    """
    p, oscillator = problem, problem.oscillator
    assert oscillator is not None
    coil_loss = oscillator.coil_loss_low[coil, band], oscillator.coil_loss[coil, band]
    started = np.isfinite(further[0] + further[1] + sum(coil_loss))
    if not started.any():
        return started
    further = tuple(np.where(started, end, 1.0) for end in further)  # type: ignore[assignment]
    kind = int(rows.shape[0])
    fixed = float(p.fixed_capacitance()[coil, band])
    inductances = float(p.inductance_low[coil, band]), float(p.inductance_high[coil, band])
    elements = float(p.tuning_high[band]), float(p.tuning_low[band])
    species = rows.species[:, : 2 if oscillator.divided else 0]
    for setting in SETTINGS:
        element = float(between(*elements, setting))
        tuned = 1.0 / (1.0 / element + 1.0 / between(*padders, setting))
        total = tuned + between(*networks, setting) + fixed
        inductance = float(between(*inductances, setting))
        loss = between(*coil_loss, setting) + (1 - setting) * further[0] + setting * further[1]
        loss = _loaded(oscillator, band, loss, inductance, total)
        values = between(p.species_low[band][species], p.species[band][species], setting)
        tanks = _tanks(inductance, total, values, kind, p.device, loss)
        if kind == SPLIT:
            tanks = Tanks(inductance, total, tuned, np.full(len(total), element), tanks.halves, loss)
        needed = _needed(oscillator, coil, tanks)
        started &= needed <= oscillator.allowed * (1 + _ROUNDING)
    return started


def between(low_end: ArrayLike, high_end: ArrayLike, setting: float) -> Floats:
    """Return what lies between two ends in ratios; equal ends, even endless ones, stay as they are."""
    low_end, high_end = np.asarray(low_end, float), np.asarray(high_end, float)
    same = low_end == high_end
    with np.errstate(invalid="ignore", divide="ignore"):
        mixed = np.exp((1 - setting) * np.log(low_end) + setting * np.log(high_end))
    return np.where(same, low_end, mixed)


def _loaded(oscillator: Oscillator, band: int, loss: Floats, inductance: float, total: Floats) -> Floats:
    """Return 1/Q with the load. [-]"""
    across = np.sqrt(inductance / total) * oscillator.load[band]
    return np.maximum(loss + across, oscillator.least_loss[band])


def _tanks(
    inductance: float,
    total: Floats,
    values: Floats,
    kind: int,
    device: tuple[float, float],
    loss: Floats,
) -> Tanks:
    """Return the tanks of networks of one shape."""
    endless = np.full(len(total), np.inf)
    if kind not in FIRST_OF_DIVIDER:
        return Tanks(inductance, total, np.zeros(len(total)), endless, np.empty((len(total), 2)), loss)
    first = FIRST_OF_DIVIDER[kind]
    halves = with_device(values, kind, device)[:, first : first + 2]
    own = values[:, : first + 2]
    branch = np.zeros(len(total)) if kind == SPLIT else divided_values(own, kind, device)
    return Tanks(inductance, total, branch, values[:, 0] if kind == CLAPPED else endless, halves, loss)


def _needed(oscillator: Oscillator, coil: int, tanks: Tanks) -> Floats:
    """Return the least transconductance of each tank, nan where none will do. [S]"""
    resistance = np.sqrt(tanks.inductance / tanks.total) * tanks.loss
    if not oscillator.divided:
        return threshold(_hartley(oscillator, coil, tanks, resistance)).transconductance
    beside = np.maximum(tanks.total - tanks.branch, 0.0)
    output, control = tanks.halves.T
    return divider_threshold(tanks.inductance, resistance, output, control, beside, tanks.series).transconductance


def _hartley(oscillator: Oscillator, coil: int, tanks: Tanks, resistance: Floats) -> Characteristic:
    turns, inductance = oscillator.output_turns[coil], tanks.inductance
    output, control, mutual = (
        share[coil] * inductance
        for share in (oscillator.output_share, oscillator.control_share, oscillator.mutual_share)
    )
    device = oscillator.device
    across = (output + mutual) ** 2 * device[0] + (control + mutual) ** 2 * device[1]
    return hartley(
        output,
        control,
        mutual,
        resistance * turns,
        resistance * (1.0 - turns),
        tanks.total - across / inductance**2,
        device[0],
        device[1],
    )


def able_to_start(problem: Problem, oscillator: Oscillator) -> Bools:
    """Return which coils might start with the best divider and no loss but their own, (J, B).

    The voltage that the divider gives back is at most a quarter of what its halves have together squared, so
    that 4 G is needed at least, G being the loss of the tank as a conductance. Exact within 1/Q^2: a tenth is
    left for that, and a Q below 10 is left to the search.
    """
    p = problem
    error = p.error_limit[None, :]
    least = np.where(p.swept[None, :], p.least_at_low_end, p.wanted / (1.0 + error) ** 2)
    inductance = np.where(p.swept[None, :], p.inductance_low, p.inductance_high)
    loss = np.where(p.swept[None, :], oscillator.coil_loss_low, oscillator.coil_loss)
    conductance = np.maximum(loss, oscillator.least_loss[None, :]) * np.sqrt(least / inductance)
    low_q = np.asarray(~(loss <= 0.1))
    hopeless = 4.0 * 0.9 * (conductance + oscillator.load[None, :]) > oscillator.allowed
    return np.asarray(np.isfinite(loss) & (low_q | ~hopeless))


