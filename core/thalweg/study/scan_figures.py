"""What a curve yields: the minimum and the constants of a bond, or the transitions along a coupling."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from thalweg.study.curve_fit import CurveMinimum, diatomic_constants, fit_minimum, well_depth
from thalweg.study.path import SettingPath
from thalweg.study.scan_flags import extremum_of_second_derivative, level_crossings
from thalweg.study.scan_result import CurveFigures
from thalweg.study.scan_spec import ScanSpec
from thalweg.units import BOHR_IN_ANGSTROM

NO_MINIMUM = "No minimum: the curve has none inside, too few points around it, or does not follow a smooth fit."

FEW_POINTS = "The points around the minimum are too few for a sure fit: add some there."
#: A minimum whose place moves by more than this part with the degree of the fit is said to be uncertain.
UNCERTAIN = 2e-3


def curve_figures(scan: ScanSpec, curve: Sequence[tuple[float, float]], mass: float | None) -> CurveFigures:
    """Minimum, depth and constants of one curve of (coordinate, energy); empty for couplings and frames, which have no such thing."""
    if not scan.path.has_equilibrium:
        return CurveFigures()
    x, energies = [p for p, _ in curve], [e for _, e in curve]
    distance = scan.path.is_distance
    minimum = fit_minimum(x, energies, logarithmic=distance)
    if minimum is None:
        return CurveFigures(remarks=(NO_MINIMUM,))
    depth, sentence = well_depth(x, energies, minimum) if distance else (None, "")
    remarks = (f"No D_e: {sentence}.",) if distance and depth is None else ()
    if minimum.r_e_spread > UNCERTAIN * abs(minimum.r_e):
        remarks = (FEW_POINTS, *remarks)
    return CurveFigures(
        r_e=minimum.r_e,
        e_min=minimum.e_min,
        d_e=depth,
        depth=sentence if depth is not None else "",
        fit=minimum.sentence(),
        remarks=remarks,
        **_constants(scan, minimum, mass),
    )


def coupling_figures(scan: ScanSpec, exact: Sequence[tuple[float, float]]) -> dict[str, Any]:
    """Kinks of the exact curve along a coupling, and where there are none the extremum of its second derivative."""
    if not isinstance(scan.path, SettingPath) or scan.path.counts_something(scan.study):
        return {}
    x, energies = [p for p, _ in exact], [e for _, e in exact]
    crossings = level_crossings(x, energies)
    return {"level_crossings": crossings, "transition": None if crossings else extremum_of_second_derivative(x, energies)}


def _constants(scan: ScanSpec, minimum: CurveMinimum, mass: float | None) -> dict[str, float]:
    if mass is None or not scan.path.is_distance:
        return {}
    found = diatomic_constants(minimum.scaled(BOHR_IN_ANGSTROM) if scan.path.unit(scan.study) == "bohr" else minimum, mass)
    return {"omega_e": found.omega_e, "omega_e_x_e": found.omega_e_x_e, "b_e": found.b_e}
