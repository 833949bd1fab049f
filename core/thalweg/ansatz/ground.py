"""What a trial state is built from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion

if TYPE_CHECKING:  # it needs compiled kernels, which the settings of trial states must not load
    from thalweg.encoding.encoded import EncodedSystem


@dataclass(frozen=True)
class Ground:
    """Everything an ansatz may look at.

    Attributes:
        fermions: None for spin models.
        qubits: the Hamiltonian on the register that a gate program runs on (tapered where tapering is on).
        reference_bits: the reference state as a basis state of that register.
        encoded: how operators of the system are written on that register; None where no one asks.
        reference_kind, reference_pairs, reference_terms: a spin model's reference where it is no basis state, as in
            `systems.prepared.PreparedSystem`.
    """

    fermions: FermionHamiltonian | None
    qubits: PauliExpansion
    reference_bits: int
    encoded: EncodedSystem | None = None
    reference_kind: str = ""
    reference_pairs: tuple[tuple[int, int], ...] = ()
    reference_terms: tuple[tuple[float, int], ...] = ()

    @property
    def begins_combined(self) -> bool:
        """Whether the reference is a combination of determinants or of basis states."""
        return bool(self.reference_terms if self.fermions is None else self.fermions.reference_terms)
