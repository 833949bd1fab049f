"""A finished scan as plain numbers: one JSON object, or a CSV file whose header states units and settings."""

from __future__ import annotations

from typing import Any

from thalweg.storage.plain_json import json_text
from thalweg.study.result import StudyResult
from thalweg.study.scan_result import FLAGS, CurveFigures, CurvePoint, ScanResult
from thalweg.units import constants_record
from thalweg_app.presenters.chart import csv_of
from thalweg_app.presenters.curve import CurveUnits
from thalweg_app.presenters.wording import difference_factor, unit_name


def scan_data(result: ScanResult) -> dict[str, Any]:
    """The scan as JSON data, energies in its energy unit and coordinates in their own."""
    first = next((p.result for p in result.points if p.result is not None), None)
    return {
        "label": result.label,
        "verdict": result.verdict,
        "finished": result.finished,
        "axis": result.axis,
        "unit": result.unit,
        "energy_unit": result.energy_unit,
        "target_error": result.target_error,
        "points": [_point(point, result.unit) for point in result.points],
        "max_error": result.max_error,
        "mean_error": result.mean_error,
        "npe": result.npe,
        "error_at_minimum": result.error_at_minimum,
        "exact": _figures(result.exact),
        "variational": _figures(result.variational),
        "literature": result.spec.literature.model_dump(exclude_none=True),
        "reduced_mass": result.reduced_mass,
        "transition": result.transition,
        "level_crossings": list(result.level_crossings),
        "remarks": list(result.remarks),
        "flags": {flag: text for flag, text in FLAGS.items() if any(flag in p.flags for p in result.points)},
        "seconds": result.seconds,
        "versions": first.versions if first is not None else {},
        "constants": constants_record(),
        "spec": result.spec.model_dump(mode="json"),
    }


def scan_csv(result: ScanResult, units: CurveUnits) -> str:
    """One row a point under lines that begin with #: what was run, how, and in which units."""
    factor, unit = units.coordinate(result.unit)
    scale, error_unit = difference_factor(result.energy_unit, units.difference)
    energy_unit = unit_name(result.energy_unit)
    done = [p.result for p in result.points if p.result is not None]
    methods = list(dict.fromkeys(key for r in done for key in r.classical))
    sites = any(p.energy_per_site is not None for p in result.points)
    header = [f"{result.axis} / {unit}" if unit else result.axis, f"reference / {energy_unit}", f"variational / {energy_unit}"]
    header += [f"exact / {energy_unit}", f"error / {error_unit}", *(f"{key.upper()} / {energy_unit}" for key in methods)]
    header += [f"variational per site / {energy_unit}"] if sites else []
    header += ["S^2", "exact S^2", "parameters", "flags", "failure"]
    rows = [_row(point, factor, scale, methods, sites) for point in result.points]
    return "".join(f"# {line}\n" for line in _header_lines(result, energy_unit, error_unit, unit)) + csv_of(header, rows)


def _point(point: CurvePoint, unit: str) -> dict[str, Any]:
    r = point.result
    data: dict[str, Any] = {
        "coordinate": point.coordinate,
        "unit": unit,
        "energy": r.energy if r else None,
        "exact_energy": r.exact_energy if r else None,
        "reference_energy": r.reference_energy if r else None,
        "error": r.error if r else None,
        "flags": list(point.flags),
        "notes": list(point.notes),
        "failure": point.failure,
    }
    if r is not None:
        data |= {
            "verdict": r.verdict,
            "classical": r.classical,
            "s_squared": r.s_squared,
            "exact_s_squared": r.exact_s_squared,
            "energy_per_site": point.energy_per_site,
            "parameters": r.parameters,
            "evaluations": r.evaluations,
            "gradient_norm": r.gradient_norm,
            "stop_reason": r.stop_reason,
        }
    return data


def _figures(figures: CurveFigures) -> dict[str, Any]:
    data: dict[str, Any] = figures.model_dump()
    return data


def _row(point: CurvePoint, factor: float, scale: float, methods: list[str], sites: bool) -> list[Any]:
    r = point.result
    flags = " ".join(point.flags)
    if r is None:
        return [point.coordinate * factor, *[""] * (4 + len(methods) + sites + 3), flags, point.failure]
    error = "" if r.error is None else r.error * scale
    energies = [r.reference_energy, r.energy, _or_empty(r.exact_energy), error, *(_or_empty(r.classical.get(key)) for key in methods)]
    per_site = [_or_empty(point.energy_per_site)] if sites else []
    return [point.coordinate * factor, *energies, *per_site, _or_empty(r.s_squared), _or_empty(r.exact_s_squared), r.parameters, flags, ""]


def _or_empty(value: float | None) -> float | str:
    return "" if value is None else value


def _header_lines(result: ScanResult, energy_unit: str, error_unit: str, unit: str) -> list[str]:
    first: StudyResult | None = next((p.result for p in result.points if p.result is not None), None)
    study = result.spec.study
    lengths = f"; coordinate in {unit}" if unit else ""
    constants = "; ".join(f"{name} {value}" for name, value in constants_record().items())
    lines = [
        f"{result.label}: {result.axis}, {len(result.points)} of {len(result.spec.points)} points",
        result.verdict,
        f"energies in {energy_unit}, errors against exact in {error_unit}{lengths}",
        f"trial state {study.ansatz.title}; encoding {study.encoding.title}; optimiser {study.optimizer.title}; seed {study.seed}",
        *([f"operator order: {first.operator_order}"] if first is not None and first.operator_order else []),
        *([f"versions: {', '.join(f'{name} {version}' for name, version in first.versions.items())}"] if first is not None else []),
        f"constants: {constants}",
        *(f"fit of the {name} curve: {f.fit}" for name, f in (("exact", result.exact), ("variational", result.variational)) if f.fit),
        *result.remarks,
        f"settings: {json_text(result.spec.model_dump(mode='json'))}",
    ]
    return [" ".join(line.split()) for line in lines]
