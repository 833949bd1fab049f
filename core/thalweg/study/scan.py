"""Runs a scan: blocks of neighbours side by side, each point from the last, then a healing pass from both sides.

The order of work depends on the points alone, never on the executor or the number of workers, so that serial, parallel and cluster
runs give the same curve.
"""

from __future__ import annotations

import time
from collections import deque
from collections.abc import Callable, Iterable
from concurrent.futures import Executor
from dataclasses import replace
from typing import Any

from thalweg.errors import Stopped, StudyError
from thalweg.study.events import AnyEvent, ScanFinished, ScanPoint, ScanStarted, Stage, watch_into
from thalweg.study.point_seed import PointSeed
from thalweg.study.scan_mean_fields import BRANCH, CurveField, curve_fields
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import BLOCK, ScanSpec
from thalweg.study.scan_summary import STUCK, flagged_points, needs_healing, summarise, with_classical
from thalweg.study.scan_task import PointOutcome
from thalweg.study.scan_tasks import PointTasks

#: A rerun replaces a point when its energy is lower by more than this, and is passed on to the neighbours when by more than this part
#: of the target error.
LOWER = 1e-9
PASSED_ON = 1e-3
BRANCHED = "mean-field-branch: starts from the two sides lead to different mean fields; the lower variational energy is kept"
#: Rounds of the healing pass; each lets a better solution travel one point further.
HEALING_ROUNDS = 2 * BLOCK
#: Starts at a point that still jumps or stalls after runs from both neighbours.
SEVERAL_STARTS = 4


def run_scan(
    scan: ScanSpec,
    make_pool: Callable[[], Executor],
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = lambda: False,
    *,
    done: Iterable[CurvePoint] = (),
    checked: bool = False,
) -> ScanResult:
    """Runs every point of the scan that is not in `done` and returns the curve.

    `done` are points of an interrupted scan, or with `checked` those of a finished one that has been refined: their healing pass is over,
    so that only new points are run. `make_pool` makes the executor, and makes a new one when a worker was killed. Emits ScanStarted,
    ScanPoint for every point that is new or became lower, and ScanFinished. Stopping keeps the finished points.
    Raises StudyError where there are no points or the path does not fit the system.
    """
    if not scan.points:
        raise StudyError("No points to scan", "the list of values is empty", "Give a range or a list of values", "points")
    scan.at(scan.points[0])
    return _Scan(scan, make_pool, emit, should_stop, {p.coordinate: p for p in done}, checked).run()


