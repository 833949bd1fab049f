"""The starts of a study: one after another in this process, or shared with processes beside it where that pays.

A start depends on the study and on its number alone, so that both ways give the same digits.
"""

from __future__ import annotations

import multiprocessing
import time
from collections import deque
from collections.abc import Callable, Iterable

from thalweg.arrays import FloatArray
from thalweg.errors import Stopped
from thalweg.exact.answer import ExactAnswer
from thalweg.study.events import AnyEvent, Stage, StartEnded, watch_into
from thalweg.study.executors import Local
from thalweg.study.outcome import Outcome, SearchEnd, with_study
from thalweg.study.problem import Problem, make_engine
from thalweg.study.result import StartRecord
from thalweg.study.search import run_start
from thalweg.study.start_workers import Ended, Lost, News, Raised, StartWorker, StartWorkers, Told

#: How often this process, while it searches itself, looks at what the others have told, seconds.
TICK = 0.03


def run_starts(
    problem: Problem,
    exact: ExactAnswer | None,
    initial: FloatArray | None,
    emit: Callable[[AnyEvent], None],
    should_stop: Callable[[], bool],
    local: Local | None = None,
    only: Iterable[int] | None = None,
) -> Outcome:
    """Runs the starts of the study, or `only` those, counted from 0; `initial` are parameters for start 0.

    Without `local` they run one after another here. With it this process begins, and is joined by others as soon as the time that a
    start takes shows that it pays; its `workers` counts this process too. A stop keeps the best of every start that has begun. Raises
    what a start raises, and Stopped where there is no energy yet.
    """
    starts = _Starts(problem, exact, emit, should_stop, local)
    try:
        return starts.run(range(problem.spec.starts) if only is None else only, initial)
    finally:
        starts.close()


