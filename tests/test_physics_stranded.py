"""Loss of stranded wire and of layers: limits, and fields summed afresh."""

from __future__ import annotations

import numpy as np
import pytest

from partpick.physics import loss, skin
from partpick.physics.coaxial_field import ring_field
from partpick.physics.stranded import layered_resistance, section_field, stranded_resistance, window_field


def stranded(x: float, strands: int = 30, pitch: float = np.inf) -> loss.CopperLoss:
    """Return the loss of an invented bundle of 0.05 mm strands, relative to its direct-current resistance."""
    bundle = 0.05e-3 * 1.25 * np.sqrt(strands)
    return stranded_resistance(1.0, x, strands, 0.05e-3, bundle, pitch, np.inf)


def test_one_straight_strand_is_a_round_wire() -> None:
    """Limiting case: no neighbours."""
    assert stranded(2.0, strands=1).total == pytest.approx(skin.skin_ratio(2.0))


def test_many_strands_follow_the_field_of_an_even_current() -> None:
    """Inside a bundle of even current <H^2> = I^2/(2 pi^2 D^2): integrated here, low-frequency eddy loss."""
    x, strands, strand = 0.3, 10**6, 0.05e-3
    bundle = strand * 1.25 * np.sqrt(strands)
    radius = np.linspace(0.0, bundle / 2.0, 20001)
    field = radius / (2.0 * np.pi * (bundle / 2.0) ** 2)  # per ampere
    mean = np.trapezoid(field**2 * 2.0 * np.pi * radius, radius) / (np.pi * (bundle / 2.0) ** 2)
    # Loss per strand pi H^2 x^4/sigma over I^2 rho/(pi a^2), low-frequency limit (Terman 1943, from memory).
    expected = x**4 / 8.0 * 2.0 * (np.pi * strand * strands) ** 2 * mean
    assert stranded(x, strands=strands).proximity == pytest.approx(expected, rel=0.01)


@pytest.mark.parametrize(("strands", "crowding"), [(3, 1.55), (9, 1.84), (27, 1.92)])
def test_few_strands_crowd_each_other_less(strands: int, crowding: float) -> None:
    """The published constant of a straight bundle (Terman 1943, from memory), in units of (n d/D)^2 G."""
    packing = np.sqrt(strands) / 1.25  # n d/D of the invented bundle
    g = skin.transverse_loss_ratio(0.5)
    assert stranded(0.5, strands=strands).proximity == pytest.approx(crowding * packing**2 * g / 2.0)


def test_turns_add_to_the_loss_of_strands() -> None:
    """A coil's field crosses every strand; a straight wire has its own only."""
    assert stranded(0.5, pitch=0.5e-3).total > stranded(0.5).total
    # Thin single strand in an endless coil: (Phi - 1) g of the solid wire, first order in (d/s)^2.
    coil = stranded_resistance(1.0, 3.0, 1, 0.1e-3, 0.1e-3, 1e-3, np.inf)
    solid = loss.ring_resistance(1.0, 3.0, 0.1)
    assert coil.proximity == pytest.approx(solid.proximity, rel=0.02)


def test_stranded_wire_wins_at_medium_and_loses_at_high_frequency() -> None:
    """The reason for stranded wire at 100 kHz to 2 MHz, and against it above (common practice, no source)."""
    solid_radius = 0.05e-3 / 2.0 * np.sqrt(30)
    for frequency, wins in [(500e3, True), (10e6, False)]:
        depth = skin.skin_depth(frequency)
        solid = skin.skin_ratio(solid_radius / depth)
        assert (stranded(0.025e-3 / depth).total < solid) == wins


def test_layers_of_one_turn_each_are_one_layer() -> None:
    """Cousins: a window with one layer loses what an endless single layer does, in the thin-wire limit."""
    pitch = 1e-3
    layered = layered_resistance(1.0, 3.0, 1, 0.1e-3, 0.1e-3, window_field(10, 10 * pitch, 1))
    single = stranded_resistance(1.0, 3.0, 1, 0.1e-3, 0.1e-3, pitch, np.inf)
    assert layered.proximity == pytest.approx(single.proximity, rel=1e-3)
    assert layered.skin == single.skin


@pytest.mark.parametrize("layers", [1, 2, 3, 7])
def test_the_window_field_is_the_sum_over_its_layers(layers: int) -> None:
    """Layer p of m meets the mean of the fields on its two sides, (p - 1/2)/m of N/w."""
    met = (np.arange(layers) + 0.5) / layers
    assert window_field(60, 5e-3, layers) == pytest.approx(60 / 5e-3 * np.sqrt(np.mean(met**2)))


@pytest.mark.parametrize(("length", "depth"), [(0.2, 0.1), (0.45, 0.2), (0.45, 0.4), (1.0, 0.1)])
def test_the_section_field_is_within_its_stated_15_percent(length: float, depth: float) -> None:
    """Field of 12 by 12 rings on each of them, its own left out; mean diameter 1."""
    count = 12
    steps = (np.arange(count) + 0.5) / count - 0.5
    radius, height = (grid.ravel() for grid in np.meshgrid(0.5 + depth * steps, length * steps, indexing="ij"))
    other = ~np.eye(len(radius), dtype=bool)
    apart = np.subtract.outer(height, height)
    field = ring_field(
        np.broadcast_to(radius[None, :], apart.shape)[other],
        np.broadcast_to(radius[:, None], apart.shape)[other],
        apart[other],
    )
    axial, radial = np.zeros(apart.shape), np.zeros(apart.shape)
    axial[other], radial[other] = field
    square = axial.sum(axis=1) ** 2 + radial.sum(axis=1) ** 2
    summed = np.sqrt(np.average(square, weights=radius)) / len(radius)
    assert section_field(1, 1.0, length, depth) == pytest.approx(summed, rel=0.15)


def test_more_layers_of_thick_wire_lose_more_than_thin_ones() -> None:
    """Why a full window of thick wire is no good at 500 kHz: loss by proximity goes with the wire's square."""
    depth = skin.skin_depth(500e3)
    thin, thick = (
        layered_resistance(1.0, d / 2 / depth, 1, d, d, window_field(60, 5e-3, 5)) for d in (0.1e-3, 0.5e-3)
    )
    assert thick.proximity / thick.skin > thin.proximity / thin.skin
