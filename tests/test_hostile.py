"""Files from strangers: nothing in them is run, nothing else is read or written, and their size is bounded."""

from __future__ import annotations

import csv
import io
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from workbench import CAPACITORS, INDUCTORS, run, write_drawer

ROOT = Path(__file__).resolve().parent.parent
SPREADSHEET = ("=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "\r=1")
TAGS = '<script>alert(1)</script><img src="x" onerror="a()">'


def drawer_named(folder: Path, name: str) -> Path:
    """Write a drawer whose parts are all called by a hostile name."""
    capacitors = [{**row, "label": f"{name} {place}"} for place, row in enumerate(CAPACITORS)]
    inductors = [{**row, "label": f"{name} {place}"} for place, row in enumerate(INDUCTORS)]
    return write_drawer(folder, capacitors=capacitors, inductors=inductors)


@pytest.mark.parametrize("start", SPREADSHEET)
def test_no_cell_of_a_bill_is_run_by_a_spreadsheet(tmp_path: Path, start: str) -> None:
    """Neither a name from the drawer nor one from the plan."""
    plan = tmp_path / "p.toml"
    plan.write_text(f'[[band]]\nname = {start.strip()!r}\nat = "7.1 MHz"\n'.replace("'", '"'), encoding="utf-8")
    drawer = drawer_named(tmp_path / "drawer", start.strip())
    done = run("bands", plan, "--drawer", drawer, "--bom", "-")
    assert done.code == 0, done.err
    cells = [cell for row in csv.reader(io.StringIO(done.out)) for cell in row]
    texts = [cell for cell in cells if not re.fullmatch(r"[-+]?[\d.]+(e[-+]?\d+)?", cell)]
    assert any(start.strip() in cell for cell in cells)
    assert not [cell for cell in texts if cell[:1] in ("=", "+", "-", "@", "\t", "\r")]


def test_no_tag_in_a_name_reaches_the_sheet(tmp_path: Path) -> None:
    """Of title, band and part."""
    plan = tmp_path / "p.toml"
    name = TAGS.replace('"', '\\"')
    plan.write_text(f'title = "{name}"\n[[band]]\nname = "{name}"\nat = "7.1 MHz"\n', encoding="utf-8")
    done = run("bands", plan, "--drawer", drawer_named(tmp_path / "drawer", TAGS), "--sheet", "-")
    assert done.code == 0, done.err
    assert "&lt;script&gt;" in done.out
    assert not re.search(r"<(script|img)\b", done.out)


def test_a_link_out_of_the_drawer_is_not_followed(tmp_path: Path) -> None:
    """A packed drawer from elsewhere could have any file read, and its cells shown in the message."""
    drawer = write_drawer(tmp_path / "drawer")
    secret = tmp_path / "secret.csv"
    secret.write_text("password\nhunter\n")
    (drawer / "capacitors.csv").unlink()
    (drawer / "capacitors.csv").symlink_to(secret)
    done = run("pair", "7.1MHz", "--drawer", drawer)
    assert done.code == 2 and "outside the drawer" in done.err and "password" not in done.err


def test_a_link_inside_the_drawer_is_a_file_of_it(tmp_path: Path) -> None:
    """And a drawer that is itself a link is the folder that it leads to."""
    drawer = write_drawer(tmp_path / "drawer")
    (drawer / "wires.csv").rename(drawer / "wires-of-last-year.txt")
    (drawer / "wires.csv").symlink_to("wires-of-last-year.txt")
    (tmp_path / "mine").symlink_to(drawer)
    assert run("parts", "--drawer", tmp_path / "mine").code == 0


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="named pipes")
def test_a_pipe_or_device_in_a_drawer_is_refused_at_once(tmp_path: Path) -> None:
    """Reading it would wait for ever."""
    drawer = write_drawer(tmp_path / "drawer")
    (drawer / "capacitors.csv").unlink()
    os.mkfifo(drawer / "capacitors.csv")
    done = run("pair", "7.1MHz", "--drawer", drawer)
    assert done.code == 2 and "not a plain file" in done.err


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="a device that never ends")
def test_a_plan_without_an_end_is_refused() -> None:
    """After the most that a plan may have."""
    done = run("bands", "/dev/zero")
    assert done.code == 2 and "no plan" in done.err


@pytest.mark.skipif(sys.platform != "linux", reason="the memory of a child")
def test_a_drawer_of_a_million_rows_is_refused_within_a_gigabyte(tmp_path: Path) -> None:
    """With the limit that it breaks."""
    drawer = write_drawer(tmp_path / "drawer")
    with (drawer / "capacitors.csv").open("w", encoding="utf-8") as file:
        file.write("value,label\n")
        file.writelines(f"{1 + place} pF,part {place}\n" for place in range(1_000_000))
    code = (
        "import resource, sys\n"
        "from partpick.cli import main\n"
        f"code = main(['parts', '--drawer', {str(drawer)!r}])\n"
        "print(code, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    exit_code, kilobytes = (int(each) for each in done.stdout.split())
    assert exit_code == 2 and "the most that is read" in done.stderr
    assert kilobytes < 1_000_000


@pytest.mark.parametrize("depth", [10, 1_000, 100_000])
def test_deep_nesting_ends_in_one_line(tmp_path: Path, depth: int) -> None:
    """Of lists, of tables in a row, and of a dotted key."""
    for text in (
        "a = " + "[" * depth + "]" * depth,
        "a = " + "{a=" * depth + "1" + "}" * depth,
        ".".join("a" * depth) + " = 1",
    ):
        plan = tmp_path / "p.toml"
        plan.write_text(text, encoding="utf-8")
        done = run("bands", plan)
        assert done.code == 2 and done.err.count("\n") == 1


def test_a_deep_earlier_result_ends_in_one_line(tmp_path: Path) -> None:
    """JSON nests as well."""
    plan = tmp_path / "p.toml"
    plan.write_text('[[band]]\nname = "a"\nat = "7.1 MHz"\n', encoding="utf-8")
    earlier = tmp_path / "r.json"
    earlier.write_text("[" * 100_000 + "]" * 100_000, encoding="utf-8")
    done = run("bands", plan, "--drawer", write_drawer(tmp_path / "drawer"), "--against", earlier)
    assert done.code == 2 and done.err.count("\n") == 1


def test_nothing_in_a_plan_or_drawer_names_a_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Paths stand in names and labels; the only files opened are those of the command line."""
    target = tmp_path / "target.txt"
    name = f"../{target.name}"
    plan = tmp_path / "p.toml"
    plan.write_text(f'title = "{target}"\n[[band]]\nname = "{name}"\nat = "7.1 MHz"\n', encoding="utf-8")
    drawer = drawer_named(tmp_path / "drawer", str(target))
    out = tmp_path / "out"
    out.mkdir()
    monkeypatch.chdir(out)
    done = run("bands", plan, "--drawer", drawer, "--json", "r.json", "--sheet", "s.html", "--netlist", "n.cir")
    assert done.code == 0, done.err
    assert sorted(path.name for path in out.iterdir()) == ["n.cir", "r.json", "s.html"]
    assert not target.exists()
