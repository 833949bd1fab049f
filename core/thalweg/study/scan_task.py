"""One point of a scan as a task for any executor: plain data in, plain data out."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from thalweg.errors import Stopped, StudyError
from thalweg.study.point_seed import PointSeed
from thalweg.study.result import StudyResult
from thalweg.study.run import never, run_from
from thalweg.study.scan_spec import ScanSpec


@dataclass(frozen=True)
class PointOutcome:
    """A point's result and seed, or the sentence that says why there is none; `details` holds the traceback of a defect."""

    result: StudyResult | None
    seed: PointSeed | None
    notes: tuple[str, ...] = ()
    failure: str = ""
    details: str = ""


def solve_point(scan: ScanSpec, value: float, seed: PointSeed | None, should_stop: Callable[[], bool] = never) -> PointOutcome:
    """Runs the study at one value, from a neighbour's seed where there is one. A StudyError becomes a failure with its sentence.

    Raises Stopped when asked to stop: a point that was cut short is no point of the curve.
    """
    try:
        result, own = run_from(scan.at(value), _following(scan, seed), should_stop=should_stop)
    except StudyError as error:
        return PointOutcome(None, None, failure=str(error))
    except MemoryError:
        return PointOutcome(None, None, failure="Not enough memory: the system refused the memory that this point needs.")
    if result.stop_reason == "stopped-by-person":
        raise Stopped(result.stop_reason)
    return PointOutcome(result, own, tuple(result.system_facts.get("orbital_following", ())))


def _following(scan: ScanSpec, seed: PointSeed | None) -> PointSeed | None:
    if seed is None or seed.mean_field is None:
        return seed
    return replace(seed, mean_field=replace(seed.mean_field, follow=scan.follow_orbitals))