class _Starts:
    """The starts left, under way and found. Whatever runs here asks whether to stop, and so lets this object look after the rest."""

    def __init__(
        self,
        problem: Problem,
        exact: ExactAnswer | None,
        emit: Callable[[AnyEvent], None],
        should_stop: Callable[[], bool],
        local: Local | None,
    ) -> None:
        self._problem, self._exact, self._emit, self._should_stop, self._local = problem, exact, emit, should_stop, local
        self._left: deque[int] = deque()
        self._found: dict[int, tuple[StartRecord, SearchEnd]] = {}
        self._again: deque[int] = deque()  # their process was lost, or had no memory
        self._tried: set[int] = set()  # given to a process of their own after that
        self._lost: list[int] = []
        self._failure: BaseException | None = None
        self._workers: StartWorkers | None = None
        self._is_stopping = self._is_ending = self._was_shared = False  # ending: stopped, or failed
        self._began = self._looked = 0.0
        self._reason = "stopped-by-person"

    def run(self, starts: Iterable[int], initial: FloatArray | None) -> Outcome:
        begun = time.perf_counter()
        self._left.extend(starts)
        most = self._most(len(self._left))
        self._local = self._local if most > 1 else None
        self._beside = most - 1
        while self._left:
            self._run_here(self._left.popleft(), initial)
            if not self._left or self._asked():
                break
        self._wait()
        self._try_again()
        if self._failure is not None:
            raise self._failure
        if not self._found:
            raise Stopped(self._reason)
        records, ends = zip(*(self._found[index] for index in sorted(self._found)), strict=True)
        elapsed = time.perf_counter() - begun if self._was_shared else None
        return Outcome(list(records), list(ends), tuple(sorted(self._lost)), elapsed)

    def close(self) -> None:
        if self._workers is not None:
            self._workers.close()

    def _most(self, starts: int) -> int:
        """Processes that may share these starts, this one counted: each holds states of its own within the memory budget."""
        is_worker = multiprocessing.parent_process() is not None  # the cores are taken by others of its kind
        if self._local is None or is_worker or min(starts, self._local.workers) < 2:
            return 1
        engine = make_engine(self._problem, watch_into(lambda event: None, self._should_stop))
        return min(starts, self._local.workers, self._problem.budget_bytes // max(1, engine.memory_bytes()))

    def _run_here(self, index: int, initial: FloatArray | None) -> None:
        self._began = time.perf_counter()
        try:
            found = run_start(self._problem, self._exact, index, initial if index == 0 else None, lambda event: self._tell(index, event), self._asked)
        except Stopped as stop:  # before its first energy
            self._reason = stop.reason
            return
        except MemoryError:
            if self._workers is None:
                raise
            self._again.append(index)
            return
        self._keep(index, found)
        if self._local is not None:
            self._local.took(time.perf_counter() - self._began)

    def _asked(self) -> bool:
        """Whether what runs here is to stop. Asked several times an evaluation."""
        if self._local is None:
            return self._should_stop()
        if time.perf_counter() - self._looked >= TICK:
            self._look(0.0)
        return self._is_ending or self._heed_stop()

    def _heed_stop(self) -> bool:
        """Whether the person asked to stop, which all starts under way are told of once."""
        if not self._is_stopping and self._should_stop():
            self._is_stopping = self._is_ending = True
            if self._workers is not None:
                self._workers.stop()
        return self._is_stopping

    def _look(self, seconds: float) -> None:
        """Takes what the other processes have told, waiting up to `seconds` for it, or starts them where that pays now."""
        if self._workers is not None:
            for worker, news in self._workers.news(seconds):
                self._hear(self._workers, worker, news)
        elif self._pays():
            self._workers = StartWorkers(self._problem, self._exact, min(self._beside, len(self._left)))
        self._looked = time.perf_counter()

    def _pays(self) -> bool:
        if self._local is None or not self._left or self._is_ending:
            return False
        return self._local.pays(len(self._left) + 1, time.perf_counter() - self._began)

    def _hear(self, workers: StartWorkers, worker: StartWorker, news: News) -> None:
        index = worker.index
        if isinstance(news, Told):
            assert index is not None
            for event in news.events:
                self._tell(index, event)
            return
        worker.index = None
        is_lost = isinstance(news, Lost) or (isinstance(news, Raised) and isinstance(news.error, MemoryError))
        if is_lost and index is not None and index not in self._tried:
            self._again.append(index)
        elif isinstance(news, Raised) and not is_lost:
            self._failure, self._is_ending = news.error, True
        elif isinstance(news, Ended) and news.end is not None and index is not None:
            self._keep(index, with_study(news.end, self._problem))
        if is_lost or not self._left or self._is_ending:
            workers.dismiss(worker)
        else:
            self._was_shared = True
            worker.give(self._left.popleft())

    def _wait(self) -> None:
        """Until no start is under way in another process."""
        while self._workers is not None and self._workers.running and self._failure is None:
            self._heed_stop()
            self._look(TICK)

    def _try_again(self) -> None:
        """Lost starts once more, each in a process of its own while nothing else runs: never here, where it would end the program."""
        while self._again and not self._is_ending:
            index = self._again.popleft()
            self._tried.add(index)
            self.close()
            self._left.append(index)
            self._workers = StartWorkers(self._problem, self._exact, 1)
            while self._workers.is_alive and (self._workers.running or not self._is_ending):
                self._heed_stop()
                self._look(TICK)
            self._left.clear()
            if index not in self._found:
                self._lost.append(index)
        self._lost += self._again

    def _keep(self, index: int, found: tuple[StartRecord, SearchEnd]) -> None:
        self._found[index] = found
        record = found[0]
        self._emit(StartEnded(start=index, energy=record.energy, reason=record.stop_reason, seconds=record.seconds))

    def _tell(self, index: int, event: AnyEvent) -> None:
        """Passes an event on; where starts run side by side a stage is that of one of them."""
        if self._workers is not None and isinstance(event, Stage):
            event = Stage(text=f"Start {index + 1}: {event.text}")
        self._emit(event)
