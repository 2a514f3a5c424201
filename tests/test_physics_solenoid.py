"""Coils summed turn by turn, and their inductance at radio frequency."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from partpick.physics import filaments, sheet, solenoid
from partpick.physics.proximity import solenoid_proximity_factor
from partpick.physics.skin import MU_0, internal_inductance_ratio, transverse_loss_ratio

PUBLISHED = Path(__file__).parent / "published"
families = st.tuples(st.integers(0, 60), st.floats(3e-3, 0.2), st.floats(1e-4, 1e-3), st.floats(1.0, 3.0))


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.mark.parametrize("row", rows("solenoid_round_wire.csv"), ids=lambda r: r["N"])
def test_summed_turns_are_the_published_sum(row: dict[str, str]) -> None:
    """Rings by Maxwell and by Rayleigh and Niven; a true helix lies up to 0.4 % lower at 10 wires' width."""
    n, d, w, p = int(row["N"]), float(row["d_mean_m"]), float(row["wire_d_m"]), float(row["pitch_m"])
    computed = solenoid.solenoid_family(n, d, w, p)[-1]
    assert computed == pytest.approx(float(row["L_discrete_loops_H"]), rel=float(row["rel_tol"]))
    assert 1.0 <= computed / float(row["L_helix_azimuthal_H"]) <= 1.004


def test_the_sum_is_the_plain_double_sum() -> None:
    """Two cumulative sums stand for every pair of turns."""
    n, d, w, p = 23, 0.021, 0.0007, 0.0011
    place = np.arange(n) * p
    first, second = np.triu_indices(n, 1)
    pairs = filaments.mutual_inductance(d / 2.0, d / 2.0, place[second] - place[first])
    plain = n * filaments.loop_inductance(d, w) + 2.0 * pairs.sum()
    assert solenoid.solenoid_family(n, d, w, p)[-1] == pytest.approx(plain, rel=1e-13)


def test_one_turn_is_a_loop() -> None:
    """The shortest coil."""
    assert solenoid.solenoid_family(1, 0.02, 1e-3, 2e-3)[0] == filaments.loop_inductance(0.02, 1e-3)


def test_a_very_long_coil_is_a_current_sheet() -> None:
    """The closed form's corrections fade: 4000 turns of fine wire, 1 m on 10 mm."""
    n, d, w, p = 4000, 0.01, 2e-4, 2.5e-4
    summed = solenoid.solenoid_family(n, d, w, p)[-1]
    assert summed == pytest.approx(sheet.solenoid_inductance(n, d, w, p), rel=2e-4)


@given(st.lists(families, min_size=1, max_size=5))
def test_a_family_does_not_notice_its_neighbours(asked: list[tuple[int, float, float, float]]) -> None:
    """Bit for bit: the order of rows in a file must not change a rank."""
    each = [(n, d, min(w, d / 5), min(w, d / 5) * s) for n, d, w, s in asked]
    together = solenoid.solenoid_families(*(list(column) for column in zip(*each, strict=True)))
    apart = [solenoid.solenoid_family(*one) for one in each]
    assert together.tolist() == [value for family in apart for value in family.tolist()]


def test_families_without_turns_take_no_place() -> None:
    """A wire that does not fit a former."""
    assert solenoid.solenoid_families([], [], [], []).shape == (0,)
    assert solenoid.solenoid_families([0, 2, 0], 0.02, 1e-3, 2e-3).shape == (2,)


@given(families)
def test_inductance_grows_faster_than_turns_and_slower_than_their_square(
    family: tuple[int, float, float, float],
) -> None:
    """Coupling lies between nothing and all."""
    n, d, w, spacing = family
    wire = min(w, d / 5)
    inductance = solenoid.solenoid_family(n + 2, d, wire, wire * spacing)
    turns = np.arange(1, n + 3)
    assert np.all(np.diff(inductance / turns) > 0.0)
    assert np.all(np.diff(inductance / turns**2) < 0.0)


@given(families, st.floats(1.001, 3.0))
def test_wider_coils_have_more_inductance(family: tuple[int, float, float, float], wider: float) -> None:
    """At the same wire and pitch."""
    n, d, w, spacing = family
    wire = min(w, d / 5)
    narrow, wide = (solenoid.solenoid_family(n + 1, k * d, wire, wire * spacing) for k in (1.0, wider))
    assert np.all(wide > narrow)


@given(families, st.floats(0.1, 10.0))
def test_larger_coils_have_more_inductance_in_proportion(family: tuple[int, float, float, float], k: float) -> None:
    """Magnetostatics has no length of its own."""
    n, d, w, spacing = family
    wire = min(w, d / 5)
    small, large = (solenoid.solenoid_family(n + 1, s * d, s * wire, s * wire * spacing) for s in (1.0, k))
    assert large == pytest.approx(k * small, rel=1e-10)


