"""Number-conserving fermionic Hamiltonians on M spatial orbitals with real coefficients."""

from __future__ import annotations

from dataclasses import dataclass
from math import comb

import numpy as np

from thalweg.arrays import FloatArray, IntArray


@dataclass(frozen=True)
class Sector:
    """Fixed numbers of electrons of each spin on `n_orbitals` spatial orbitals."""

    n_orbitals: int
    n_alpha: int
    n_beta: int

    @property
    def shape(self) -> tuple[int, int]:
        """(alpha strings, beta strings); strings are ascending bit masks, bit p = orbital p."""
        return comb(self.n_orbitals, self.n_alpha), comb(self.n_orbitals, self.n_beta)

    @property
    def dimension(self) -> int:
        return self.shape[0] * self.shape[1]

    @property
    def n_electrons(self) -> int:
        return self.n_alpha + self.n_beta

    @property
    def s_z(self) -> float:
        return 0.5 * (self.n_alpha - self.n_beta)

    def __str__(self) -> str:
        return f"{self.n_alpha} alpha + {self.n_beta} beta electrons in {self.n_orbitals} orbitals"


@dataclass(frozen=True)
class FermionHamiltonian:
    """H = core + sum_pq,s h[p,q] a+_ps a_qs + 1/2 sum_pqrs,st (pq|rs) a+_ps a+_rt a_st a_qs.

    Attributes:
        core_energy: nuclear repulsion plus the energy of frozen orbitals, Eh.
        one_body: h[p,q], shape (M, M), Eh, symmetric (includes the field of frozen orbitals).
        two_body: (pq|rs) in chemist's order without the 1/2, shape (M, M, M, M), Eh, 8-fold symmetric.
        orbital_irreps: Abelian irrep label of each orbital, shape (M,); the product of irreps is the bitwise xor,
            0 is totally symmetric. All zero when no point group is used.
        sector: the electrons of the state asked for.
        reference: occupied (alpha, beta) orbital masks of the reference determinant.
        orbital_energies: shape (M,), Eh; used by MP2 starts. May be empty.
    """

    core_energy: float
    one_body: FloatArray
    two_body: FloatArray
    orbital_irreps: IntArray
    sector: Sector
    reference: tuple[int, int]
    orbital_energies: FloatArray
    irrep_names: tuple[str, ...] = ()

    @property
    def n_orbitals(self) -> int:
        return self.sector.n_orbitals

    def determinant_energy(self, alpha: int, beta: int) -> float:
        """<D|H|D> of the determinant with these occupied masks, Eh (Slater-Condon rules)."""
        bits = np.arange(self.n_orbitals)
        occupied = [bits[(mask >> bits) & 1 == 1] for mask in (alpha, beta)]
        energy = self.core_energy
        for i, own in enumerate(occupied):
            energy += float(self.one_body[own, own].sum())
            for j, other in enumerate(occupied):
                grid = np.ix_(own, other)
                energy += 0.5 * float(np.einsum("iijj->ij", self.two_body)[grid].sum())
                if i == j:
                    energy -= 0.5 * float(np.einsum("ijji->ij", self.two_body)[grid].sum())
        return energy

    @property
    def reference_energy(self) -> float:
        return self.determinant_energy(*self.reference)

    def orbitals_are_degenerate(self, tolerance: float = 1e-6) -> bool:
        """True when two orbital energies coincide: Pauli term counts then depend on the orientation of the pair."""
        energies = np.sort(self.orbital_energies)
        return bool(energies.size > 1 and np.any(np.diff(energies) < tolerance))
