"""Flags the points of a scan and draws from the curve what it yields."""

from __future__ import annotations

from collections.abc import Sequence

from thalweg.study.curve_fit import CurveMinimum, diatomic_constants, error_measures, fit_minimum, well_depth
from thalweg.study.path import SettingPath
from thalweg.study.result import CONVERGED, StudyResult
from thalweg.study.scan_flags import extremum_of_second_derivative, jumps, spin_crossings
from thalweg.study.scan_result import CurveFigures, CurvePoint, ScanResult
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.scan_task import PointOutcome
from thalweg.study.verdict import amount
from thalweg.systems.elements import find_element
from thalweg.systems.molecule import Molecule
from thalweg.units import BOHR_IN_ANGSTROM

#: A jump counts from this part of the target error.
JUMP_PART = 0.1


def flagged_points(scan: ScanSpec, outcomes: Sequence[PointOutcome | None], retried: set[int]) -> list[CurvePoint]:
    """One CurvePoint for every point that has an outcome, with its flags."""
    results = [o.result if o is not None else None for o in outcomes]
    jumped = set(jumps([_error(r) for r in results], JUMP_PART * scan.study.target.error))
    spins = [r.exact_s_squared if r is not None else None for r in results]
    turned = {crossing.right for crossing in spin_crossings(scan.points, spins)}
    points = []
    for index, outcome in enumerate(outcomes):
        flags = [] if outcome is None else _own_flags(outcome)
        flags += [name for name, on in (("jump", index in jumped), ("spin-changed", scan.points[index] in turned)) if on]
        flags += ["retried"] if index in retried and results[index] is not None else []
        points.append(
            CurvePoint(
                index=index,
                coordinate=scan.points[index],
                result=results[index],
                flags=tuple(flags),
                notes=outcome.notes if outcome is not None else (),
                failure=outcome.failure if outcome is not None else "",
            )
        )
    return points


def needs_healing(scan: ScanSpec, points: Sequence[CurvePoint]) -> list[int]:
    """Points to run again from their neighbours: failed, stalled, jumped or not converged."""
    return [p.index for p in points if set(p.flags) & {"failed", "jump", "stalled", "not-converged", "mean-field-branch"}]


def summarise(scan: ScanSpec, points: Sequence[CurvePoint], seconds: float) -> ScanResult:
    """The scan's result: errors over the curve, both fits, remarks and the verdict."""
    done = [(p, p.result) for p in points if p.result is not None]
    first = done[0][1] if done else None
    mass, mass_remarks = _reduced_mass(scan)
    x = [p.coordinate for p, _ in done]
    both = [(p.coordinate, r.energy, r.exact_energy) for p, r in done if r.exact_energy is not None]
    measures = error_measures([e for _, e, _ in both], [e for _, _, e in both]) if both else None
    varies_coupling = isinstance(scan.path, SettingPath)
    return ScanResult(
        label=first.label if first else "",
        axis=scan.path.axis(scan.study),
        unit=scan.path.unit(scan.study),
        energy_unit=first.energy_unit if first else "hartree",
        target_error=first.target_error if first else scan.study.target.error,
        points=tuple(p for p in points if p.result is not None or p.failure),
        finished=len(done) == len(points),
        max_error=measures.maximum if measures else None,
        mean_error=measures.mean if measures else None,
        npe=measures.npe if measures else None,
        error_at_minimum=measures.at_minimum if measures else None,
        exact=_figures(scan, [c for c, _, _ in both], [e for _, _, e in both], mass),
        variational=_figures(scan, x, [r.energy for _, r in done], mass),
        reduced_mass=mass,
        transition=extremum_of_second_derivative([c for c, _, _ in both], [e for _, _, e in both]) if varies_coupling else None,
        remarks=mass_remarks + _remarks(scan, points),
        verdict=_verdict(points, [r for _, r in done], measures.maximum if measures else None),
        seconds=seconds,
        spec=scan,
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


def _figures(scan: ScanSpec, x: Sequence[float], energies: Sequence[float], mass: float | None) -> CurveFigures:
    distance = scan.path.is_distance
    minimum = fit_minimum(x, energies, logarithmic=distance) if len(x) >= 5 else None
    if minimum is None:
        return CurveFigures(remarks=("No minimum: the curve has none inside, too few points, or does not follow a smooth fit.",))
    depth = well_depth(x, energies, minimum) if distance else None
    remarks = () if depth is not None or not distance else ("No D_e: the curve does not flatten out at its far end.",)
    frequency = _constants(scan, minimum, mass)
    return CurveFigures(r_e=minimum.r_e, e_min=minimum.e_min, d_e=depth, fit=minimum.sentence(), remarks=remarks, **frequency)


def _constants(scan: ScanSpec, minimum: CurveMinimum, mass: float | None) -> dict[str, float]:
    if mass is None or not scan.path.is_distance:
        return {}
    found = diatomic_constants(minimum.scaled(BOHR_IN_ANGSTROM) if scan.path.unit(scan.study) == "bohr" else minimum, mass)
    return {"omega_e": found.omega_e, "omega_e_x_e": found.omega_e_x_e, "b_e": found.b_e}


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
    lost = (f"{len(failed)} points failed: {', '.join(failed)}.",) if failed else ()
    return crossings + lost


def _verdict(points: Sequence[CurvePoint], results: Sequence[StudyResult], worst: float | None) -> str:
    if not results:
        return "No point was finished"
    if len(results) < len(points):
        return f"Unfinished: {len(results)} of {len(points)} points"
    reached = sum(r.reached_target for r in results)
    unit = results[0].energy_unit
    size = f"; largest error {amount(worst, unit)}" if worst is not None else ""
    if reached == len(results):
        return f"Reaches the target at all {reached} points{size}"
    outside = [f"{p.coordinate:g}" for p in points if p.result is not None and not p.result.reached_target]
    return f"Outside the target at {len(outside)} of {len(results)} points ({outside[0]} to {outside[-1]}){size}"
