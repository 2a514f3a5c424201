"""How a search says where it is and is told to stop; it neither prints nor reads signals."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Protocol


class Unsettled(Exception):  # noqa: N818 - a stop that was asked for is no error
    """A search for one candidate ended before it was known whether there is any."""


class Monitor(Protocol):
    """What a search may ask of whoever started it."""

    def report(self, proving: str, best: str | None = None, bound: str | None = None) -> None:
        """Say what is being proved, the best so far and its bound, each in words."""

    def stopped(self) -> str | None:
        """Return why to stop now: "time limit", "interrupt", or None to go on."""

    def on_stop(self, callback: Callable[[], None] | None) -> None:
        """Set what to call at once when a stop is asked for, from any thread; None clears it."""


class Quiet:
    """A monitor for library use: prints nothing; stops at an optional time limit in seconds."""

    def __init__(self, time_limit: float | None = None) -> None:
        self._end = None if time_limit is None else time.monotonic() + time_limit

    def report(self, proving: str, best: str | None = None, bound: str | None = None) -> None:
        """Ignore the report."""

    def stopped(self) -> str | None:
        """Return "time limit" once the limit has passed."""
        return "time limit" if self._end is not None and time.monotonic() >= self._end else None

    def on_stop(self, callback: Callable[[], None] | None) -> None:
        """Ignore the callback: nothing can interrupt this monitor."""
