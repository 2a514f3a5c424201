"""Manners of the command line: completion, colour, width, outputs beside the table."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import handmade
import pytest
from test_cli import PLAN, Canned, canned  # noqa: F401  (a fixture)

from partpick.cli import cli, main

ROOT = Path(__file__).resolve().parent.parent


def run(*arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the program as a shell does."""
    return subprocess.run(
        [sys.executable, "-m", "partpick", *arguments],
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
        env={**os.environ, "PYTHONPATH": str(ROOT), **environment},
    )


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_each_shell_gets_a_completion_script(shell: str) -> None:
    """As the README says: one line in the start-up file of the shell."""
    done = run(_PARTPICK_COMPLETE=f"{shell}_source")
    assert done.returncode == 0 and "_PARTPICK_COMPLETE" in done.stdout


@pytest.mark.parametrize(
    ("typed", "place", "offered"),
    [
        ("partpick ", "1", ["plain,pair", "plain,bands", "plain,windings", "plain,parts", "plain,starter"]),
        ("partpick bands --by ", "3", ["plain,build", "plain,error", "plain,price"]),
        ("partpick bands --she", "2", ["plain,--sheet"]),
        ("partpick bands pl", "2", ["file,pl"]),
        ("partpick bands p.toml --sheet o", "4", ["file,o"]),
    ],
)
def test_commands_options_choices_and_files_are_completed(typed: str, place: str, offered: list[str]) -> None:
    """A file that cannot be completed is typed wrong."""
    done = run(_PARTPICK_COMPLETE="bash_complete", COMP_WORDS=typed, COMP_CWORD=place)
    assert done.stdout.split("\n")[:-1] == offered


@pytest.mark.parametrize("command", ["", *cli.commands])
def test_help_has_an_example_and_keeps_to_80_columns(command: str) -> None:
    """Also on a wide terminal, and without a colour code."""
    done = run(*filter(None, [command]), "--help", COLUMNS="200", FORCE_COLOR="1", NO_COLOR="1")
    lines = done.stdout.splitlines()
    assert any(line.strip().startswith(f"partpick {command}".strip()) for line in lines)
    assert max(map(len, lines)) <= 80 and "\x1b" not in done.stdout


def test_sheet_and_netlist_are_written_beside_the_table(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:  # noqa: F811
    """All outputs of one run come together."""
    assert main(["pair", "7.1MHz", "--sheet", "s.html", "--netlist", "t.cir"]) == 0
    assert Path("s.html").read_text(encoding="utf-8").startswith("<!DOCTYPE html>")
    assert ".control" in Path("t.cir").read_text(encoding="utf-8")
    assert "rank" in capsys.readouterr().out


def test_one_sheet_a_plan_goes_into_the_folder(canned: Canned) -> None:  # noqa: F811
    """Of several plans each has its own page."""
    for name in ("a.toml", "b.toml"):
        Path(name).write_text(PLAN, encoding="utf-8")
    Path("out").mkdir()
    assert main(["bands", "a.toml", "b.toml", "--sheet", "out", "--netlist", "out", "--workers", "1"]) == 0
    assert sorted(path.name for path in Path("out").iterdir()) == ["a.cir", "a.html", "b.cir", "b.html"]


def test_reasons_stand_below_the_table(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:  # noqa: F811
    """And enough candidates are asked for to reach the rank."""
    canned.results = [handmade.result(handmade.candidate(1), handmade.candidate(2))]
    assert main(["pair", "7.1MHz", "--why", "2", "--top", "1"]) == 0
    assert canned.asked["top"] == 2
    out = capsys.readouterr().out
    assert out.index("rank") < out.index("Why rank 2 stands where it does")


def test_a_rank_that_was_not_found_is_an_error_and_nothing_is_written(
    canned: Canned,  # noqa: F811
    capsys: pytest.CaptureFixture[str],
) -> None:
    """Half an answer would look whole."""
    assert main(["pair", "7.1MHz", "--why", "9", "--json", "r.json"]) == 2
    caught = capsys.readouterr()
    assert caught.out == "" and "--why 9: there is no such rank" in caught.err
    assert not Path("r.json").exists()


def test_reasons_need_the_table(canned: Canned, capsys: pytest.CaptureFixture[str]) -> None:  # noqa: F811
    """Stdout holds one output; reasons in the middle of JSON would break every reader."""
    assert main(["pair", "7.1MHz", "--why", "1", "--json", "-"]) == 2
    assert "--why is told below the table" in capsys.readouterr().err


def test_reasons_of_nothing_leave_the_answer_as_it_is(canned: Canned) -> None:  # noqa: F811
    """Nothing fits is an answer with its own reasons."""
    canned.results = [handmade.nothing()]
    assert main(["pair", "7.1MHz", "--why", "1", "--sheet", "s.html"]) == 1
    assert "Nothing fits" in Path("s.html").read_text(encoding="utf-8")
