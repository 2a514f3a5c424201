"""Signals at any moment, a full disk, and runs side by side: files are whole or as before, bytes are the same."""

from __future__ import annotations

import hashlib
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from random import Random

import pytest
from workbench import write_drawer

ROOT = Path(__file__).resolve().parent.parent
BEFORE = "the file of before\n"
OUTPUTS = {"json": "r.json", "bom": "b.csv", "sheet": "s.html", "netlist": "n.cir"}
PLAN = """
[limits]
inductors = 2
error = "20 %"
[[band]]
name = "one"
at = "7.1 MHz"
[[band]]
name = "two"
at = "11 MHz"
"""


def start(folder: Path, *more: str) -> subprocess.Popen[bytes]:
    outputs = [word for name, file in OUTPUTS.items() for word in (f"--{name}", file)]
    return subprocess.Popen(
        [sys.executable, "-m", "partpick", "bands", "p.toml", "--drawer", "drawer", "--force", *outputs, *more],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )


@pytest.fixture
def bench(tmp_path: Path) -> Path:
    """A folder with a plan, a drawer, and outputs of an earlier run."""
    (tmp_path / "p.toml").write_text(PLAN, encoding="utf-8")
    write_drawer(tmp_path / "drawer")
    return tmp_path


def laid_out(folder: Path, old: bool) -> None:
    for file in OUTPUTS.values():
        if old:
            (folder / file).write_text(BEFORE, encoding="utf-8")
        else:
            (folder / file).unlink(missing_ok=True)


def whole(folder: Path) -> dict[str, bytes]:
    """Return the outputs of a run that nothing disturbs."""
    laid_out(folder, old=False)
    done = start(folder)
    _, err = done.communicate(timeout=120)
    assert done.returncode == 0, err
    return {file: (folder / file).read_bytes() for file in OUTPUTS.values()}


def disturbed(folder: Path, expected: dict[str, bytes], random: Random, length: float) -> str:
    """Send a signal at a random moment; return "before", "after" or "stopped" for what stands there then."""
    old = random.random() < 0.5
    laid_out(folder, old)
    number = random.choice((signal.SIGINT, signal.SIGTERM))
    process = start(folder)
    time.sleep(random.uniform(0.0, 1.2) * length)
    process.send_signal(number)
    _, err = process.communicate(timeout=120)
    assert [path.name for path in folder.iterdir() if path.name.startswith(".")] == []
    files = {file: (folder / file).read_bytes() for file in OUTPUTS.values() if (folder / file).exists()}
    before = {file: BEFORE.encode() for file in OUTPUTS.values()} if old else {}
    if files == before:
        return "before"
    assert set(files) == set(OUTPUTS.values()), "some outputs are there and some are not"
    if files == expected:
        return "after"
    assert process.returncode == 130, err
    assert json.loads(files["r.json"])["proof"]["stopped_by"] == "interrupt"
    return "stopped"


@pytest.mark.skipif(os.name != "posix", reason="signals as a shell sends them")
@pytest.mark.parametrize("count", [2, pytest.param(150, marks=pytest.mark.slow)])
def test_a_signal_at_any_moment_leaves_the_old_files_or_the_new_ones(bench: Path, count: int) -> None:
    """All of them or none, and nothing lies about."""
    expected = whole(bench)
    began = time.monotonic()
    assert whole(bench) == expected
    length = time.monotonic() - began
    random = Random(count)
    ends = [disturbed(bench, expected, random, length) for _ in range(count)]
    if count > 50:
        assert ends.count("before") > 10 and ends.count("after") > 3, ends


FULL_DISK = """
import os, sys
from partpick.cli import main
real = os.fdopen
left = int(sys.argv[1])
class Small:
    def __init__(self, stream): self.stream = stream
    def __enter__(self): return self
    def __exit__(self, *error): self.stream.close()
    def write(self, data):
        global left
        left -= len(data)
        if left < 0:
            self.stream.write(data[:left] if left > -len(data) else b"")
            raise OSError(28, "No space left on device")
        return self.stream.write(data)
    def flush(self): self.stream.flush()
    def fileno(self): return self.stream.fileno()
os.fdopen = lambda descriptor, mode: Small(real(descriptor, mode))
sys.exit(main(sys.argv[2:]))
"""


@pytest.mark.parametrize(("room", "old"), [(0, False), (1_000, True), (20_000, True)])
def test_a_disk_that_fills_up_leaves_everything_as_it_was(bench: Path, room: int, old: bool) -> None:
    """Whichever of the outputs it is that does not fit (simulated: the system says so after so many bytes)."""
    laid_out(bench, old)
    outputs = [word for name, file in OUTPUTS.items() for word in (f"--{name}", file)]
    done = subprocess.run(
        [sys.executable, "-c", FULL_DISK, str(room), "bands", "p.toml", "--drawer", "drawer", "--force", *outputs],
        cwd=bench,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 2 and "no space left" in done.stderr and done.stderr.count("\n") == 1
    assert done.stdout == ""
    for file in OUTPUTS.values():
        assert (bench / file).exists() is old
        assert not old or (bench / file).read_text(encoding="utf-8") == BEFORE
    assert [path.name for path in bench.iterdir() if path.name.startswith(".")] == []


def digest(folder: Path, plan: Path, *more: str) -> str:
    outputs = [word for name, file in OUTPUTS.items() for word in (f"--{name}", file)]
    done = subprocess.run(
        [sys.executable, "-m", "partpick", "bands", str(plan), "--top", "3", "--force", *outputs, *more],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        check=True,
    )
    shown = hashlib.sha256(done.stdout)
    for file in sorted(OUTPUTS.values()):
        shown.update((folder / file).read_bytes())
    return shown.hexdigest()


@pytest.mark.parametrize("runs", [2, pytest.param(20, marks=pytest.mark.slow)])
def test_the_same_bytes_come_out_of_every_run(bench: Path, runs: int) -> None:
    """From any folder, with the other core busy or not, and whatever the order of hashes."""
    elsewhere = bench / "else" / "where"
    elsewhere.mkdir(parents=True)
    busy = subprocess.Popen([sys.executable, "-c", "while True: pass"])
    try:
        digests = set()
        for run in range(runs):
            if run == runs // 2:
                busy.kill()
            folder = elsewhere if run % 2 else bench
            plan = bench / "p.toml"
            drawer = "../../drawer" if run % 2 else "drawer"
            os.environ["PYTHONHASHSEED"] = str(run)
            digests.add(digest(folder, plan, "--drawer", drawer))
    finally:
        busy.kill()
        busy.wait()
        os.environ.pop("PYTHONHASHSEED", None)
    assert len(digests) == 1


@pytest.mark.slow
def test_what_the_solver_settles_gives_the_same_bytes_twenty_times(tmp_path: Path) -> None:
    """A limit that ties the bands together goes to the solver."""
    plan = tmp_path / "p.toml"
    plan.write_text(PLAN.replace("inductors = 2", "inductors = 1\nvalues = 1\nparts_per_band = 2"), encoding="utf-8")
    write_drawer(tmp_path / "drawer")
    assert len({digest(tmp_path, plan, "--drawer", "drawer") for _ in range(20)}) == 1
