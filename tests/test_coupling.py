"""Two coupled tanks and the image of a receiver, from plan to answer, against scikit-rf and plain enumeration."""

from __future__ import annotations

import itertools
import math
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import skrf

import partpick
from partpick.catalogue import select_capacitors
from partpick.errors import RequestError
from partpick.planfile import request_from_tables
from partpick.request import CapacitorRules
from partpick.result import BandFigures, Candidate

PLANS = Path(__file__).resolve().parents[1] / "data" / "plans"


@cache
def catalogue() -> partpick.Catalogue:
    return partpick.load_catalogue()


def solved(**tables: Any) -> Candidate:
    plan = {"band": [{"at": "7.1 MHz"}], **tables}
    return partpick.solve(request_from_tables(plan, "pair"), catalogue(), top=1).candidates[0]


def pair_of(band: BandFigures) -> dict[str, Any]:
    pair = band.extra["coupling"]
    assert isinstance(pair, dict)
    return pair


def transfer(band: BandFigures, frequencies: np.ndarray) -> np.ndarray:
    """Return the size of the voltage across the second tank for one ampere into the first, by scikit-rf. [ohm]"""
    pair, load = pair_of(band), band.extra.get("load")
    loaded = load["loaded_q"] if isinstance(load, dict) else band.q
    coupling = pair["factor"] * pair["capacitance_f"]
    x = math.sqrt(band.inductance / pair["capacitance_f"])
    assert band.q and loaded
    order = np.argsort(frequencies)
    frequency = skrf.Frequency.from_f(frequencies[order], unit="hz")
    line = skrf.media.DefinedGammaZ0(frequency, z0=50.0, gamma=1j)
    coil = line.resistor(x / band.q) ** line.inductor(band.inductance) ** line.short()
    tank = line.shunt(coil) ** line.shunt_capacitor(pair["capacitance_f"] - coupling)
    if loaded < band.q * (1 - 1e-9):
        tank = tank ** line.shunt(line.resistor(x / (1 / loaded - 1 / band.q)) ** line.short())
    size = np.empty(len(order))
    size[order] = np.abs((tank ** line.capacitor(coupling) ** tank).z[:, 1, 0])
    return size


CASES = [
    ({"coupling": {"bandwidth": "250 kHz"}, "load": {"resistance": "5 kohm", "loaded_q": 50, "offset": "455 kHz"}}),
    ({"coupling": {}, "load": {"loaded_q": 40, "offset": "300 kHz"}}),
    ({"coupling": {"bandwidth": "400 kHz"}, "load": {"loaded_q": 60, "offset": "1 MHz"}}),
]


@pytest.mark.parametrize("tables", CASES)
def test_the_response_of_a_pair_agrees_with_scikit_rf(tables: dict[str, Any]) -> None:
    """Neighbours and harmonics within 0.1 dB, bandwidth and dip on a fine grid."""
    (band,) = solved(**tables).bands
    pair, target = pair_of(band), 7.1e6
    offset = {"455 kHz": 455e3, "300 kHz": 300e3, "1 MHz": 1e6}[tables["load"]["offset"]]
    size = transfer(band, np.array([target, target - offset, target + offset, 2 * target, 3 * target]))
    found = 20 * np.log10(size[0] / size[1:])
    answered = [*pair["rejection_db"].values(), *pair["harmonics_db"].values()]
    assert answered == pytest.approx(list(found), abs=0.1)
    grid = np.linspace(0.85, 1.15, 12_001) * target
    size = transfer(band, grid)
    inside = np.flatnonzero(size >= size.max() / math.sqrt(2))
    assert pair["bandwidth_hz"] == pytest.approx(grid[inside[-1]] - grid[inside[0]], rel=0.01)
    tops = [i for i in range(1, len(grid) - 1) if size[i - 1] < size[i] >= size[i + 1]]
    assert len(pair["peaks_hz"]) == len(tops)
    dip = 20 * math.log10(size.max() / size[tops[0] : tops[-1] + 1].min())
    assert pair["ripple_db"] == pytest.approx(dip, abs=0.02)
    wanted = tables["coupling"].get("bandwidth")
    if wanted:  # a step of E24 is a tenth
        assert pair["bandwidth_hz"] == pytest.approx(float(wanted.split()[0]) * 1e3, rel=0.15)
    assert pair["capacitance_f"] * band.inductance * (2 * math.pi * target) ** 2 == pytest.approx(1.0, abs=0.02)


