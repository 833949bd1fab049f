"""The worker's way out: lines on a stream, with frequent events gathered so that the window is never flooded."""

from __future__ import annotations

import threading
from typing import TextIO

from thalweg.study.events import AnyEvent, Iteration
from thalweg_app.messages import Events, Message

#: Seconds between two lines of events; 30 lines a second are as many as the window draws.
PAUSE = 1.0 / 30.0


class Outbox:
    """Iterations wait up to PAUSE for company; everything else leaves at once, in order."""

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._lock = threading.Lock()
        self._wake = threading.Event()
        self._waiting: list[AnyEvent] = []
        self._job = 0
        threading.Thread(target=self._flush_regularly, name="outbox", daemon=True).start()

    def event(self, job: int, event: AnyEvent) -> None:
        with self._lock:
            self._job = job
            self._waiting.append(event)
            if not isinstance(event, Iteration):
                self._flush()
        self._wake.set()

    def message(self, message: Message) -> None:
        """Sends waiting events first, then `message`."""
        with self._lock:
            self._flush()
            self._write(message)

    def _flush_regularly(self) -> None:
        while True:
            self._wake.wait()
            self._wake.clear()
            threading.Event().wait(PAUSE)
            with self._lock:
                self._flush()

    def _flush(self) -> None:
        if self._waiting:
            events, self._waiting = self._waiting, []
            self._write(Events(job=self._job, events=events))

    def _write(self, message: Message) -> None:
        self._stream.write(message.model_dump_json() + "\n")
        self._stream.flush()
