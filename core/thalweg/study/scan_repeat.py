"""Repeats a scan with its own settings, and states how far the second curve lies from the first."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor

from thalweg.study.events import AnyEvent
from thalweg.study.result import Record
from thalweg.study.run import never
from thalweg.study.scan import run_scan
from thalweg.study.scan_result import ScanResult


class ScanRepetition(Record):
    """The second curve and its distance from the first, in the energy unit of the scan.

    Attributes:
        result: the second curve, over the points that the first has.
        deviation: the largest |second energy - first energy|, and `place` its coordinate.
        exact_deviation: the same of the exact energies; None where there are none.
        lost: coordinates of points that could not be repeated.
    """

    result: ScanResult
    deviation: float
    place: float
    exact_deviation: float | None
    lost: tuple[float, ...] = ()

    def within(self, tolerance: float) -> bool:
        return not self.lost and self.deviation <= tolerance and (self.exact_deviation or 0.0) <= tolerance


def repeat_scan(
    first: ScanResult,
    make_pool: Callable[[], Executor],
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = never,
) -> ScanRepetition | None:
    """Runs the points of `first` again; None when stopped on the way, or where it has none. Raises what `run_scan` raises."""
    before = {p.coordinate: p.result for p in first.points if p.result is not None}
    if not before:
        return None
    second = run_scan(first.spec.model_copy(update={"points": tuple(before)}), make_pool, emit, should_stop)
    after = {p.coordinate: p.result for p in second.points if p.result is not None}
    if should_stop():
        return None
    both = [x for x in before if x in after]
    deviation, place = max(((abs(after[x].energy - before[x].energy), x) for x in both), default=(0.0, first.points[0].coordinate))
    exact = [abs(a - b) for x in both if (a := after[x].exact_energy) is not None and (b := before[x].exact_energy) is not None]
    return ScanRepetition(
        result=second,
        deviation=deviation,
        place=place,
        exact_deviation=max(exact) if exact else None,
        lost=tuple(x for x in before if x not in after),
    )
