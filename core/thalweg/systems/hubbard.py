"""The Fermi-Hubbard model on any lattice (Hubbard 1963)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.operators.pauli import MAX_QUBITS
from thalweg.options import Options, option
from thalweg.systems.lattice_graph import LatticeGraph, two_colouring
from thalweg.systems.spin_model import number

#: Orbital energies closer than this count as one level.
LEVEL_TOLERANCE = 1e-9


class Hubbard(Options):
    title: ClassVar[str] = "Fermi-Hubbard"
    about: ClassVar[str] = "Electrons that hop between sites and repel on a site; runs in a fixed sector of electrons and S_z."
    unit_name: ClassVar[str] = "t"

    key: Literal["hubbard"] = "hubbard"
    t: float = option(1.0, "Hopping t", "The term -t sum (a+_i a_j + a+_j a_i) on each bond; bond weights multiply it.", unit="t")
    u: float = option(4.0, "Repulsion U", "The term U sum n_up n_down.", unit="t")
    mu: float = option(0.0, "Chemical potential mu", "The term -mu sum n: a constant in a fixed sector.", unit="t")
    electrons: int = option(-1, "Electrons", "Number of electrons; -1 takes half filling, one for each site.", ge=-1, le=MAX_QUBITS)
    s_z: float = option(0.0, "S_z", "Half the difference of up and down electrons; a multiple of 1/2.", ge=-MAX_QUBITS / 4, le=MAX_QUBITS / 4)
    orbitals: Literal["hopping", "site"] = option(
        "hopping",
        "Orbitals",
        "`hopping` takes eigenstates of the hopping, so that the free-fermion state is a determinant; `site` the sites themselves.",
    )

    def hamiltonian(self, graph: LatticeGraph) -> FermionHamiltonian:
        """H in the orbitals chosen. Raises StudyError when lattice, filling and S_z do not fit."""
        sector = self.sector(graph)
        hopping = hopping_matrix(graph, self.t)
        energies, orbitals = self._levels(graph)
        filled = (2**sector.n_alpha - 1, 2**sector.n_beta - 1)
        reference = site_determinant(graph, sector) if self.orbitals == "site" else filled
        one_body = orbitals.T @ hopping @ orbitals - self.mu * np.eye(graph.n_sites)
        one_body = 0.5 * (one_body + one_body.T)
        one_body[np.abs(one_body) < 1e-14 * max(1.0, abs(self.t))] = 0.0
        return FermionHamiltonian(
            core_energy=0.0,
            one_body=one_body,
            two_body=self.u * _fourfold(orbitals),
            orbital_irreps=np.zeros(graph.n_sites, dtype=np.int64),
            sector=sector,
            reference=reference,
            orbital_energies=energies - self.mu if energies.size else energies,
        )

    def orbital_coefficients(self, graph: LatticeGraph) -> FloatArray:
        """The orbitals of the Hamiltonian in columns over sites, shape (n, n)."""
        return self._levels(graph)[1]

    def _levels(self, graph: LatticeGraph) -> tuple[FloatArray, FloatArray]:
        """Hopping energies (none for sites) and the orbitals."""
        if self.orbitals == "site":
            return np.empty(0), np.eye(graph.n_sites)
        return hopping_orbitals(hopping_matrix(graph, self.t))

    def sector(self, graph: LatticeGraph) -> Sector:
        n = graph.n_sites
        if not 1 <= n <= MAX_QUBITS // 2:
            raise StudyError(
                "The lattice does not fit", f"{n} sites need {2 * n} qubits, and {MAX_QUBITS} are the most", "Use 1 to 31 sites", "lattice"
            )
        electrons, twice = (n if self.electrons < 0 else self.electrons), round(2 * self.s_z)
        if abs(2 * self.s_z - twice) > 1e-9 or (electrons + twice) % 2:
            raise StudyError(
                f"S_z = {self.s_z:g} does not fit",
                f"{electrons} electrons have S_z of {'whole numbers' if electrons % 2 == 0 else 'odd halves'}",
                f"Set S_z to {0 if electrons % 2 == 0 else 0.5}, or change the number of electrons",
                "model.s_z",
            )
        up, down = (electrons + twice) // 2, (electrons - twice) // 2
        if not (0 <= up <= n and 0 <= down <= n):
            raise StudyError(
                "The electrons do not fit",
                f"{up} up and {down} down electrons on {n} sites",
                "Use fewer electrons or a smaller S_z",
                "model.electrons",
            )
        return Sector(n, up, down)

    def convention(self) -> str:
        values = f"t = {number(self.t)}, U = {number(self.u)}, mu = {number(self.mu)}"
        return f"H = -t sum_<ij>,s (a+_is a_js + a+_js a_is) + U sum_i n_i,up n_i,down - mu sum_i n_i; {values}; bond weights multiply t"

    def main_coupling(self) -> float:
        return self.t

    def reference_name(self) -> str:
        return "free-fermion state" if self.orbitals == "hopping" else "site determinant"

    def warnings(self, graph: LatticeGraph, hamiltonian: FermionHamiltonian) -> tuple[str, ...]:
        """That the free-fermion reference is one of several, where the highest filled level is not full."""
        energies = hamiltonian.orbital_energies
        found = []
        for spin, filled in (("up", hamiltonian.sector.n_alpha), ("down", hamiltonian.sector.n_beta)):
            if energies.size and 0 < filled < energies.size and energies[filled] - energies[filled - 1] < LEVEL_TOLERANCE:
                found.append(spin)
        if not found:
            return ()
        return (
            f"The free-fermion level of the {' and '.join(found)} electrons is partly filled: the reference is one of several equal determinants",
        )


def hopping_matrix(graph: LatticeGraph, t: float) -> FloatArray:
    """-t times the weights of the first-kind bonds, shape (n, n), symmetric."""
    hopping = np.zeros((graph.n_sites, graph.n_sites))
    for bond in graph.first_bonds:
        hopping[bond.first, bond.second] -= t * bond.weight
        hopping[bond.second, bond.first] -= t * bond.weight
    return hopping


def hopping_orbitals(hopping: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Eigenvalues ascending and eigenvectors in columns, made unique.

    A level of several orbitals is turned to the eigenvectors of a number that grows with the site (to the power 1.5, so that
    no two sums agree by chance) within it, and each orbital's largest
    component (the first of equals) is positive, so that the same lattice always gives the same integrals.
    """
    energies, vectors = np.linalg.eigh(hopping)
    growing = np.arange(1.0, len(energies) + 1.0) ** 1.5
    first = 0
    for last in range(1, len(energies) + 1):
        if last == len(energies) or energies[last] - energies[last - 1] > LEVEL_TOLERANCE:
            level = vectors[:, first:last]
            if last - first > 1:
                _, turn = np.linalg.eigh(level.T @ (growing[:, None] * level))
                vectors[:, first:last] = level @ turn
            first = last
    size = np.abs(vectors)
    largest = np.argmax(size > size.max(axis=0) - 1e-8, axis=0)
    return energies, vectors * np.sign(vectors[largest, np.arange(len(energies))])


def site_determinant(graph: LatticeGraph, sector: Sector) -> tuple[int, int]:
    """Up electrons fill one sublattice first, down electrons the other (by site number where the lattice is frustrated)."""
    colour = two_colouring(graph)
    shade = np.arange(graph.n_sites) % 2 if colour is None else colour
    up = sorted(range(graph.n_sites), key=lambda q: (int(shade[q]), q))
    down = sorted(range(graph.n_sites), key=lambda q: (-int(shade[q]), q))
    return sum(1 << q for q in up[: sector.n_alpha]), sum(1 << q for q in down[: sector.n_beta])


def _fourfold(orbitals: FloatArray) -> FloatArray:
    """sum_i C_ip C_iq C_ir C_is, shape (M, M, M, M): the on-site repulsion in these orbitals, without U."""
    size = len(orbitals)
    pairs = np.einsum("ip,iq->ipq", orbitals, orbitals).reshape(size, -1)
    square = pairs.T @ pairs
    square[np.abs(square) < 1e-14] = 0.0  # rounding would turn into Pauli terms
    return (0.5 * (square + square.T)).reshape(size, size, size, size)
