"""Flags the points of a scan and draws from the curve what it yields."""

from __future__ import annotations

from collections.abc import Sequence

from thalweg.study.curve_fit import error_measures
from thalweg.study.result import CONVERGED, StudyResult
from thalweg.study.scan_figures import coupling_figures, curve_figures
from thalweg.study.scan_flags import jumps, spin_crossings
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.scan_task import PointOutcome
from thalweg.study.verdict import amount
from thalweg.systems.elements import find_element
from thalweg.systems.molecule import Molecule
from thalweg.systems.wording import counted

#: A jump counts from this part of the target error.
JUMP_PART = 0.1
#: Flags of points that are run again from their neighbours, and of those that then get several starts.
DOUBTFUL = frozenset({"jump", "stalled", "not-converged", "mean-field-branch"})
STUCK = frozenset({"jump", "stalled"})
#: How remarks on classical methods begin.
CLASSICAL_REMARKS = ("Classical", "MP2", "CCSD")
#: Kind of a verdict -> what is said of the points that have it.
KINDS = {
    "outside": "outside the target",
    "wrong-symmetry": "in a state of other symmetry or spin than the exact one",
    "stationary": "stalled at a stationary point",
    "not-converged": "not converged",
    "no-exact": "without an exact energy to compare with",
}


def flagged_points(scan: ScanSpec, outcomes: Sequence[PointOutcome | None], retried: set[int]) -> list[CurvePoint]:
    """One CurvePoint for every point that has an outcome, with its flags."""
    results = [o.result if o is not None else None for o in outcomes]
    tolerance = JUMP_PART * next((r.target_error for r in results if r is not None), scan.study.target.error)
    jumped = set(jumps(scan.points, [_error(r) for r in results], tolerance))
    branched = set(jumps(scan.points, [_reference_error(r) for r in results], tolerance)) - jumped
    spins = [r.exact_s_squared if r is not None else None for r in results]
    turned = {crossing.right for crossing in spin_crossings(scan.points, spins)}
    points = []
    for index, outcome in enumerate(outcomes):
        flags = [] if outcome is None else _own_flags(outcome)
        seen = (("jump", index in jumped), ("mean-field-branch", index in branched), ("spin-changed", scan.points[index] in turned))
        flags += [name for name, on in seen if on and name not in flags]
        flags += ["retried"] if index in retried and results[index] is not None else []
        points.append(
            CurvePoint(
                index=index,
                coordinate=scan.points[index],
                result=results[index],
                flags=tuple(flags),
                notes=outcome.notes if outcome is not None else (),
                failure=outcome.failure if outcome is not None else "",
                details=outcome.details if outcome is not None else "",
            )
        )
    return points


def with_classical(result: StudyResult, other: StudyResult) -> StudyResult:
    """The result with the classical figures of another on the same mean field, and with what was said of them."""
    told = tuple(remark for remark in other.remarks if remark.startswith(CLASSICAL_REMARKS))
    spec = result.spec.model_copy(update={"classical": other.spec.classical})
    return result.model_copy(update={"classical": other.classical, "remarks": (*result.remarks, *told), "spec": spec})


def needs_healing(points: Sequence[CurvePoint], flags: frozenset[str] = DOUBTFUL) -> list[int]:
    """Indices of the points that carry one of these flags."""
    return [p.index for p in points if flags.intersection(p.flags)]


def summarise(scan: ScanSpec, points: Sequence[CurvePoint], seconds: float) -> ScanResult:
    """The scan's result: errors over the curve, both fits, remarks and the verdict."""
    done = [(p, p.result) for p in points if p.result is not None]
    first = done[0][1] if done else None
    mass, mass_remarks = _reduced_mass(scan)
    both = [(p.coordinate, r.energy, r.exact_energy) for p, r in done if r.exact_energy is not None]
    measures = error_measures([e for _, e, _ in both], [e for _, _, e in both]) if both else None
    exact = [(x, e) for x, _, e in both]
    return ScanResult(
        label=first.label if first else "",
        axis=scan.path.axis(scan.study),
        unit=scan.path.unit(scan.study),
        energy_unit=first.energy_unit if first else "hartree",
        target_error=first.target_error if first else scan.study.target.error,
        points=tuple(p for p in points if p.result is not None or p.failure),
        finished=all(p.result is not None or p.failure for p in points),
        max_error=measures.maximum if measures else None,
        mean_error=measures.mean if measures else None,
        npe=measures.npe if measures else None,
        error_at_minimum=measures.at_minimum if measures and scan.path.has_equilibrium else None,
        exact=curve_figures(scan, exact, mass),
        variational=curve_figures(scan, [(p.coordinate, r.energy) for p, r in done], mass),
        reduced_mass=mass,
        remarks=mass_remarks + _remarks(scan, points),
        verdict=_verdict(points, measures.maximum if measures else None),
        seconds=seconds,
        spec=scan,
        **coupling_figures(scan, exact),
    )


