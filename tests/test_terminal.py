"""Tests of the monitor: signals, time limit, and how little it says."""

from __future__ import annotations

import io
import itertools
import os
import signal
import time

import pytest

from partpick import terminal
from partpick.progress import Monitor
from partpick.terminal import Terminal


class _Screen(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def _late(monitor: Terminal, seconds: float) -> None:
    """Make the run look as if it had begun so long ago."""
    monitor._start -= seconds
    monitor._next -= seconds


def test_it_is_a_monitor() -> None:
    """The search knows the protocol only; the type checker compares the signatures here."""
    monitor: Monitor = Terminal(stream=io.StringIO())
    assert monitor.stopped() is None


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_a_signal_asks_for_a_stop_at_once(number: int) -> None:
    """A solver that swallows signals is told by the callback, within the handler."""
    told: list[str] = []
    with Terminal(stream=io.StringIO()) as monitor:
        monitor.on_stop(lambda: told.append("stop"))
        os.kill(os.getpid(), number)
        assert monitor.stopped() == "interrupt"
        assert monitor.interrupted
    assert told == ["stop"]


def test_a_second_signal_gives_up() -> None:
    """A search that does not come back must not hold the terminal."""
    with pytest.raises(KeyboardInterrupt), Terminal(stream=io.StringIO()):
        os.kill(os.getpid(), signal.SIGINT)
        os.kill(os.getpid(), signal.SIGINT)


def test_nothing_breaks_off_the_writing() -> None:
    """Between two files of one result no signal counts."""
    with Terminal(stream=io.StringIO()) as monitor:
        monitor.writing()
        os.kill(os.getpid(), signal.SIGINT)
        os.kill(os.getpid(), signal.SIGTERM)
        assert monitor.stopped() is None


def test_the_handlers_of_before_come_back() -> None:
    """In a notebook Ctrl-C must work as ever after a run."""
    before = signal.getsignal(signal.SIGINT), signal.getsignal(signal.SIGTERM)
    with Terminal(stream=io.StringIO()):
        assert signal.getsignal(signal.SIGINT) != before[0]
    assert (signal.getsignal(signal.SIGINT), signal.getsignal(signal.SIGTERM)) == before


def test_the_time_limit_calls_back_without_being_asked() -> None:
    """A solver in the middle of its work asks nobody for the time."""
    told: list[float] = []
    with Terminal(0.05, io.StringIO()) as monitor:
        monitor.on_stop(lambda: told.append(monitor.elapsed))
        time.sleep(0.3)
        assert monitor.stopped() == "time limit"
    assert told and told[0] < 0.3


def test_a_callback_that_comes_late_is_called_too() -> None:
    """The stop may fall between two stages, when no callback is set."""
    told: list[str] = []
    with Terminal(stream=io.StringIO()) as monitor:
        os.kill(os.getpid(), signal.SIGINT)
        monitor.on_stop(lambda: told.append("stop"))
    assert told == ["stop"]


def test_a_short_run_says_nothing() -> None:
    """Below a second progress is only noise."""
    stream = _Screen()
    with Terminal(stream=stream) as monitor:
        monitor.report("the pieces")
    assert stream.getvalue() == ""


def test_a_terminal_sees_one_line_that_goes_away() -> None:
    """Rewritten, never wrapped, gone before the table is printed."""
    stream = _Screen()
    with Terminal(stream=stream) as monitor:
        _late(monitor, 12)
        monitor.report("least worst error", "0.12 %", "0.08 % " + "x" * 100)
        shown = stream.getvalue()
        assert shown.startswith("\r12 s: least worst error (best so far 0.12 %, no better than 0.08 %")
        assert len(shown) <= 80 and "\n" not in shown
        monitor.clear()
    assert stream.getvalue()[len(shown) :] == "\r" + " " * (len(shown) - 1) + "\r"


def test_a_file_gets_few_plain_lines() -> None:
    """A log of an hour must not hold thousands of lines."""
    stream = io.StringIO()
    with Terminal(60, stream) as monitor:
        _late(monitor, 12)
        for _ in range(1000):
            monitor.report("the pieces")
    assert stream.getvalue() == "12 s, at most 48 s left: the pieces\n"


def test_the_pause_between_plain_lines_grows_to_a_minute(monkeypatch: pytest.MonkeyPatch) -> None:
    """Lines at a doubling distance first, then one a minute."""
    clock = [0.0]
    monkeypatch.setattr(terminal.time, "monotonic", lambda: clock[0])
    stream = io.StringIO()
    monitor = Terminal(stream=stream)
    for second in range(3600):
        clock[0] = float(second)
        monitor.report("the pieces")
    times = [int(line.split()[0]) for line in stream.getvalue().splitlines()]
    assert times[:3] == [2, 4, 8]
    assert max(later - earlier for earlier, later in itertools.pairwise(times)) == 60
    assert len(times) < 70


def test_a_closed_stream_stops_nothing() -> None:
    """Progress that nobody can read is no reason to lose a result."""
    stream = _Screen()
    with Terminal(stream=stream) as monitor:
        _late(monitor, 5)
        stream.close()
        monitor.report("the pieces")
