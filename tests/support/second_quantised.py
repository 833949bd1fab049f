"""Fock-space matrices written down from the anticommutation rules: the plain ground under the sector engine.

Modes 0..M-1 are the alpha orbitals, M..2M-1 the beta ones, so that the alpha string stands left of the beta string.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.sparse import csr_matrix, identity, kron

from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.operators import FermionHamiltonian, Sector


@lru_cache(maxsize=8)
def annihilators(n_modes: int) -> tuple[csr_matrix, ...]:
    """a_k as Z x ... x Z x sigma x 1 x ...; mode 0 is the leftmost factor. Basis: occupation 0, 1 of each mode."""
    lower, sign, one = csr_matrix([[0.0, 1.0], [0.0, 0.0]]), csr_matrix([[1.0, 0.0], [0.0, -1.0]]), identity(2, format="csr")
    found = []
    for k in range(n_modes):
        matrix = identity(1, format="csr")
        for j in range(n_modes):
            matrix = kron(matrix, sign if j < k else lower if j == k else one, format="csr")
        found.append(matrix)
    return tuple(found)


def sector_positions(sector: Sector) -> np.ndarray:
    """Index in Fock space of each determinant, shape (Na, Nb), strings ascending."""
    m = sector.n_orbitals
    strings = [[s for s in range(1 << m) if s.bit_count() == n] for n in (sector.n_alpha, sector.n_beta)]

    def place(mask: int, first: int) -> int:
        return sum(1 << (2 * m - 1 - first - p) for p in range(m) if mask >> p & 1)

    return np.array([[place(a, 0) + place(b, m) for b in strings[1]] for a in strings[0]])


def hamiltonian_matrix(h: FermionHamiltonian) -> np.ndarray:
    """H in the sector, determinants in row-major order of (alpha, beta), from sums of E_pq = sum_s a+_ps a_qs."""
    m = h.n_orbitals
    a = annihilators(2 * m)
    e = [[a[p].T @ a[q] + a[m + p].T @ a[m + q] for q in range(m)] for p in range(m)]
    total = h.core_energy * identity(1 << 2 * m, format="csr")
    for p in range(m):
        for q in range(m):
            right = csr_matrix(total.shape)
            for r in range(m):
                for s in range(m):
                    right = right + 0.5 * h.two_body[p, q, r, s] * e[r][s]
            shift = h.one_body[p, q] - 0.5 * sum(h.two_body[p, r, r, q] for r in range(m))
            total = total + e[p][q] @ (right + shift * identity(total.shape[0], format="csr"))
    index = sector_positions(h.sector).ravel()
    return total.tocsr()[index][:, index].toarray()


def excitation_matrix(e: Excitation, sector: Sector) -> np.ndarray:
    """T in the sector: creations of the targets in order, annihilations of the sources in reverse order, alpha left."""
    m = sector.n_orbitals
    a = annihilators(2 * m)
    matrix = identity(1 << 2 * m, format="csr")
    for first, source, target in ((0, e.alpha_source, e.alpha_target), (m, e.beta_source, e.beta_target)):
        for p in target:
            matrix = matrix @ a[first + p].T
        for p in reversed(source):
            matrix = matrix @ a[first + p]
    index = sector_positions(sector).ravel()
    return matrix.tocsr()[index][:, index].toarray()


def program_state(program: ExcitationProgram, parameters: np.ndarray) -> np.ndarray:
    """|psi(theta)> by dense matrix exponentials, shape (Na, Nb)."""
    from scipy.linalg import expm

    sector = program.sector
    masks = [[s for s in range(1 << sector.n_orbitals) if s.bit_count() == n] for n in (sector.n_alpha, sector.n_beta)]
    psi = np.zeros(sector.shape)
    for amplitude, alpha, beta in program.begins:
        psi[masks[0].index(alpha), masks[1].index(beta)] = amplitude
    psi = psi.ravel()
    for e, k, factor in zip(program.excitations, program.parameter, program.factor, strict=True):
        t = excitation_matrix(e, sector)
        psi = expm(factor * parameters[k] * (t - t.T)) @ psi
    return psi.reshape(sector.shape)
