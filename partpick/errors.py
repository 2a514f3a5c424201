"""The errors a user may meet; everything else is a bug.

`cli.py` alone turns one of these into a line on stderr and an exit code.
"""

from __future__ import annotations


class PartpickError(Exception):
    """Base of every expected failure; its text is one complete line for the user."""

    exit_code = 2


class QuantityError(PartpickError):
    """A number or unit that could not be read."""


class RequestError(PartpickError):
    """A plan file or an option that is not understood."""


class CatalogueError(PartpickError):
    """A row of the catalogue or of a drawer that is not understood; what it holds breaks no line."""

    def __init__(self, text: str) -> None:
        super().__init__("".join(letter if letter.isprintable() else "\ufffd" for letter in text))


class OutputError(PartpickError):
    """An output that cannot be written."""


class InternalError(PartpickError):
    """A result that failed its own recheck; never shown as an answer."""
