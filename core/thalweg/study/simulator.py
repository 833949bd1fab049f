"""A study's engine as what evaluations ask for: shifted angles, drawn bit strings, the metric."""

from __future__ import annotations

from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np

from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import ComplexArray, FloatArray, IntArray
from thalweg.circuit.angles import Angles, angles_of, one_parameter_an_angle
from thalweg.circuit.curvature import reference_curvature
from thalweg.circuit.program import ExcitationProgram
from thalweg.circuit.structure import Structure, structure_of
from thalweg.encoding.encoded import EncodedSystem
from thalweg.encoding.symmetry import Tapering
from thalweg.errors import StudyError
from thalweg.evaluate.settings import Source
from thalweg.evaluate.simulator import SetSums
from thalweg.optimize.settings import refuse_unless_offered
from thalweg.simulate.engine import Engine
from thalweg.study.problem import Problem, make_engine
from thalweg.watch import SILENT, Watch


class StudySimulator:
    """See `evaluate.simulator.Simulator`. Everything beyond energy and gradient is prepared when it is first asked for.

    A gradient by shifts takes many energies, so that each of them asks the watch whether to stop.
    """

    def __init__(self, problem: Problem, engine: Engine, watch: Watch = SILENT) -> None:
        self._problem, self._engine, self._watch = problem, engine, watch
        self.n_parameters = problem.program.n_parameters

    @cached_property
    def angles(self) -> Angles:
        return angles_of(self._problem.program)

    @cached_property
    def structure(self) -> Structure:
        program, fermions = self._problem.program, self._problem.prepared.fermions
        structure = structure_of(program, self._problem.encoded.working.one_norm)
        if fermions is None or not isinstance(program, ExcitationProgram):
            return structure
        return replace(structure, curvature=reference_curvature(program, fermions))

    @property
    def set_weights(self) -> FloatArray:
        weights: FloatArray = self._sets.weights
        return weights

    @property
    def constant(self) -> float:
        return float(self._sets.constant)

    def energy(self, parameters: FloatArray) -> float:
        return self._engine.energy(parameters)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        return self._engine.energy_and_gradient(parameters)

    def energy_at(self, angles: FloatArray) -> float:
        self._watch.check()
        return self._by_angle.energy(self._settings_of(angles))

    def sample(self, angles: FloatArray, shots: IntArray, rng: np.random.Generator) -> SetSums:
        sums = self._sets.sample(self._register_state(angles), shots, rng)
        return SetSums(shots, sums[:, 0], sums[:, 1])

    def set_variances(self, angles: FloatArray) -> FloatArray:
        variances: FloatArray = self._sets.moments(self._register_state(angles))[1]
        return variances

    def state(self, angles: FloatArray) -> Any:
        self._watch.check()
        return self._by_angle.state(self._settings_of(angles))

    def metric(self, parameters: FloatArray) -> FloatArray:
        from thalweg.simulate.metric import metric_tensor

        return metric_tensor(self._problem.program, parameters, budget_bytes=self._problem.budget_bytes)

    @cached_property
    def _is_plain(self) -> bool:
        """Whether every parameter turns one gate, so that shifting it shifts that gate alone."""
        once = np.bincount(self.angles.parameter, minlength=self.angles.n_parameters)
        return bool(np.all(once == 1) and np.all(self.angles.factor != 0))

    @cached_property
    def _by_angle(self) -> Engine:
        """The engine of the same circuit with a parameter for every angle."""
        if self._is_plain:
            return self._engine
        return make_engine(replace(self._problem, program=one_parameter_an_angle(self._problem.program)), self._watch)

    def _settings_of(self, angles: FloatArray) -> FloatArray:
        if not self._is_plain:
            return angles
        settings = np.empty_like(angles)
        settings[self.angles.parameter] = angles / self.angles.factor
        return settings

    def _register_state(self, angles: FloatArray) -> ComplexArray:
        state = self.state(angles)
        if isinstance(self._problem.program, ExcitationProgram):
            return self.register.from_sector(state[None])[0]
        register_state: ComplexArray = state
        return register_state

    @cached_property
    def register(self) -> EncodedSystem:
        """The register that is measured."""
        return measured_register(self._problem)

    @cached_property
    def _sets(self) -> Any:
        expansion = self.register.working
        needed = 64 << expansion.n_qubits
        if needed > self._problem.budget_bytes:
            raise StudyError(
                f"A register of {expansion.n_qubits} qubits cannot be measured",
                f"drawing bit strings needs {needed / 2**30:.3g} GiB of memory and {self._problem.spec.memory_gib:.3g} GiB are allowed",
                "Allow more memory, or evaluate exactly",
                "memory_gib",
            )
        from thalweg.cost.groups import qubit_wise_groups
        from thalweg.simulate.shots import MeasuredSets

        if getattr(self._problem.spec.evaluation, "sets", "qubit-wise") == "single-terms":
            return MeasuredSets(expansion, tuple(np.flatnonzero((expansion.x | expansion.z) != 0)[:, None]))
        return MeasuredSets(expansion, qubit_wise_groups(expansion, largest_first=True, watch=self._watch))  # this order needs fewer shots


def measured_register(problem: Problem) -> EncodedSystem:
    """The working register, or the full one where the state leaves the tapered sector, as for gates."""
    encoded, program = problem.encoded, problem.program
    if isinstance(program, ExcitationProgram) and encoded.symmetries:
        from thalweg.circuit.compile import leaves_sector

        if leaves_sector(program, encoded):
            encoded = replace(encoded, working=encoded.full, tapering=Tapering(encoded.full.n_qubits), symmetries=())
    return encoded


def search_source(problem: Problem, engine: Engine, rng: np.random.Generator, watch: Watch = SILENT) -> Source:
    """Where a search by the study's optimiser draws its numbers from; StudyError where that optimiser needs more than is offered."""
    refuse_unfit(problem)
    return problem.spec.evaluation.source(StudySimulator(problem, engine, watch), rng)


def refuse_unfit(problem: Problem) -> None:
    """StudyError where parts of the settings do not go together: what the optimiser needs, the evaluation and the trial state, the reference."""
    spec, program = problem.spec, problem.program
    if spec.continuation > 1 and problem.ground.begins_combined:
        raise StudyError(
            "Continuation cannot begin at a combination",
            "it needs an easy Hamiltonian of which the reference is an eigenstate",
            "Choose one determinant or basis state as the reference, or no continuation steps",
            "continuation",
        )
    if spec.ladder.on and not isinstance(spec.ansatz, Adaptive):
        depth_field(spec.ansatz)
    if spec.optimizer.needs and program.n_parameters:
        offers = spec.evaluation.offers(structure_of(program, problem.encoded.working.one_norm))
        refuse_unless_offered(spec.optimizer, offers, spec.evaluation.title)


def depth_field(ansatz: Any) -> str:
    """The field that holds the number of layers; StudyError where there is none."""
    name: str = getattr(type(ansatz), "depth_field", "")
    if not name:
        raise StudyError(
            f"No depth ladder for {ansatz.title}", "this trial state has no layers", "Choose a layered one, or switch the ladder off", "ladder.on"
        )
    return name
