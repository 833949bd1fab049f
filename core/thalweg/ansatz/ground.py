"""What a trial state is built from."""

from __future__ import annotations

from dataclasses import dataclass

from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion


@dataclass(frozen=True)
class Ground:
    """Everything an ansatz may look at.

    Attributes:
        fermions: None for spin models.
        qubits: the Hamiltonian on the register that a gate program runs on (tapered where tapering is on).
        reference_bits: the reference state as a basis state of that register.
    """

    fermions: FermionHamiltonian | None
    qubits: PauliExpansion
    reference_bits: int
