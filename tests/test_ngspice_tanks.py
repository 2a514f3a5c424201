"""Tanks that partpick proposes, built up part by part in ngspice: resonance, bandwidth, ring-down, within 0.1 %."""

from __future__ import annotations

import math
import os
import shutil
import subprocess
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import partpick
from partpick.parts import Capacitor
from partpick.planfile import request_from_tables
from partpick.result import BandFigures, Candidate

WITHIN = 1e-3
# Absent, the simulator is skipped on a workbench; where CI is set its absence is a failure.
needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None and "CI" not in os.environ, reason="ngspice is not installed"
)
PLANS: dict[str, dict[str, Any]] = {
    "pot core at 100 kHz": {"band": [{"at": "100 kHz"}], "coil": {"forms": ["pot core"]}},
    "many layers at 455 kHz": {"band": [{"at": "455 kHz"}], "coil": {"forms": ["multilayer"]}},
    "ring at 1.9 MHz": {"band": [{"at": "1.9 MHz"}], "coil": {"forms": ["ring core"]}},
    "solenoid at 7.1 MHz": {"band": [{"at": "7.1 MHz"}], "coil": {"forms": ["solenoid"]}},
    "three in a network at 14.2 MHz": {
        "band": [{"at": "14.2 MHz"}],
        "coil": {"forms": ["solenoid"]},
        "capacitors": {"connect": "any"},
        "limits": {"parts_per_band": 3, "error": "0.01 %"},
        "by": "error",
    },
    "with 20 nH of leads at 28.5 MHz": {
        "band": [{"at": "28.5 MHz"}],
        "coil": {"forms": ["solenoid"]},
        "stray": {"inductance": "20 nH"},
    },
}


@cache
def proposed(name: str) -> tuple[Candidate, float]:
    """Return partpick's first candidate for a plan, and the plan's inductance of leads."""
    tables = dict(PLANS[name])
    by = tables.pop("by", "build")
    request = request_from_tables(tables, "pair", by=by)
    return partpick.solve(request, partpick.load_catalogue(), top=1).candidates[0], request.stray.inductance


def capacitor_called(label: str) -> Capacitor:
    return next(part for part in partpick.load_catalogue().capacitors if part.label == label)


def tank_lines(name: str) -> tuple[list[str], BandFigures]:
    """Return the elements of the tank between node t and ground; nothing of our own arithmetic but 1/Q."""
    candidate, leads = proposed(name)
    (band,) = candidate.bands
    assert band.coil_q is not None
    assert band.resonance is not None
    omega = 2 * math.pi * band.resonance  # where the Q of each part is taken
    lines = [
        f"L1 t l {band.inductance!r}",
        f"R1 l 0 {omega * band.inductance / band.coil_q!r}",
        f"CS t 0 {band.stray + band.self_capacitance!r}",
        *([f"L2 t top {leads!r}"] if leads else []),
    ]
    if "(" in band.connection:
        outer, inner = band.connection.replace("(", "").replace(")", ""), band.connection.split("(")[1]
        mixed = "|" in inner  # C1 + (C2 | C3), else C1 | (C2 + C3)
        assert outer.split()[0] == "C1"
        if mixed:
            ends = {"C1": ("top", "m"), "C2": ("m", "0"), "C3": ("m", "0")}
        else:
            ends = {"C1": ("top", "0"), "C2": ("top", "m"), "C3": ("m", "0")}
    elif "+" in band.connection:
        chain = ["top", *(f"m{i}" for i in range(1, len(band.capacitors))), "0"]
        ends = {reference: (chain[i], chain[i + 1]) for i, reference in enumerate(band.capacitors)}
    else:
        ends = {reference: ("top", "0") for reference in band.capacitors}
    for line in candidate.parts:
        if line.kind != "capacitor":
            continue
        part = capacitor_called(line.description)
        assert part.q is not None
        assert part.series_inductance
        upper, lower = ends[line.reference]
        lines += [
            f"{line.reference} {upper} {line.reference}a {part.value!r}",
            f"L{line.reference} {line.reference}a {line.reference}b {part.series_inductance!r}",
            f"R{line.reference} {line.reference}b {lower} {1 / (omega * part.value * part.q)!r}",
        ]
    return [text if leads else text.replace(" top", " t") for text in lines], band


