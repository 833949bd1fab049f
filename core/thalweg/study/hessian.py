"""Second derivatives of the energy at a point: is it a minimum or a saddle?"""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.simulate.engine import Engine
from thalweg.study.diagnosis_result import Curvature, StartSpread
from thalweg.study.neighbour import as_found
from thalweg.study.problem import make_engine, prepare
from thalweg.study.result import StudyResult
from thalweg.study.verdict import amount
from thalweg.watch import SILENT, Watch

#: Step of the central differences of the gradient, radians.
STEP = 1e-4
#: Up to so many parameters the whole matrix is worked out; beyond, its lowest eigenvalues by Lanczos.
MOST_DENSE = 120
#: An eigenvalue this close to zero, as a part of the largest, counts as zero; a gradient above this is not stationary, Eh.
FLAT, STATIONARY = 1e-6, 1e-3
#: How many eigenvalues are kept.
KEPT = 8
#: Energies closer than this, in their own unit, are the same minimum.
SAME = 1e-6


def curvature_of(result: StudyResult, watch: Watch = SILENT) -> Curvature:
    """The Hessian at the found parameters of a run, in the trial state that it ended with. StudyError where they are not known."""
    problem = prepare(as_found(result.spec, result.final_parameters, result.parameter_labels, watch), watch)
    if problem.program.n_parameters != len(result.final_parameters):
        raise StudyError("There is no found point", "the parameters of this run were not handed over", "Run it again to its end", "ansatz")
    return curvature(make_engine(problem, watch), np.array(result.final_parameters), result.parameter_labels, result.energy_unit, watch)


def curvature(engine: Engine, x: FloatArray, labels: tuple[str, ...], unit: str, watch: Watch = SILENT) -> Curvature:
    """Lowest eigenvalues of the Hessian at x, from central differences of the exact gradient."""
    gradient = engine.energy_and_gradient(x)[1]
    norm = float(np.abs(gradient).max(initial=0.0))
    values, direction, largest = _dense(engine, x, watch) if x.size <= MOST_DENSE else _lowest(engine, x, watch)
    kind = _kind(norm, float(values[0]) if values.size else 0.0, largest)
    leading = labels[int(np.argmax(np.abs(direction)))] if direction.size else ""
    return Curvature(
        unit=unit,
        gradient_norm=norm,
        eigenvalues=tuple(float(v) for v in values[:KEPT]),
        direction=tuple(float(v) for v in direction),
        leading_parameter=leading,
        kind=kind,
        verdict=_sentence(kind, norm, values, leading, unit),
    )


def spread_of_starts(result: StudyResult) -> StartSpread:
    """Where the starts of a run ended."""
    energies = np.array([s.energy for s in result.starts])
    lowest, highest = float(energies.min()), float(energies.max())
    distinct = 1 + int(np.count_nonzero(np.diff(np.sort(energies)) > SAME))
    within = None
    if result.exact_energy is not None:
        within = int(np.count_nonzero(energies <= result.exact_energy + result.target_error))
    ended = "at one energy" if distinct == 1 else f"at {distinct} different energies, {amount(highest - lowest, result.energy_unit)} apart"
    found = f"{energies.size} start{'s' if energies.size > 1 else ''} ended {ended}"
    verdict = found if within is None else f"{found}; {within} of them within the target"
    return StartSpread(
        starts=energies.size,
        lowest=lowest,
        highest=highest,
        mean=float(energies.mean()),
        deviation=float(energies.std(ddof=1)) if energies.size > 1 else 0.0,
        distinct=distinct,
        within_target=within,
        verdict=verdict,
    )


def _along(engine: Engine, x: FloatArray, direction: FloatArray) -> FloatArray:
    """The Hessian times a direction of norm 1."""
    plus, minus = engine.energy_and_gradient(x + STEP * direction)[1], engine.energy_and_gradient(x - STEP * direction)[1]
    return (plus - minus) / (2 * STEP)


def _dense(engine: Engine, x: FloatArray, watch: Watch) -> tuple[FloatArray, FloatArray, float]:
    rows = np.zeros((x.size, x.size))
    for k, unit in enumerate(np.eye(x.size)):
        watch.stage("Second derivatives", k / x.size)
        rows[k] = _along(engine, x, unit)
    if not x.size:
        return np.empty(0), np.empty(0), 0.0
    values, vectors = np.linalg.eigh(0.5 * (rows + rows.T))
    return values, vectors[:, 0], float(np.abs(values).max())


def _lowest(engine: Engine, x: FloatArray, watch: Watch) -> tuple[FloatArray, FloatArray, float]:
    from scipy.sparse.linalg import LinearOperator, eigsh

    def product(v: FloatArray) -> FloatArray:
        watch.stage("Second derivatives")
        norm = float(np.linalg.norm(v))
        return norm * _along(engine, x, v.ravel() / norm) if norm else np.zeros(x.size)

    operator = LinearOperator((x.size, x.size), matvec=product, dtype=float)
    start = np.random.default_rng(1).normal(size=x.size)
    largest = float(np.abs(eigsh(operator, k=1, which="LM", v0=start, tol=1e-3, return_eigenvectors=False)[0]))
    values, vectors = eigsh(operator, k=3, which="SA", v0=start, tol=1e-5)
    order = np.argsort(values)
    return values[order], vectors[:, order[0]], largest


def _kind(norm: float, lowest: float, largest: float) -> str:
    if norm > STATIONARY:
        return "not-stationary"
    if lowest < -FLAT * max(largest, 1e-12):
        return "saddle"
    return "flat" if lowest < FLAT * max(largest, 1e-12) else "minimum"


def _sentence(kind: str, norm: float, values: FloatArray, leading: str, unit: str) -> str:
    if not values.size:
        return "no parameters, no curvature"
    lowest = f"lowest curvature {values[0]:.3g} {'Eh' if unit == 'hartree' else unit}"
    if kind == "not-stationary":
        return f"not stationary: largest gradient component {norm:.2g}; {lowest}"
    if kind == "saddle":
        return f"saddle point: {lowest}, mostly along {leading}; the energy falls on both sides"
    if kind == "flat":
        return f"flat: {lowest}, so that some parameters can be changed together at no cost"
    return f"minimum: {lowest}"
