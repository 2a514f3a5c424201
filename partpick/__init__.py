"""Picks the coils and capacitors of tuned circuits from parts that can be had.

The public names load what they need when they are first used, so that importing the package is cheap.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from partpick import frames
    from partpick.catalogue import load_catalogue
    from partpick.errors import PartpickError
    from partpick.planfile import load_plan, request_from_tables
    from partpick.request import Request
    from partpick.result import Result
    from partpick.solving import solve

__version__ = "0.1.0"

__all__ = [
    "PartpickError",
    "Request",
    "Result",
    "__version__",
    "frames",
    "load_catalogue",
    "load_plan",
    "request_from_tables",
    "solve",
]

_HOMES = {
    "PartpickError": "partpick.errors",
    "Request": "partpick.request",
    "Result": "partpick.result",
    "load_catalogue": "partpick.catalogue",
    "load_plan": "partpick.planfile",
    "request_from_tables": "partpick.planfile",
    "solve": "partpick.solving",
}


def __getattr__(name: str) -> object:
    if name == "frames":
        return import_module("partpick.frames")
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
