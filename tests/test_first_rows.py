"""What comes first from the shipped parts is something that a technician would wind."""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
import pytest
from smallstock import former, inductor, stock, wire

import partpick
from partpick.candidates import realisable_coils
from partpick.planfile import request_from_tables
from partpick.report.windings_table import windings_table
from partpick.request import Band, CoilRules, Request
from partpick.result import Candidate
from partpick.solving import windings

# Usual reactance of a tank by frequency, from the contract (common practice, no source). [ohm]
WINDOWS = {
    "455 kHz": (200, 1500),
    "1.9 MHz": (60, 400),
    "3.6 MHz": (60, 400),
    "7.1 MHz": (60, 400),
    "14.2 MHz": (60, 400),
    "28.5 MHz": (60, 400),
    "145 MHz": (30, 150),
}


@cache
def _catalogue() -> partpick.Catalogue:
    return partpick.load_catalogue()


def first(at: str, count: int, **tables: Any) -> tuple[Candidate, ...]:
    request = request_from_tables({"band": [{"at": at}], **tables}, "pair")
    return partpick.solve(request, _catalogue(), top=count).candidates


@pytest.mark.parametrize("at", WINDOWS)
def test_the_first_three_are_inside_every_usual_window(at: str) -> None:
    """Strays under 20 %, length 0.4 to 2.5 diameters, reactance as usual there, wire of 0.3 to 1.0 mm."""
    low, high = WINDOWS[at]
    bare = {used.name: used.bare_diameter for used in _catalogue().wires}
    three = first(at, 3)
    assert len(three) == 3
    for candidate in three:
        (band,), (coil,) = candidate.bands, candidate.coils
        assert low <= band.reactance <= high
        assert band.capacitance is not None
        assert (band.stray + band.self_capacitance) / band.capacitance < 0.2
        if coil.wire is not None:
            assert 0.3e-3 <= bare[coil.wire] <= 1.0e-3
        if coil.form == "solenoid":
            assert coil.winding_length is not None and coil.mean_diameter is not None
            assert 0.4 <= coil.winding_length / coil.mean_diameter <= 2.5


SMALL = (former(4, 8, "twin"), wire(0.8, 0.861), inductor(10e-9, self_capacitance=1e-13))


def coils_at(frequency: float, **rules: Any) -> Any:
    request = Request(command="pair", bands=(Band(name="vhf", at=frequency),), coil=CoilRules(**rules))
    return realisable_coils(request, stock(*SMALL))


def test_no_winding_is_offered_whose_leads_decide() -> None:
    """Three times 8 nH, that of a centimetre of lead (common practice, no source); bought coils are exempt."""
    coils = coils_at(145e6)
    usable = coils.in_play[:, 0]
    wound = coils.turns > 0
    assert (coils.inductance[usable & wound, 0] >= 24e-9).all() and (usable & wound).any()
    assert usable[~wound].all()
    every = coils_at(145e6, least_wound=0.0)
    more = every.in_play[:, 0] & (every.turns > 0)
    assert np.sort(every.inductance[more, 0])[0] < 24e-9
    kept = np.sort(every.inductance[more & (every.inductance[:, 0] >= 24e-9), 0])
    assert kept == pytest.approx(np.sort(coils.inductance[usable & wound, 0]))


def test_windings_lists_them_with_a_word() -> None:
    """They can be wound, and are told apart."""
    request = Request(command="pair", bands=(), coil=CoilRules())
    listed = windings(request, stock(*SMALL))
    small = [coil for coil in listed if coil.turns and coil.inductance < 24e-9]
    assert small and all("leads" in str(coil.extra["note"]) for coil in small)
    assert not [coil for coil in listed if "note" in coil.extra and coil not in small]
    assert "its leads decide" in " ".join(windings_table(small).split())


def test_nothing_but_tiny_windings_is_told() -> None:
    """Where only that rule stands in the way, it is named with the coil that would be left."""
    tables = {"band": [{"at": "145 MHz"}], "coil": {"forms": ["solenoid"], "inductance": ["10 nH", "20 nH"]}}
    result = partpick.solve(request_from_tables(tables, "pair"), _catalogue())
    assert not result.candidates and result.ruled_out_by is not None
    every = (result.ruled_out_by, *result.ruled_out_by.others)
    (told,) = [ruled for ruled in every if ruled.limit == "least_wound"]
    assert "below 24 nH the leads decide" in told.text
    assert isinstance(told.needed, float) and told.needed < 24e-9


def test_at_very_high_frequencies_bought_inductors_serve() -> None:
    """At 433 MHz every winding that fits is all leads: chips are what is offered."""
    candidates = first("433 MHz", 3)
    assert candidates and all(c.coils[0].form == "bought" for c in candidates)