@pytest.mark.parametrize("row", rows("high_frequency_inductance.csv"), ids=lambda r: r["N"])
def test_radio_frequency_takes_as_much_as_boundary_elements_say(row: dict[str, str]) -> None:
    """No internal inductance, the turns perfect conductors; any coil of these proportions."""
    n, ratio, proportion, factor = (float(row[key]) for key in ("N", "d_over_s", "l_over_D", "Phi_BEM"))
    d = 0.02
    p = proportion * d / n
    low = solenoid.solenoid_family(int(n), d, ratio * p, p)[-1]
    high = solenoid.high_frequency_inductance(low, n, d, factor, np.inf, 0.0)
    assert high / low == pytest.approx(float(row["L_hf_ext_over_L_dc_BEM"]), rel=float(row["rel_tol"]))
    # the same formula worked apart, its factor rounded to four figures
    assert high / low == pytest.approx(float(row["formula_over_L_dc"]), abs=3e-5)
    # the stated error is one of sign: the formula is never below
    assert high / low >= float(row["L_hf_ext_over_L_dc_BEM"]) - 2e-5


def test_without_skin_effect_nothing_is_lost() -> None:
    """Low frequency: the whole internal inductance, no reaction of the neighbours."""
    low = solenoid.high_frequency_inductance(1e-6, 10, 0.02, 2.0, 1e-3, internal_inductance_ratio(1e-3))
    assert low == pytest.approx(1e-6, rel=1e-9)


def test_the_internal_inductance_is_that_of_the_wire() -> None:
    """mu0/(8 pi) for each metre of wire."""
    lost = 1e-6 - solenoid.high_frequency_inductance(1e-6, 10, 0.02, 1.0, np.inf, 0.0)
    assert lost == pytest.approx(MU_0 / (8.0 * np.pi) * np.pi * 0.02 * 10)


@given(st.floats(0.01, 3.0), st.floats(0.05, 100.0), st.floats(0.1, 0.9))
def test_inductance_falls_with_frequency(proportion: float, x: float, ratio: float) -> None:
    """Skin and proximity effect only ever push the field out of the copper."""
    factor = solenoid_proximity_factor(20, ratio, proportion)
    at = np.array([x, 1.1 * x])
    inductance = solenoid.high_frequency_inductance(1e-6, 20, 0.02, factor, at, internal_inductance_ratio(at))
    assert inductance[1] < inductance[0] <= 1e-6


def test_reaction_follows_its_limits() -> None:
    """x^4/12 at low frequency; a cylinder half a skin depth thinner where the skin is thin."""
    assert solenoid.reaction_ratio([0.1, 0.2]) == pytest.approx([1e-4 / 12, 16e-4 / 12], rel=1e-3)
    assert solenoid.reaction_ratio([50.0, 500.0]) == pytest.approx([1 - 1 / 50, 1 - 1 / 500], rel=1e-3)
    assert solenoid.reaction_ratio([0.0, np.inf]).tolist() == [0.0, 1.0]
    before, after = solenoid.reaction_ratio([1000.0 * (1 - 1e-12), 1000.0 * (1 + 1e-12)])
    assert before == pytest.approx(after, rel=1e-8)
    assert np.isnan(solenoid.reaction_ratio(-1.0))
    assert solenoid.reaction_ratio(np.ones((2, 3))).shape == (2, 3)


def test_reaction_and_loss_are_one_response() -> None:
    """Causality (Kramers and Kronig): the reaction at one frequency follows from the loss at all of them.

    The loss is that of `skin.transverse_loss_ratio`, written from another formula: the response of a wire,
    -J2(z)/J0(z), has the imaginary part 2 g/x^2, with x^2 proportional to frequency.
    """
    log = np.linspace(np.log(1e-8), np.log(1e12), 100_000)
    frequency = np.exp(log)

    def loss(w: np.ndarray) -> np.ndarray:
        return 2.0 * transverse_loss_ratio(np.sqrt(w)) / w

    for x in (0.5, 1.5, 3.0, 8.0):
        w = x * x
        # the singular part, whose principal value is nought, is taken off
        numerator = frequency**2 * loss(frequency) - w * frequency * loss(np.array(w))
        integral = np.sum(numerator / (frequency**2 - w**2)) * (log[1] - log[0])
        assert solenoid.reaction_ratio(x) == pytest.approx(1.0 - 2.0 / np.pi * integral, abs=1e-4)
