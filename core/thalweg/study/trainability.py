"""Trainability: the spread of gradients over random starts against qubits and layers, and how it decays."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor
from typing import Any

import numpy as np

from thalweg.ansatz.ground import Ground
from thalweg.arrays import FloatArray
from thalweg.circuit.program import GateProgram, Program
from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.study.decay import decays_of
from thalweg.study.diagnosis_result import GradientSpread, TrainabilityResult
from thalweg.study.diagnosis_spec import Trainability
from thalweg.study.gather import gather
from thalweg.study.problem import Problem, make_engine, prepare
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel
from thalweg.watch import SILENT, Watch

#: A global cost has as many strings as basis states.
MOST_GLOBAL_QUBITS = 20
Gradients = Callable[[FloatArray], tuple[float, FloatArray]]


def trainability(spec: Trainability, executor: Executor | None = None, watch: Watch = SILENT) -> TrainabilityResult:
    """Every point as a task of the executor. StudyError where the trial state or the system has no such sizes; Stopped on request."""
    _refuse_what_cannot_vary(spec)
    tasks = [(spec, n, depth) for n in spec.qubits or (0,) for depth in spec.layers or (0,)]
    points = gather(gradient_spread, tasks, executor, watch, "Gradients over random starts")
    decays = decays_of(points)
    verdict = decays[0].sentence if decays else _single(points[0])
    return TrainabilityResult(spec=spec, unit=_unit(spec), points=tuple(points), decays=decays, verdict=verdict)


def gradient_spread(spec: Trainability, size: int, depth: int) -> GradientSpread:
    """One point; 0 takes the size or the depth of the study itself. The starts depend on seed, size and depth alone."""
    study = _with_depth(spec.study, depth)
    ground, program, gradients = _set_up(spec, study, size)
    if program.n_parameters == 0:
        raise StudyError("There is no gradient", "the trial state has no parameters", "Choose another trial state", "ansatz")
    rng = np.random.default_rng([study.seed, size, depth])
    costs, slopes = np.empty(spec.samples), np.empty((spec.samples, program.n_parameters))
    for i in range(spec.samples):
        costs[i], slopes[i] = gradients(_start(spec, study.ansatz, ground, program, rng))
    variance, error = spread_of(_chosen(slopes, spec.component))
    qubits = program.n_qubits if isinstance(program, GateProgram) else ground.qubits.n_qubits
    return GradientSpread(
        qubits=qubits,
        layers=_depth_of(study.ansatz),
        parameters=program.n_parameters,
        samples=spec.samples,
        variance=variance,
        variance_error=error,
        cost_deviation=float(costs.std(ddof=1)),
    )


def spread_of(slopes: FloatArray) -> tuple[float, float]:
    """The variance of each column, averaged over the columns, and its standard error; slopes: (samples, K)."""
    squares = ((slopes - slopes.mean(axis=0)) ** 2).mean(axis=1)
    count = len(squares)
    return float(squares.mean() * count / (count - 1)), float(squares.std(ddof=1) / np.sqrt(count))


def global_cost(n: int) -> PauliExpansion:
    """1 - |0...0><0...0| on n qubits (Cerezo et al., Nat. Commun. 12, 1791 (2021)); StudyError past MOST_GLOBAL_QUBITS."""
    if n > MOST_GLOBAL_QUBITS:
        raise StudyError(
            f"A global cost on {n} qubits is too large", f"it has 2^{n} Pauli strings", f"Use up to {MOST_GLOBAL_QUBITS} qubits", "qubits"
        )
    z = np.arange(1 << n, dtype=np.uint64)
    coefficients = np.full(z.size, -(0.5**n))
    coefficients[0] += 1.0
    return collect_terms(n, np.zeros_like(z), z, coefficients)


def local_cost(n: int) -> PauliExpansion:
    """1 - (1/n) sum_q |0><0|_q on n qubits (Cerezo et al., Nat. Commun. 12, 1791 (2021))."""
    z = np.array([0, *(1 << q for q in range(n))], np.uint64)
    return collect_terms(n, np.zeros_like(z), z, np.array([0.5, *[-0.5 / n] * n]))


def _set_up(spec: Trainability, study: StudySpec, size: int) -> tuple[Ground, Program, Gradients]:
    """The trial state on a register of this size, and its cost with the gradient."""
    on_lattice = isinstance(study.system, LatticeModel)
    if spec.cost == "energy" or on_lattice or not size:
        problem = prepare(_resized(study, size) if size and on_lattice else study)
        if spec.cost == "energy":
            return problem.ground, problem.program, make_engine(problem).energy_and_gradient
        return problem.ground, problem.program, _cost_gradients(spec.cost, _gates(problem), study)
    ground = Ground(None, local_cost(size), 0)
    ansatz: Any = study.ansatz
    program = ansatz.build(ground)
    return ground, program, _cost_gradients(spec.cost, program, study)


def _gates(problem: Problem) -> GateProgram:
    if isinstance(problem.program, GateProgram):
        return problem.program
    raise StudyError(
        "A global or local cost is for circuits of gates", "this trial state acts on electrons", "Choose the energy as the cost", "diagnosis.cost"
    )


def _cost_gradients(cost: str, program: GateProgram, study: StudySpec) -> Gradients:
    from thalweg.simulate.register import RegisterEngine

    expansion = global_cost(program.n_qubits) if cost == "global" else local_cost(program.n_qubits)
    return RegisterEngine(expansion, program, budget_bytes=int(study.memory_gib * 2**30)).energy_and_gradient


def _resized(study: StudySpec, sites: int) -> StudySpec:
    """The same model on a lattice of so many sites: longer, not wider. StudyError where the lattice has no such size."""
    system = study.system
    assert isinstance(system, LatticeModel)
    lattice, fields = system.lattice, type(system.lattice).model_fields
    name = next((field for field in ("sites", "rungs", "columns") if field in fields), "")
    if name:
        one, two = (lattice.model_copy(update={name: length}).build().n_sites for length in (3, 4))
        length = 3 + (sites - one) // (two - one) if (sites - one) % (two - one) == 0 else 0
        if length > 0 and (resized := lattice.model_copy(update={name: length})).build().n_sites == sites:
            return study.model_copy(update={"system": system.model_copy(update={"lattice": resized})})
    fix = "Choose sizes that the lattice has, or a chain"
    raise StudyError(f"There is no such lattice with {sites} sites", f"it is a {lattice.title.lower()} lattice", fix, "diagnosis.qubits")


def _with_depth(study: StudySpec, depth: int) -> StudySpec:
    if not depth:
        return study
    name = _depth_field(study.ansatz)
    return study.model_copy(update={"ansatz": type(study.ansatz).model_validate({**study.ansatz.model_dump(), name: depth})})


def _depth_field(ansatz: Any) -> str:
    name: str = getattr(type(ansatz), "depth_field", "")
    return name


def _depth_of(ansatz: Any) -> int | None:
    name = _depth_field(ansatz)
    return getattr(ansatz, name) if name else None


def _refuse_what_cannot_vary(spec: Trainability) -> None:
    if spec.layers and not _depth_field(spec.study.ansatz):
        raise StudyError(f"{spec.study.ansatz.title} has no layers", "its depth is fixed", "Leave the layers out, or choose a layered one", "layers")
    if len(spec.qubits) > 1 and spec.cost == "energy" and not isinstance(spec.study.system, LatticeModel):
        raise StudyError(
            "The size of this system is fixed",
            "a molecule has its own number of qubits",
            "Choose a lattice, a global or local cost, or one size",
            "qubits",
        )
    if spec.starts == "as-set" and getattr(spec.study.ansatz, "start", "") in ("zero", "mp2"):
        raise StudyError("The starts are all the same", "the trial state starts at a fixed point", "Use uniform starts, or a random start", "starts")


def _start(spec: Trainability, ansatz: Any, ground: Ground, program: Program, rng: np.random.Generator) -> FloatArray:
    if spec.starts == "uniform":
        return rng.uniform(-np.pi, np.pi, program.n_parameters)
    start: FloatArray = ansatz.start_parameters(ground, program, rng)
    return start


def _chosen(slopes: FloatArray, component: str) -> FloatArray:
    return {"mean": slopes, "first": slopes[:, :1], "last": slopes[:, -1:]}[component]


def _unit(spec: Trainability) -> str:
    if spec.cost != "energy":
        return "1"
    return spec.study.system.energy_unit() if isinstance(spec.study.system, LatticeModel) else "hartree"


def _single(point: GradientSpread) -> str:
    return f"variance of the gradient {point.variance:.3g} +- {point.variance_error:.1g}; one point shows no decay"
