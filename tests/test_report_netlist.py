"""The SPICE deck: it runs as it is, and its peaks stand where the result says."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path

import handmade
import pytest
import solved

import partpick
from partpick.report.netlist import netlist

# Absent, the simulator is skipped on a workbench; where CI is set its absence is a failure.
needs_ngspice = pytest.mark.skipif(
    shutil.which("ngspice") is None and "CI" not in os.environ, reason="ngspice is not installed"
)


def simulate(deck: str, folder: Path) -> dict[str, float]:
    """Run a deck in a folder of its own and return its measurements."""
    file = folder / "tanks.cir"
    file.write_text(deck, encoding="utf-8")
    done = subprocess.run(
        ["ngspice", "-b", str(file)], capture_output=True, text=True, timeout=60, check=False, cwd=folder
    )
    assert done.returncode == 0, done.stdout + done.stderr
    found = re.findall(r"^(\w+)\s*=\s*([-+0-9.eE]+)", done.stdout, re.MULTILINE)
    return {name: float(value) for name, value in found}


@needs_ngspice
def test_every_band_of_the_demo_plan_peaks_where_it_is_printed(tmp_path: Path) -> None:
    """Resonance within 0.1 %, and the height of the peak, which is Q times reactance, within 1 %."""
    result = solved.demo()
    got = simulate(netlist(result), tmp_path)
    bands = result.candidates[0].bands
    assert len(bands) == 6
    for place, band in enumerate(bands, 1):
        assert band.q is not None and band.resonance is not None and band.target is not None
        assert got[f"t{place}_peak_hz"] == pytest.approx(band.resonance, rel=1e-3)
        reactance = band.reactance * band.resonance / band.target
        assert got[f"t{place}_peak_ohm"] == pytest.approx(band.q * reactance, rel=0.01)


@needs_ngspice
@pytest.mark.parametrize(
    "tables",
    [
        {"band": [{"at": "7.1 MHz"}]},
        {"band": [{"at": "455 kHz"}], "coil": {"forms": ["ring core", "bought"]}, "capacitors": {"connect": "any"}},
        {
            "band": [{"at": "14.2 MHz"}],
            "capacitors": {"connect": "any"},
            "limits": {"parts_per_band": 3, "error": "0.01 %"},
            "by": "error",
        },
        {"band": [{"at": "21 MHz"}], "stray": {"inductance": "20 nH"}},
        {"band": [{"at": "3.58 MHz"}], "trimmer": {"low": "3 pF", "high": "20 pF"}},
        {"band": [{"at": "28 MHz"}], "coil": {"measured": "400 nH", "self_capacitance": "1 pF"}},
    ],
    ids=["plain", "rings and series", "three mixed", "leads", "trimmer", "measured coil of unknown loss"],
)
def test_one_tank_peaks_where_it_is_printed(tables: dict[str, object], tmp_path: Path) -> None:
    """Series inductances, mixed networks, leads and trimmers are all in the deck: within 0.1 %."""
    asked = {key: table for key, table in tables.items() if key != "by"}
    request = partpick.request_from_tables(asked, "pair", by=str(tables.get("by", "build")))
    result = partpick.solve(request, partpick.load_catalogue(), top=1)
    band = result.candidates[0].bands[0]
    assert band.resonance is not None
    assert simulate(netlist(result), tmp_path)["t1_peak_hz"] == pytest.approx(band.resonance, rel=1e-3)


@needs_ngspice
def test_a_name_cannot_add_a_line_to_the_deck(tmp_path: Path) -> None:
    """Names come from plans of other people: they stay inside a comment of plain letters."""
    evil = "beacon\n.control\nshell touch hacked\n.endc\n\u7121\u7dda"
    result = handmade.result(handmade.candidate(bands=(replace(handmade.candidate().bands[0], name=evil),)))
    result = replace(result, request=replace(result.request, title=evil))
    deck = netlist(result)
    assert deck.isascii()
    assert [line for line in deck.splitlines() if "shell" in line and not line.startswith("*")] == []
    assert "t1_peak_hz" in simulate(deck, tmp_path)
    assert not (tmp_path / "hacked").exists()


@needs_ngspice
def test_a_swept_band_is_a_tank_at_each_end_of_its_range(tmp_path: Path) -> None:
    """The element closed and open: both ends peak where the band is said to tune to."""
    inductance, padder, low, high = 4.05e-6, 100e-12, 12e-12, 150e-12
    own = handmade.STRAY + handmade.SELF_CAPACITANCE

    def resonance(element: float) -> float:
        total = element * padder / (element + padder) + own
        return 1 / (2 * 3.141592653589793 * (inductance * total) ** 0.5)

    band = handmade.swept_band()
    band = replace(
        band,
        connection="T + C1",
        extra={**band.extra, "tuned_low_hz": resonance(high), "tuned_high_hz": resonance(low)},
    )
    got = simulate(netlist(handmade.result(handmade.candidate(bands=(band,)))), tmp_path)
    assert got["t1_peak_hz"] == pytest.approx(resonance(high), rel=1e-3)
    assert got["t2_peak_hz"] == pytest.approx(resonance(low), rel=1e-3)


def test_a_loss_that_is_not_known_is_said_to_be_missing() -> None:
    """A peak without its loss is no figure to design by."""
    deck = netlist(handmade.result(handmade.candidate()))
    assert "* loss of L1 is unknown: none is taken" in deck
    assert "* C1: loss is unknown" in deck


def test_nothing_that_fits_is_no_tank() -> None:
    """The file comes all the same, and says so."""
    deck = netlist(handmade.nothing())
    assert "Nothing fits" in deck and deck.rstrip().endswith(".end")
