"""Runs a scan: blocks of neighbours side by side, each point from the last, then a healing pass from both sides.

The order of work depends on the points alone, never on the executor or the number of workers, so that serial, parallel and cluster
runs give the same curve.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable
from concurrent.futures import FIRST_COMPLETED, Executor, Future, wait
from concurrent.futures.process import BrokenProcessPool

from thalweg.study.events import AnyEvent, ScanFinished, ScanPoint, ScanStarted, Stage
from thalweg.study.point_seed import PointSeed
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import BLOCK, ScanSpec
from thalweg.study.scan_summary import flagged_points, needs_healing, summarise
from thalweg.study.scan_task import PointOutcome, solve_point

#: A rerun replaces a point when its energy is lower by more than this.
LOWER = 1e-9
#: Rounds of the healing pass; each lets a better solution travel one point further.
HEALING_ROUNDS = 2 * BLOCK
#: How often a waiting scan looks whether it should stop, seconds.
TICK = 0.05


def run_scan(
    scan: ScanSpec,
    make_pool: Callable[[], Executor],
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = lambda: False,
    *,
    done: Iterable[CurvePoint] = (),
) -> ScanResult:
    """Runs every point of the scan that is not in `done` (from an interrupted session) and returns the curve.

    `make_pool` makes the executor, and makes a new one when a worker was killed. Emits ScanStarted, ScanPoint for every point that is
    new or became lower, and ScanFinished. Stopping keeps the finished points. Raises StudyError where the path does not fit the system.
    """
    scan.at(scan.points[0])
    return _Scan(scan, make_pool, emit, should_stop, {p.coordinate: p for p in done}).run()


class _Scan:
    """State of one scan: an outcome for each point, and the tasks under way."""

    def __init__(
        self,
        scan: ScanSpec,
        make_pool: Callable[[], Executor],
        emit: Callable[[AnyEvent], None],
        should_stop: Callable[[], bool],
        done: dict[float, CurvePoint],
    ) -> None:
        self._scan, self._make_pool, self._emit, self._should_stop = scan, make_pool, emit, should_stop
        self._outcomes: list[PointOutcome | None] = [_known(done.get(x)) for x in scan.points]
        self._retried: set[int] = set()
        self._tasks = _Tasks(make_pool, should_stop)
        self._begun = time.perf_counter()

    def run(self) -> ScanResult:
        self._emit(ScanStarted(axis=self._scan.path.axis(self._scan.study), unit=self._scan.path.unit(self._scan.study), points=self._scan.points))
        try:
            self._blocks(forward=True)
            if self._scan.both_directions:
                self._blocks(forward=False)
            self._heal()
        finally:
            self._tasks.close()
        result = summarise(self._scan, self._curve(), time.perf_counter() - self._begun)
        self._emit(ScanFinished(result=result))
        return result

    def _blocks(self, *, forward: bool) -> None:
        """Chains of neighbours: a block's next point is submitted when its last one has ended."""
        count = len(self._scan.points)
        chains = [list(range(a, min(a + BLOCK, count))) for a in range(0, count, BLOCK)]
        if not forward:
            chains = [chain[::-1] for chain in chains[::-1]]
        fresh = forward
        for chain in chains:
            self._advance(chain, None, fresh)
        for (index, rest), outcome in self._tasks.results():
            self._keep(index, outcome)
            self._advance(rest, outcome.seed, fresh)

    def _advance(self, chain: list[int], seed: PointSeed | None, fresh: bool) -> None:
        """Submits the first point of the chain that is still to be computed."""
        while fresh and chain and self._outcomes[chain[0]] is not None:
            known = self._outcomes[chain[0]]
            seed = known.seed if known is not None else seed
            chain = chain[1:]
        if chain:
            self._tasks.submit((chain[0], chain[1:]), self._scan, self._scan.points[chain[0]], seed)

    def _heal(self) -> None:
        """Reruns block edges and doubtful points from their neighbours, and passes every improvement on to both sides."""
        edges = [i for a in range(BLOCK, len(self._outcomes), BLOCK) for i in (a - 1, a)]
        wanted = sorted({*edges, *needs_healing(self._scan, self._curve())})
        for round_number in range(HEALING_ROUNDS):
            pairs = [(i, n) for i in wanted for n in (i - 1, i + 1) if self._seed(n) is not None]
            if not pairs or self._should_stop():
                return
            self._emit(Stage(text="Checking points from both sides", fraction=round_number / HEALING_ROUNDS))
            self._retried.update(i for i, _ in pairs)
            for i, n in pairs:
                self._tasks.submit((i, []), self._scan, self._scan.points[i], self._seed(n))
            found = sorted(self._tasks.results(), key=lambda item: item[0][0])  # in order of the curve, not of arrival
            lowered = {index for (index, _), outcome in found if self._keep(index, outcome)}
            wanted = sorted({n for i in lowered for n in (i - 1, i + 1)} - lowered)

    def _seed(self, index: int) -> PointSeed | None:
        outcome = self._outcomes[index] if 0 <= index < len(self._outcomes) else None
        return None if outcome is None else outcome.seed

    def _keep(self, index: int, outcome: PointOutcome) -> bool:
        """Keeps the outcome where there is none yet or it lies lower; True when a lower one replaced another."""
        old = self._outcomes[index]
        first = old is None or old.result is None
        lower = outcome.result is not None and old is not None and old.result is not None and outcome.result.energy < old.result.energy - LOWER
        if not first and not lower:
            return False
        self._outcomes[index] = outcome
        curve = self._curve()
        self._emit(ScanPoint(point=curve[index], done=sum(o is not None for o in self._outcomes), total=len(self._outcomes)))
        return lower

    def _curve(self) -> list[CurvePoint]:
        return flagged_points(self._scan, self._outcomes, self._retried)


class _Tasks:
    """Tasks on a pool that may lose workers: a broken pool is made anew and its tasks are submitted once more."""

    def __init__(self, make_pool: Callable[[], Executor], should_stop: Callable[[], bool]) -> None:
        self._make_pool, self._should_stop = make_pool, should_stop
        self._pool: Executor | None = None
        self._waiting: dict[Future[PointOutcome], tuple[tuple[int, list[int]], ScanSpec, float, PointSeed | None, int]] = {}

    def submit(self, tag: tuple[int, list[int]], scan: ScanSpec, value: float, seed: PointSeed | None, tries: int = 0) -> None:
        if self._should_stop():
            return
        self._pool = self._pool or self._make_pool()
        future = self._pool.submit(solve_point, scan, value, seed)
        self._waiting[future] = (tag, scan, value, seed, tries)

    def results(self) -> Iterable[tuple[tuple[int, list[int]], PointOutcome]]:
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

    def _outcome(
        self, future: Future[PointOutcome], entry: tuple[tuple[int, list[int]], ScanSpec, float, PointSeed | None, int]
    ) -> PointOutcome | None:
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
            self._pool.shutdown(wait=False, cancel_futures=True)
            self._pool = None


def _known(point: CurvePoint | None) -> PointOutcome | None:
    """The outcome of a point taken over from a session: its parameters seed the neighbours, its mean field is not stored."""
    if point is None or point.result is None:
        return None
    return PointOutcome(point.result, PointSeed(None, point.result.final_parameters, point.result.parameter_labels), point.notes)