class _Scan:
    """State of one scan: an outcome for each point, and the tasks under way."""

    def __init__(
        self,
        scan: ScanSpec,
        make_pool: Callable[[], Executor],
        emit: Callable[[AnyEvent], None],
        should_stop: Callable[[], bool],
        done: dict[float, CurvePoint],
        checked: bool,
    ) -> None:
        self._scan, self._emit, self._should_stop = scan, emit, should_stop
        self._outcomes: list[PointOutcome | None] = [_taken_over(done.get(x)) for x in scan.points]
        self._settled = {i for i, outcome in enumerate(self._outcomes) if outcome is not None} if checked else set()
        self._retried = {i for i, x in enumerate(scan.points) if x in done and "retried" in done[x].flags}
        self._fields: list[CurveField | None] = [None] * len(scan.points)
        self._bare: set[int] = set()  # points without the classical figures of their own mean field
        self._tasks = PointTasks(make_pool, should_stop)
        self._begun = time.perf_counter()

    def run(self) -> ScanResult:
        path, study = self._scan.path, self._scan.study
        self._emit(ScanStarted(axis=path.axis(study), unit=path.unit(study), points=self._scan.points))
        try:
            if any(outcome is None for outcome in self._outcomes):
                self._fields = curve_fields(self._scan, watch_into(self._emit, self._should_stop))
            self._blocks(forward=True)
            if self._scan.both_directions:
                self._blocks(forward=False)
            self._heal()
        except Stopped:  # while the mean fields were followed: what is finished is kept
            pass
        finally:
            self._tasks.close()
        result = summarise(self._scan, self._curve(), time.perf_counter() - self._begun)
        self._emit(ScanFinished(result=result))
        return result

    def _blocks(self, *, forward: bool) -> None:
        """Blocks of neighbours side by side. A block's first point starts from that of the block before, the others each from the last."""
        count = len(self._scan.points)
        chains = [list(range(a, min(a + BLOCK, count))) for a in range(0, count, BLOCK)]
        if not forward:
            chains = [chain[::-1] for chain in chains[::-1]]
        coming = deque(chains)
        self._tasks.left = sum(self._known(i, forward) is None for i in range(count))
        leading = self._open(coming, None, forward)
        for (index, rest), outcome in self._tasks.results():
            self._keep(index, outcome)
            self._advance(rest, outcome.seed, forward)
            if index == leading:
                leading = self._open(coming, outcome.seed, forward)

    def _open(self, coming: deque[list[int]], seed: PointSeed | None, fresh: bool) -> int | None:
        """Starts the next block, and those after it as long as their first points are known; the first point that is now to be waited for."""
        while coming:
            chain = coming.popleft()
            known = self._known(chain[0], fresh)
            self._advance(chain, seed, fresh)
            if known is None:
                return chain[0]
            seed = known.seed
        return None

    def _known(self, index: int, fresh: bool) -> PointOutcome | None:
        """The outcome of a point that is not to be run: on the first way all that are there, later only those of a checked scan."""
        return self._outcomes[index] if fresh or index in self._settled else None

    def _advance(self, chain: list[int], seed: PointSeed | None, fresh: bool) -> None:
        """Submits the first point of the chain that is still to be computed."""
        while chain and (known := self._known(chain[0], fresh)) is not None:
            seed, chain = known.seed, chain[1:]
        if chain:
            self._tasks.submit((chain[0], chain[1:]), self._scan, self._scan.points[chain[0]], self._start(chain[0], seed))

    def _heal(self) -> None:
        """Reruns block starts and doubtful points from their neighbours, and those that stay doubtful from several starts.

        A block's first point did not start from its neighbour, whose seed shows whether it lies on the same branch. Where it does, nothing
        is lower and the pass ends at once.
        """
        doubtful = [i for i in needs_healing(self._curve()) if i not in self._settled]
        starts = [(a, a - 1) for a in range(BLOCK, len(self._outcomes), BLOCK) if a not in self._settled]
        self._pass_on({*starts, *((i, n) for i in doubtful for n in (i - 1, i + 1))}, set(doubtful))
        stuck = [i for i in needs_healing(self._curve(), STUCK) if i not in self._settled]
        if stuck and not self._should_stop():
            self._emit(Stage(text=f"Trying {SEVERAL_STARTS} starts where the curve jumps"))
            several = _with_study(self._scan, starts=max(SEVERAL_STARTS, self._scan.study.starts))
            lowered = self._rerun([(i, self._start(i, self._seed(i - 1) or self._seed(i + 1))) for i in stuck], several)
            self._retried |= {*stuck, *lowered}
            self._pass_on(self._beside(lowered), set())
        self._complete()

    def _complete(self) -> None:
        """Works out the classical figures that belong to a mean field which was found on the way."""
        lacking = sorted(i for i in self._bare if self._seed(i) is not None)
        for i in lacking:
            self._tasks.submit((i, []), self._scan, self._scan.points[i], self._seed(i))
        for (i, _), outcome in self._tasks.results():
            old = self._outcomes[i]
            if outcome.result is not None and old is not None and outcome.result.energy <= self._energy(i) + PASSED_ON * self._target(i):
                self._outcomes[i] = replace(outcome, notes=old.notes)

    def _pass_on(self, pairs: set[tuple[int, int]], retried: set[int]) -> None:
        """Reruns point i from the seed of point n for each (i, n), then the neighbours of what became lower, and so on."""
        for round_number in range(HEALING_ROUNDS):
            ready = sorted((i, n) for i, n in pairs if self._seed(n) is not None)
            if not ready or self._should_stop():
                return
            self._emit(Stage(text="Checking points from both sides", fraction=round_number / HEALING_ROUNDS))
            self._retried.update(i for i, _ in ready if i in retried)
            lowered = self._rerun([(i, self._start(i, self._seed(n))) for i, n in ready], self._scan)
            self._retried |= lowered
            pairs = self._beside(lowered)

    def _rerun(self, wanted: list[tuple[int, PointSeed | None]], scan: ScanSpec) -> set[int]:
        """Runs these points again, without the classical methods; those whose energy became lower by an amount that matters."""
        self._tasks.left = len(wanted)
        for i, seed in wanted:
            self._tasks.submit((i, []), _with_study(scan, classical=()), scan.points[i], seed)
        found = sorted(self._tasks.results(), key=lambda item: item[0][0])  # in order of the curve, not of arrival
        falls = [(index, self._keep(index, outcome)) for (index, _), outcome in found]
        return {index for index, fall in falls if fall > PASSED_ON * self._target(index)}

    def _beside(self, lowered: set[int]) -> set[tuple[int, int]]:
        """(neighbour, lowered point) where the neighbour did not become lower itself."""
        last = len(self._outcomes) - 1
        return {(n, i) for i in lowered for n in (i - 1, i + 1) if 0 <= n <= last and n not in lowered}

    def _start(self, index: int, neighbour: PointSeed | None) -> PointSeed | None:
        """The neighbour's parameters with the point's own mean field where the curve's mean fields were followed first."""
        field = self._fields[index]
        if field is None:
            return neighbour
        return PointSeed(replace(field.seed, here=True), *((neighbour.parameters, neighbour.labels) if neighbour is not None else ((), ())))

    def _seed(self, index: int) -> PointSeed | None:
        outcome = self._outcomes[index] if 0 <= index < len(self._outcomes) else None
        return None if outcome is None else outcome.seed

    def _keep(self, index: int, outcome: PointOutcome) -> float:
        """Keeps the outcome where there is none yet or it lies lower; by how much a lower one replaced another, 0 where none did."""
        old, new = self._outcomes[index], outcome.result
        fall = 0.0
        if old is not None and old.result is not None:
            fall = old.result.energy - new.energy if new is not None else 0.0
            if new is None or fall <= LOWER:
                return 0.0
            if abs(new.reference_energy - old.result.reference_energy) > BRANCH:
                outcome = replace(outcome, notes=(*outcome.notes, BRANCHED))
                self._bare |= {index} if self._scan.study.classical else set()
            else:
                outcome = replace(outcome, result=with_classical(new, old.result))
        field = self._fields[index]
        self._outcomes[index] = outcome if field is None else replace(outcome, notes=tuple(dict.fromkeys((*outcome.notes, *field.notes))))
        curve = self._curve()
        self._emit(ScanPoint(point=curve[index], done=sum(o is not None for o in self._outcomes), total=len(self._outcomes)))
        return fall

    def _energy(self, index: int) -> float:
        outcome = self._outcomes[index]
        return outcome.result.energy if outcome is not None and outcome.result is not None else float("inf")

    def _target(self, index: int) -> float:
        outcome = self._outcomes[index]
        return outcome.result.target_error if outcome is not None and outcome.result is not None else 0.0

    def _curve(self) -> list[CurvePoint]:
        return flagged_points(self._scan, self._outcomes, self._retried)


def _with_study(scan: ScanSpec, **changes: Any) -> ScanSpec:
    return scan.model_copy(update={"study": scan.study.model_copy(update=changes)})


def _taken_over(point: CurvePoint | None) -> PointOutcome | None:
    """The outcome of a point taken over from a session: its parameters seed the neighbours, its mean field is worked out anew for them."""
    if point is None or point.result is None:
        return None
    result = point.result
    seed = PointSeed(None, result.final_parameters, result.parameter_labels, point.coordinate, result.system_facts)
    return PointOutcome(result, seed, point.notes)
