"""What a result looks like in each form of output: rendered when called, loaded when wanted."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from partpick.result import Result

REPORTS = {"json": "result_json", "bom": "bom_csv", "sheet": "sheet", "netlist": "netlist"}
MODULES = {"bom_csv": "bom"}  # of a function that is not named as its module


def renderers(
    result: Result,
    why: int | None,
    before: Mapping[str, Any] | None = None,
    dial: str | None = None,
    tracking: str | None = None,
) -> dict[str, Callable[[], str]]:
    """Return what writes each output; those that are not wanted are never called, nor loaded.

    Parameters
    ----------
    result : Result
        What was found.
    why : int or None
        Rank of the candidate whose place is explained below the table.
    before : mapping or None
        First candidate of an earlier result, told against this one below the table.
    dial : str or None
        File of the dial chart: its ending decides the form.
    tracking : str or None
        File of a receiver's tracking error, likewise.
    """

    def by(function: str) -> Callable[[], str]:
        def render() -> str:
            module = import_module(f"partpick.report.{MODULES.get(function, function)}")
            text: str = getattr(module, function)(result)
            return text

        return render

    def table() -> str:
        from partpick.report.table import result_table

        text = result_table(result)
        if before is not None:
            from partpick.report.against import changes

            text += "\n" + changes(result, before)
        if why is None or not result.candidates:
            return text
        from partpick.report.reasons import reasons

        return text + "\n" + reasons(result, why)

    def chart() -> str:
        from partpick.report.dial import dial_text

        return dial_text(result, dial or "-")

    def curve() -> str:
        from partpick.report.tracking import tracking_text

        return tracking_text(result, tracking or "-")

    charts = {"dial": chart, "tracking": curve}
    return {"table": table, **charts, **{name: by(function) for name, function in REPORTS.items()}}
