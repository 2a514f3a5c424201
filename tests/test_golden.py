"""One expected output per form of output, read by eye once; a change of form shows as a difference here."""

from __future__ import annotations

from pathlib import Path

import handmade
import pytest

import partpick
from partpick.report.bom import bom_csv
from partpick.report.result_json import result_json
from partpick.report.table import result_table
from partpick.result import Result

GOLDEN = Path(__file__).parent / "golden"


def _plan() -> Result:
    """Return two candidates of a plan of two bands."""
    request = handmade.request("beacon", "weather", title="Listening set (invented)")
    first, second = handmade.two_bands(1), handmade.two_bands(2)
    return handmade.result(first, second, request=request)


@pytest.mark.parametrize(
    ("name", "written"),
    [("plan.txt", result_table), ("plan.csv", bom_csv), ("plan.json", result_json)],
)
def test_each_form_of_output_is_as_it_was_read(
    name: str, written: object, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Scripts and eyes rely on the form; a deliberate change replaces the golden file in the same commit."""
    monkeypatch.setattr(partpick, "__version__", "0", raising=False)
    assert callable(written)
    assert written(_plan()).encode() == (GOLDEN / name).read_bytes()
