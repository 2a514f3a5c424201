"""One tank or two coupled ones: coupling factor, bandwidth, and how far off-frequency signals are put down."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


class Tank(NamedTuple):
    """Coil with series resistance, capacitor, and a conductance across them.

    Parameters
    ----------
    inductance : float or (n,) array
        Of the coil. [H]
    capacitance : float or (n,) array
        Across it. [F]
    series_resistance : float or (n,) array
        Of the coil. [ohm]
    conductance : float or (n,) array
        Of source, load and damping across the tank. [S]
    """

    inductance: ArrayLike
    capacitance: ArrayLike
    series_resistance: ArrayLike = 0.0
    conductance: ArrayLike = 0.0


def tank_admittance(frequency: ArrayLike, tank: Tank) -> ComplexArray:
    """Return the admittance of a tank.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency; broadcasts with the tank. [Hz]
    tank : Tank
        Coil, capacitor and conductance. [H, F, ohm, S]

    Returns
    -------
    admittance : complex or (n,) array
        G + j w C + 1/(r + j w L). [S]

    Notes
    -----
    Exact for the circuit as drawn, at any frequency above 0.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (parallel resonance).
    """
    s = 2j * np.pi * np.asarray(frequency, float)
    coil = np.asarray(tank.series_resistance, float) + s * np.asarray(tank.inductance, float)
    rest = np.asarray(tank.conductance, float) + s * np.asarray(tank.capacitance, float)
    return np.asarray(rest + 1.0 / coil)[()]


def tank_attenuation(frequency: ArrayLike, reference: ArrayLike, tank: Tank) -> FloatArray:
    """Return by how much a tank's response at a frequency lies below that at another.

    Parameters
    ----------
    frequency : float or (n,) array
        Of the unwanted signal: image, neighbour, harmonic. [Hz]
    reference : float or (n,) array
        Of the wanted signal. [Hz]
    tank : Tank
        Coil, capacitor and all conductance across them. [H, F, ohm, S]

    Returns
    -------
    attenuation : float or (n,) array
        Voltage across the tank for one current, as a ratio; negative: louder. [dB]

    Notes
    -----
    Exact, the skirts included: a coil's series resistance lifts the low side, which
    `loading.rejection` leaves out.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (parallel resonance).
    """
    ratio = np.abs(tank_admittance(frequency, tank)) / np.abs(tank_admittance(reference, tank))
    result: FloatArray = 20.0 * np.log10(ratio)
    return result


def coupling_factor(coupling: ArrayLike, first: ArrayLike, second: ArrayLike) -> FloatArray:
    """Return the coupling factor that a capacitor between the hot ends of two tanks makes.

    Parameters
    ----------
    coupling : float or (n,) array
        The capacitor between the tanks. [F]
    first : float or (n,) array
        Capacitance of one tank, the coupling not counted. [F]
    second : float or (n,) array
        Of the other. [F]

    Returns
    -------
    factor : float or (n,) array
        Cc/sqrt((C1 + Cc)(C2 + Cc)). [-]

    Notes
    -----
    Each tank is to be on frequency with its own capacitance plus the coupling: take Cc off both.
    Exact for the circuit as drawn.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (coefficient of coupling).
    """
    shared = np.asarray(coupling, float)
    one, two = np.asarray(first, float) + shared, np.asarray(second, float) + shared
    result: FloatArray = shared / np.sqrt(one * two)
    return result


def coupling_capacitance(factor: ArrayLike, first_total: ArrayLike, second_total: ArrayLike) -> FloatArray:
    """Return the capacitor between the hot ends of two tanks that makes a coupling factor.

    Parameters
    ----------
    factor : float or (n,) array
        Coupling factor wanted, 0 to 1. [-]
    first_total : float or (n,) array
        Capacitance of one tank on frequency, the coupling counted. [F]
    second_total : float or (n,) array
        Of the other. [F]

    Returns
    -------
    coupling : float or (n,) array
        k sqrt(C1 C2); nan where a tank would have less than the coupling itself. [F]

    Notes
    -----
    Exact for the circuit as drawn, loose and close coupling alike: any factor from 0 to 1.

    References
    ----------
    `coupling_factor` solved for the capacitor.
    """
    one, two = np.asarray(first_total, float), np.asarray(second_total, float)
    needed = np.asarray(factor, float) * np.sqrt(one * two)
    return np.where(needed <= np.minimum(one, two), needed, np.nan)[()]


def critical_coupling(first_q: ArrayLike, second_q: ArrayLike) -> FloatArray:
    """Return the coupling factor at which most power passes between two tanks.

    Parameters
    ----------
    first_q : float or (n,) array
        Q of one tank with its source or load. [-]
    second_q : float or (n,) array
        Q of the other. [-]

    Returns
    -------
    factor : float or (n,) array
        1/sqrt(Q1 Q2); with equal Q the response splits in two above it. [-]

    Notes
    -----
    Exact to about 1/Q^2; for Q above 10 within 1 %.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (critical coupling).
    """
    result: FloatArray = 1.0 / np.sqrt(np.asarray(first_q, float) * np.asarray(second_q, float))
    return result


def pair_bandwidth(resonance: ArrayLike, q: ArrayLike, factor: ArrayLike) -> FloatArray:
    """Return the bandwidth of two equal coupled tanks.

    Parameters
    ----------
    resonance : float or (n,) array
        Middle of the response. [Hz]
    q : float or (n,) array
        Q of each tank with its source or load. [-]
    factor : float or (n,) array
        Coupling factor. [-]

    Returns
    -------
    bandwidth : float or (n,) array
        Between the outer points 3 dB below the greatest response. [Hz]

    Notes
    -----
    Narrow band: within 2 % for a bandwidth up to a twentieth of the resonance. 0.644 f/Q far below critical
    coupling, sqrt(2) f/Q at it. From 2.414 times critical on the dip in the middle is deeper than 3 dB.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (response of coupled circuits);
    closed form derived from |H|^2 ~ 1/((1 + K^2 - x^2)^2 + 4 x^2), x = 2 Q df/f.
    """
    quality = np.asarray(q, float)
    square = (np.asarray(factor, float) * quality) ** 2
    single = square - 1.0 + np.sqrt((square - 1.0) ** 2 + (square + 1.0) ** 2)
    humps = square - 1.0 + 2.0 * np.sqrt(square)
    detuning = np.sqrt(np.where(square <= 1.0, single, humps))
    result: FloatArray = np.asarray(resonance, float) / quality * detuning
    return result


def coupling_for_bandwidth(resonance: ArrayLike, q: ArrayLike, bandwidth: ArrayLike) -> FloatArray:
    """Return the coupling factor that gives two equal tanks a bandwidth.

    Parameters
    ----------
    resonance : float or (n,) array
        Middle of the response. [Hz]
    q : float or (n,) array
        Q of each tank with its source or load. [-]
    bandwidth : float or (n,) array
        Wanted, 3 dB below the greatest response. [Hz]

    Returns
    -------
    factor : float or (n,) array
        Coupling factor; nan below 0.644 f/Q, which loose coupling leaves; from 2.414/Q on, the dip in the
        middle is deeper than 3 dB. [-]

    Notes
    -----
    High Q, as the universal curve: within a few per cent for Q above 10.

    References
    ----------
    `pair_bandwidth` solved for the factor.
    """
    quality = np.asarray(q, float)
    square = (np.asarray(bandwidth, float) * quality / np.asarray(resonance, float)) ** 2
    # K^2 - 1 + 2 K = x^2 above critical coupling; below, x^4 - 2 (K^2 - 1) x^2 = (K^2 + 1)^2
    above = np.sqrt(square + 2.0) - 1.0
    below = np.sqrt(2.0 * square * (square + 2.0)) - square - 1.0
    below = np.sqrt(np.where(below >= -1e-12, np.maximum(below, 0.0), np.nan))
    return (np.where(square >= 2.0, above, below) / quality)[()]


def pair_transfer(
    frequency: ArrayLike, first: Tank, second: Tank, coupling: ArrayLike = 0.0, mutual: ArrayLike = 0.0
) -> ComplexArray:
    """Return the voltage across the second of two coupled tanks for one ampere into the first.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency; broadcasts with the tanks. [Hz]
    first : Tank
        Driven tank, source conductance included, the coupling capacitor not. [H, F, ohm, S]
    second : Tank
        The other, load conductance included, the coupling capacitor not. [H, F, ohm, S]
    coupling : float or (n,) array
        Capacitor between the hot ends. [F]
    mutual : float or (n,) array
        Mutual inductance of the coils, positive where it acts with the capacitor: coils wound alike and
        both earthed at the same end have it negative. [H]

    Returns
    -------
    transfer : complex or (n,) array
        Transfer impedance. [ohm]

    Notes
    -----
    Exact nodal equations.

    References
    ----------
    Nodal analysis; checked with scikit-rf in tests/test_physics_coupled_tanks.py.
    """
    s = 2j * np.pi * np.asarray(frequency, float)
    z1, z2 = (
        np.asarray(tank.series_resistance, float) + s * np.asarray(tank.inductance, float) for tank in (first, second)
    )
    sm = s * np.asarray(mutual, float)
    determinant = z1 * z2 - sm**2
    bridge = s * np.asarray(coupling, float)
    # between coils wound alike, both from the cold end, M works against the capacitor: one is turned round
    across = sm / determinant - bridge
    y1 = np.asarray(first.conductance, float) + s * np.asarray(first.capacitance, float) + z2 / determinant
    y2 = np.asarray(second.conductance, float) + s * np.asarray(second.capacitance, float) + z1 / determinant
    return np.asarray(-across / ((y1 + bridge) * (y2 + bridge) - across**2))[()]


def pair_attenuation(
    frequency: ArrayLike,
    reference: ArrayLike,
    first: Tank,
    second: Tank,
    coupling: ArrayLike = 0.0,
    mutual: ArrayLike = 0.0,
) -> FloatArray:
    """Return by how much the response of two coupled tanks at a frequency lies below that at another.

    Parameters
    ----------
    frequency : float or (n,) array
        Of the unwanted signal. [Hz]
    reference : float or (n,) array
        Of the wanted signal. [Hz]
    first : Tank
        Driven tank, source conductance included. [H, F, ohm, S]
    second : Tank
        The other, load conductance included. [H, F, ohm, S]
    coupling : float or (n,) array
        Capacitor between the hot ends. [F]
    mutual : float or (n,) array
        Mutual inductance of the coils, as in `pair_transfer`. [H]

    Returns
    -------
    attenuation : float or (n,) array
        Ratio of the transfer impedances; negative: louder. [dB]

    Notes
    -----
    Exact for the circuit as drawn, at any frequency above 0.

    References
    ----------
    As `pair_transfer`.
    """
    wanted = np.abs(pair_transfer(reference, first, second, coupling, mutual))
    unwanted = np.abs(pair_transfer(frequency, first, second, coupling, mutual))
    result: FloatArray = 20.0 * np.log10(wanted / unwanted)
    return result
