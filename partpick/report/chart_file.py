"""What the files of charts have in common: their names, and cells that a spreadsheet would run."""

from __future__ import annotations

import os

from partpick.errors import RequestError
from partpick.quantities import shown


def ending(path: str) -> str:
    """Return the ending of a file's name, folded."""
    return os.path.splitext(path)[1].casefold()


def check_chart_name(option: str, path: str) -> None:
    """Refuse a name that says neither CSV nor JSON.

    Raises
    ------
    RequestError
        Names the option, what was read and what is accepted.
    """
    if path != "-" and ending(path) not in (".csv", ".json"):
        raise RequestError(f"{option}: read {shown(path)}: a name that ends in .csv or .json is wanted, or -")


def cell(name: str) -> str:
    """Return a name as it may stand in a cell that no spreadsheet runs."""
    return f"'{name}" if name[:1] in "=+-@" else name
