"""One point of a scan as a task for any executor: plain data in, plain data out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from thalweg.errors import Stopped, StudyError
from thalweg.study.point_seed import PointSeed
from thalweg.study.problem import prepare_system
from thalweg.study.result import StudyResult
from thalweg.study.run import never, run_from
from thalweg.study.scan_spec import ScanSpec
from thalweg.systems.orbital_following import as_told
from thalweg.systems.prepared import MeanFieldSeed


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
    if seed is None:
        return None
    mean_field = seed.mean_field if seed.kept_at is None else _worked_out_anew(scan, seed.kept_at, seed.kept_facts)
    return seed if mean_field is None else replace(seed, mean_field=replace(mean_field, follow=scan.follow_orbitals))


def _worked_out_anew(scan: ScanSpec, value: float, facts: Mapping[str, Any]) -> MeanFieldSeed | None:
    """The mean field of a point that a session has kept, in the order and with the signs that its parameters belong to."""
    try:
        seed = prepare_system(scan.at(value)).seed
    except StudyError:
        return None
    return None if seed is None else as_told(seed, facts)
