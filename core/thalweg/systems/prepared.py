"""What every kind of system becomes once it is worked out."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion

#: Memory that a system may take unless told otherwise, bytes.
DEFAULT_BUDGET: Final = 4 * 2**30


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
class MeanFieldSeed:
    """What a neighbouring geometry takes over: plain arrays, so that it travels between processes.

    Attributes:
        density: density matrix in the basis, (functions,) * 2, or (2,) + that for open shells.
        orbitals: S^(1/2) C, shape (functions, orbitals): coefficients in symmetrically orthogonalised functions.
        occupation: 2, 1 or 0 for each orbital.
        core, active: orbitals counted from 0.
        energy: of the mean field, Eh.
        stability, warnings, breaks_group: what was found of it.
        here: it is this very geometry's own, followed beforehand, so that nothing of this is to be found out again.
        follow: pick the neighbour's active orbitals by overlap instead of those that the description of the space picks.
    """

    density: Any
    orbitals: Any
    occupation: Any
    core: tuple[int, ...]
    active: tuple[int, ...]
    energy: float
    stability: str = ""
    warnings: tuple[str, ...] = ()
    breaks_group: bool = False
    here: bool = False
    follow: bool = True


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
        seed: what a neighbouring geometry may take over; None where there is no mean field.
        reference_bits: basis state that a spin model's circuit starts from, bit q = 1 is spin down (Z = -1) on qubit q.
        reference_kind: what is prepared from those bits: `bits`, `plus` (every qubit in |+>), `singlets` (dimer singlets), `combination`;
            empty for fermions.
        reference_pairs: the pairs of sites that form singlets when `reference_kind` is `singlets`.
        reference_terms: (amplitude, bits) of each basis state when `reference_kind` is `combination`, normalised.
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
    seed: MeanFieldSeed | None = None
    reference_bits: int = 0
    reference_kind: str = ""
    reference_pairs: tuple[tuple[int, int], ...] = ()
    reference_terms: tuple[tuple[float, int], ...] = ()
    translations: tuple[tuple[int, ...], ...] = ()


def masks(occupation: FloatArray) -> tuple[int, int]:
    """Occupied (alpha, beta) orbital masks of occupations 2, 1 and 0; singly occupied orbitals hold alpha electrons."""
    alpha = sum(1 << p for p, n in enumerate(occupation.tolist()) if n >= 1)
    beta = sum(1 << p for p, n in enumerate(occupation.tolist()) if n == 2)
    return alpha, beta


def read_only(array: Any) -> Any:
    """A contiguous copy-free view that refuses writes."""
    array = np.ascontiguousarray(array)
    array.flags.writeable = False
    return array