def simulate(lines: list[str], control: list[str], folder: Path) -> np.ndarray[Any, np.dtype[np.float64]]:
    """Run a deck that writes `out.txt` and return its columns."""
    head = ["* tank", *lines, ".options rshunt=1e14 reltol=1e-6"]
    deck = [*head, ".control", "set numdgt=14", *control, "quit", ".endc", ".end"]
    (folder / "tank.cir").write_text("\n".join(deck) + "\n", encoding="utf-8")
    done = subprocess.run(
        ["ngspice", "-b", "tank.cir"], capture_output=True, text=True, timeout=60, check=False, cwd=folder
    )
    assert (folder / "out.txt").exists(), done.stdout + done.stderr
    return np.loadtxt(folder / "out.txt")


@needs_ngspice
@pytest.mark.parametrize("name", PLANS)
def test_resonance_and_bandwidth_are_those_of_the_circuit(name: str, tmp_path: Path) -> None:
    """Driven by a current, |v| peaks at the resonance and is 3 dB down at the edges of the bandwidth."""
    lines, band = tank_lines(name)
    assert band.resonance is not None and band.bandwidth is not None
    low, high = (band.resonance + step * band.bandwidth for step in (-1.5, 1.5))
    sweep = [f"ac lin 6001 {low!r} {high!r}", "wrdata out.txt mag(v(t))"]
    out = simulate(["I1 0 t DC 0 AC 1", *lines], sweep, tmp_path)
    frequency, size = out[:, 0], out[:, 1]
    top = int(np.argmax(size))
    assert frequency[top] == pytest.approx(band.resonance, rel=WITHIN)
    peak = band.extra["lossy_resonances"]["greatest_impedance_hz"]  # type: ignore[index]
    assert frequency[top] == pytest.approx(peak, rel=WITHIN)
    level = size[top] / math.sqrt(2)
    left = np.interp(level, size[: top + 1], frequency[: top + 1])
    right = np.interp(-level, -size[top:], frequency[top:])
    assert right - left == pytest.approx(band.bandwidth, rel=WITHIN)


@needs_ngspice
@pytest.mark.parametrize("name", PLANS)
def test_a_struck_tank_rings_as_long_as_printed(name: str, tmp_path: Path) -> None:
    """Started with current in its coil: frequency and time constant of what follows, block by block."""
    lines, band = tank_lines(name)
    assert band.resonance is not None
    tau, cycles = band.extra["ringing_time_s"], band.extra["ringing_cycles"]
    assert isinstance(tau, float) and isinstance(cycles, float)
    assert cycles == pytest.approx(tau * band.extra["lossy_resonances"]["ringing_hz"], rel=WITHIN)  # type: ignore[index]
    period = 1 / band.resonance
    started = [f"{lines[0]} ic=1m", *lines[1:]]
    run = [f"tran {period / 400!r} {1.2 * tau!r} 0 {period / 400!r} uic", "linearize v(t)", "wrdata out.txt v(t)"]
    out = simulate(started, run, tmp_path)
    time, turned = out[:, 0], out[:, 1] * np.exp(-2j * np.pi * band.resonance * out[:, 0])
    block = 400 * 4  # four cycles: what does not turn with the resonance averages out
    count = len(time) // block
    means = turned[: count * block].reshape(count, block).mean(axis=1)[1:]
    middle = time[: count * block].reshape(count, block).mean(axis=1)[1:]
    decay = -np.polyfit(middle, np.log(np.abs(means)), 1)[0]
    drift = np.polyfit(middle, np.unwrap(np.angle(means)), 1)[0] / (2 * np.pi)
    assert 1 / decay == pytest.approx(tau, rel=WITHIN)
    assert band.resonance + drift == pytest.approx(band.extra["lossy_resonances"]["ringing_hz"], rel=WITHIN)  # type: ignore[index]
