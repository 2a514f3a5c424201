"""The README shows what the program really prints, and its two commands are those of the check script."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```text\n(.*?)```", README, flags=re.DOTALL)


@pytest.mark.parametrize(
    ("arguments", "block", "code"),
    [
        (["data/plans/skerry_point_preselector.toml", "--top", "3"], 0, 0),
        (["data/plans/skerry_point_one_coil.toml"], 1, 1),
    ],
)
def test_the_readme_shows_the_printed_output(arguments: list[str], block: int, code: int) -> None:
    """A reader trusts the README only as long as the program prints the same."""
    run = subprocess.run(
        [sys.executable, "-m", "partpick", "bands", *arguments],
        capture_output=True,
        text=True,
        cwd=ROOT,
        encoding="utf-8",
        check=False,
    )
    assert run.returncode == code, run.stderr
    printed = run.stdout
    shown = BLOCKS[block].rstrip("\n")
    assert shown == printed.rstrip("\n") or (shown.endswith("...") and printed.startswith(shown[:-3]))


def test_the_example_for_a_notebook_runs(monkeypatch: pytest.MonkeyPatch) -> None:
    """It is typed as it stands there; the changed plan gives what was asked for."""
    (example,) = re.findall(r"```python\n(.*?)```", README, flags=re.DOTALL)
    monkeypatch.chdir(ROOT)
    *statements, last = example.strip().splitlines()
    names: dict[str, Any] = {}
    exec("\n".join(statements), names)
    frame = eval(last, names)
    assert list(frame.columns) == ["rank", "q", "capacitance_f"] and (frame["q"] >= 180).all() and len(frame) == 3


def test_the_check_script_runs_the_test_command_of_the_readme() -> None:
    """What lands is what the README tells a newcomer to run."""
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "-m pytest" in script and "-m pytest" in README
    assert ".venv/bin/pip install . &&" in README
