"""The monitor of a run on the command line: signals, time limit, progress on standard error.

Nothing is shown of a run below a second. A terminal sees one line that is rewritten; a file or pipe
gets a plain line now and then. A first Ctrl-C or SIGTERM asks the search to stop and keep its best;
a second one, while it has not yet come back, gives up.
"""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import threading
import time
from collections.abc import Callable, Iterator
from types import FrameType, TracebackType
from typing import TextIO

QUIET_SECONDS = 1.0
REWRITE_SECONDS = 0.1
FIRST_PLAIN_SECONDS = 2.0  # then after twice the pause each time, up to the next figure
LONGEST_PLAIN_SECONDS = 60.0
WIDTH = 79

INTERRUPT = "interrupt"
TIME_LIMIT = "time limit"


class Terminal:
    """A `Monitor` to be used in a `with` statement around the search and the writing of its outputs."""

    def __init__(self, time_limit: float | None = None, stream: TextIO | None = None) -> None:
        """Start the clock: `time_limit` in seconds, progress to `stream`, by default to standard error."""
        self._stream = stream if stream is not None else sys.stderr
        dumb = os.environ.get("TERM") == "dumb"
        self._rewrites = self._stream is not None and self._stream.isatty() and not dumb
        self._limit = time_limit
        self._start = time.monotonic()
        self._next = self._start + (QUIET_SECONDS if self._rewrites else FIRST_PLAIN_SECONDS)
        self._pause = FIRST_PLAIN_SECONDS
        self._shown = 0  # columns of the line that stands on the terminal
        self._reason: str | None = None
        self._writing = False
        self._undisturbed = False
        self._callback: Callable[[], None] | None = None
        self._lock = threading.RLock()  # a signal may come while its own thread holds it
        self._timer: threading.Timer | None = None
        self._before: dict[int, object] = {}

    # ------------------------------------------------------------ what a search may ask

    def report(self, proving: str, best: str | None = None, bound: str | None = None) -> None:
        """Show what is being proved, the best so far and its bound, if it is time for it."""
        with self._lock:
            now = time.monotonic()
            if now < self._next or self._stream is None:
                return
            self._next = now + (REWRITE_SECONDS if self._rewrites else self._pause)
            self._pause = min(2 * self._pause, LONGEST_PLAIN_SECONDS)
            self._show(self._line(now - self._start, proving, best, bound))

    def stopped(self) -> str | None:
        """Return "interrupt" or "time limit" once a stop was asked for."""
        if self._reason is None and self._limit is not None and time.monotonic() - self._start >= self._limit:
            self._stop(TIME_LIMIT)
        return self._reason

    def on_stop(self, callback: Callable[[], None] | None) -> None:
        """Set what to call at once when a stop is asked for; called now if it already was."""
        with self._lock:
            self._callback = callback
            late = self._reason is not None
        if late and callback is not None:
            callback()

    # ------------------------------------------------------------ what the command line does

    def writing(self) -> None:
        """Say that the search is over: from now on no signal may break off what is being written."""
        self._writing = True
        self.clear()

    @contextlib.contextmanager
    def undisturbed(self) -> Iterator[None]:
        """Let no signal break off what is written meanwhile; it is heard all the same."""
        self._undisturbed = True
        try:
            yield
        finally:
            self._undisturbed = False

    def clear(self) -> None:
        """Take the progress line away."""
        with self._lock:
            if self._shown:
                self._write("\r" + " " * self._shown + "\r")
                self._shown = 0

    @property
    def elapsed(self) -> float:
        """Seconds since the monitor was made."""
        return time.monotonic() - self._start

    @property
    def interrupted(self) -> bool:
        """Whether a signal asked for the stop."""
        return self._reason == INTERRUPT

    def __enter__(self) -> Terminal:
        if threading.current_thread() is threading.main_thread():
            for number in (signal.SIGINT, signal.SIGTERM):
                self._before[number] = signal.signal(number, self._signalled)
        if self._limit is not None:
            self._timer = threading.Timer(max(self._limit - self.elapsed, 0.0), self._stop, (TIME_LIMIT,))
            self._timer.daemon = True
            self._timer.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._timer is not None:
            self._timer.cancel()
        for number, handler in self._before.items():
            signal.signal(number, handler)  # type: ignore[arg-type]
        self._before.clear()
        self.clear()

    # ------------------------------------------------------------ inside

    def _signalled(self, number: int, frame: FrameType | None) -> None:
        if self._writing:
            return
        if self.interrupted and not self._undisturbed:
            raise KeyboardInterrupt
        self._stop(INTERRUPT)

    def _stop(self, reason: str) -> None:
        with self._lock:
            if self._reason is None or reason == INTERRUPT:
                self._reason = reason
            callback = self._callback
        if callback is not None:
            callback()

    def _line(self, elapsed: float, proving: str, best: str | None, bound: str | None) -> str:
        clock = f"{elapsed:.0f} s"
        if self._limit is not None:  # when the proof will be complete nobody knows: only the limit is certain
            clock += f", at most {max(self._limit - elapsed, 0.0):.0f} s left"
        told = [f"best so far {best}"] if best is not None else []
        told += [f"no better than {bound}"] if bound is not None else []
        return f"{clock}: {proving}" + (f" ({', '.join(told)})" if told else "")

    def _show(self, line: str) -> None:
        if not self._rewrites:
            self._write(line + "\n")
            return
        line = line[:WIDTH]
        self._write("\r" + line.ljust(self._shown))
        self._shown = len(line)

    def _write(self, text: str) -> None:
        with contextlib.suppress(OSError, ValueError):  # nobody listens: no reason to fail
            self._stream.write(text)
            self._stream.flush()
