"""Contacts of the band switch: the limit in the search against plain enumeration, and what is told of the switch."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from handmade import STRAY, band, coil
from test_search_against_enumeration import found_in
from test_taps import plain_columns, random_sections
from tiny.brute_force import ranking
from tiny.random_problem import random_problem, random_swept_problem

from partpick.band_switch import contacts_of, switch_entry
from partpick.catalogue import load_catalogue
from partpick.circuit import Design, Network
from partpick.planfile import request_from_tables
from partpick.progress import Quiet
from partpick.search.bands import search_bands
from partpick.search.taps import TappedSource
from partpick.solving import solve

SHAPES = {
    "one coil": {"bands": 2},
    "two coils": {"bands": 2, "inductors": 2},
    "two coils for three bands": {"bands": 3, "inductors": 2},
    "with other limits": {"bands": 2, "inductors": 2, "coupled": True},
    "swept": {"bands": 2, "swept": 2},
    "mixed": {"bands": 2, "swept": 1, "inductors": 2},
}


def agree(seed: int, shape: dict[str, int]) -> tuple[bool, bool]:
    """Compare every rank; return whether there were plans, and whether the limit took some away."""
    free = random_swept_problem(seed, **shape) if "swept" in shape else random_problem(seed, **shape)
    limit = int(np.random.default_rng(seed + 7).integers(free.bands - 1, 2 * free.bands + 1))
    problem = replace(free, contacts_limit=limit)
    wanted, _ = ranking(problem)
    assert [choice.key for choice in found_in(problem).choices] == wanted, f"seed {seed}, at most {limit}"
    return bool(wanted), wanted != ranking(free)[0]


def agree_tapped(seed: int) -> tuple[bool, bool]:
    """Compare every rank of a tapped problem."""
    free = random_problem(seed, bands=2, inductors=1 + seed % 2)
    sections = random_sections(free, seed)
    problem = replace(free, contacts_limit=int(np.random.default_rng(seed + 7).integers(0, 5)))

    def plain(made, coil, band):
        return plain_columns(made, sections, coil, band)

    def chosen(coils):
        keep = np.isin(sections.coil, coils)
        return replace(sections, **{name: value[keep] for name, value in vars(sections).items()})

    counts = np.bincount(sections.coil, minlength=free.coils)
    source = TappedSource(problem, chosen, counts)
    found = search_bands(problem, source, wanted=100, all_windings=False, monitor=Quiet())
    wanted, _ = ranking(problem, plain)
    assert [choice.key for choice in found.choices] == wanted, f"seed {seed}"
    return bool(wanted), wanted != ranking(free, plain)[0]


@pytest.mark.parametrize("name", SHAPES)
def test_the_limit_on_contacts_equals_plain_enumeration(name: str) -> None:
    """A plan that one contact fewer would do must not be called impossible."""
    seen = [agree(seed, SHAPES[name]) for seed in range(20 if "swept" in SHAPES[name] else 80)]
    assert sum(any_plan for any_plan, _ in seen) > 2 and any(bound for _, bound in seen)


def test_the_limit_on_contacts_with_taps_equals_plain_enumeration() -> None:
    """A tap brings a pole of its own, so that the whole coil may be the better choice."""
    seen = [agree_tapped(seed) for seed in range(30)]
    assert sum(any_plan for any_plan, _ in seen) > 2 and any(bound for _, bound in seen)


@pytest.mark.slow
@pytest.mark.parametrize("name", SHAPES)
def test_the_limit_on_contacts_equals_plain_enumeration_at_length(name: str) -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1200):
        agree(seed, SHAPES[name])


@pytest.mark.slow
def test_the_limit_on_contacts_with_taps_equals_plain_enumeration_at_length() -> None:
    """The same over more instances than the default suite has time for."""
    for seed in range(1000, 1200):
        agree_tapped(seed)


# ---------------------------------------------------------------- what is told


def tables(switching: str, **limits: object) -> dict[str, object]:
    bands = [{"name": name, "at": at} for name, at in (("low", "3.6 MHz"), ("mid", "7.1 MHz"), ("high", "14.1 MHz"))]
    plan = {"switching": switching, "limits": {"error": "2 %", **limits}, "band": bands}
    return {**plan, "coil": {"forms": ["bought"]}}


def solved(switching: str, **limits: object):
    return solve(request_from_tables(tables(switching, **limits), "bands"), load_catalogue(None), top=1)


def test_a_stack_has_one_contact_fewer_than_bands_and_shorts_progressively() -> None:
    """The capacitors of the highest band are wired; each position keeps the contacts of those above closed."""
    first = solved("stacked", contacts=2).candidates[0]
    switch = first.extra["switch"]
    assert switch["kind"] == "progressive shorting" and switch["contacts"] == 2
    assert [band.contacts for band in first.bands] == [("S1", "S2"), ("S2",), ()]
    assert not solved("stacked", contacts=1).candidates


def test_a_shared_set_is_no_larger_than_its_contacts() -> None:
    """Each capacitor of the set has a relay or a toggle of its own."""
    free = solved("shared", parts=5).candidates[0]
    assert free.extra["switch"]["contacts"] == free.part_count
    limited = solved("shared", parts=5, contacts=free.part_count - 1)
    assert limited.ruled_out_by is None or limited.ruled_out_by.limit in ("error", "contacts")
    for candidate in limited.candidates:
        assert candidate.part_count < free.part_count


def test_contacts_told_are_those_that_the_search_counts() -> None:
    """The limit would mean nothing if table and search counted differently."""
    several = solved("separate", inductors=2, contacts=6)
    for candidate in several.candidates:
        closing = {contact for band in candidate.bands for contact in band.contacts}
        assert len(closing) == candidate.extra["switch"]["contacts"] <= 6


def test_nothing_fits_names_the_contacts_and_how_many_would_do() -> None:
    """Every limit in force is tried by itself."""
    ruled = solved("stacked", contacts=0).ruled_out_by
    assert ruled is not None and (ruled.limit, ruled.needed) == ("contacts", 2)


def test_trimmers_taps_and_swept_bands_have_poles_of_their_own() -> None:
    """Counted by hand: two trimmers with one capacitor each, one band on a tap, one padder in series."""
    plan = {
        "band": [
            {"name": "a", "at": "3.6 MHz", "trimmer": "3pF..20pF"},
            {"name": "b", "from": "7 MHz", "to": "7.2 MHz"},
            {"name": "c", "at": "14.1 MHz"},
        ],
        "tuning": "variable capacitor:12pF..150pF",
    }
    request = request_from_tables(plan, "bands")
    networks = (Network(parts=(), shape=0), Network(parts=(), shape=0, series=0), Network(parts=(), shape=0))
    whole = contacts_of(request, Design(coils=(0, 0, 0), networks=networks))
    assert [contact.name for contact in whole] == ["S1", "SV2"]
    tapped = contacts_of(request, Design(coils=(0, 0, 0), networks=networks, taps=(None, None, 5)))
    assert [contact.name for contact in tapped] == ["S1", "SL1", "SL2", "SL3", "SV2"]


def test_an_idle_coil_that_resonates_in_a_band_is_named() -> None:
    """By hand: 2.2 uH with 3 pF of its own and up to all strays beside rings from below 50 MHz to 62 MHz."""
    bands = [band("low", 7e6, 230e-12, ["C1"], coil="L1"), band("high", 50e6, 20e-12, ["C2"], coil="L2")]
    first = coil("L1", inductance=2.2e-6, self_capacitance=3e-12)
    coils = [first, coil("L2", inductance=0.4e-6, self_capacitance=1e-12)]
    request = request_from_tables({"band": [{"name": "low", "at": 7e6}, {"name": "high", "at": 50e6}]}, "bands")
    idle = switch_entry(request, (), bands, coils)["switch"]["idle_coils"]
    assert idle[0]["resonance_low_hz"] == pytest.approx(1 / (2 * math.pi * math.sqrt(2.2e-6 * (3e-12 + STRAY))))
    assert idle[0]["near"] == ["high"] and idle[1]["near"] == []
    assert idle[0]["resonance_high_hz"] == pytest.approx(1 / (2 * math.pi * math.sqrt(2.2e-6 * 3e-12)))
