"""More points where a finished curve needs them: around its minimum, or where the error is largest."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from typing import Literal

from thalweg.errors import StudyError
from thalweg.study.path import FramesPath, SettingPath
from thalweg.study.scan_result import ScanResult
from thalweg.study.scan_spec import ScanSpec

Place = Literal["minimum", "error"]


def refined(result: ScanResult, count: int, where: Place) -> ScanSpec:
    """The scan of `result` with `count` points more; run it with `done=result.points, checked=result.finished`.

    Each new point halves an interval: for `minimum` the widest in proportion to its distance from the lowest exact (or variational)
    energy, for `error` the one with the largest error times width. StudyError where there is nothing to halve.
    """
    if count < 1:
        raise StudyError(f"{count} more points", "there is nothing to add", "Ask for at least one", "points")
    weight = _nearness(result) if where == "minimum" else _error(result)
    points = list(result.spec.points)
    for _ in range(count):
        middle = _widest(result.spec, points, weight)
        if middle is None:
            raise StudyError("No room for more points", "neighbouring values have none between them", "Ask for fewer points", "points")
        points = sorted([*points, middle])
    return result.spec.model_copy(update={"points": tuple(points)})


def _widest(scan: ScanSpec, points: list[float], weight: Callable[[float, float], float]) -> float | None:
    whole = isinstance(scan.path, FramesPath) or (isinstance(scan.path, SettingPath) and scan.path.counts_something(scan.study))
    rated = sorted(((weight(a, b) * (b - a), a, b) for a, b in itertools.pairwise(points)), reverse=True)
    for _, a, b in rated:
        middle = float((a + b) // 2) if whole else round(0.5 * (a + b), 10)
        if a < middle < b:
            return middle
    return None


def _nearness(result: ScanResult) -> Callable[[float, float], float]:
    """Larger for intervals near the minimum of the curve."""
    done = [(p.result.energy if p.result.exact_energy is None else p.result.exact_energy, p.coordinate) for p in result.points if p.result]
    if len(done) < 2:
        raise StudyError("There is no curve to refine", f"{len(done)} of its points have an energy", "Run more points first", "points")
    fitted = result.exact.r_e if result.exact.r_e is not None else result.variational.r_e
    lowest = fitted if fitted is not None else min(done)[1]
    coordinates = sorted(x for _, x in done)
    spacing = (coordinates[-1] - coordinates[0]) / (len(coordinates) - 1)
    return lambda a, b: 1.0 / (spacing + max(a - lowest, lowest - b, 0.0)) ** 2


def _error(result: ScanResult) -> Callable[[float, float], float]:
    """The larger error at the ends of an interval; of a new point, that of its neighbours."""
    known = sorted((p.coordinate, abs(p.result.error)) for p in result.points if p.result is not None and p.result.error is not None)
    if len(known) < 2:
        raise StudyError("There is no error to refine by", "the scan has no exact energies", "Refine around the minimum instead", "points")

    def at(a: float, b: float) -> float:
        beside = [e for x, e in known if a <= x <= b]
        left = max((k for k in known if k[0] <= a), default=known[0])
        right = min((k for k in known if k[0] >= b), default=known[-1])
        return max([*beside, left[1], right[1]])

    return at
