"""Ctrl-C and SIGTERM, as a shell sends them, in the middle of long searches: the best so far is written, marked so."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from workbench import read_json

import partpick
from partpick.planfile import request_from_tables
from partpick.progress import Quiet

FREQUENCIES = (1.85, 3.65, 5.3, 7.1, 8.2, 9.4, 10.1, 12.3, 14.1, 16.7, 18.1, 21.2)  # MHz
HEADS = {
    "separate": '[limits]\nparts_per_band = 3\nvalues = 6\n[coil]\nforms = ["bought", "ring core"]\n',
    "shared": 'switching = "shared"\n[limits]\nparts = 9\n',
    "stacked": 'switching = "stacked"\n[limits]\nparts_per_band = 4\nvalues = 9\n',
}
SIGNALS = {"separate": signal.SIGTERM, "shared": signal.SIGINT, "stacked": signal.SIGTERM}
INSIDE_SOLVER = "of one choice of coils"
PATIENCE = 60.0  # s, until a search is under way on a busy machine
AT_ONCE = 10.0  # s, from the signal to the end, files written


def _start(layout: str, folder: Path) -> subprocess.Popen[str]:
    bands = "".join(f'[[band]]\nname = "channel {i}"\nat = "{f} MHz"\n' for i, f in enumerate(FREQUENCIES, 1))
    plan = folder / "plan.toml"
    plan.write_text(HEADS[layout] + bands, encoding="utf-8")
    command = [sys.executable, "-m", "partpick", "bands", str(plan), "--json", str(folder / "result.json")]
    return subprocess.Popen(command, stderr=subprocess.PIPE, stdout=subprocess.DEVNULL, text=True)


@pytest.mark.skipif(os.name != "posix", reason="signals as a shell sends them")
@pytest.mark.parametrize("layout", HEADS)
def test_a_signal_in_a_long_search_writes_the_best_so_far(layout: str, tmp_path: Path) -> None:
    """With switching "separate" the signal falls into a solve of CP-SAT, which itself would not hear it."""
    process = _start(layout, tmp_path)
    assert process.stderr is not None
    said = ""
    try:
        begun = time.monotonic()
        for said in process.stderr:
            if layout != "separate" or INSIDE_SOLVER in said:
                break
            assert time.monotonic() - begun < PATIENCE
        assert process.poll() is None, said
        process.send_signal(SIGNALS[layout])
        sent = time.monotonic()
        process.communicate(timeout=AT_ONCE)
        assert time.monotonic() - sent < AT_ONCE
    finally:
        process.kill()
        process.communicate()
    assert process.returncode == 130
    proof = read_json((tmp_path / "result.json").read_text(encoding="utf-8"))["proof"]
    assert proof["stopped_by"] == "interrupt"
    assert proof["status"] in ("feasible", "unknown")  # never "infeasible", never "optimal"


def test_a_time_limit_is_heard_while_sections_are_bounded() -> None:
    """Millions of tapped sections of swept bands take minutes to bound; a limit of a second is a second or few."""
    bands = [{"name": "low", "from": "3.4 MHz", "to": "4.2 MHz"}, {"name": "high", "from": "6.9 MHz", "to": "8.1 MHz"}]
    tables = {
        "band": bands,
        "limits": {"parts_per_band": 3},
        "coil": {"taps": True, "forms": ["ring core", "solenoid"]},
        "tuning": {"kind": "variable capacitor", "low": "12 pF", "high": "365 pF"},
    }
    began = time.monotonic()
    result = partpick.solve(
        request_from_tables(tables, "bands"), partpick.load_catalogue(), top=1, monitor=Quiet(1.0)
    )
    assert result.proof.stopped_by == "time limit" and result.proof.status in ("unknown", "feasible")
    assert time.monotonic() - began < 20
