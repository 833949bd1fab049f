"""One point of a scan as a task for any executor: plain data in, plain data out."""

from __future__ import annotations

from dataclasses import dataclass, replace

from thalweg.errors import StudyError
from thalweg.study.point_seed import PointSeed
from thalweg.study.result import StudyResult
from thalweg.study.run import run_from
from thalweg.study.scan_spec import ScanSpec


@dataclass(frozen=True)
class PointOutcome:
    """A point's result and seed, or the sentence that says why there is none."""

    result: StudyResult | None
    seed: PointSeed | None
    notes: tuple[str, ...] = ()
    failure: str = ""


def solve_point(scan: ScanSpec, value: float, seed: PointSeed | None) -> PointOutcome:
    """Runs the study at one value, from a neighbour's seed where there is one. A StudyError becomes a failure with its sentence."""
    try:
        result, own = run_from(scan.at(value), _following(scan, seed))
    except StudyError as error:
        return PointOutcome(None, None, failure=str(error))
    return PointOutcome(result, own, tuple(result.system_facts.get("orbital_following", ())))


def _following(scan: ScanSpec, seed: PointSeed | None) -> PointSeed | None:
    if seed is None or seed.mean_field is None:
        return seed
    return replace(seed, mean_field=replace(seed.mean_field, follow=scan.follow_orbitals))
