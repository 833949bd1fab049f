"""Landscape: the energy along one or two directions through a point."""

from __future__ import annotations

from collections import Counter
from concurrent.futures import Executor

import numpy as np

from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
from thalweg.errors import StudyError
from thalweg.study.diagnosis_result import LandscapeResult
from thalweg.study.diagnosis_spec import Direction, Landscape
from thalweg.study.gather import gather
from thalweg.study.neighbour import as_found, begun_at
from thalweg.study.problem import Problem, exact_answer, make_engine, prepare
from thalweg.study.spec import StudySpec
from thalweg.study.verdict import amount
from thalweg.watch import SILENT, Watch

#: Energies of one task: enough that setting it up is worth while.
TASK = 200


def landscape(spec: Landscape, executor: Executor | None = None, watch: Watch = SILENT) -> LandscapeResult:
    """Exact energies on a line or a grid. StudyError where point and directions do not fit the trial state; Stopped on request."""
    study = as_found(spec.study, spec.centre, spec.labels, watch) if spec.labels else spec.study
    problem = prepare(study, watch)
    engine = make_engine(problem, watch)
    centre = _centre(spec, problem)
    vectors, labels, steps = zip(*(_direction(d, i, spec, problem, centre) for i, d in enumerate(spec.directions)), strict=True)
    grid = np.stack([g.ravel() for g in np.meshgrid(*steps, indexing="ij")], axis=1)
    points = centre + grid @ np.array(vectors)
    tasks = [(study, points[first : first + TASK]) for first in range(0, len(points), TASK)]
    energies = np.concatenate(gather(energies_at, tasks, executor, watch, "Energies along the directions")).reshape(steps[0].size, -1)
    here, exact = engine.energy(centre), exact_answer(problem, watch)
    row, column = (int(i) for i in np.unravel_index(np.argmin(energies), energies.shape))
    minima = _minima(energies)
    return LandscapeResult(
        spec=spec,
        unit=problem.prepared.energy_unit,
        labels=labels,
        steps=tuple(tuple(float(v) for v in s) for s in steps),
        energies=tuple(tuple(float(v) for v in line) for line in energies),
        centre=tuple(float(v) for v in centre),
        centre_energy=here,
        exact_energy=None if exact is None else exact.energy,
        lowest=(row, column),
        minima=minima,
        verdict=_sentence(here - float(energies.min()), minima, problem.prepared.energy_unit),
    )


def energies_at(study: StudySpec, points: FloatArray) -> FloatArray:
    """Energies of the rows of `points`, shape (P, K): one task."""
    engine = make_engine(prepare(study))
    return np.array([engine.energy(point) for point in points])


def _centre(spec: Landscape, problem: Problem) -> FloatArray:
    program, ansatz = problem.program, spec.study.ansatz
    if not program.n_parameters:
        fix = "Take the point of a run that has grown" if isinstance(ansatz, Adaptive) else "Choose another trial state"
        raise StudyError("There is no landscape", "the trial state has no parameters", fix, "ansatz")
    if not spec.centre:
        own: FloatArray = ansatz.start_parameters(problem.ground, program, np.random.default_rng(spec.study.seed))  # type: ignore[arg-type]
        return begun_at(problem, ansatz, program, own)
    return _fitting(spec.centre, spec.labels, program, "centre")


def _fitting(values: tuple[float, ...], labels: tuple[str, ...], program: Program, what: str) -> FloatArray:
    """The point as parameters of the program: one of the same trial state, or of a part of it, whose other factors do nothing at zero."""
    if len(values) == program.n_parameters and labels in ((), program.labels()):
        return np.array(values)
    if not labels or len(labels) != len(values):
        raise StudyError(
            f"The {what} has {len(values)} parameters",
            f"the trial state has {program.n_parameters}",
            "Give a point of the same trial state",
            f"diagnosis.{what}",
        )
    places = _places(labels, program, what)
    point = np.zeros(program.n_parameters)
    point[places] = values
    return point


def _places(labels: tuple[str, ...], program: Program, what: str) -> list[int]:
    """The parameter of each label. StudyError where the state at the point is none of the program's: factors are missing or in another order."""
    here = program.labels()
    missing = Counter(labels) - Counter(here)
    places: list[int] = []
    for label in labels:
        begin = places[-1] + 1 if places else 0
        if label in here[begin:]:
            places.append(here.index(label, begin))
    why = ""
    if missing:
        why = f"it has `{next(iter(missing))}`, which the trial state at the centre lacks"
    elif len(places) < len(labels):
        why = "its operators act in another order than those of the trial state at the centre"
    elif _has_fixed_gates_between(program):
        why = "the trial state at the centre has gates between its parameters that the point lacks"
    if why:
        raise StudyError(f"The {what} lies on no such landscape", why, "Take the larger trial state as the centre", f"diagnosis.{what}")
    return places


def _has_fixed_gates_between(program: Program) -> bool:
    """Whether gates without a parameter follow the first one with a parameter, so that the circuit does not shrink to a part of it."""
    turned = program.parameter >= 0
    return bool((~turned[int(np.argmax(turned)) :]).any())


def _direction(direction: Direction, index: int, spec: Landscape, problem: Problem, centre: FloatArray) -> tuple[FloatArray, str, FloatArray]:
    """The vector, its name, and the steps along it."""
    steps = np.linspace(-spec.reach, spec.reach, spec.points)
    if direction.kind == "point":
        other = _fitting(direction.point, direction.labels, problem.program, "point")
        return other - centre, "towards the other point", np.linspace(-0.5, 1.5, spec.points)
    if direction.kind == "parameter":
        if direction.parameter >= centre.size:
            raise StudyError(
                f"There is no parameter {direction.parameter}",
                f"they are numbered 0 to {centre.size - 1}",
                "Give one of these",
                "diagnosis.parameter",
            )
        return np.eye(centre.size)[direction.parameter], problem.program.labels()[direction.parameter], steps
    if direction.kind == "steepest":
        gradient = make_engine(problem).energy_and_gradient(centre)[1]
        norm = float(np.linalg.norm(gradient))
        if norm < 1e-10:
            raise StudyError(
                "There is no steepest direction", "the gradient vanishes at the centre", "Choose another direction", "diagnosis.directions"
            )
        return -gradient / norm, "steepest descent", steps
    vector = np.random.default_rng([spec.study.seed, index]).normal(size=centre.size)
    return vector / np.linalg.norm(vector), f"random direction {index + 1}", steps


def _minima(energies: FloatArray) -> int:
    """Points lower than all their neighbours on the grid, the border left out."""
    inner = np.ones_like(energies, dtype=bool)
    for axis in range(2):
        if energies.shape[axis] < 3:
            continue
        for shift in (1, -1):
            inner &= energies < np.roll(energies, shift, axis)
        edge = [slice(None), slice(None)]
        for edge_at in (0, -1):
            edge[axis] = edge_at  # type: ignore[call-overload]
            inner[tuple(edge)] = False
    return int(np.count_nonzero(inner))


def _sentence(fall: float, minima: int, unit: str) -> str:
    counted = f"{minima} {'minimum' if minima == 1 else 'minima'} inside"
    if fall <= 1e-9:
        return f"the centre is the lowest point looked at; {counted}"
    return f"the lowest point looked at lies {amount(fall, unit)} below the centre; {counted}"
