"""What every engine offers, whatever the state looks like inside."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Protocol

from thalweg.arrays import FloatArray
from thalweg.watch import Watch


@dataclass(frozen=True)
class LeadingState:
    """One determinant or basis state with its weight |c|^2 in the trial state and in the exact ground space."""

    label: str
    weight: float
    exact_weight: float | None


@dataclass(frozen=True)
class StateFacts:
    """What is known of a state beside its energy. None where the figure has no meaning or cannot be had.

    Attributes:
        n_electrons, s_z, s_squared: expectation values of N, S_z and S^2 (hbar = 1) of the active electrons.
        variance: <H^2> - <H>^2, energy unit squared.
        fidelity: weight of the state in the exact ground space (all degenerate states), 0 to 1.
        leading: the largest weights, descending.
        natural_occupations: eigenvalues of the spin-summed one-particle density matrix, descending; empty for spins.
    """

    n_electrons: float | None
    s_z: float | None
    s_squared: float | None
    variance: float | None
    fidelity: float | None
    leading: tuple[LeadingState, ...] = ()
    natural_occupations: tuple[float, ...] = ()


class Engine(Protocol):
    """Evaluates one program on one Hamiltonian. Energies in the Hamiltonian's unit; parameters shape (K,)."""

    n_parameters: int
    watch: Watch  # asked during an evaluation; whoever takes the engine over sets it

    def energy(self, parameters: FloatArray) -> float: ...

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]: ...

    def state(self, parameters: FloatArray) -> Any:
        """The amplitudes (a copy): (alpha, beta) real for the sector engine, (2^n,) complex for the register."""
        ...

    def facts(self, parameters: FloatArray, exact_vectors: Any | None) -> StateFacts:
        """`exact_vectors`: ground space in this engine's representation, first axis the degenerate states."""
        ...

    def memory_bytes(self) -> int:
        """Peak of what the engine allocates, bytes (an estimate made before allocation)."""
        ...
