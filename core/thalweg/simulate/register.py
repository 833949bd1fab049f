"""Gate programs on a register of 2^n complex amplitudes."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import StudyError
from thalweg.kernels import register as kernels
from thalweg.operators.pauli import PauliExpansion
from thalweg.operators.product import ExpansionProduct, product_bytes
from thalweg.simulate.engine import StateFacts
from thalweg.simulate.register_facts import ground_weight, leading_states, squared_distance
from thalweg.watch import SILENT, Watch

AMPLITUDE_BYTES = 16
DEFAULT_BUDGET = 4 * 2**30


class RegisterEngine:
    """Evaluates a gate program on a Pauli expansion; see `simulate.engine.Engine`.

    Args:
        hamiltonian, program: on registers of one size n.
        number, s_z, s_squared: observables on the same register; None where they have no meaning.
        label: text of a basis state given as a bit mask; the plain bits by default.
        budget_bytes: StudyError when the estimate is above it.
        watch: asked between parts of every long pass; raises Stopped.
    """

    def __init__(
        self,
        hamiltonian: PauliExpansion,
        program: GateProgram,
        *,
        number: PauliExpansion | None = None,
        s_z: PauliExpansion | None = None,
        s_squared: PauliExpansion | None = None,
        label: Callable[[int], str] | None = None,
        budget_bytes: int = DEFAULT_BUDGET,
        watch: Watch = SILENT,
    ) -> None:
        if hamiltonian.n_qubits != program.n_qubits:
            raise ValueError("program and Hamiltonian act on registers of different sizes")
        self.n_parameters, self.n_qubits, self.watch = program.n_parameters, program.n_qubits, watch
        self._hamiltonian, self._program, self._observables = hamiltonian, program, (number, s_z, s_squared)
        self._label = label or (lambda bits: format(bits, f"0{self.n_qubits}b"))
        refuse_above(self.memory_bytes(), budget_bytes, self.n_qubits)
        self._product = ExpansionProduct(hamiltonian)
        self._phases = np.array(kernels.PHASES)[np.bitwise_count(program.x & program.z) & 3]

    def memory_bytes(self) -> int:
        """State, adjoint state, and the tables of the Hamiltonian."""
        return 2 * AMPLITUDE_BYTES * (1 << self.n_qubits) + product_bytes(self._hamiltonian)

    def energy(self, parameters: FloatArray) -> float:
        return self._product.expectation(self.state(parameters), self.watch)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        """One forward pass, H psi, and one backward pass that undoes the gates on both states (adjoint differentiation)."""
        state = self.state(parameters)
        adjoint = np.empty_like(state)
        energy = self._product.apply(state, adjoint, self.watch)
        gradient = np.zeros(self.n_parameters)
        program, angles = self._program, self._angles(parameters)
        for g in reversed(range(program.kind.size)):
            self.watch.check()
            k = program.parameter[g]
            if program.kind[g] == Gate.ROTATION and k >= 0:
                element = kernels.generator_element(adjoint, state, program.x[g], program.z[g], self._phases[g])
                gradient[k] += program.factor[g] * element.imag
            self._gate(state, g, -angles[g])
            self._gate(adjoint, g, -angles[g])
        return energy, gradient

    def state(self, parameters: FloatArray) -> ComplexArray:
        """Amplitudes, shape (2^n,)."""
        state = np.zeros(1 << self.n_qubits, dtype=np.complex128)
        state[self._program.reference] = 1.0
        angles = self._angles(parameters)
        for g in range(angles.size):
            self.watch.check()
            self._gate(state, g, angles[g])
        return state

    def facts(self, parameters: FloatArray, exact_vectors: Any | None) -> StateFacts:
        state = self.state(parameters)
        image = np.empty_like(state)
        energy = self._product.apply(state, image, self.watch)
        variance = squared_distance(image, energy, state)
        del image
        number, s_z, s_squared = (None if o is None else ExpansionProduct(o).expectation(state, self.watch) for o in self._observables)
        fidelity = None if exact_vectors is None else ground_weight(exact_vectors, state)
        return StateFacts(number, s_z, s_squared, variance, fidelity, leading_states(state, exact_vectors, self._label))

    def _angles(self, parameters: FloatArray) -> FloatArray:
        program = self._program
        if program.n_parameters == 0:
            return program.factor
        return np.where(program.parameter < 0, 1.0, np.asarray(parameters)[program.parameter]) * program.factor

    def _gate(self, state: ComplexArray, g: int, angle: float) -> None:
        program = self._program
        x, z = program.x[g], program.z[g]
        if program.kind[g] == Gate.ROTATION:
            kernels.rotate(state, x, z, self._phases[g], np.cos(angle / 2), np.sin(angle / 2))
        else:
            kernels.fixed_gate(state, program.kind[g], x, z)


def refuse_above(needed: int, budget: int, n_qubits: int) -> None:
    """StudyError that states the figure when a register does not fit the budget."""
    if needed > budget:
        raise StudyError(
            f"A register of {n_qubits} qubits does not fit",
            f"it needs {needed / 2**30:.3g} GiB of memory and {budget / 2**30:.3g} GiB are allowed",
            "Allow more memory, taper qubits away, or study a smaller system",
            "memory_gib",
        )
