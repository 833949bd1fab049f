"""The decay of gradient variances with qubits or layers: exponential, a power, none, or not to be told."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.study.diagnosis_result import Decay, GradientSpread

#: A fit must be better by so much chi-squared for the other form to be ruled out.
CLEARLY_BETTER = 6.0
#: Least relative error that a variance is credited with: the form itself holds only so well for small registers.
LEAST_ERROR = 0.02


def decays_of(points: Sequence[GradientSpread]) -> tuple[Decay, ...]:
    """Along qubits for each depth, deepest first, then along layers for each register, largest first."""
    found = []
    for along, held in (("qubits", "layers"), ("layers", "qubits")):
        values = sorted({getattr(p, held) for p in points}, key=lambda v: -1 if v is None else v, reverse=True)
        for value in values:
            line = [p for p in points if getattr(p, held) == value and getattr(p, along) is not None]
            if len({getattr(p, along) for p in line}) > 1:
                other = "" if value is None or len(values) == 1 else f"{value} {held if value != 1 else held[:-1]}"
                found.append(fitted_decay(line, along, other))
    return tuple(found)


def fitted_decay(points: Sequence[GradientSpread], along: str, other: str = "") -> Decay:
    """Two straight lines, ln variance against n and against ln n. `along`: qubits or layers."""
    n = np.array([getattr(p, along) for p in points], float)
    variance = np.maximum(np.array([p.variance for p in points]), 1e-300)
    errors = np.maximum(np.array([p.variance_error for p in points]) / variance, LEAST_ERROR)
    slope, slope_error, misfit = _line(n, np.log(variance), errors)
    power, power_error, power_misfit = _line(np.log(n), np.log(variance), errors)
    kind = _kind(n.size, slope, slope_error, misfit, power_misfit)
    unit = along[:-1]
    return Decay(
        along=unit,
        other=other,
        factor=float(np.exp(slope)),
        factor_error=float(np.exp(slope) * slope_error),
        power=power,
        power_error=power_error,
        kind=kind,
        sentence=_sentence(kind, unit, float(np.exp(slope)), power, slope, other),
    )


def _line(x: FloatArray, y: FloatArray, errors: FloatArray) -> tuple[float, float, float]:
    """Slope, its standard error, and chi-squared of the weighted straight line."""
    weights = errors**-2
    middle = float((weights * x).sum() / weights.sum())
    stretch = float((weights * (x - middle) ** 2).sum())
    slope = float((weights * (x - middle) * y).sum() / stretch)
    height = float((weights * y).sum() / weights.sum())
    misfit = float((weights * (y - height - slope * (x - middle)) ** 2).sum())
    return slope, stretch**-0.5, misfit


def _kind(count: int, slope: float, slope_error: float, misfit: float, power_misfit: float) -> str:
    if slope > -2 * slope_error:
        return "flat"
    if count < 3 or abs(misfit - power_misfit) < CLEARLY_BETTER:
        return "undecided"
    return "exponential" if misfit < power_misfit else "power"


def _sentence(kind: str, unit: str, factor: float, power: float, slope: float, other: str) -> str:
    where = f" at {other}" if other else ""
    if kind == "flat":
        return f"does not decay with {unit}s{where}" if slope < 0.1 else f"grows with {unit}s{where}: factor {factor:.2f} a {unit}"
    if kind == "exponential":
        return f"decays exponentially{where}: factor {factor:.2f} a {unit}"
    if kind == "power":
        return f"decays as a power{where}: {unit}s^{power:.1f}"
    return f"decays{where}: factor {factor:.2f} a {unit} if exponentially, {unit}s^{power:.1f} if as a power; more sizes would tell"
