"""A coil that was wound and measured: the rest is picked again, and the changes are told."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from workbench import plan, ranked, run, write_drawer

CLOSE = ("--error", "8 %")


@pytest.fixture
def drawer(tmp_path: Path) -> Path:
    return write_drawer(tmp_path / "drawer")


def parts(candidate: dict[str, object]) -> list[str]:
    return sorted(part["description"] for part in candidate["parts"] if part["kind"] == "capacitor")  # type: ignore


def test_a_measured_coil_is_refitted_in_one_command(drawer: Path, tmp_path: Path) -> None:
    """Wound low, at 2.2 µH instead of 4.7 µH: other capacitors, and the swap is told by their labels."""
    earlier = tmp_path / "earlier.json"
    before = ranked("pair", "7.1MHz", "--drawer", drawer, *CLOSE, "--forms", "bought")[0]
    assert run("pair", "7.1MHz", "--drawer", drawer, *CLOSE, "--forms", "bought", "--json", earlier).code == 0
    job = ("pair", "7.1MHz", "--drawer", drawer, *CLOSE, "--measured", "2.2uH", "--against", earlier)
    done = run(*job)
    after = ranked(*job[:-2])[0]
    told = done.out[done.out.index("Against the earlier result:") :]
    joined = " ".join(told.split())
    assert parts(before) != parts(after)
    assert "choke B, bought gives way to the coil as measured" in joined
    for label in set(parts(before)) ^ set(parts(after)):
        assert label in joined
    assert max(map(len, told.splitlines())) <= 80


def test_the_same_request_changes_nothing(drawer: Path, tmp_path: Path) -> None:
    """Against its own result every band keeps its parts."""
    job = plan(tmp_path / "plan.toml", [("beacon", "7.1 MHz"), ("weather", "5 MHz")], '[limits]\nerror = "20 %"\n')
    earlier = tmp_path / "earlier.json"
    assert run("bands", job, "--drawer", drawer, "--json", earlier).code == 0
    out = run("bands", job, "--drawer", drawer, "--against", earlier).out
    assert out.count("the same parts") == 2
    other = plan(tmp_path / "other.toml", [("beacon", "7.1 MHz"), ("ship", "5 MHz")], '[limits]\nerror = "20 %"\n')
    out = run("bands", other, "--drawer", drawer, "--against", earlier).out
    assert "ship: new in the plan" in out and "weather: no longer in the plan" in out


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (None, "No such file"),
        ("{", "no JSON"),
        ("[1]", "no result file"),
        ('{"partpick_result": 2}', "no result file"),
        ('{"partpick_result": 1, "candidates": []}', "no candidate"),
        ('{"partpick_result": 1, "candidates": [{"bands": [], "coils": 3}]}', "no candidate"),
        ("[" * 100_000, "no JSON"),
    ],
)
def test_a_file_that_is_no_result_is_refused(drawer: Path, tmp_path: Path, text: str | None, said: str) -> None:
    """Before anything is solved, in one line with the name of the option."""
    earlier = tmp_path / "earlier.json"
    if text is not None:
        earlier.write_text(text)
    done = run("pair", "7.1MHz", "--drawer", drawer, "--against", earlier)
    assert done.code == 2 and done.out == ""
    assert "--against" in done.err and said in done.err and len(done.err.splitlines()) == 1


def test_nothing_found_is_nothing_to_compare(drawer: Path, tmp_path: Path) -> None:
    """The answer stays that nothing fits, with its exit code."""
    earlier = tmp_path / "earlier.json"
    assert run("pair", "7.1MHz", "--drawer", drawer, *CLOSE, "--json", earlier).code == 0
    done = run("pair", "7.1MHz", "--drawer", drawer, "--error", "0.00001 %", "--against", earlier)
    assert done.code == 1 and "Nothing to compare" in done.out


def test_a_comparison_needs_the_table(drawer: Path, tmp_path: Path) -> None:
    """With JSON on stdout there is no place for it; silence would hide the request."""
    earlier = tmp_path / "earlier.json"
    earlier.write_text(json.dumps({}))
    done = run("pair", "7.1MHz", "--drawer", drawer, "--against", earlier, "--json", "-")
    assert done.code == 2 and "--against" in done.err
