"""Scan points under way on a pool that may lose workers."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from concurrent.futures import FIRST_COMPLETED, Executor, Future, wait
from concurrent.futures.process import BrokenProcessPool

from thalweg.study.point_seed import PointSeed
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.scan_task import PointOutcome, solve_point

#: How often a waiting scan looks whether it should stop, seconds.
TICK = 0.05

#: A point's index, and the points that follow it in its chain.
Tag = tuple[int, list[int]]
_Entry = tuple[Tag, ScanSpec, float, PointSeed | None, int]


class PointTasks:
    """Tasks on a pool that may lose workers: a broken pool is made anew and its tasks are submitted once more."""

    def __init__(self, make_pool: Callable[[], Executor], should_stop: Callable[[], bool]) -> None:
        self._make_pool, self._should_stop = make_pool, should_stop
        self._pool: Executor | None = None
        self._waiting: dict[Future[PointOutcome], _Entry] = {}

    def submit(self, tag: Tag, scan: ScanSpec, value: float, seed: PointSeed | None, tries: int = 0) -> None:
        if self._should_stop():
            return
        self._pool = self._pool or self._make_pool()
        future = self._pool.submit(solve_point, scan, value, seed)
        self._waiting[future] = (tag, scan, value, seed, tries)

    def results(self) -> Iterable[tuple[Tag, PointOutcome]]:
        """Outcomes as they come, until nothing is under way; those submitted meanwhile included."""
        while self._waiting:
            if self._should_stop():
                self._abandon()
                return
            finished, _ = wait(self._waiting, timeout=TICK, return_when=FIRST_COMPLETED)
            for future in finished:
                entry = self._waiting.pop(future, None)
                if entry is not None:
                    outcome = self._outcome(future, entry)
                    if outcome is not None:
                        yield entry[0], outcome

    def _outcome(self, future: Future[PointOutcome], entry: _Entry) -> PointOutcome | None:
        tag, scan, value, seed, tries = entry
        try:
            return future.result()
        except BrokenProcessPool:
            if tries:
                return PointOutcome(None, None, failure="The worker process ended twice at this point, perhaps for want of memory.")
            lost = [(tag, scan, value, seed, tries), *self._waiting.values()]
            self._waiting.clear()
            self.close()
            for old_tag, old_scan, old_value, old_seed, old_tries in lost:
                self.submit(old_tag, old_scan, old_value, old_seed, old_tries + 1)
            return None
        except Exception as error:
            return PointOutcome(None, None, failure=f"{type(error).__name__}: {error}")

    def _abandon(self) -> None:
        for future in self._waiting:
            future.cancel()
        self._waiting.clear()
        for process in list((getattr(self._pool, "_processes", None) or {}).values()):
            process.kill()  # a point under way cannot be asked to stop from here, and its result is not wanted

    def close(self) -> None:
        if self._pool is not None:
            for future in self._waiting:
                future.cancel()
            self._pool.shutdown(wait=False)  # a cluster's executor knows no cancel_futures
            self._pool = None
