"""A diagnosis as a picture and as lines of text."""

from __future__ import annotations

from itertools import groupby

import numpy as np

from thalweg.errors import StudyError
from thalweg.study.diagnosis_result import Curvature, GradientSpread, LandscapeResult, StartSpread, TrainabilityResult
from thalweg_app.presenters.chart import Chart, Level, Panel, Series
from thalweg_app.presenters.wording import counted, significant, unit_name

Finding = TrainabilityResult | LandscapeResult | Curvature | StartSpread


def chart_of(found: Finding) -> Chart:
    """Variances on a log axis with error bars, or the energy along a line. StudyError for what is no curve."""
    if isinstance(found, TrainabilityResult):
        return _trainability(found)
    if isinstance(found, LandscapeResult) and len(found.steps) == 1:
        return _line(found)
    raise StudyError("This diagnosis is no curve", "a map, a curvature or a spread is told in numbers", "Write it with --json", "figure")


def table_of_finding(found: Finding) -> list[tuple[str, str]]:
    """Name and text of every figure, in order."""
    if isinstance(found, TrainabilityResult):
        return [_spread_row(p, found.unit) for p in found.points] + [("Verdict", d.sentence) for d in found.decays]
    if isinstance(found, LandscapeResult):
        return _landscape_rows(found)
    if isinstance(found, Curvature):
        values = ", ".join(f"{v:.6g}" for v in found.eigenvalues)
        unit = unit_name(found.unit)
        rows = [("Lowest curvatures", f"{values} {unit}" if values else ""), ("Largest gradient", f"{significant(found.gradient_norm)} {unit}")]
        return [*rows, ("Mostly along", found.leading_parameter)]
    rows = [("Starts", str(found.starts)), ("Lowest", f"{found.lowest:.9f}"), ("Highest", f"{found.highest:.9f}")]
    return [*rows, ("Mean", f"{found.mean:.9f} +- {significant(found.deviation)} (standard deviation)")]


def _trainability(found: TrainabilityResult) -> Chart:
    along_layers = len({p.qubits for p in found.points}) == 1 and len({p.layers for p in found.points}) > 1
    along, held = ("layers", "qubits") if along_layers else ("qubits", "layers")
    ordered = sorted(found.points, key=lambda p: (getattr(p, held) or 0, getattr(p, along)))
    curves = []
    for rank, (value, group) in enumerate(groupby(ordered, key=lambda p: getattr(p, held))):
        points = list(group)
        x, y = (np.array([getattr(p, name) for p in points], float) for name in (along, "variance"))
        spread = np.array([2 * p.variance_error for p in points])
        name = "Variance" if value is None else counted(value, held[:-1])
        curves.append(Series(name, x, np.where(y > 0, y, np.nan), "variational" if rank == 0 else "overlay", rank, spread=spread))
    unit = "" if found.unit == "1" else f" / {unit_name(found.unit)}²"
    panel = Panel(f"Variance of the gradient{unit}", tuple(curves), log=True)
    return Chart("Trainability", along.capitalize(), (panel,), "", found.verdict)


def _line(found: LandscapeResult) -> Chart:
    steps, energies = np.array(found.steps[0]), np.array(found.energies)[:, 0]
    levels = [] if found.exact_energy is None else [Level("Exact", found.exact_energy, "exact")]
    curve = Series("Energy", steps, energies, marks=False)
    centre = Series("Centre", np.zeros(1), np.array([found.centre_energy]), "overlay", line=False)
    unit = "part of the way" if found.spec.directions[0].kind == "point" else "rad"
    panel = Panel(f"Energy / {unit_name(found.unit)}", (curve, centre), tuple(levels))
    return Chart("Landscape", f"{found.labels[0]} / {unit}", (panel,), "", found.verdict)


def _spread_row(point: GradientSpread, unit: str) -> tuple[str, str]:
    name = counted(point.qubits, "qubit") + ("" if point.layers is None else f", {counted(point.layers, 'layer')}")
    squared = "" if unit == "1" else f" {unit_name(unit)}^2"
    return (
        name,
        f"variance {point.variance:.4g} +- {point.variance_error:.1g}{squared}, {counted(point.parameters, 'parameter')}, {point.samples} starts",
    )


def _landscape_rows(found: LandscapeResult) -> list[tuple[str, str]]:
    unit = unit_name(found.unit)
    row, column = found.lowest
    place = ", ".join(f"{steps[i]:.4g}" for steps, i in zip(found.steps, (row, column), strict=False))
    rows = [(f"Direction {i + 1}", label) for i, label in enumerate(found.labels)]
    rows += [("Centre", f"{found.centre_energy:.8f} {unit}"), ("Lowest looked at", f"{found.energies[row][column]:.8f} {unit} at {place}")]
    return rows if found.exact_energy is None else [*rows, ("Exact", f"{found.exact_energy:.8f} {unit}")]
