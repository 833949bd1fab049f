"""Runs long work beside the terminal: its events are shown, and Ctrl-C stops it with the best so far kept.

The work runs in a thread of its own, so that a signal is answered at once, even inside a long call of a library.
"""

from __future__ import annotations

import contextlib
import os
import signal
import sys
import threading
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from types import FrameType
from typing import TypeVar

from thalweg.errors import Stopped
from thalweg.study.events import AnyEvent, Stage
from thalweg_app.compiled import COMPILING, announced
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.terminal.display import Display

T = TypeVar("T")
Work = Callable[[Emit, ShouldStop], T]

#: The shell's convention: 128 plus the number of the signal.
SIGNAL_STATUS = 128
STOP_SIGNALS = (signal.SIGINT, signal.SIGTERM)
#: Seconds between two redraws.
TICK = 0.1
#: A hidden cursor would outlive a hard end.
SHOW_CURSOR = b"\x1b[?25h\r\n"


class Interrupts:
    """The first signal asks for a stop, the second ends the process at once. `status` is the exit status owed, 0 when none came."""

    def __init__(self) -> None:
        self.stop = threading.Event()
        self.status = 0

    def __call__(self, number: int, frame: FrameType | None) -> None:
        if self.stop.is_set():
            if sys.stderr.isatty():
                os.write(2, SHOW_CURSOR)
            os._exit(SIGNAL_STATUS + number)
        self.status = SIGNAL_STATUS + number
        self.stop.set()

    @contextlib.contextmanager
    def listening(self) -> Iterator[None]:
        if threading.current_thread() is not threading.main_thread():
            yield
            return
        before = {number: signal.signal(number, self) for number in STOP_SIGNALS}
        try:
            yield
        finally:
            for number, handler in before.items():
                signal.signal(number, handler)


def attend(work: Work[T], display: Display) -> tuple[T | None, int]:
    """The work's value, and the exit status owed to a signal (0 when none came).

    The value is None when the stop came before there was anything to keep. Whatever else the work raises passes on.
    """
    events: deque[AnyEvent] = deque()
    done, interrupts = threading.Event(), Interrupts()
    with interrupts.listening(), library_prints_to_stderr(), display, ThreadPoolExecutor(1) as pool:
        future = pool.submit(_announcing, work, events.append, interrupts.stop.is_set)
        future.add_done_callback(lambda _: done.set())
        try:
            _show_until(done, events, display, interrupts)
        finally:
            interrupts.stop.set()  # when showing itself fails, the work ends too
    try:
        return future.result(), interrupts.status
    except Stopped:
        return None, interrupts.status


def _announcing(work: Work[T], emit: Emit, should_stop: ShouldStop) -> T:
    """The work's value. Compiling is a stage of its own, with the stage that it cuts into told again behind it."""
    stages: list[AnyEvent] = []

    def keep(event: AnyEvent) -> None:
        if isinstance(event, Stage):
            stages[:] = [event]
        emit(event)

    def tell(on: bool) -> None:
        for event in [Stage(text=COMPILING)] if on else stages:
            emit(event)

    with announced(tell):
        return work(keep, should_stop)


def _show_until(done: threading.Event, events: deque[AnyEvent], display: Display, interrupts: Interrupts) -> None:
    """Shows what has gathered, some times a second: waking this thread for every event would slow the work down."""
    told = finished = False
    while not finished:
        finished = done.wait(TICK)
        while events:
            display.take(events.popleft())
        if interrupts.stop.is_set() and not told:
            display.say("Stopping with the best so far; Ctrl-C once more ends at once.")
            told = True
        display.tick()


@contextlib.contextmanager
def library_prints_to_stderr() -> Iterator[None]:
    """Keeps what libraries print, from Python or from C, out of the answer on standard output."""
    sys.stdout.flush()
    kept = os.dup(1)
    os.dup2(2, 1)
    try:
        with contextlib.redirect_stdout(sys.stderr):
            yield
    finally:
        os.dup2(kept, 1)
        os.close(kept)
