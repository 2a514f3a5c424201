"""Oscillators that partpick proposes, as transients in ngspice: they grow above the transconductance told, die below.

The parts of the answer stand in the deck as they act at the frequency, the device across them; all loss is one
resistance in series with the coil, as the answer states it. The simulator knows no formula of start-up.
"""

from __future__ import annotations

import os
import shutil
import subprocess
from dataclasses import replace
from functools import cache
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import partpick
from partpick.parts import Catalogue
from partpick.planfile import request_from_tables
from partpick.result import BandFigures, Candidate

WITHIN = 2e-3  # of the frequency
CYCLES, STEPS = 60, 120  # of a transient, and in a cycle
needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None and "CI" not in os.environ, reason="ngspice is not installed"
)
DEVICE = {"transconductance": "5 mS", "margin": 3, "input_capacitance": "5 pF", "output_capacitance": "2 pF"}
AIR = {"kind": "variable capacitor", "low": "12 pF", "high": "150 pF"}
TUBES: dict[str, Any] = {"coil": {"forms": ["solenoid"], "inductance": ["1 µH", "9 µH"]}}
PLANS: dict[str, dict[str, Any]] = {
    "colpitts": {**TUBES, "band": [{"at": "7.1 MHz"}], "oscillator": {"circuit": "colpitts"}},
    "colpitts, three capacitors": {
        **TUBES,
        "band": [{"at": "5.2 MHz"}],
        "oscillator": {"circuit": "colpitts"},
        "limits": {"parts_per_band": 3, "error": "0.05 %"},
    },
    "clapp": {
        **TUBES,
        "band": [{"at": "7.1 MHz"}],
        "oscillator": {"circuit": "clapp"},
        "limits": {"parts_per_band": 3},
    },
    "hartley": {**TUBES, "band": [{"at": "7.1 MHz"}], "oscillator": {"circuit": "hartley"}},
    "colpitts, swept": {
        **TUBES,
        "band": [{"from": "7 MHz", "to": "7.3 MHz"}],
        "tuning": AIR,
        "oscillator": {"circuit": "colpitts"},
        "limits": {"parts_per_band": 2},
    },
    "clapp, swept": {
        "coil": {"forms": ["solenoid"], "inductance": ["3 µH", "15 µH"], "reactance": "none"},
        "band": [{"from": "7 MHz", "to": "7.3 MHz"}],
        "tuning": {**AIR, "low": "60 pF", "high": "300 pF"},
        "oscillator": {"circuit": "clapp", "transconductance": "10 mS"},
        "limits": {"parts_per_band": 2},
    },
}


@cache
def catalogue() -> Catalogue:
    """Return a part of what is shipped, so that a search takes no time."""
    shipped = partpick.load_catalogue(None)
    formers = [former for former in shipped.formers if former.support in ("tube", "ribbed")][:4]
    return replace(
        shipped, formers=tuple(formers), wires=shipped.wires[::4], cores=shipped.cores[:6], inductors=()
    )


@cache
def proposed(name: str) -> Candidate:
    """Return the first candidate of a plan."""
    plan = {**PLANS[name], "oscillator": {**DEVICE, **PLANS[name]["oscillator"]}}
    tables = {key: value for key, value in plan.items() if key != "by"}
    result = partpick.solve(request_from_tables(tables, command="pair"), catalogue(), top=1)
    assert result.candidates
    return result.candidates[0]


def elements(candidate: Candidate, band: BandFigures, setting: dict[str, float], element: float | None) -> list[str]:
    """Return the tank between `out` and `ctl`, common terminal at ground; the coil's cold end is `ctl`."""
    keys: Any = band.extra["oscillator"]
    parts = {part.reference: part for part in candidate.parts}
    lines: list[str] = []

    def capacitor(reference: str, high: str, low: str) -> None:
        part = parts[reference]
        value = element if reference == "T" else part.value
        # an ideal device would find the resonance of its own capacitance with the leads and oscillate there
        squared = (2 * np.pi * setting["frequency_hz"]) ** 2
        value = value / (1 - squared * (part.series_inductance or 0.0) * value)
        lines.append(f"C{reference} {high} {low} {value!r}")

    hot = "out" if keys["series_capacitor"] is None else "hot"
    if keys["series_capacitor"] is not None:
        capacitor(keys["series_capacitor"], "out", "hot")
    own = {keys["output_capacitor"], keys["control_capacitor"], keys["series_capacitor"]}
    for reference in band.capacitors:
        if reference not in own:
            capacitor(reference, hot, "ctl")
    if element is not None and keys["series_capacitor"] != "T":
        assert "(T +" not in band.connection, "no plan of these has a padder"
        capacitor("T", hot, "ctl")
    self_capacitance, strays = band.self_capacitance, band.stray
    inductance, resistance = setting["inductance_h"], setting["resistance_ohm"]
    if keys["common_turns"] is None:
        capacitor(keys["output_capacitor"], "out", "0")
        capacitor(keys["control_capacitor"], "ctl", "0")
        lines.append(f"Lcoil {hot} r1 {inductance!r}")
        lines.append(f"Rcoil r1 ctl {resistance!r}")
    else:
        strays -= device_across(candidate, band)
        coil = candidate.coils[0]
        share = keys["common_turns"] / coil.turns
        # sections by the length-corrected rule of one coil: told by the answer's own family of windings
        one, two, mutual = sections(candidate, band)
        lines.append(f"Lone {hot} r1 {one * inductance!r}")
        lines.append(f"Rone r1 0 {resistance * share!r}")
        lines.append(f"Ltwo 0 r2 {two * inductance!r}")
        lines.append(f"Rtwo r2 ctl {resistance * (1 - share)!r}")
        lines.append(f"Kcoil Lone Ltwo {float(mutual / np.sqrt(one * two))!r}")
    lines.append(f"Cstrays {hot} ctl {strays + self_capacitance!r}")
    lines.append(f"Cout out 0 {keys['output_capacitance_f']!r}")
    lines.append(f"Cin ctl 0 {keys['input_capacitance_f']!r}")
    return lines


