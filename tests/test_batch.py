"""Several plans at once, from outside: the same bytes whatever the number of processes, and whole files."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from partpick.starter import write_starter

ROOT = Path(__file__).resolve().parent.parent
PLAN = """title = "invented"
[limits]
{limits}
[[band]]
name = "one"
at = "{one}"
[[band]]
name = "two"
at = "{two}"
"""


def arguments(*given: str) -> list[str]:
    return [sys.executable, "-m", "partpick", "bands", *given]


def environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(ROOT)}


@pytest.fixture
def plans(tmp_path: Path) -> Path:
    """A folder of four plans, one of them with a slip and one that nothing fits, and a drawer."""
    write_starter(str(tmp_path / "start"), False)
    folder = tmp_path / "plans"
    folder.mkdir()
    for name, limits, one in (
        ("a", "inductors = 2", "7.1 MHz"),
        ("b", "inductors = two", "7.1 MHz"),
        ("c", "inductors = 1\nparts_per_band = 0", "1.9 MHz"),
        ("d", "inductors = 2\nparts_per_band = 1", "5 MHz"),
    ):
        (folder / f"{name}.toml").write_text(PLAN.format(limits=limits, one=one, two="14.2 MHz"))
    return folder


def test_the_number_of_processes_changes_no_byte(plans: Path) -> None:
    """And one plan with a slip costs none of the others."""
    told = []
    for workers in ("1", "2"):
        out = plans.parent / f"out{workers}"
        out.mkdir()
        done = subprocess.run(
            arguments("plans", "--drawer", "start/drawer", "--workers", workers, "--json", out.name, "--bom", out.name),
            cwd=plans.parent,
            env=environment(),
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 2 and "b.toml" in done.stderr and "Traceback" not in done.stderr
        told.append((done.stdout, {path.name: path.read_bytes() for path in sorted(out.iterdir())}))
    assert told[0] == told[1]
    shown, files = told[0]
    assert [line for line in shown.splitlines() if line.startswith("==")] == [f"== plans/{n}.toml" for n in "acd"]
    assert sorted(files) == [f"{n}{ending}" for n in "acd" for ending in (".csv", ".json")]
    assert json.loads(files["a.json"])["candidates"] and "Nothing fits" in shown


@pytest.mark.skipif(os.name != "posix", reason="signals as a shell sends them")
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_stops_every_plan_and_leaves_whole_files(plans: Path, number: signal.Signals) -> None:
    """The plan that is quick is written; those that are long come back with their best, or not at all."""
    bands = "".join(f'[[band]]\nname = "b{i}"\nat = "{3 + 1.37 * i:.2f} MHz"\n' for i in range(8))
    for name in "bcd":
        (plans / f"{name}.toml").write_text("[limits]\ninductors = 3\nparts_per_band = 3\nvalues = 5\n" + bands)
    out = plans.parent / "out"
    out.mkdir()
    process = subprocess.Popen(
        arguments("plans", "--workers", "2", "--json", "out"),
        cwd=plans.parent,
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    deadline = time.monotonic() + 60
    while not (out / "a.json").exists() and time.monotonic() < deadline:
        time.sleep(0.1)
    time.sleep(1.0)
    assert process.poll() is None, "the long plans were not long enough to be interrupted"
    os.killpg(process.pid, number)  # the whole group, as a terminal does
    _, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert "Traceback" not in err
    results = {path.name: json.loads(path.read_text()) for path in out.iterdir()}
    assert results["a.json"]["proof"]["status"] == "optimal"
    for name in set(results) - {"a.json"}:
        assert results[name]["proof"]["stopped_by"] == "interrupt"
        assert results[name]["proof"]["status"] in ("feasible", "unknown")
