"""Coils are left out early only where the limits on coils would leave them out anyway."""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import partpick
from partpick import candidates
from partpick.candidates import Coils, realisable_coils
from partpick.forms.screen import Screen
from partpick.physics.solenoid import high_frequency_inductance, least_high_frequency_inductance
from partpick.planfile import request_from_tables

RULES: tuple[dict[str, Any], ...] = (
    {},
    {"self_resonance": 2.0},
    {"self_resonance": "none", "inductance": ["1 µH", "3 µH"]},
    {"reactance": ["60 ohm", "300 ohm"], "proportions": "none"},
    {"proportions": [0.8, 1.2], "forms": ["solenoid", "ring core"]},
)


@cache
def _catalogue() -> partpick.Catalogue:
    return partpick.load_catalogue()


def in_play(coils: Coils) -> dict[tuple[str, str, str, int], tuple[bool, ...]]:
    """Return what can be used at which band, by form, former, wire and turns, with the inductance in full."""
    usable = coils.in_play.any(axis=1)
    found = {}
    for coil in np.flatnonzero(usable):
        block, row = coils.locate(int(coil))
        wire = block.wires[block.wire[row]].name if block.wire[row] >= 0 else ""
        name = block.form, coils.supports[int(coils.support[coil])].name, wire, int(coils.turns[coil])
        found[name] = tuple(coils.in_play[coil])
    return found


@pytest.mark.parametrize("rules", RULES, ids=str)
@pytest.mark.parametrize("bands", [("455 kHz",), ("7.1 MHz", "21 MHz"), ("145 MHz",)], ids=str)
def test_nothing_that_a_band_can_use_is_left_out(
    rules: dict[str, Any], bands: tuple[str, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The same coils in play with and without, out of 120,000: a coil lost here would be a false "optimal"."""
    tables = {"band": [{"name": at, "at": at} for at in bands], "coil": rules}
    request = request_from_tables(tables, "bands")
    early = realisable_coils(request, _catalogue())
    monkeypatch.setattr(candidates, "_screen", lambda _: Screen())
    late = realisable_coils(request, _catalogue())
    assert in_play(early) == in_play(late)
    assert len(early) < len(late) == early.considered == late.considered


def test_tapped_coils_are_all_kept() -> None:
    """A section of a coil that is too large as a whole may do."""
    tables = {"band": [{"name": "one", "at": "7.1 MHz"}], "coil": {"taps": True}}
    coils = realisable_coils(request_from_tables(tables, "bands"), _catalogue())
    assert len(coils) == coils.considered


@settings(max_examples=200)
@given(
    st.integers(1, 200), st.floats(0.02, 1.0), st.floats(1.0, 40.0), st.floats(1e-3, 400.0), st.floats(1e-9, 1e-3)
)
def test_the_least_inductance_is_never_above_the_inductance(
    turns: int, d_over_s: float, slender: float, a_over_delta: float, dc: float
) -> None:
    """Over all that the published table of proximity holds, at any frequency."""
    from partpick.physics.proximity import solenoid_proximity_factor
    from partpick.physics.skin import internal_inductance_ratio

    diameter = slender * 1e-3 / d_over_s
    l_over_d = turns * 1e-3 / d_over_s / diameter
    factor = solenoid_proximity_factor(turns, d_over_s, l_over_d)
    internal = internal_inductance_ratio(a_over_delta)
    exact = high_frequency_inductance(dc, turns, diameter, factor, a_over_delta, internal)
    assert least_high_frequency_inductance(dc, turns, diameter, d_over_s) <= max(exact, 0.0) * (1 + 1e-9) + 1e-30
