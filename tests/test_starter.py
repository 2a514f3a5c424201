"""The starter: a plan and a drawer that work as they are, written without harm."""

from __future__ import annotations

import shlex
import subprocess
import sys
from pathlib import Path

import pytest

import partpick
from partpick import load_catalogue, load_plan
from partpick.errors import OutputError
from partpick.starter import next_steps, starter_files, write_starter


def test_the_starter_is_marked_invented() -> None:
    """Nobody shall take its stock or prices for real ones."""
    files = starter_files()
    assert "invented" in files["plan.toml"]
    for name, text in files.items():
        if name.endswith(".csv"):
            header, *rows = text.splitlines()
            assert header.endswith(",source")
            assert rows
            assert all(row.endswith(",invented stock") for row in rows)


def test_the_plan_and_the_drawer_load(tmp_path: Path) -> None:
    """All five files come from the drawer, and every figure that matters is stated."""
    write_starter(tmp_path / "new" / "tanks", force=False)
    parts = load_catalogue(tmp_path / "new" / "tanks" / "drawer")
    assert len(parts.drawer_files) == 5
    for part in (*parts.capacitors, *parts.formers, *parts.cores):
        assert part.notes == ()
    for part in (*parts.capacitors, *parts.inductors, *parts.formers, *parts.cores):
        assert part.unit_price is not None
    assert len(load_plan(str(tmp_path / "new" / "tanks" / "plan.toml")).bands) == 2


def test_what_the_comments_of_the_plan_offer_is_read(tmp_path: Path) -> None:
    """Who takes the marks away, as told, has a plan that is understood."""
    head, tail = starter_files()["plan.toml"].split("# To go on", 1)
    (tmp_path / "plan.toml").write_text(
        head + "\n".join(line.removeprefix("#").removeprefix(" ") for line in tail.splitlines()[1:]), encoding="utf-8"
    )
    request = load_plan(str(tmp_path / "plan.toml"))
    assert request.tuning is not None and [band.swept for band in request.bands] == [False, False, True]
    assert request.bands[1].trimmer is not None


def test_the_next_steps_are_commands_that_can_be_typed(tmp_path: Path) -> None:
    """Also where the name of the folder has a blank; nothing has to be looked up elsewhere."""
    folder = tmp_path / "my tanks"
    write_starter(folder, force=False)
    typed = [shlex.split(line) for line in next_steps(folder).splitlines() if line.startswith("  partpick")]
    assert len(typed) == 2
    for command in typed:
        run = subprocess.run(
            [sys.executable, "-m", *command], capture_output=True, text=True, check=False, encoding="utf-8"
        )
        assert run.returncode == 0, run.stderr
        assert "Rank 1 in full" in run.stdout
    assert "Build sheet" in (folder / "sheet.html").read_text(encoding="utf-8")


def test_the_plan_is_solved_with_the_drawer(tmp_path: Path) -> None:
    """The first thing a new user runs must find something, within its own limits."""
    write_starter(tmp_path, force=False)
    plan, parts = load_plan(str(tmp_path / "plan.toml")), load_catalogue(tmp_path / "drawer")
    result = partpick.solve(plan, parts, top=1)
    (first,) = result.candidates
    assert result.proof.status == "optimal"
    assert first.worst_error is not None
    assert first.worst_error <= 0.005
    assert first.price is not None


@pytest.mark.parametrize("name", ["plan.toml", "drawer/cores.csv"])
def test_nothing_is_written_where_a_file_is_in_the_way(tmp_path: Path, name: str) -> None:
    """A drawer is hours of counting; it must not be lost to a second `starter`."""
    own = tmp_path / name
    own.parent.mkdir(exist_ok=True)
    own.write_text("mine")
    with pytest.raises(OutputError, match="--force"):
        write_starter(tmp_path, force=False)
    assert [path for path in tmp_path.rglob("*") if path.is_file()] == [own]
    assert own.read_text() == "mine"


def test_force_replaces_the_starter_and_nothing_else(tmp_path: Path) -> None:
    """Other files in the folder are the user's."""
    (tmp_path / "plan.toml").write_text("old")
    (tmp_path / "notes.txt").write_text("mine")
    write_starter(tmp_path, force=True)
    assert (tmp_path / "plan.toml").read_text(encoding="utf-8") == starter_files()["plan.toml"]
    assert (tmp_path / "notes.txt").read_text() == "mine"


def test_a_folder_that_cannot_be_made_is_refused(tmp_path: Path) -> None:
    """A file of that name is in the way, or no name is given."""
    (tmp_path / "file").write_text("")
    with pytest.raises(OutputError, match="folder"):
        write_starter(tmp_path / "file", force=True)
    with pytest.raises(OutputError, match="folder"):
        write_starter("", force=False)
