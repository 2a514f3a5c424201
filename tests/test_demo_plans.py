"""The plans that are shipped: invented and marked so, each solved to proof in seconds, with a sheet to build from."""

from __future__ import annotations

from pathlib import Path

import pytest

from partpick import load_catalogue, load_plan, solve
from partpick.report.sheet import sheet

PLANS = sorted((Path(__file__).parent.parent / "data" / "plans").glob("*.toml"))


@pytest.mark.parametrize("plan", PLANS, ids=lambda plan: plan.stem)
def test_a_plan_is_read_and_marked_invented(plan: Path) -> None:
    """Nobody is to take a demo for a real station."""
    assert plan.read_text(encoding="utf-8").startswith("# Invented example")
    assert "(invented)" in load_plan(str(plan)).title


@pytest.mark.parametrize("name", ["oscillator", "eight_bands", "beacon"])
def test_a_plan_is_proven_and_its_sheet_names_every_part(name: str) -> None:
    """A technician builds from the sheet alone."""
    plan = next(plan for plan in PLANS if plan.stem == f"skerry_point_{name}")
    result = solve(load_plan(str(plan)), load_catalogue(None), top=1)
    assert result.proof.status == "optimal"
    page = sheet(result)
    for part in result.candidates[0].parts:
        assert part.reference in page and (part.kind == "coil" or part.label in page.replace("\u00a0", " "))