def _own_flags(outcome: PointOutcome) -> list[str]:
    result = outcome.result
    if result is None:
        return ["failed"]
    flags = []
    if result.verdict_kind == "stationary":
        flags.append("stalled")
    if result.stop_reason not in CONVERGED and not (result.gradient_norm is not None and result.gradient_norm <= 1e-4):
        flags.append("not-converged")
    for flag in ("active-space-changed", "mean-field-branch"):
        if any(note.startswith(flag) for note in outcome.notes):
            flags.append(flag)
    return flags


def _error(result: StudyResult | None) -> float | None:
    if result is None:
        return None
    return result.error if result.error is not None else result.energy - result.reference_energy


def _reference_error(result: StudyResult | None) -> float | None:
    return None if result is None or result.exact_energy is None else result.reference_energy - result.exact_energy


def _reduced_mass(scan: ScanSpec) -> tuple[float | None, tuple[str, ...]]:
    """In dalton: typed, or of the principal isotopes of a diatomic."""
    if scan.reduced_mass:
        return scan.reduced_mass, (f"Reduced mass {scan.reduced_mass:.6f} u as typed.",)
    system = scan.study.system
    if not isinstance(system, Molecule) or len(system.atoms) != 2 or not scan.path.is_distance:
        return None, ()
    elements = [find_element(atom[0]) for atom in system.atoms]
    masses = [e.mass for e in elements if e is not None and e.mass]
    if len(masses) != 2:
        return None, ()
    mass = masses[0] * masses[1] / (masses[0] + masses[1])
    return mass, (f"Reduced mass {mass:.6f} u of the principal isotopes.",)


def _remarks(scan: ScanSpec, points: Sequence[CurvePoint]) -> tuple[str, ...]:
    spins = [p.result.exact_s_squared if p.result else None for p in points]
    crossings = tuple(c.sentence()[:1].upper() + c.sentence()[1:] + "." for c in spin_crossings(scan.points, spins))
    failed = [f"{p.coordinate:g}" for p in points if p.failure]
    lost = (f"{counted(len(failed), 'point')} failed: {', '.join(failed)}.",) if failed else ()
    return crossings + lost


def _verdict(points: Sequence[CurvePoint], worst: float | None) -> str:
    results = [p.result for p in points if p.result is not None]
    failures = [p.failure for p in points if p.failure]
    if not results:
        return f"No point could be computed: {failures[0].rstrip('.')}" if failures else "No point was finished"
    size = f"; largest error {amount(worst, results[0].energy_unit)}" if worst is not None else ""
    lost = f"; {counted(len(failures), 'point')} failed" if failures else ""
    if len(results) + len(failures) < len(points):
        return f"Unfinished: {len(results)} of {len(points)} points{size}{lost}"
    reached = sum(r.reached_target for r in results)
    if reached == len(results):
        return f"Reaches the target at {'all ' if not failures else ''}{counted(reached, 'point')}{size}{lost}"
    parts = [text for kind in KINDS if (text := _points_of(points, kind))]
    return "; ".join(parts)[:1].upper() + "; ".join(parts)[1:] + size + lost


def _points_of(points: Sequence[CurvePoint], kind: str) -> str:
    """`outside the target at 3 of 9 points (2.6 to 3.2)`; empty where no point has this kind of verdict."""
    places = [p.coordinate for p in points if p.result is not None and p.result.verdict_kind == kind]
    if not places:
        return ""
    where = f"{places[0]:g}" if len(places) == 1 else f"{places[0]:g} to {places[-1]:g}"
    return f"{KINDS[kind]} at {len(places)} of {counted(sum(p.result is not None for p in points), 'point')} ({where})"
