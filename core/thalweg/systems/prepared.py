"""What every kind of system becomes once it is worked out."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion


@dataclass(frozen=True)
class OrbitalRow:
    """One rung of the orbital-energy ladder, over all orbitals of the mean field (counted from 1)."""

    number: int
    energy: float  # Eh
    occupation: float  # 0, 1 or 2
    irrep: str
    active: bool
    frozen: bool


@dataclass(frozen=True)
class PreparedSystem:
    """Read-only ground on which encoding, trial state and exact answer stand.

    Attributes:
        label: for tables, e.g. `LiH, STO-3G`.
        fermions: the Hamiltonian of a fermionic system, None for spin models.
        spins: the Hamiltonian of a spin model, None for fermionic systems.
        energy_unit: `hartree`, or the unit of the couplings for lattices.
        reference_name, reference_energy: e.g. `Hartree-Fock`.
        facts: ordered figures for `inspect` and the set-up column (JSON values).
        warnings: sentences to stand beside every number.
        ladder: orbital rungs, empty where there is no mean field.
        mean_field: the PySCF object for classical reference methods; never serialised.
        reference_bits: basis state that a spin model's circuit starts from, bit q = 1 is spin down (Z = -1) on qubit q.
        reference_kind: what is prepared from those bits: `bits`, `plus` (every qubit in |+>), `singlets` (dimer singlets); empty for fermions.
        reference_pairs: the pairs of sites that form singlets when `reference_kind` is `singlets`.
        translations: site permutations (site i moves to entry i) of the lattice, candidates for symmetries of the exact solver.
    """

    label: str
    fermions: FermionHamiltonian | None
    spins: PauliExpansion | None
    energy_unit: str
    reference_name: str
    reference_energy: float
    facts: dict[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()
    ladder: tuple[OrbitalRow, ...] = ()
    mean_field: Any = None
    reference_bits: int = 0
    reference_kind: str = ""
    reference_pairs: tuple[tuple[int, int], ...] = ()
    translations: tuple[tuple[int, ...], ...] = ()
