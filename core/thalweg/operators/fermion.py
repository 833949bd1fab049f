"""Number-conserving fermionic Hamiltonians on M spatial orbitals with real coefficients."""

from __future__ import annotations

from dataclasses import dataclass
from math import comb
from typing import NamedTuple

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.operators.slater_condon import determinant_matrix


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


class WeightedDeterminant(NamedTuple):
    """One term of a combination: its real amplitude, and occupied (alpha, beta) orbital masks."""

    amplitude: float
    alpha: int
    beta: int


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
        reference_terms: a reference that is a normalised combination of determinants of one symmetry, `reference` the one that
            excitations are counted from; empty where `reference` is all of it.
    """

    core_energy: float
    one_body: FloatArray
    two_body: FloatArray
    orbital_irreps: IntArray
    sector: Sector
    reference: tuple[int, int]
    orbital_energies: FloatArray
    irrep_names: tuple[str, ...] = ()
    reference_terms: tuple[WeightedDeterminant, ...] = ()

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
        """<reference|H|reference>, Eh."""
        if not self.reference_terms:
            return self.determinant_energy(*self.reference)
        amplitudes = np.array([term.amplitude for term in self.reference_terms])
        return float(amplitudes @ determinant_matrix(self, [term[1:] for term in self.reference_terms]) @ amplitudes)

    def irrep_of(self, alpha: int, beta: int) -> int:
        """Irrep of the determinant with these occupied masks."""
        product = 0
        for p, label in enumerate(self.orbital_irreps.tolist()):
            product ^= label if (alpha ^ beta) >> p & 1 else 0
        return product

    def orbitals_are_degenerate(self, tolerance: float = 1e-6) -> bool:
        """True when two orbital energies coincide: Pauli term counts then depend on the orientation of the pair."""
        energies = np.sort(self.orbital_energies)
        return bool(energies.size > 1 and np.any(np.diff(energies) < tolerance))
