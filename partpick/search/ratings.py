"""The ratings of parts as limits: which networks bear the drive, and which coils can have none that does."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from partpick.search.drift_bound import weight_gains
from partpick.search.drive import Drive, borne
from partpick.search.networks import CHAINED, SERIES, SHUNTED
from partpick.search.problem import Bools, Floats, Ints, Problem

_SLACK = 1e-9  # of a bound, for rounding

Shapes = NDArray[np.int8]


def voltage_shares(acting: Floats, shape: Shapes) -> Floats:
    """Return the share of the voltage across a network that each part has, (m, k): in series by 1/C. [-]"""
    shares = np.ones_like(acting)
    rows = shape == SERIES
    if rows.any():
        elastance = 1.0 / acting[rows]
        shares[rows] = elastance / elastance.sum(axis=1, keepdims=True)
    for kind in (SHUNTED, CHAINED):
        rows = shape == kind
        if not rows.any():
            continue
        first, second, third = acting[rows].T
        if kind == SHUNTED:
            shares[rows, 1:] = np.stack([third, second], axis=1) / (second + third)[:, None]
        else:
            pair = second + third
            shares[rows] = np.stack([pair, first, first], axis=1) / (first + pair)[:, None]
    return shares


def inside_ratings(
    problem: Problem,
    coil: int,
    band: int,
    acting: Floats,
    chosen: Ints,
    shape: Shapes,
    rise: Floats,
    loss: Floats,
) -> Bools:
    """Return which networks of a fixed band bear the drive, (m,).

    Parameters
    ----------
    problem : Problem
        With a drive.
    coil, band : int
        Which coil and band. [-]
    acting : (m, k) array
        Each part as it acts at the band. [F]
    chosen : (m, k) array of int
        The parts. [-]
    shape : (m,) array of int
        Shape of each network. [-]
    rise : (m,) array
        Voltage on the network over that on the tank: leads in series raise it. [-]
    loss : (m,) array
        1/Q of the tank; nan: unknown. [-]
    """
    drive = _drive(problem)
    omega, reactance = _at_high_end(problem, coil, band)
    share = voltage_shares(acting, shape) * rise[:, None]
    most = drive.on_parts(omega, acting, share, chosen)
    carrier = drive.carrier(reactance, loss)
    return borne(carrier, most, drive.on_coil(reactance, coil), drive.on_trimmer(band))


def inside_ratings_at_end(
    problem: Problem,
    coil: int,
    band: int,
    acting: Floats,
    share: Floats,
    chosen: Ints,
    on_element: Floats,
    loss: Floats,
    *,
    low_end: bool,
) -> Bools:
    """Return which choices for a swept band bear the drive at one end, (m,).

    Parameters
    ----------
    problem : Problem
        With a drive.
    coil, band : int
        Which coil and band. [-]
    acting, share, chosen : (m, k) arrays
        Each part as it acts there [F], its share of the tank's voltage [-], and which it is; a series padder last.
    on_element : (m,) array
        Share of the tank's voltage on the tuning element. [-]
    loss : (m,) array
        1/Q of the tank there; nan: unknown. [-]
    low_end : bool
        The lower end, else the upper. [-]
    """
    drive = _drive(problem)
    omega, reactance = _at_low_end(problem, coil, band) if low_end else _at_high_end(problem, coil, band)
    most = drive.on_parts(omega, acting, share, chosen)
    element = drive.element_voltage / (drive.crest * on_element)
    carrier = drive.carrier(reactance, loss)
    return borne(carrier, most, element, drive.on_coil(reactance, coil), drive.on_trimmer(band))


def can_bear(problem: Problem, parts: int) -> Bools:
    """Return which coils might bear the drive with a number of capacitors, (J, B); false only where none can.

    Notes
    -----
    The least carrier comes with the most loss. In parallel every part has at least the tank's voltage, so
    that k parts make at most k times the largest that bears it. In any connection the reactive powers of
    the parts add up to that of the network, V^2 w C/2, and no part takes more than its voltage and
    current ratings allow.
    """
    p, drive = problem, _drive(problem)
    omega = 2 * np.pi * p.frequency[None, :]
    reactance = omega * p.inductance_high
    carrier = least_carrier(p)
    able = borne(carrier, drive.on_coil(reactance.T, np.arange(p.coils)).T, drive.on_trimmer(np.arange(p.bands)))
    if parts == 0:
        return able
    wanted = p.windows(parts)[0]
    for band in np.flatnonzero(~p.swept).tolist():
        if p.connect_any:
            least = np.where(np.isfinite(wanted[:, band]), np.maximum(wanted[:, band], 0.0), 0.0)
            most = (drive.part_voltage[:-1] * drive.part_current[:-1]).max(initial=0.0)
            if np.isinf(most):
                continue
            with np.errstate(invalid="ignore"):
                reactive = np.nan_to_num(least * carrier[:, band] ** 2 * omega[0, band], nan=0.0, posinf=np.inf)
            able[:, band] &= reactive <= parts * most / (drive.crest * drive.effective) * (1 + _SLACK)
        else:
            largest = _largest_that_bears(p, band, carrier[:, band])
            able[:, band] &= wanted[:, band] <= parts * largest * (1 + _SLACK)
    return able


def part_limits(problem: Problem, band: int) -> Floats:
    """Return the carrier up to which each part bears the whole voltage, (P,); 0 for one of no use there. [V peak]"""
    p, drive = problem, _drive(problem)
    omega = 2 * np.pi * float(p.frequency[band])
    limits = np.zeros(len(p.part_value))
    for index in np.flatnonzero(np.isfinite(p.species[band])).tolist():
        parts = np.array(p.options[index], dtype=np.int64)[:, None]
        acting = np.full(parts.shape, p.species[band][index])
        limits[parts[:, 0]] = drive.on_parts(omega, acting, np.ones(parts.shape), parts)
    return limits


def least_carrier(problem: Problem) -> Floats:
    """Return a carrier below which no rated part is in the tank of a coil, (J, B); inf: its loss is unknown. [V peak]

    A part whose own loss is unknown stands beside unrated parts alone.
    """
    p, drive = problem, _drive(problem)
    reactance = 2 * np.pi * p.frequency[None, :] * p.inductance_high
    parts = np.nan_to_num(p.part_loss, nan=0.0).max(axis=1, initial=0.0) * weight_gains(p)[-1]
    others = np.maximum(parts, np.maximum(p.trimmer_loss, np.where(p.swept, p.tuning_loss, 0.0))[None, :])
    return np.nan_to_num(drive.carrier(reactance, p.coil_loss + others), nan=np.inf, posinf=np.inf)


def _largest_that_bears(problem: Problem, band: int, carrier: Floats) -> Floats:
    """Return the largest single capacitance that bears each carrier, (J,); -inf: none does. [F]"""
    limits = part_limits(problem, band)
    acting = np.full(len(limits), -np.inf)
    for index in np.flatnonzero(np.isfinite(problem.species[band])).tolist():
        acting[list(problem.options[index])] = problem.species[band][index]
    order = np.argsort(limits)
    largest = np.maximum.accumulate(acting[order][::-1])[::-1]
    place = np.searchsorted(limits[order], carrier * (1 - _SLACK), side="left")
    return np.append(largest, -np.inf)[place]


def _drive(problem: Problem) -> Drive:
    assert problem.drive is not None
    return problem.drive


def _at_high_end(problem: Problem, coil: int, band: int) -> tuple[float, float]:
    omega = 2 * np.pi * float(problem.frequency[band])
    return omega, 1.0 / (omega * float(problem.wanted[coil, band]))


def _at_low_end(problem: Problem, coil: int, band: int) -> tuple[float, float]:
    omega = 2 * np.pi * float(problem.low_end[band])
    return omega, omega * float(problem.inductance_low[coil, band])
