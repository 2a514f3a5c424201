"""Loads on a tank: scikit-rf, round trips, light-load limits, energy."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from hypothesis import assume, given
from hypothesis import strategies as st

from partpick.physics.coupling import divider_for, divider_load, link_load, tap_load
from partpick.physics.solenoid import solenoid_family
from partpick.physics.taps import tapped_section

FREQUENCIES = np.array([3.5e6, 7.1e6, 14.2e6])
loads = st.floats(5.0, 5e3)
capacitances = st.floats(1e-11, 3e-9)


def line(z0: float) -> skrf.media.DefinedGammaZ0:
    return skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(FREQUENCIES, unit="Hz"), z0=z0)


def admittance(network: skrf.Network) -> np.ndarray:
    return 1.0 / network.z[:, 0, 0]


@pytest.mark.parametrize("resistance", [5.0, 50.0, 1000.0])
def test_divider_agrees_with_scikit_rf(resistance: float) -> None:
    """Series capacitor, shunt capacitor, load, seen from the hot end."""
    media = line(50.0)
    network = media.capacitor(2.2e-10) ** media.shunt_capacitor(8.2e-10) ** media.resistor(resistance) ** media.short()
    seen = admittance(network)
    ours = divider_load(FREQUENCIES, 2.2e-10, 8.2e-10, resistance)
    assert ours.resistance == pytest.approx(1.0 / seen.real, rel=1e-6)
    assert ours.capacitance == pytest.approx(seen.imag / (2 * np.pi * FREQUENCIES), rel=1e-6)


@pytest.mark.parametrize("resistance", [5.0, 50.0, 1000.0])
def test_link_agrees_with_scikit_rf(resistance: float) -> None:
    """The transformer as its T of three inductances, coil side to load side."""
    coil, link, mutual = 4.1e-6, 0.6e-6, 0.45e-6
    media = line(50.0)
    network = (
        media.inductor(coil - mutual)
        ** media.shunt_inductor(mutual)
        ** media.inductor(link - mutual)
        ** media.resistor(resistance)
        ** media.short()
    )
    seen = admittance(network)
    ours = link_load(FREQUENCIES, coil, link, mutual, resistance)
    assert ours.resistance == pytest.approx(1.0 / seen.real, rel=1e-6)
    assert ours.inductance == pytest.approx(-1.0 / (seen.imag * 2 * np.pi * FREQUENCIES), rel=1e-6)


def test_tap_agrees_with_scikit_rf() -> None:
    """Section and rest as coupled coils in series: the T of an autotransformer, M aiding."""
    parts = tapped_section(solenoid_family(20, 0.025, 0.001, 0.002), 6)
    resistance, media = 50.0, line(50.0)
    # hot end - (rest + M) - tap; tap - (section + M) - cold; the load through -M at the tap
    network = (
        media.inductor(parts.rest + parts.mutual)
        ** media.shunt_inductor(parts.section + parts.mutual)
        ** media.inductor(-parts.mutual)
        ** media.resistor(resistance)
        ** media.short()
    )
    seen = admittance(network)
    ours = tap_load(FREQUENCIES, parts.total, parts.section, parts.mutual, resistance)
    assert ours.resistance == pytest.approx(1.0 / seen.real, rel=1e-6)
    assert ours.inductance == pytest.approx(-1.0 / (seen.imag * 2 * np.pi * FREQUENCIES), rel=1e-6)


def test_light_loads_go_with_the_square_of_the_voltage_ratio() -> None:
    """Where the load draws little, each is an ideal transformer."""
    heavy = 1e7
    divided = divider_load(7.1e6, 2e-10, 6e-10, heavy)
    assert divided.resistance == pytest.approx(heavy * 16.0, rel=1e-6)
    assert divided.capacitance == pytest.approx(1.5e-10, rel=1e-6)
    parts = tapped_section(solenoid_family(20, 0.025, 0.001, 0.002), 6)
    tapped = tap_load(7.1e6, parts.total, parts.section, parts.mutual, heavy)
    assert tapped.resistance == pytest.approx(heavy / parts.voltage_ratio**2, rel=1e-6)
    assert tapped.inductance == pytest.approx(parts.total, rel=1e-6)


@given(loads, capacitances, capacitances, st.floats(1e6, 3e7))
def test_divider_is_found_again(resistance: float, upper: float, lower: float, frequency: float) -> None:
    """From the capacitors to the equivalent and back, at any loading."""
    seen = divider_load(frequency, upper, lower, resistance)
    omega = 2 * np.pi * frequency
    # else a few digits only: the load all but shorts the lower capacitor, or is lost beside it
    assume(omega * lower * resistance > 1e-3 and omega * seen.capacitance * seen.resistance < 1e4)
    found = divider_for(frequency, resistance, seen.resistance, seen.capacitance)
    assert found.upper == pytest.approx(upper, rel=1e-5)
    assert found.lower == pytest.approx(lower, rel=1e-5)


def test_divider_cannot_lower_a_resistance() -> None:
    """A load is never seen across the tank as less than itself; too little capacitance will not do either."""
    assert np.isnan(divider_for(7.1e6, 1000.0, 500.0, 1e-12)).all()
    assert np.isnan(divider_for(7.1e6, 50.0, 3000.0, 1e-12)).all()
    assert divider_load(7.1e6, 1e-9, 1e-12, 300.0).resistance > 300.0


@given(loads, st.floats(1e-6, 1e-5), st.floats(0.02, 0.3), st.floats(0.05, 0.98), st.floats(1e6, 3e7))
def test_link_only_ever_lowers_the_inductance(
    resistance: float, coil: float, share: float, coupling: float, frequency: float
) -> None:
    """Current in the link opposes the coil's field, and between open and shorted lies every load."""
    link = share * coil
    mutual = coupling * np.sqrt(coil * link)
    impedance_inductance = link_load(frequency, coil, link, mutual, resistance).inductance
    shorted = link_load(frequency, coil, link, mutual, 1e-9).inductance
    assert shorted == pytest.approx(coil * (1 - coupling**2), rel=1e-6)
    assert impedance_inductance >= shorted * (1 - 1e-9)
    assert link_load(frequency, coil, link, -mutual, resistance).resistance > 0.0


def test_uncoupled_link_is_no_load() -> None:
    """No mutual inductance, no resistance across the tank."""
    seen = link_load(7.1e6, 4e-6, 5e-7, 0.0, 50.0)
    assert seen.resistance == np.inf
    assert seen.inductance == pytest.approx(4e-6, rel=1e-12)
