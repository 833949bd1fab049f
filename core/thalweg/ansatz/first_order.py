"""Start amplitudes from first-order perturbation theory."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.operators.fermion import FermionHamiltonian

#: Largest amplitude, in radians, that a perturbative start may take; and matrix elements below which it is zero, Eh.
LARGEST_START = 0.5
SMALLEST_ELEMENT = 1e-10


def first_order_amplitudes(hamiltonian: FermionHamiltonian, program: ExcitationProgram) -> FloatArray:
    """First-order amplitudes <T ref|H|ref> / (E0(ref) - E0(T ref)), averaged over the excitations of a parameter, shape (K,).

    E0 adds the diagonal Fock elements of each spin, taken from the reference's own alpha and beta densities. For a closed
    shell these are the MP2 amplitudes (Moller and Plesset 1934) and singles vanish; for an open shell it is the
    spin-orbital form with separate Fock operators, singles included. Excitations that do not lead from the reference to
    another determinant get zero. Amplitudes are cut at `LARGEST_START`, where perturbation theory has lost its meaning.
    """
    weights: dict[tuple[int, Excitation], float] = {}
    for k, e, factor in zip(program.parameter.tolist(), program.excitations, program.factor.tolist(), strict=True):
        weights[k, e] = weights.get((k, e), 0.0) + factor
    known = dict(zip(dict.fromkeys(program.excitations), amplitudes_of(hamiltonian, tuple(dict.fromkeys(program.excitations))), strict=True))
    totals, counts = np.zeros(program.n_parameters), np.zeros(program.n_parameters)
    for (k, e), weight in weights.items():
        totals[k] += np.clip(known[e] / weight, -LARGEST_START, LARGEST_START) if weight else 0.0
        counts[k] += 1
    averages: FloatArray = totals / np.maximum(counts, 1)
    return averages


def amplitudes_of(hamiltonian: FermionHamiltonian, excitations: tuple[Excitation, ...]) -> FloatArray:
    """The amplitude of each excitation by itself, shape (F,); infinite where the two determinants have one energy."""
    fock = tuple(fock_matrix(hamiltonian, spin) for spin in (0, 1))
    return np.array([_amplitude(e, hamiltonian, fock) for e in excitations])


def _amplitude(e: Excitation, hamiltonian: FermionHamiltonian, fock: tuple[FloatArray, ...]) -> float:
    """A = T - T+ turns by the amplitude of T where T acts on the reference, and by minus that of T+ where T+ does."""
    if _leads_away(e, hamiltonian.reference):
        return _first_order(e, hamiltonian.two_body, fock)
    back = Excitation(e.alpha_target, e.alpha_source, e.beta_target, e.beta_source)
    return -_first_order(back, hamiltonian.two_body, fock) if _leads_away(back, hamiltonian.reference) else 0.0


def _leads_away(e: Excitation, reference: tuple[int, int]) -> bool:
    spins = ((e.alpha_source, e.alpha_target, reference[0]), (e.beta_source, e.beta_target, reference[1]))
    return all(all(mask >> p & 1 for p in source) and not any(mask >> p & 1 for p in target) for source, target, mask in spins)


def fock_matrix(hamiltonian: FermionHamiltonian, spin: int) -> FloatArray:
    """h_pq + sum_r (pq|rr) over both spins - sum_r (pr|rq) over the same spin, shape (M, M)."""
    every = np.arange(hamiltonian.n_orbitals)
    fock = hamiltonian.one_body.copy()
    for s, mask in enumerate(hamiltonian.reference):
        occupied = every[(mask >> every) & 1 == 1]
        fock += np.einsum("pqrr->pq", hamiltonian.two_body[:, :, occupied][:, :, :, occupied])
        if s == spin:
            fock -= np.einsum("prrq->pq", hamiltonian.two_body[:, occupied][:, :, occupied])
    return fock


def _first_order(e: Excitation, two_body: FloatArray, fock: tuple[FloatArray, ...]) -> float:
    gap = 0.0
    for spin, source, target in ((0, e.alpha_source, e.alpha_target), (1, e.beta_source, e.beta_target)):
        gap += sum(fock[spin][p, p] for p in source) - sum(fock[spin][p, p] for p in target)
    if e.rank == 1:
        element = fock[0][e.alpha_target[0], e.alpha_source[0]] if e.alpha_source else fock[1][e.beta_target[0], e.beta_source[0]]
    elif len(e.alpha_source) == 1:
        element = two_body[e.alpha_target[0], e.alpha_source[0], e.beta_target[0], e.beta_source[0]]
    else:
        (i, j), (a, b) = (e.alpha_source, e.alpha_target) if e.alpha_source else (e.beta_source, e.beta_target)
        element = two_body[a, i, b, j] - two_body[a, j, b, i]
    if abs(element) < SMALLEST_ELEMENT:
        return 0.0
    return float(np.copysign(np.inf, element) if gap == 0.0 else element / gap)
