"""A sample of what `tests/fuzz/` throws at the readers and at whole plans; the full runs are by hand or slow."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from fuzz.plans import run, run_one
from fuzz.readers import CORPUS, Readers
from workbench import write_drawer

import partpick


def test_readers_refuse_in_one_line_or_read(tmp_path: Path) -> None:
    """No traceback, no hang, nothing that is not a number."""
    folder = tmp_path / "drawer"
    folder.mkdir()
    outcomes = Readers(folder, seed=3).run(400)
    assert sum(outcomes.values()) == 400 and outcomes["quantity read"] and outcomes["plan read"]


def test_whole_plans_end_in_an_answer_or_one_line(tmp_path: Path) -> None:
    """Every layout and element, each result looked at twice and written in every form."""
    outcomes = run(10, 5, tmp_path / "drawer")
    assert sum(outcomes.values()) == 10


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(10))
def test_many_whole_plans(tmp_path: Path, seed: int) -> None:
    """Hundreds of them."""
    assert run(100, 100 + seed, tmp_path / "drawer")["optimal"] > 5


@pytest.mark.parametrize("path", sorted(CORPUS.glob("*.json")), ids=lambda path: path.stem)
def test_what_once_failed_does_not_again(path: Path, tmp_path: Path) -> None:
    """Plans that ended badly, each kept as `command`, `by` and the tables of the plan."""
    kept = json.loads(path.read_text(encoding="utf-8"))
    catalogue = partpick.load_catalogue(write_drawer(tmp_path / "drawer"))
    assert run_one(kept["command"], kept["plan"], catalogue, kept["by"]) in kept["ends"]
