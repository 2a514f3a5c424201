"""The demo plan solved once for all tests that read its answer."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import partpick
from partpick.result import Result

PLAN = Path(__file__).parent.parent / "data" / "plans" / "skerry_point_preselector.toml"


@cache
def demo() -> Result:
    """Return the first four candidates of the demo plan, from the shipped parts."""
    return partpick.solve(partpick.load_plan(str(PLAN)), partpick.load_catalogue(), top=4)
