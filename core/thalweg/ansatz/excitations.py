"""Lists of spin-conserving excitations that trial states and pools are made of."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations, product

from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian


def occupied_and_empty(hamiltonian: FermionHamiltonian, spin: int) -> tuple[list[int], list[int]]:
    """Occupied and empty orbitals of one spin (0 alpha, 1 beta) in the reference."""
    mask = hamiltonian.reference[spin]
    every = range(hamiltonian.n_orbitals)
    return [p for p in every if mask >> p & 1], [p for p in every if not mask >> p & 1]


def singles(hamiltonian: FermionHamiltonian) -> list[Excitation]:
    """Occupied to empty, alpha then beta."""
    (oa, va), (ob, vb) = occupied_and_empty(hamiltonian, 0), occupied_and_empty(hamiltonian, 1)
    return [Excitation((i,), (a,)) for i, a in product(oa, va)] + [Excitation((), (), (i,), (a,)) for i, a in product(ob, vb)]


def doubles(hamiltonian: FermionHamiltonian) -> list[Excitation]:
    """Two occupied to two empty: both alpha, both beta, one of each."""
    (oa, va), (ob, vb) = occupied_and_empty(hamiltonian, 0), occupied_and_empty(hamiltonian, 1)
    both_alpha = [Excitation(ij, ab) for ij, ab in product(combinations(oa, 2), combinations(va, 2))]
    both_beta = [Excitation((), (), ij, ab) for ij, ab in product(combinations(ob, 2), combinations(vb, 2))]
    one_of_each = [Excitation((i,), (a,), (j,), (b,)) for i, j, a, b in product(oa, ob, va, vb)]
    return both_alpha + both_beta + one_of_each


def pair_doubles(hamiltonian: FermionHamiltonian) -> list[Excitation]:
    """An electron pair from a doubly occupied to an empty orbital."""
    (oa, va), (ob, vb) = occupied_and_empty(hamiltonian, 0), occupied_and_empty(hamiltonian, 1)
    return [pair_double(i, a) for i in oa if i in ob for a in va if a in vb]


def pair_double(source: int, target: int) -> Excitation:
    return Excitation((source,), (target,), (source,), (target,))


def generalised_pair_doubles(n_orbitals: int) -> list[Excitation]:
    """An electron pair from any orbital to any higher one."""
    return [pair_double(p, q) for p, q in combinations(range(n_orbitals), 2)]


def generalised_singles(n_orbitals: int) -> list[Excitation]:
    """Any orbital to any higher one, alpha then beta."""
    pairs = list(combinations(range(n_orbitals), 2))
    return [Excitation((p,), (q,)) for p, q in pairs] + [Excitation((), (), (p,), (q,)) for p, q in pairs]


def generalised_doubles(n_orbitals: int) -> list[Excitation]:
    """Any two spin orbitals to any other two with as many alpha, each unordered pair of pairs once: both alpha, both beta, one of each.

    Source and target may share a spin orbital, which then conditions a single excitation of the other electron.
    """
    same = list(combinations(combinations(range(n_orbitals), 2), 2))
    both_alpha = [Excitation(source, target) for source, target in same]
    both_beta = [Excitation((), (), source, target) for source, target in same]
    mixed = combinations(product(range(n_orbitals), repeat=2), 2)
    return both_alpha + both_beta + [Excitation((i,), (a,), (j,), (b,)) for (i, j), (a, b) in mixed]


def mirror(excitation: Excitation) -> Excitation:
    """The excitation with the spins exchanged."""
    return Excitation(excitation.beta_source, excitation.beta_target, excitation.alpha_source, excitation.alpha_target)


def totally_symmetric(excitations: Iterable[Excitation], hamiltonian: FermionHamiltonian) -> list[Excitation]:
    """Those that keep the irrep of the state."""
    labels = hamiltonian.orbital_irreps.tolist()
    return [e for e in excitations if e.irrep(labels) == 0]
