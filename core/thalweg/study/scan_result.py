"""The result of a scan: a study result for every point, flags, and what the curve yields."""

from __future__ import annotations

from thalweg.study.result import Record, StudyResult
from thalweg.study.scan_spec import ScanSpec

#: Flag -> what it means, shown at the point.
FLAGS: dict[str, str] = {
    "failed": "the point could not be computed",
    "jump": "the error jumps against its neighbours, and starts from both sides did not mend it",
    "stalled": "the search stalled at a stationary point above exact",
    "not-converged": "the search was not converged",
    "active-space-changed": "the active orbitals are not those of the neighbour",
    "mean-field-branch": "the mean field changed to another solution",
    "spin-changed": "the exact state has another spin than at the neighbour",
    "retried": "the point was run again from a neighbour, and the lower energy was kept",
}


class CurvePoint(Record):
    """One point. `result` is None where it failed; `failure` then says why."""

    index: int
    coordinate: float
    result: StudyResult | None
    flags: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    failure: str = ""
    details: str = ""  # the traceback where the failure is a defect of the program

    @property
    def energy_per_site(self) -> float | None:
        """The variational energy divided by the sites of a lattice; None for molecules and failed points."""
        sites = self.result.system_facts.get("sites") if self.result is not None else None
        return self.result.energy / sites if self.result is not None and sites else None


class CurveFigures(Record):
    """What one curve (exact or variational) yields; None where it cannot be had, with the reason in `remarks`."""

    r_e: float | None = None
    e_min: float | None = None
    d_e: float | None = None
    omega_e: float | None = None
    omega_e_x_e: float | None = None
    b_e: float | None = None
    fit: str = ""
    depth: str = ""  # how d_e was taken
    remarks: tuple[str, ...] = ()


class ScanResult(Record):
    """A finished, stopped or interrupted scan."""

    label: str
    axis: str
    unit: str
    energy_unit: str
    target_error: float
    points: tuple[CurvePoint, ...]
    finished: bool
    max_error: float | None = None
    mean_error: float | None = None
    npe: float | None = None
    error_at_minimum: float | None = None
    exact: CurveFigures = CurveFigures()
    variational: CurveFigures = CurveFigures()
    reduced_mass: float | None = None
    transition: float | None = None  # coordinate of the extremum of the second derivative, for couplings
    level_crossings: tuple[float, ...] = ()  # coordinates where the exact curve has a kink, for couplings
    remarks: tuple[str, ...] = ()
    verdict: str = ""
    seconds: float = 0.0
    spec: ScanSpec
