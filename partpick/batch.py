"""Several plans at once: one pool of processes; each plan is solved and rendered in one of them.

Every plan has a process to itself while it is solved, and nothing is shared, so that the answers are the same
whatever the number of processes. Answers come back in the order of the plans. Signals meet the parent alone: it
lifts a flag that the monitor of every process looks at, so that each comes back with the best it has.
"""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import signal
import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import CancelledError, Future, ProcessPoolExecutor
from concurrent.futures import TimeoutError as NotYetError
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, field
from multiprocessing.synchronize import Event

from partpick.errors import PartpickError
from partpick.parts import Catalogue
from partpick.progress import Monitor
from partpick.rendering import renderers
from partpick.request import Request

LOOK_SECONDS = 0.1  # how often the parent looks for a stop
INTERRUPT = "interrupt"


@dataclass(frozen=True, kw_only=True)
class Order:
    """One plan to be solved, and what is wanted of it."""

    request: Request
    top: int
    outputs: tuple[str, ...]  # names, "table" among them where it is shown
    why: int | None = None
    dial: str | None = None
    tracking: str | None = None


@dataclass(frozen=True, kw_only=True)
class Answer:
    """What came of it: the text of each output, or why there is none."""

    texts: dict[str, str] = field(default_factory=dict)
    found: bool = False
    interrupted: bool = False
    complaint: str | None = None
    exit_code: int = 0  # of a complaint


class _Errand:
    """The monitor of one plan of several: stopped from outside or by its own time limit."""

    def __init__(self, stopped: Callable[[], bool], time_limit: float | None, report: Callable[..., None]) -> None:
        self._stopped = stopped
        self._end = None if time_limit is None else time.monotonic() + time_limit
        self.report = report

    def stopped(self) -> str | None:
        """Return why to stop now, None to go on."""
        if self._stopped():
            return INTERRUPT
        return "time limit" if self._end is not None and time.monotonic() >= self._end else None

    def on_stop(self, callback: Callable[[], None] | None) -> None:
        """Ignore the callback: whoever solves looks at `stopped`."""


@dataclass
class _Process:
    """What a process of the pool is given once."""

    catalogue: Catalogue
    stop: Event
    time_limit: float | None


_process: _Process | None = None


def _begin(catalogue: Catalogue, stop: Event, time_limit: float | None) -> None:
    global _process
    for number in (signal.SIGINT, signal.SIGTERM):
        signal.signal(number, signal.SIG_IGN)
    _process = _Process(catalogue, stop, time_limit)


@contextlib.contextmanager
def _signals_held() -> Iterator[None]:
    """Hold back signals meanwhile; a process that is started inherits it for good."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    before = signal.pthread_sigmask(signal.SIG_BLOCK, (signal.SIGINT, signal.SIGTERM))
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _silent(proving: str, best: str | None = None, bound: str | None = None) -> None:
    """Say nothing: the parent tells how far the plans are."""


def _solved_in_process(order: Order) -> Answer:
    assert _process is not None
    errand = _Errand(_process.stop.is_set, _process.time_limit, _silent)
    return _solved(order, _process.catalogue, errand)


def _solved(order: Order, catalogue: Catalogue, errand: _Errand) -> Answer:
    from partpick.solving import solve

    if errand.stopped() == INTERRUPT:  # not begun: nothing to show
        return Answer(interrupted=True)
    try:
        result = solve(order.request, catalogue, top=max(order.top, order.why or 0), monitor=errand)
        render = renderers(result, order.why, None, order.dial, order.tracking)
        texts = {name: render[name]() for name in order.outputs}
    except PartpickError as error:
        return Answer(complaint=str(error), exit_code=error.exit_code)
    stopped = result.proof.stopped_by == INTERRUPT
    return Answer(texts=texts, found=bool(result.candidates), interrupted=stopped)


def processes(wanted: int | None, plans: int) -> int:
    """Return how many processes to use: as many as wanted, else one a core, never more than plans."""
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    return max(1, min(cores if wanted is None else wanted, plans))


def answers(
    orders: Sequence[Order], catalogue: Catalogue, *, workers: int, time_limit: float | None, monitor: Monitor
) -> Iterator[Answer]:
    """Yield the answer to each order, in their sequence.

    Parameters
    ----------
    orders : sequence of Order
        The plans.
    catalogue : Catalogue
        The parts in use.
    workers : int
        Processes; with one, everything happens in this process. [-]
    time_limit : float or None
        Of each plan. [s]
    monitor : Monitor
        Hears how many plans are done; where it says stop, each plan that has begun comes back with its best.
    """
    if workers == 1:
        for order in orders:
            errand = _Errand(lambda: monitor.stopped() is not None, time_limit, monitor.report)
            yield _solved(order, catalogue, errand)
        return
    context = multiprocessing.get_context("spawn")  # a fork would copy the threads of numpy half alive
    stop = context.Event()
    with ProcessPoolExecutor(workers, context, _begin, (catalogue, stop, time_limit)) as pool:
        with _signals_held():  # also by the processes that start here, from their first moment
            futures = [pool.submit(_solved_in_process, order) for order in orders]
        try:
            for place, future in enumerate(futures):
                yield _wait(future, futures, stop, monitor)
                monitor.report(f"{place + 1} of {len(futures)} plans")
        except BaseException:
            stop.set()
            for future in futures:
                future.cancel()
            for process in multiprocessing.active_children():
                process.kill()
            raise


def _wait(future: Future[Answer], futures: Sequence[Future[Answer]], stop: Event, monitor: Monitor) -> Answer:
    """Return an answer, looking meanwhile for a stop."""
    while True:
        if monitor.stopped() is not None and not stop.is_set():
            stop.set()
            for other in futures:
                other.cancel()  # what has begun goes on to its end
        try:
            return future.result(timeout=LOOK_SECONDS)
        except NotYetError:
            done = sum(other.done() for other in futures)
            monitor.report(f"{done} of {len(futures)} plans are done")
        except CancelledError:
            return Answer(interrupted=True)
        except BrokenProcessPool:
            return Answer(complaint="its process ended without an answer (out of memory?)", exit_code=2)