@pytest.mark.parametrize("tables", CASES)
def test_coupling_and_networks_are_the_nearest_of_all(tables: dict[str, Any]) -> None:
    """Every capacitor in play as the coupling, and every one or two of them in each tank."""
    (band,) = solved(**tables).bands
    pair = pair_of(band)
    omega = 2 * math.pi * 7.1e6
    acting = {
        part.value: part.value / (1 - omega**2 * (part.series_inductance or 0.0) * part.value)
        for part in select_capacitors(catalogue(), CapacitorRules(), False)
    }
    wanted = 1 / (omega**2 * band.inductance)
    off = {value: abs(math.log(c / pair["needed_f"])) for value, c in acting.items()}
    assert off[pair["capacitor_f"]] == min(off.values())
    left = wanted - acting[pair["capacitor_f"]] - band.stray - band.self_capacitance
    pairs = itertools.combinations_with_replacement(acting.values(), 2)
    sums = np.array([*acting.values(), *(sum(two) for two in pairs)])
    own = sum(acting[value] for value in pair["capacitors_f"])
    assert abs(own - left) == pytest.approx(np.abs(sums - left).min(), abs=1e-18)


def test_a_bandwidth_that_no_coupling_gives_says_what_would_do() -> None:
    """Loose coupling leaves 0.644 of what one tank has."""
    candidate = solved(coupling={"bandwidth": "20 kHz"}, load={"loaded_q": 50})
    assert any("tanks of higher Q would do" in warning for warning in candidate.warnings)
    assert pair_of(candidate.bands[0])["capacitor_f"] is None


def test_what_goes_with_no_pair_is_refused() -> None:
    """One line that says what would do."""
    load = {"resistance": "50 ohm", "loaded_q": 20, "connection": "divider"}
    with pytest.raises(RequestError, match=r'\[coupling\] with load.connection = "divider"'):
        solved(coupling={}, load=load)
    oscillator = {"circuit": "colpitts", "transconductance": "5 mS"}
    with pytest.raises(RequestError, match=r"\[coupling\] with \[oscillator\]"):
        solved(coupling={}, oscillator=oscillator)


def test_the_image_of_a_receiver_agrees_with_scikit_rf() -> None:
    """The signal circuit alone at both ends, by its own parts, within 0.1 dB."""
    request = partpick.load_plan(str(PLANS / "skerry_point_receiver.toml"))
    intermediate = dict(dict(request.extra)["receiver"])["intermediate"]
    band = partpick.solve(request, catalogue(), top=1).candidates[0].bands[0]
    kept: Any = band.extra["selectivity"]
    assert isinstance(intermediate, float)
    offset = 2 * intermediate
    for end, name, inductance in zip(kept["image"], ("low", "high"), ("inductance_low_h", None), strict=True):
        own: Any = band.extra
        henry = own[inductance] if inductance else band.inductance
        at, farad, q = own[f"tuned_{name}_hz"], own[f"capacitance_{name}_f"], own[f"q_{name}"]
        assert end["at_hz"] == pytest.approx(at, rel=1e-9)
        assert end["image_hz"] == pytest.approx(abs(at + offset), rel=1e-9)
        frequency = skrf.Frequency.from_f(np.array([at, at + offset]), unit="hz")
        line = skrf.media.DefinedGammaZ0(frequency, z0=50.0, gamma=1j)
        coil = line.resistor(math.sqrt(henry / farad) / q) ** line.inductor(henry) ** line.short()
        size = np.abs((line.shunt(coil) ** line.shunt_capacitor(farad)).z[:, 1, 0])
        assert end["rejection_db"] == pytest.approx(20 * math.log10(size[0] / size[1]), abs=0.1)
