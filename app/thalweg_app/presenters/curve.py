"""The Curve picture as data: the curves, their errors, the table of points, and what each curve yields."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.study.result import StudyResult
from thalweg.study.scan_result import FLAGS, CurvePoint, ScanResult
from thalweg.units import LENGTH_UNITS
from thalweg_app.presenters import wording
from thalweg_app.presenters.chart import Band, Chart, Panel, Series, column
from thalweg_app.presenters.tables import Table
from thalweg_app.presenters.traces import CLASSICAL_NAMES

#: Short signs for narrow headings.
UNIT_SIGNS = {"angstrom": "Å", "degree": "°"}
EMPTY = "Choose a path and press Scan to see the curve fill in point by point."


@dataclass(frozen=True)
class ShownCurve:
    """A scan in the picture, finished or under way; the points in order of the coordinate."""

    name: str
    axis: str
    unit: str
    points: tuple[CurvePoint, ...]
    result: ScanResult | None = None

    @property
    def done(self) -> list[tuple[CurvePoint, StudyResult]]:
        return [(p, p.result) for p in self.points if p.result is not None]

    @property
    def energy_unit(self) -> str:
        return self.done[0][1].energy_unit if self.done else "hartree"


@dataclass(frozen=True)
class CurveUnits:
    """Units that the person chose: of distances and of energy differences."""

    length: str = "angstrom"
    difference: str = "mEh"

    def coordinate(self, unit: str) -> tuple[float, str]:
        """Factor from the scan's own unit to the shown one, and the shown one's name."""
        if unit in LENGTH_UNITS:
            return LENGTH_UNITS[self.length] / LENGTH_UNITS[unit], self.length
        return 1.0, unit


def curve_chart(shown: ShownCurve | None, units: CurveUnits) -> Chart:
    """Energies above, errors below on a logarithmic axis with the accuracy band."""
    if shown is None or not shown.done:
        return Chart("Curve", "", (), EMPTY)
    factor, unit = units.coordinate(shown.unit)
    x = np.array([p.coordinate for p, _ in shown.done]) * factor
    title = f"{shown.axis} / {UNIT_SIGNS.get(unit, unit)}" if unit else shown.axis
    energy = Panel(f"Energy / {wording.unit_name(shown.energy_unit)}", _energies(shown, x), share=1.15)
    return Chart("Curve", title, (energy, _errors(shown, x, units)), EMPTY, _describe(shown))


def curve_table(shown: ShownCurve | None, units: CurveUnits) -> Table:
    """One row a point: coordinate, energies, error and flags."""
    if shown is None:
        return Table((), (), (), ())
    factor, unit = units.coordinate(shown.unit)
    scale, difference_unit = wording.difference_factor(shown.energy_unit, units.difference)
    energy_unit = wording.unit_name(shown.energy_unit)
    reference = shown.done[0][1].reference_name if shown.done else "Reference"
    header = (
        f"{shown.axis} / {UNIT_SIGNS.get(unit, unit)}" if unit else shown.axis,
        f"{reference} / {energy_unit}",
        f"Variational / {energy_unit}",
        f"Exact / {energy_unit}",
        f"Error / {difference_unit}",
        "Remarks",
    )
    rows: list[tuple[str, ...]] = []
    keys: list[tuple[float | str, ...]] = []
    for point in shown.points:
        values = _row_values(point)
        error = None if values[3] is None else values[3] * scale
        energies = tuple(wording.energy(v) for v in values[:3])
        shown_error = wording.MISSING if error is None else wording.minus(wording.significant(error))
        remark = point.failure or "; ".join(flag.replace("-", " ") for flag in point.flags)
        rows.append((f"{point.coordinate * factor:.6g}", *energies, shown_error, remark))
        sorted_by = [np.inf if v is None else v for v in (*values[:3], error)]
        keys.append((point.coordinate, *sorted_by, remark))
    return Table(header, tuple(rows), (True, True, True, True, True, False), tuple(keys), "Every point of the curve.")


def point_text(shown: ShownCurve, coordinate: float, units: CurveUnits) -> str:
    """All values of the point nearest `coordinate` (in the shown unit), for the read-out."""
    factor, unit = units.coordinate(shown.unit)
    point = nearest_point(shown, coordinate / factor)
    if point is None:
        return ""
    place = f"{point.coordinate * factor:.6g} {UNIT_SIGNS.get(unit, unit)}".strip()
    if point.result is None:
        return f"{place}: {point.failure}"
    scale, difference_unit = wording.difference_factor(shown.energy_unit, units.difference)
    reference, energy, exact, error = _row_values(point)
    energy_unit = wording.unit_name(shown.energy_unit)
    parts = [f"{point.result.reference_name} {wording.energy(reference)}", f"variational {wording.energy(energy)}"]
    parts += [f"exact {wording.energy(exact)} {energy_unit}"] if exact is not None else [energy_unit]
    if error is not None:
        parts.append(f"error {wording.minus(wording.significant(error * scale))} {difference_unit}")
    parts += [FLAGS.get(flag, flag) for flag in point.flags]
    return f"{place}:  " + "   ".join(parts)


def nearest_point(shown: ShownCurve, coordinate: float) -> CurvePoint | None:
    return min(shown.points, key=lambda p: abs(p.coordinate - coordinate), default=None)


def yield_figures(shown: ShownCurve | None, units: CurveUnits) -> list[tuple[str, str, str, str]]:
    """Rows (quantity, variational, exact, literature) of what the curves yield; empty while nothing is known."""
    result = shown.result if shown is not None else None
    if shown is None or result is None:
        return []
    factor, unit = units.coordinate(shown.unit)
    energy_unit = wording.unit_name(shown.energy_unit)
    typed = result.spec.literature
    quantities = [
        (f"Minimum / {UNIT_SIGNS.get(unit, unit)}" if unit else "Minimum", "r_e", factor, ".5f", typed.r_e),
        (f"E_min / {energy_unit}", "e_min", 1.0, ".6f", None),
        (f"D_e / {energy_unit}", "d_e", 1.0, ".6f", typed.d_e),
        ("ω_e / cm⁻¹", "omega_e", 1.0, ".1f", typed.omega_e),
        ("ω_e x_e / cm⁻¹", "omega_e_x_e", 1.0, ".1f", typed.omega_e_x_e),
    ]
    curves = (result.variational, result.exact)
    rows: list[tuple[str, str, str, str]] = []
    for name, key, scale, form, known in quantities:
        variational, exact = (_number(getattr(figures, key), scale, form) for figures in curves)
        rows.append((name, variational, exact, _number(known, scale, form)))
    return [row for row in rows if any(cell != wording.MISSING for cell in row[1:])]


def yield_table(rows: list[tuple[str, str, str, str]]) -> Table:
    """The rows of `yield_figures` as a table; the literature has a column only where something was typed."""
    typed = any(row[3] != wording.MISSING for row in rows)
    count = 4 if typed else 3
    header = ("Quantity", "Variational", "Exact", "Literature")[:count]
    keys: tuple[tuple[float | str, ...], ...] = tuple((float(i),) * count for i in range(len(rows)))
    return Table(header, tuple(row[:count] for row in rows), (False, True, True, True)[:count], keys, "What the curves yield.")


def curve_sentence(shown: ShownCurve | None, units: CurveUnits) -> str:
    """Verdict, largest and non-parallelity error in one line."""
    result = shown.result if shown is not None else None
    if shown is None:
        return ""
    if result is None:
        return f"{len(shown.done)} points so far"
    parts = [result.verdict]
    if result.npe is not None:
        scale, unit = wording.difference_factor(shown.energy_unit, units.difference)
        parts.append(f"non-parallelity error {wording.significant(result.npe * scale)} {unit}")
    return "; ".join(parts) + "."


def curve_remarks(shown: ShownCurve | None) -> tuple[str, ...]:
    """The fit, and what is to be said of the curve."""
    result = shown.result if shown is not None else None
    if result is None:
        return ()
    fits = [
        f"Fit of the {name} curve: {figures.fit}." for name, figures in (("exact", result.exact), ("variational", result.variational)) if figures.fit
    ]
    return (*result.remarks, *dict.fromkeys((*result.exact.remarks, *result.variational.remarks)), *fits)


def _energies(shown: ShownCurve, x: FloatArray) -> tuple[Series, ...]:
    results = [r for _, r in shown.done]
    series = [Series(results[0].reference_name, x, column([r.reference_energy for r in results]), "reference", marks=False)]
    methods = dict.fromkeys(key for r in results for key in r.classical)
    for rank, key in enumerate(methods):
        series.append(Series(CLASSICAL_NAMES.get(key, key), x, column([r.classical.get(key) for r in results]), "classical", rank, marks=False))
    if any(r.exact_energy is not None for r in results):
        series.append(Series("Exact", x, column([r.exact_energy for r in results]), "exact", marks=False))
    return (*series, Series(shown.name, x, column([r.energy for r in results]), "variational"))


def _errors(shown: ShownCurve, x: FloatArray, units: CurveUnits) -> Panel:
    scale, unit = wording.difference_factor(shown.energy_unit, units.difference)
    errors = column([r.error for _, r in shown.done]) * scale
    flagged = np.array([bool(set(p.flags) - {"retried"}) for p, _ in shown.done])
    positive = np.where(errors > 0, errors, np.nan)
    series = [Series(shown.name, x, positive, "variational")]
    if flagged.any():
        series.append(Series("flagged", x, np.where(flagged, positive, np.nan), "overlay", line=False))
    target = max(r.target_error for _, r in shown.done) * scale
    band = Band(target, f"Target, {wording.significant(target)} {unit}")
    return Panel(f"Error against exact / {unit}", tuple(series), band=band, log=True)


def _row_values(point: CurvePoint) -> tuple[float | None, float | None, float | None, float | None]:
    r = point.result
    return (None, None, None, None) if r is None else (r.reference_energy, r.energy, r.exact_energy, r.error)


def _number(value: float | None, factor: float, form: str) -> str:
    return wording.MISSING if value is None else wording.minus(format(value * factor, form))


def _describe(shown: ShownCurve) -> str:
    return f"{shown.name}: {len(shown.done)} of {len(shown.points)} points; {shown.result.verdict if shown.result else 'under way'}"
