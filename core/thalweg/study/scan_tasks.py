"""Scan points under way on a pool that may lose workers."""

from __future__ import annotations

import time
import traceback
from collections import deque
from collections.abc import Callable, Iterable
from concurrent.futures import FIRST_COMPLETED, Executor, Future, wait
from concurrent.futures.process import BrokenProcessPool
from typing import Any

from thalweg.errors import Stopped
from thalweg.study.executors import InProcess, Local
from thalweg.study.point_seed import PointSeed
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.scan_task import PointOutcome, solve_point

#: How often a waiting scan looks whether it should stop, seconds.
TICK = 0.05
LOST = "The worker process ended twice at this point, perhaps for want of memory."

#: A point's index, and the points that follow it in its chain.
Tag = tuple[int, list[int]]
_Entry = tuple[Tag, ScanSpec, float, PointSeed | None]


class PointTasks:
    """Tasks on a pool that may lose workers.

    A worker that ends takes its whole pool along, and nothing tells whose fault it was. Whatever was under way is run once more, one
    point after another in a pool of its own, while a new pool goes on with the rest; a point that is lost again has failed.
    """

    def __init__(self, make_pool: Callable[[], Executor], should_stop: Callable[[], bool]) -> None:
        self._make_pool, self._should_stop = make_pool, should_stop
        self._pool: Executor | None = None
        self._second_pool: Executor | None = None
        self._waiting: dict[Future[PointOutcome], tuple[_Entry, Executor]] = {}
        self._second: Future[PointOutcome] | None = None
        self.left = 0  # points still to come, as far as is foreseen
        self._in_line: deque[_Entry] = deque()  # this process takes one point after another, so that each is told of when it is done
        self._suspects: deque[_Entry] = deque()

    def submit(self, tag: Tag, scan: ScanSpec, value: float, seed: PointSeed | None) -> None:
        if self._should_stop():
            return
        entry = (tag, scan, value, seed)
        self._pool = self._pool or self._make_pool()
        if isinstance(self._pool, InProcess):
            self._in_line.append(entry)
            return
        try:
            self._start(self._pool, entry)
        except BrokenProcessPool:  # lost while nobody looked
            self._pool = _apart(self._make_pool())
            self._start(self._pool, entry)

    def results(self) -> Iterable[tuple[Tag, PointOutcome]]:
        """Outcomes as they come, until nothing is under way; those submitted meanwhile included. A stop keeps what has come."""
        while self._waiting or self._suspects or self._in_line:
            self._try_suspect()
            self._take_next_in_line()
            finished, _ = wait(self._waiting, timeout=TICK, return_when=FIRST_COMPLETED)
            for future in finished:
                if future in self._waiting:
                    entry, pool = self._waiting.pop(future)
                    outcome = self._outcome(future, entry, pool)
                    if outcome is not None:
                        yield entry[0], outcome
            if self._should_stop():
                self._abandon()

    def close(self) -> None:
        for future in self._waiting:
            future.cancel()
        for pool in (self._pool, self._second_pool):
            if pool is not None:
                pool.shutdown(wait=False)  # a cluster's executor knows no cancel_futures
        self._pool = self._second_pool = None

    def _start(self, pool: Executor, entry: _Entry) -> Future[PointOutcome]:
        _, scan, value, seed = entry
        here = (self._should_stop,) if isinstance(pool, InProcess) else ()  # elsewhere a point under way is ended by force
        future = pool.submit(solve_point, scan, value, seed, *here)
        self._waiting[future] = (entry, pool)
        return future

    def _take_next_in_line(self) -> None:
        if not self._in_line or self._pool is None:
            return
        here = self._pool
        if isinstance(here, Local) and here.pays(self.left):
            self._pool = here.pool()
            while self._in_line:
                self._start(self._pool, self._in_line.popleft())
            return
        self.left -= 1
        begun = time.perf_counter()
        self._start(here, self._in_line.popleft())
        if isinstance(here, Local):
            here.took(time.perf_counter() - begun)

    def _try_suspect(self) -> None:
        if self._suspects and (self._second is None or self._second not in self._waiting):
            if self._second_pool is not None:
                self._second_pool.shutdown(wait=False)
            self._second_pool = _apart(self._make_pool())
            self._second = self._start(self._second_pool, self._suspects.popleft())

    def _outcome(self, future: Future[PointOutcome], entry: _Entry, pool: Executor) -> PointOutcome | None:
        """None where the point was stopped, or is to be run once more because its worker was lost."""
        try:
            return future.result()
        except Stopped:
            return None
        except BrokenProcessPool:
            pool.shutdown(wait=False)
            if pool is self._second_pool:
                self._second_pool = None
                return PointOutcome(None, None, failure=LOST)
            self._pool = None if self._pool is pool else self._pool
            broken = [f for f, (_, owner) in self._waiting.items() if owner is pool]
            self._suspects.extend([entry, *(self._waiting.pop(f)[0] for f in broken)])
            return None
        except Exception as error:
            if type(error).__name__ == "KilledWorker":  # a cluster's scheduler has tried the point on several workers
                return PointOutcome(None, None, failure=LOST)
            details = "".join(traceback.format_exception(error))
            return PointOutcome(None, None, failure=f"A defect of the program: {type(error).__name__}: {error}", details=details)

    def _abandon(self) -> None:
        """Ends what is under way: elsewhere a point cannot be asked to stop, and its result is not wanted."""
        for future, (_, pool) in self._waiting.items():
            if not _processes(pool):
                future.cancel()  # a pool whose processes end finds a cancelled point in its way
        self._waiting.clear()
        self._suspects.clear()
        self._in_line.clear()
        for ended in (self._pool, self._second_pool):
            for process in _processes(ended):
                process.kill()


def _processes(pool: Executor | None) -> list[Any]:
    return list((getattr(pool, "_processes", None) or {}).values())


def _apart(pool: Executor) -> Executor:
    """Never this process: what killed a worker would end the program."""
    return pool.pool() if isinstance(pool, Local) else pool