def sections(candidate: Candidate, band: BandFigures) -> tuple[float, float, float]:
    """Return both sections and what is between them as shares of the coil, by Neumann's integral over ring turns."""
    from partpick.physics.solenoid import solenoid_family

    coil, keys = candidate.coils[0], band.extra["oscillator"]
    assert isinstance(keys, dict) and coil.turns and coil.mean_diameter and coil.pitch
    wire = next(w for w in catalogue().wires if w.name == coil.wire)
    family = solenoid_family(coil.turns, coil.mean_diameter, wire.bare_diameter, coil.pitch)
    turns = keys["common_turns"]
    one, two = family[turns - 1] / family[-1], family[coil.turns - turns - 1] / family[-1]
    return float(one), float(two), float((1 - one - two) / 2)


def device_across(candidate: Candidate, band: BandFigures) -> float:
    """Return what of the strays stands for the device: the deck has the device itself."""
    keys = band.extra["oscillator"]
    assert isinstance(keys, dict)
    one, two, mutual = sections(candidate, band)
    across = (one + mutual) ** 2 * keys["output_capacitance_f"]
    return float(across + (two + mutual) ** 2 * keys["input_capacitance_f"])


def transient(lines: list[str], frequency: float, gain: float, folder: Path) -> np.ndarray:
    """Return time and control voltage after a kick, (2, n)."""
    step = 1 / frequency / STEPS
    deck = [
        "* oscillator",
        *lines,
        f"Gdevice out 0 ctl 0 {gain!r}",
        "Rbias ctl 0 1e9",
        "Rfeed out 0 1e9",
        f"Ikick 0 out PULSE(0 1e-3 0 {step!r} {step!r} {1 / frequency / 4!r} 1)",
        ".options reltol=1e-6 method=trap",
        f".tran {step!r} {CYCLES / frequency!r} 0 {step!r}",
        ".control",
        "run",
        "wrdata out.txt v(ctl)",
        "quit",
        ".endc",
        ".end",
    ]
    (folder / "deck.cir").write_text("\n".join(deck) + "\n", encoding="ascii")
    ran = subprocess.run(
        ["ngspice", "-b", "deck.cir"], cwd=folder, capture_output=True, text=True, timeout=60, check=False
    )
    assert (folder / "out.txt").exists(), ran.stdout + ran.stderr
    return np.loadtxt(folder / "out.txt").T


def growth_and_frequency(time: np.ndarray, volts: np.ndarray) -> tuple[float, float]:
    """Return the rate at which successive peaks grow, and the frequency by zero crossings, of the later part."""
    later = time > time[-1] / 4
    t, v = time[later], volts[later] - volts[later].mean()
    rising = np.flatnonzero((v[:-1] < 0) & (v[1:] >= 0))
    crossings = t[rising] - v[rising] * (t[rising + 1] - t[rising]) / (v[rising + 1] - v[rising])
    peaks = [np.abs(v[a:b]).max() for a, b in pairwise(rising)]
    rate = np.polyfit(crossings[:-1], np.log(peaks), 1)[0]
    return float(rate), float((len(crossings) - 1) / (crossings[-1] - crossings[0]))


@needs_ngspice
@pytest.mark.parametrize("name", PLANS)
def test_it_grows_above_the_transconductance_told_and_dies_below(name: str, tmp_path: Path) -> None:
    """8 % above and below the figure told, at each end of a swept band; frequency within 0.2 %."""
    candidate = proposed(name)
    band = candidate.bands[0]
    keys: Any = band.extra["oscillator"]
    ends = [(keys["settings"][-1], band.extra.get("tuning_low_f"))]
    if band.target is None:
        ends.append((keys["settings"][0], band.extra["tuning_high_f"]))
    assert keys["needed_s"] == max(setting["needed_s"] for setting in keys["settings"])
    assert keys["margin"] >= 3
    for setting, element in ends:
        lines = elements(candidate, band, setting, element)
        rates = []
        for share in (0.92, 1.08):
            time, volts = transient(lines, setting["frequency_hz"], share * setting["needed_s"], tmp_path)
            rate, frequency = growth_and_frequency(time, volts)
            rates.append(rate)
            assert frequency == pytest.approx(setting["frequency_hz"], rel=WITHIN)
        assert rates[0] < 0 < rates[1]
