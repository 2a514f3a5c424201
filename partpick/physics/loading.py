"""What hangs on a tank: Q of capacitor networks, load and damping, selectivity, and the stress of a drive."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def parallel_q(capacitances: ArrayLike, q: ArrayLike) -> FloatArray:
    """Return the Q of capacitors in parallel.

    Parameters
    ----------
    capacitances : (..., k) array
        Capacitances; the last axis is summed over. [F]
    q : (..., k) array
        Q of each; infinity: no loss, nan: unknown. [-]

    Returns
    -------
    q : float or (...) array
        1/Q = sum(C_i/Q_i) / sum(C_i). [-]

    Notes
    -----
    To about 1/Q^2: for Q above 10 within 1 %.

    References
    ----------
    Definition of Q by energy: F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2.
    """
    value = np.asarray(capacitances, float)
    with np.errstate(divide="ignore"):
        result: FloatArray = value.sum(axis=-1) / (value / np.asarray(q, float)).sum(axis=-1)
        return result


def series_q(capacitances: ArrayLike, q: ArrayLike) -> FloatArray:
    """Return the Q of capacitors in series.

    Parameters
    ----------
    capacitances : (..., k) array
        Capacitances; the last axis is summed over. [F]
    q : (..., k) array
        Q of each; infinity: no loss, nan: unknown. [-]

    Returns
    -------
    q : float or (...) array
        1/Q = C sum(1/(C_i Q_i)) with C that of the network. [-]

    Notes
    -----
    To about 1/Q^2: for Q above 10 within 1 %.

    References
    ----------
    Definition of Q by energy: F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 2.
    """
    elastance = 1.0 / np.asarray(capacitances, float)
    with np.errstate(divide="ignore"):
        result: FloatArray = elastance.sum(axis=-1) / (elastance / np.asarray(q, float)).sum(axis=-1)
        return result


def loaded_q(unloaded_q: ArrayLike, reactance: ArrayLike, load_resistance: ArrayLike) -> FloatArray:
    """Return the Q of a tank with a resistance across it.

    Parameters
    ----------
    unloaded_q : float or (n,) array
        Q of the tank alone. [-]
    reactance : float or (n,) array
        Reactance of coil or capacitor at resonance. [ohm]
    load_resistance : float or (n,) array
        All resistance across the tank, source and load in parallel. [ohm]

    Returns
    -------
    q : float or (n,) array
        1/Q_L = 1/Q_U + X/R; right to about 1/Q^2. [-]

    Notes
    -----
    To about 1/Q^2: for Q above 10 within 1 %.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3;
    tests/published/loading_two_port.csv.
    """
    share = np.asarray(reactance, float) / np.asarray(load_resistance, float)
    result: FloatArray = 1.0 / (1.0 / np.asarray(unloaded_q, float) + share)
    return result


def damping_resistance(unloaded_q: ArrayLike, reactance: ArrayLike, wanted_q: ArrayLike) -> FloatArray:
    """Return the resistor across a tank that brings its Q down to a wanted one.

    Parameters
    ----------
    unloaded_q : float or (n,) array
        Q without the resistor (with any load that is there already). [-]
    reactance : float or (n,) array
        Reactance of coil or capacitor at resonance. [ohm]
    wanted_q : float or (n,) array
        Q wanted: resonance over the bandwidth wanted. [-]

    Returns
    -------
    resistance : float or (n,) array
        X/(1/Q_wanted - 1/Q); infinity where nothing is needed, nan where the tank is too lossy already. [ohm]

    Notes
    -----
    To about 1/Q^2: for Q above 10 within 1 %.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3; `loaded_q` solved for R.
    """
    with np.errstate(divide="ignore"):
        loss = 1.0 / np.asarray(wanted_q, float) - 1.0 / np.asarray(unloaded_q, float)
        resistance = np.asarray(reactance, float) / np.where(loss >= 0.0, loss, np.nan)
    return np.abs(resistance)[()]


def insertion_loss(unloaded_q: ArrayLike, loaded_q: ArrayLike) -> FloatArray:
    """Return what a tank between equal source and load takes away at resonance.

    Parameters
    ----------
    unloaded_q : float or (n,) array
        Q of the tank alone. [-]
    loaded_q : float or (n,) array
        Q with source and load, at most the unloaded. [-]

    Returns
    -------
    loss : float or (n,) array
        -20 log10(1 - Q_L/Q_U). [dB]

    Notes
    -----
    At resonance; for a loaded Q from 0 up to the unloaded one, where it becomes infinite.

    References
    ----------
    S. B. Cohn, Dissipation loss in multiple-coupled-resonator filters, Proc. IRE 47 (1959) 1342-1348 (from
    memory); tests/published/loading_two_port.csv.
    """
    with np.errstate(divide="ignore"):
        through = 1.0 - np.asarray(loaded_q, float) / np.asarray(unloaded_q, float)
        result: FloatArray = np.abs(-20.0 * np.log10(through))
        return result


def rejection(frequency: ArrayLike, resonance: ArrayLike, loaded_q: ArrayLike) -> FloatArray:
    """Return by how much a tank's response at a frequency lies below that at its resonance.

    Parameters
    ----------
    frequency : float or (n,) array
        Frequency of the unwanted signal. [Hz]
    resonance : float or (n,) array
        Resonance of the tank. [Hz]
    loaded_q : float or (n,) array
        Q with source and load. [-]

    Returns
    -------
    rejection : float or (n,) array
        10 log10(1 + Q^2 (f/f0 - f0/f)^2). [dB]

    Notes
    -----
    For a loss that acts as a resistance across the tank: within 0.1 dB down to Q = 15 between half and twice
    the resonance; far below it a coil's series resistance lifts the skirt.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 3 (universal resonance curve).
    """
    step = np.asarray(frequency, float) / np.asarray(resonance, float)
    result: FloatArray = 10.0 * np.log10(1.0 + (np.asarray(loaded_q, float) * (step - 1.0 / step)) ** 2)
    return result


def efficiency(unloaded_q: ArrayLike, loaded_q: ArrayLike) -> FloatArray:
    """Return the share of the power into a tank that reaches its load.

    Parameters
    ----------
    unloaded_q : float or (n,) array
        Q of the tank alone. [-]
    loaded_q : float or (n,) array
        Q with the load. [-]

    Returns
    -------
    efficiency : float or (n,) array
        1 - Q_L/Q_U; the rest heats the tank. [-]

    Notes
    -----
    At resonance; for a loaded Q from 0 up to the unloaded one.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 5 (tank circuits);
    tests/published/loading_stress.csv.
    """
    result: FloatArray = 1.0 - np.asarray(loaded_q, float) / np.asarray(unloaded_q, float)
    return result


def peak_voltage(power: ArrayLike, reactance: ArrayLike, q: ArrayLike) -> FloatArray:
    """Return the peak voltage across a tank that takes a power.

    Parameters
    ----------
    power : float or (n,) array
        Power into the tank, load included. [W]
    reactance : float or (n,) array
        Reactance of coil or capacitor at resonance. [ohm]
    q : float or (n,) array
        Loaded Q; the unloaded one where the load is off. [-]

    Returns
    -------
    voltage : float or (n,) array
        sqrt(2 Q P X), unmodulated carrier. [V]

    Notes
    -----
    At the same power the voltage rises by sqrt(Q_U/Q_L) when the load is off, under a drive of constant
    current by Q_U/Q_L. Full amplitude modulation doubles it.
    At resonance, within 1 % for a Q above 10.

    References
    ----------
    Definition of Q by energy: F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 5;
    tests/published/loading_stress.csv.
    """
    energy = np.asarray(q, float) * np.asarray(power, float)  # stored, times angular frequency
    result: FloatArray = np.sqrt(2.0 * energy * np.asarray(reactance, float))
    return result


def circulating_current(peak_voltage: ArrayLike, reactance: ArrayLike) -> FloatArray:
    """Return the peak current that circulates in a tank.

    Parameters
    ----------
    peak_voltage : float or (n,) array
        Peak voltage across it. [V]
    reactance : float or (n,) array
        Reactance of coil or capacitor at resonance. [ohm]

    Returns
    -------
    current : float or (n,) array
        Peak current; its rms value is 1/sqrt(2) of it. [A]

    Notes
    -----
    At resonance, to about 1/Q: for Q above 10 within 1 %.

    References
    ----------
    F. E. Terman, Radio Engineers' Handbook, McGraw-Hill 1943, section 5; tests/published/loading_stress.csv.
    """
    result: FloatArray = np.asarray(peak_voltage, float) / np.asarray(reactance, float)
    return result
