"""Tapped coils: the search against plain enumeration, and the sections against published sums."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest
from tiny.brute_force import band_columns, ranking
from tiny.random_problem import random_problem
from tiny.random_sections import places_of

from partpick.candidates import realisable_coils
from partpick.catalogue import load_catalogue
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.bands import search_bands
from partpick.search.problem import Problem
from partpick.search.taps import Sections, TappedSource
from partpick.solving import solve

SHAPES = ({"bands": 1}, {"bands": 2}, {"bands": 2, "inductors": 2}, {"bands": 2, "coupled": True})


def random_sections(problem: Problem, seed: int) -> Sections:
    """Give each coil a few sections with figures of any other coil."""
    rng = np.random.default_rng(seed)
    counts = rng.integers(0, 3, problem.coils)
    coil = np.repeat(np.arange(problem.coils), counts)
    turns = np.concatenate([3 + np.arange(n) for n in counts] or [np.empty(0)]).astype(np.int64)
    return Sections(
        coil=coil,
        turns=turns,
        row=rng.integers(0, problem.coils, len(coil)),
        self_capacitance=rng.choice([1e-12, 2e-12], len(coil)),
        further_loss=rng.choice([0.0, 1e-3], (len(coil), problem.bands)),
        further_loss_low=rng.choice([0.0, 1e-3], (len(coil), problem.bands)),
        in_play=rng.random((len(coil), problem.bands)) < 0.9,
    )


def plain_columns(problem: Problem, sections: Sections, coil: int, band: int) -> list[dict[str, object]]:
    """Return the columns of the whole coil and of its sections, each worked out as a coil by itself."""
    found = []
    for alone, row, tap in places_of(problem, sections, coil):
        section = {"coil": coil, "tap": tap} if tap else {}
        found += [{**column, **section} for column in band_columns(alone, row, band)]
    return found


@pytest.mark.parametrize("shape", SHAPES, ids=str)
def test_tapped_plans_equal_plain_enumeration(shape: dict[str, int]) -> None:
    """A tap left out or misplaced would be a false "optimal"."""
    with_taps = 0
    for seed in range(60):
        problem = random_problem(seed, **shape)
        every = random_sections(problem, seed)

        def some(coils: np.ndarray, every: Sections = every) -> Sections:
            kept = np.flatnonzero(np.isin(every.coil, coils))
            return Sections(*(getattr(every, field.name)[kept] for field in fields(every)))

        counts = np.bincount(every.coil, minlength=problem.coils)
        source = TappedSource(problem, some, counts)
        found = search_bands(problem, source, wanted=50, all_windings=False, monitor=Quiet())
        wanted, _ = ranking(problem, lambda p, j, b, every=every: plain_columns(p, every, j, b))
        assert [choice.key for choice in found.choices] == wanted, f"seed {seed}"
        with_taps += any(int(c.tap[0]) for choice in found.choices for c in choice.columns)
    assert with_taps > 2, "the sample must hold plans that use a tap"


def tapped_request(**limits: object):
    tables = {
        "coil": {"taps": True, "forms": ["solenoid"]},
        "limits": limits,
        "band": [{"name": "low", "at": "3.6 MHz"}, {"name": "high", "at": "14.1 MHz"}],
    }
    return request_from_tables(tables, "bands")


def small_catalogue():
    """Return the shipped parts with a handful of formers, so that the test takes a moment only."""
    catalogue = load_catalogue(None)
    return replace(catalogue, formers=tuple(f for f in catalogue.formers if f.support == "ribbed")[:3])


def test_sections_have_the_mutual_inductance_of_summed_rings() -> None:
    """The idle turns swing with (Ls + M)/Ls, checked against the rings summed by hand here.

    Maxwell's mutual inductance of coaxial rings (Treatise, 1873, vol. 2, sec. 701) by scipy's elliptic integrals.
    """
    from scipy.special import ellipe, ellipk

    coils = realisable_coils(tapped_request(), load_catalogue(None))
    coil = next(j for j in range(len(coils)) if coils.turns[j] == 20)
    block, row = coils.locate(coil)
    radius, pitch, n = block.mean_diameter[row] / 2, block.pitch[row], 8

    def mutual(distance: float) -> float:
        k2 = 4 * radius**2 / (4 * radius**2 + distance**2)
        k = np.sqrt(k2)
        return 4e-7 * np.pi * radius * ((2 / k - k) * ellipk(k2) - 2 / k * ellipe(k2))

    between = sum(mutual((b - a) * pitch) for a in range(n) for b in range(n, 20))
    ratio = 1 + between / coils.inductance_dc[coils.section_row(coil, n)]
    expected = coils.self_capacitance[coil] * ratio**2
    assert float(coils.section_self_capacitance(coil, n)) == pytest.approx(expected, rel=1e-6)


def test_a_tapped_plan_names_the_tap_and_agrees_with_itself() -> None:
    """Tap, inductance and capacitance of a band must belong together."""
    result = solve(tapped_request(q=60), small_catalogue(), top=3)
    assert result.proof.status == "optimal"
    best = result.candidates[0]
    assert any(band.tap_turns for band in best.bands)
    for band in best.bands:
        assert band.tap_turns is None or 3 <= band.tap_turns < best.coils[0].turns
        assert band.resonance == pytest.approx(1 / (2 * np.pi * np.sqrt(band.inductance * band.capacitance)), rel=1e-14)


def test_idle_turns_never_resonate_near_a_band() -> None:
    """`self_resonance` is of the coil as it is wound: 1/(2 pi sqrt(L C)) of all its turns, also behind a tap."""
    everything = load_catalogue(None)
    long_tube = tuple(f for f in everything.formers if f.name == "ceramic tube 20x50 twin")
    wires = tuple(w for w in everything.wires if w.name in ("AWG 28", "AWG 36"))
    catalogue = replace(everything, formers=long_tube, wires=wires, cores=(), inductors=())
    tables = {"coil": {"taps": True}, "band": [{"name": "a", "at": "2.11 MHz"}, {"name": "b", "at": "5.2 MHz"}]}
    request = replace(request_from_tables(tables, "bands"), by="error", all_windings=True)
    tapped = 0
    for candidate in solve(request, catalogue, top=30).candidates:
        (coil,) = candidate.coils
        own = 1 / (2 * np.pi * np.sqrt(coil.inductance * coil.self_capacitance))
        used = [band.target for band in candidate.bands]
        tapped += any(band.tap_turns is not None for band in candidate.bands)
        assert own >= 3 * max(used) * (1 - 1e-3)  # inductance falls a little from band to band
    assert tapped


def test_taps_never_make_the_first_plan_worse() -> None:
    """Every plan without taps is a plan with taps allowed."""
    catalogue = small_catalogue()
    request = tapped_request(q=60)
    without = replace(request, coil=replace(request.coil, taps=False))
    assert (
        solve(request, catalogue, top=1).candidates[0].piece_count
        <= solve(without, catalogue, top=1).candidates[0].piece_count
    )
