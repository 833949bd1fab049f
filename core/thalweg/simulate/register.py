"""Gate programs on a register of 2^n amplitudes."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import Any

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray
from thalweg.circuit.program import GateProgram
from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion
from thalweg.operators.product import ExpansionProduct, product_bytes
from thalweg.parts import allowed_threads
from thalweg.simulate.engine import StateFacts
from thalweg.simulate.register_facts import ground_weight, leading_states, squared_distance
from thalweg.simulate.register_passes import plan
from thalweg.simulate.register_run import PlanRunner, aligned
from thalweg.watch import SILENT, Watch

DEFAULT_BUDGET = 4 * 2**30
#: A tile takes 2^16 bytes: tile, adjoint tile and tables stay in the second-level cache.
TILE_BYTES_BITS = 16


class RegisterEngine:
    """Evaluates a gate program on a Pauli expansion; see `simulate.engine.Engine`.

    Where every rotation has an odd number of Y, the amplitudes are real and half the memory and time is needed.

    Args:
        hamiltonian, program: on registers of one size n.
        number, s_z, s_squared: observables on the same register; None where they have no meaning.
        label: text of a basis state given as a bit mask; the plain bits, highest qubit first, by default.
        budget_bytes: StudyError when the estimate is above it.
        product: gives H as a product with vectors where engines share one; asked when first needed.
        watch: asked between parts of every long pass; raises Stopped.
        threads: how many share a large register, by default as many as `parts.allowed_threads` says.
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
        product: Callable[[], ExpansionProduct] | None = None,
        watch: Watch = SILENT,
        tile_bytes_bits: int = TILE_BYTES_BITS,
        threads: int | None = None,
    ) -> None:
        if hamiltonian.n_qubits != program.n_qubits:
            raise ValueError("program and Hamiltonian act on registers of different sizes")
        self.n_parameters, self.n_qubits, self.watch = program.n_parameters, program.n_qubits, watch
        self._hamiltonian, self._reference, self._observables = hamiltonian, program.reference, (number, s_z, s_squared)
        self._shared_product = product
        self._label = label or (lambda bits: format(bits, f"0{self.n_qubits}b"))
        self._plan, self._threads = plan(program, tile_bytes_bits), threads or allowed_threads()
        _refuse_above(self.memory_bytes(), budget_bytes, self.n_qubits)

    def memory_bytes(self) -> int:
        """State, adjoint state, a complex copy to hand out, scratch memory, and the tables of the Hamiltonian."""
        copies = 3 if not self._plan.unit and _has_odd_terms(self._hamiltonian) else 1  # facts then need complex vectors
        register = 2 * self._amplitude_bytes + (copies * 16 << self.n_qubits)
        return register + PlanRunner.bytes_needed(self._plan, self._threads) + product_bytes(self._hamiltonian)

    def energy(self, parameters: FloatArray) -> float:
        return self._product.expectation(self._amplitudes(self._forward(parameters)), self.watch)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        """One forward pass, H psi, and one backward pass that undoes the gates on both states (adjoint differentiation)."""
        state, adjoint = self._forward(parameters), self._adjoint
        adjoint[:] = 0.0
        energy = self._product.apply(self._amplitudes(state), self._amplitudes(adjoint), self.watch)
        by_rotation = self._runner.backward(state, adjoint, self._plan.rotations.angles(parameters), self.watch)
        return energy, self._plan.rotations.gradient(by_rotation, self.n_parameters)

    def state(self, parameters: FloatArray) -> ComplexArray:
        """Amplitudes, shape (2^n,)."""
        return self._amplitudes(self._forward(parameters)).astype(np.complex128)

    def facts(self, parameters: FloatArray, exact_vectors: Any | None) -> StateFacts:
        state, image = self._amplitudes(self._forward(parameters)), self._amplitudes(self._adjoint)
        if state.dtype == np.float64 and _has_odd_terms(self._hamiltonian):
            state = state.astype(np.complex128)
            image = np.empty_like(state)
        energy = self._full_product.apply(state, image, self.watch)
        variance = squared_distance(image, energy, state, self.watch)
        number, s_z, s_squared = (None if o is None else ExpansionProduct(o).expectation(state, self.watch) for o in self._observables)
        fidelity = None if exact_vectors is None else ground_weight(exact_vectors, state, self.watch)
        return StateFacts(number, s_z, s_squared, variance, fidelity, leading_states(state, exact_vectors, self._label, self.watch))

    def _forward(self, parameters: FloatArray) -> FloatArray:
        state = self._state
        state[:] = 0.0
        state[self._reference << self._plan.unit] = 1.0
        self._runner.forward(state, self._plan.rotations.angles(parameters), self.watch)
        return state

    def _amplitudes(self, positions: FloatArray) -> Any:
        """The register's amplitudes, complex or real, without the spare qubits of the plan."""
        whole = positions.view(np.complex128) if self._plan.unit else positions
        return whole[: 1 << self.n_qubits]

    @property
    def _amplitude_bytes(self) -> int:
        return 8 << self._plan.n_qubits + self._plan.unit

    @cached_property
    def _state(self) -> FloatArray:
        return aligned(self._amplitude_bytes // 8)

    @cached_property
    def _adjoint(self) -> FloatArray:
        return aligned(self._amplitude_bytes // 8)

    @cached_property
    def _runner(self) -> PlanRunner:
        return PlanRunner(self._plan, self._threads)

    @cached_property
    def _product(self) -> ExpansionProduct:
        """H, or its real part where the amplitudes are real: the rest adds nothing to energy and gradient."""
        if not self._plan.unit and _has_odd_terms(self._hamiltonian):
            return ExpansionProduct(_real_part(self._hamiltonian), threads=self._threads)
        return self._full_product

    @cached_property
    def _full_product(self) -> ExpansionProduct:
        return ExpansionProduct(self._hamiltonian, threads=self._threads) if self._shared_product is None else self._shared_product()


def _odd_terms(expansion: PauliExpansion) -> Any:
    return np.bitwise_count(expansion.x & expansion.z) % 2 == 1


def _has_odd_terms(expansion: PauliExpansion) -> bool:
    return bool(_odd_terms(expansion).any())


def _real_part(expansion: PauliExpansion) -> PauliExpansion:
    """The strings with an even number of Y."""
    keep = ~_odd_terms(expansion)
    return PauliExpansion(expansion.n_qubits, expansion.x[keep], expansion.z[keep], expansion.coefficients[keep], expansion.cut)


def _refuse_above(needed: int, budget: int, n_qubits: int) -> None:
    if needed > budget:
        raise StudyError(
            f"A register of {n_qubits} qubits does not fit",
            f"it needs {needed / 2**30:.3g} GiB of memory and {budget / 2**30:.3g} GiB are allowed",
            "Allow more memory, taper qubits away, or study a smaller system",
            "memory_gib",
        )
