"""What the terminal prints of a scan: the verdict first, then aligned figures, then the points that carry a flag."""

from __future__ import annotations

from thalweg.study.scan_result import FLAGS, CurvePoint, ScanResult
from thalweg.units import LENGTH_UNITS
from thalweg_app.presenters.curve import CurveUnits
from thalweg_app.presenters.wording import counted, difference_factor, significant, unit_name
from thalweg_app.terminal.answer import Rows, aligned

MISSING = "-"


def scan_lines(result: ScanResult, units: CurveUnits) -> list[str]:
    """The answer of one scan."""
    both = set(result.exact.remarks) & set(result.variational.remarks)
    remarks = [*result.remarks, *(text for text in result.exact.remarks if text in both)]
    for name, figures in (("exact", result.exact), ("variational", result.variational)):
        remarks += [f"{text.rstrip('.')} ({name} curve)." for text in figures.remarks if text not in both]
    return [
        result.verdict.rstrip(".") + ".",
        "",
        *aligned([*_what(result, units), *_errors(result, units), *_transitions(result, units)]),
        *_yield(result, units),
        *_fits(result),
        *_flagged(result, units),
        *([""] if remarks else []),
        *(f"Remark: {remark}" for remark in remarks),
    ]


def place(value: float, result_unit: str, units: CurveUnits) -> str:
    """A coordinate with its unit: `1.2 angstrom`."""
    factor, unit = units.coordinate(result_unit)
    return f"{value * factor:.6g} {unit}".rstrip()


def _what(result: ScanResult, units: CurveUnits) -> Rows:
    spec, points = result.spec, result.spec.points
    study = spec.study
    span = f"{place(points[0], result.unit, units)} to {place(points[-1], result.unit, units)}" if points else ""
    has_electrons = any(p.result is not None and p.result.n_electrons is not None for p in result.points)
    encoding = f", {study.encoding.title}" if has_electrons else ""
    spin = "; exact state at the multiplicity asked for" if spec.spin == "fixed" else ""
    return [
        ("System", result.label),
        ("Path", f"{result.axis}, {span}, {counted(len(points), 'point')}"),
        ("Method", f"{study.ansatz.title}, {study.optimizer.title}{encoding}{spin}"),
        ("Time", f"{result.seconds:.1f} s"),
    ]


def _errors(result: ScanResult, units: CurveUnits) -> Rows:
    names = (
        ("Largest error", result.max_error),
        ("Mean error", result.mean_error),
        ("Non-parallelity error", result.npe),
        ("Error at the minimum", result.error_at_minimum),
    )
    scale, unit = difference_factor(result.energy_unit, units.difference)
    relative = f"{100 * result.spec.study.target.relative:g} % of |E|"
    target = f"  (target {significant(result.target_error * scale) + ' ' + unit if result.energy_unit == 'hartree' else relative})"
    rows = [(name, f"{significant(value * scale)} {unit}") for name, value in names if value is not None]
    return [(name, text + (target if i == 0 else "")) for i, (name, text) in enumerate(rows)]


def _transitions(result: ScanResult, units: CurveUnits) -> Rows:
    rows: Rows = [("Level crossing", place(x, result.unit, units)) for x in result.level_crossings]
    if result.transition is not None:
        rows.append(("Largest |d2E/dx2| at", place(result.transition, result.unit, units)))
    sites = [p for p in result.points if p.energy_per_site is not None]
    if sites:
        lowest = min(sites, key=lambda p: p.energy_per_site or 0.0)
        unit = unit_name(result.energy_unit)
        rows.append(("Lowest energy per site", f"{lowest.energy_per_site:.8f} {unit} at {place(lowest.coordinate, result.unit, units)}"))
    return rows


def _yield(result: ScanResult, units: CurveUnits) -> list[str]:
    """Table of what the curves yield, with the typed literature values beside; empty where there is nothing."""
    factor, unit = units.coordinate(result.unit)
    energy, literature = unit_name(result.energy_unit), result.spec.literature
    quantities = [
        ("r_e" if result.unit in LENGTH_UNITS else "Minimum", unit, ".5f", factor, [f.r_e for f in (result.variational, result.exact, literature)]),
        ("E_min", energy, ".8f", 1.0, [result.variational.e_min, result.exact.e_min, None]),
        ("D_e", energy, ".6f", 1.0, [f.d_e for f in (result.variational, result.exact, literature)]),
        ("omega_e", "cm^-1", ".2f", 1.0, [f.omega_e for f in (result.variational, result.exact, literature)]),
        ("omega_e x_e", "cm^-1", ".2f", 1.0, [f.omega_e_x_e for f in (result.variational, result.exact, literature)]),
        ("B_e", "cm^-1", ".5f", 1.0, [result.variational.b_e, result.exact.b_e, None]),
    ]
    kept = [(f"{name} / {u}" if u else name, form, f, values) for name, u, form, f, values in quantities if any(v is not None for v in values)]
    if not kept:
        return []
    width = 3 if any(values[2] is not None for *_, values in kept) else 2
    head = ["Variational", "Exact", "Literature"][:width]
    rows = [(name, [MISSING if v is None else format(v * f, form) for v in values[:width]]) for name, form, f, values in kept]
    first = max(len(name) for name, _ in rows)
    table = ["".join([" " * first, *(f"  {text:>14}" for text in head)])]
    table += ["".join([f"{name:<{first}}", *(f"  {text:>14}" for text in texts)]) for name, texts in rows]
    source = [f"Literature as typed: {literature.source or 'no source given'}"] if width == 3 else []
    return ["", *table, *source]


def _fits(result: ScanResult) -> list[str]:
    pairs = (("exact", result.exact), ("variational", result.variational))
    lines = [f"Fit of the {name} curve: {figures.fit}." for name, figures in pairs if figures.fit]
    depths = [f"D_e of the {name} curve: {figures.depth}." for name, figures in pairs if figures.depth]
    return ["", *lines, *depths] if lines or depths else []


def _flagged(result: ScanResult, units: CurveUnits) -> list[str]:
    lines = [line for point in result.points for line in flag_lines(point, result.unit, units)]
    return ["", *lines] if lines else []


def flag_lines(point: CurvePoint, unit: str, units: CurveUnits) -> list[str]:
    """One line a flag, with the sentence that belongs to it, or what happened at this very point."""
    where = place(point.coordinate, unit, units)
    if point.failure:
        return [f"At {where}: failed. {point.failure}"]
    told = {note.partition(":")[0]: note.partition(": ")[2] for note in point.notes}
    lines = [f"At {where}: {flag}: {told.get(flag) or FLAGS.get(flag, '')}." for flag in point.flags]
    return lines + [f"At {where}: {name}: {text}." for name, text in told.items() if name not in point.flags]
