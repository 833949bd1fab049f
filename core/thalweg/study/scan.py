"""Runs a scan: blocks of neighbours side by side, each point from the last, then a healing pass from both sides.

The order of work depends on the points alone, never on the executor or the number of workers, so that serial, parallel and cluster
runs give the same curve.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable
from concurrent.futures import Executor
from dataclasses import replace

from thalweg.errors import Stopped
from thalweg.study.events import AnyEvent, ScanFinished, ScanPoint, ScanStarted, Stage
from thalweg.study.point_seed import PointSeed
from thalweg.study.scan_mean_fields import BRANCH, CurveField, curve_fields
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import BLOCK, ScanSpec
from thalweg.study.scan_summary import flagged_points, needs_healing, summarise
from thalweg.study.scan_task import PointOutcome
from thalweg.study.scan_tasks import PointTasks
from thalweg.watch import Watch

#: A rerun replaces a point when its energy is lower by more than this.
LOWER = 1e-9
#: Rounds of the healing pass; each lets a better solution travel one point further.
HEALING_ROUNDS = 2 * BLOCK


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
        self._fields: list[CurveField | None] = [None] * len(scan.points)
        self._tasks = PointTasks(make_pool, should_stop)
        self._begun = time.perf_counter()

    def run(self) -> ScanResult:
        self._emit(ScanStarted(axis=self._scan.path.axis(self._scan.study), unit=self._scan.path.unit(self._scan.study), points=self._scan.points))
        try:
            watch = Watch(lambda text, fraction: self._emit(Stage(text=text, fraction=fraction)), self._should_stop)
            if any(outcome is None for outcome in self._outcomes):
                self._fields = curve_fields(self._scan, watch)
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
            self._tasks.submit((chain[0], chain[1:]), self._scan, self._scan.points[chain[0]], self._start(chain[0], seed))

    def _heal(self) -> None:
        """Reruns block starts and doubtful points from their neighbours, and passes every improvement on to both sides.

        A block's first point started cold: its left neighbour's seed shows whether it lies on the same branch. Where it does, nothing is
        lower and the pass ends at once.
        """
        doubtful = needs_healing(self._scan, self._curve())
        starts = [(a, a - 1) for a in range(BLOCK, len(self._outcomes), BLOCK)]
        pairs = {*starts, *((i, n) for i in doubtful for n in (i - 1, i + 1))}
        for round_number in range(HEALING_ROUNDS):
            ready = sorted((i, n) for i, n in pairs if self._seed(n) is not None)
            if not ready or self._should_stop():
                return
            self._emit(Stage(text="Checking points from both sides", fraction=round_number / HEALING_ROUNDS))
            self._retried.update(i for i, _ in ready if i in doubtful)
            for i, n in ready:
                self._tasks.submit((i, []), self._scan, self._scan.points[i], self._start(i, self._seed(n)))
            found = sorted(self._tasks.results(), key=lambda item: item[0][0])  # in order of the curve, not of arrival
            lowered = {index for (index, _), outcome in found if self._keep(index, outcome)}
            self._retried |= lowered
            pairs = {(n, i) for i in lowered for n in (i - 1, i + 1) if 0 <= n < len(self._outcomes) and n not in lowered}

    def _start(self, index: int, neighbour: PointSeed | None) -> PointSeed | None:
        """The neighbour's parameters with the point's own mean field where the curve's mean fields were followed first."""
        field = self._fields[index]
        if field is None:
            return neighbour
        return PointSeed(field.seed, *((neighbour.parameters, neighbour.labels) if neighbour is not None else ((), ())))

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
        if lower and outcome.result is not None and abs(outcome.result.reference_energy - self._reference(index)) > BRANCH:
            note = "mean-field-branch: starts from the two sides lead to different mean fields; the lower variational energy is kept"
            outcome = replace(outcome, notes=(*outcome.notes, note))
        field = self._fields[index]
        self._outcomes[index] = outcome if field is None else replace(outcome, notes=tuple(dict.fromkeys((*outcome.notes, *field.notes))))
        curve = self._curve()
        self._emit(ScanPoint(point=curve[index], done=sum(o is not None for o in self._outcomes), total=len(self._outcomes)))
        return lower

    def _reference(self, index: int) -> float:
        outcome = self._outcomes[index]
        assert outcome is not None
        assert outcome.result is not None
        return outcome.result.reference_energy

    def _curve(self) -> list[CurvePoint]:
        return flagged_points(self._scan, self._outcomes, self._retried)


def _known(point: CurvePoint | None) -> PointOutcome | None:
    """The outcome of a point taken over from a session: its parameters seed the neighbours, its mean field is not stored."""
    if point is None or point.result is None:
        return None
    return PointOutcome(point.result, PointSeed(None, point.result.final_parameters, point.result.parameter_labels), point.notes)
