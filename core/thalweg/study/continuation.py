"""Slow continuation: H(s) = H_easy + s (H - H_easy) for s from near 0 to 1, each search begun at the best of the last.

H_easy has the reference as an eigenstate: the mean-field operator of the reference for electrons, the terms that act
within the reference for spins (adiabatic state preparation as a start: Garcia-Saez and Latorre 2018).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from thalweg.ansatz.first_order import fock_matrix
from thalweg.arrays import FloatArray
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion
from thalweg.study.course import Course
from thalweg.study.outcome import SearchEnd
from thalweg.study.problem import Problem, with_system
from thalweg.systems.prepared import PreparedSystem

#: The gradient rule on the way, Eh: the searches before the last need not be sharp.
LOOSE_GRADIENT = 1e-4


def follow(course: Course, steps: int) -> SearchEnd:
    """The search of the full Hamiltonian from where the easier ones led. What those cost is counted, their iterates are not shown."""
    parameters = course.parameters_of(course.problem.spec.ansatz, course.problem.program)
    first = parameters
    for i in range(1, steps):
        share = i / steps
        course.watch.stage(f"Hamiltonian {share:.0%} of the way from the mean field", share)
        parameters = course.aside(partway(course.problem, share), parameters, LOOSE_GRADIENT)
    descent = course.minimise(course.problem.program, parameters)
    return replace(descent.end(descent.reason), start_parameters=first)


def partway(problem: Problem, share: float) -> Problem:
    """The study with H(share), the same trial state, and the same energy of the reference."""
    return with_system(problem, system_partway(problem.prepared, share))


def system_partway(prepared: PreparedSystem, share: float) -> PreparedSystem:
    """The system with H_easy + share (H - H_easy)."""
    if prepared.fermions is not None:
        return replace(prepared, fermions=_fermions_partway(prepared.fermions, share))
    assert prepared.spins is not None
    return replace(prepared, spins=_spins_partway(prepared.spins, prepared, share))


def _fermions_partway(hamiltonian: FermionHamiltonian, share: float) -> FermionHamiltonian:
    """H_easy = sum F_pq E_pq + constant, F the mean of the alpha and beta Fock matrices among orbitals of equal occupation.

    The constant keeps the energy of the reference, which is an eigenstate of H_easy.
    """
    fock: FloatArray = 0.5 * (fock_matrix(hamiltonian, 0) + fock_matrix(hamiltonian, 1))
    every = np.arange(hamiltonian.n_orbitals)
    for mask in hamiltonian.reference:
        occupied = (mask >> every) & 1
        fock = np.where(occupied[:, None] == occupied[None, :], fock, 0.0)
    filled = sum(float(np.diag(fock)[(mask >> every) & 1 == 1].sum()) for mask in hamiltonian.reference)
    constant = hamiltonian.reference_energy - filled
    return replace(
        hamiltonian,
        core_energy=(1.0 - share) * constant + share * hamiltonian.core_energy,
        one_body=(1.0 - share) * fock + share * hamiltonian.one_body,
        two_body=share * hamiltonian.two_body,
    )


def _spins_partway(expansion: PauliExpansion, prepared: PreparedSystem, share: float) -> PauliExpansion:
    weight = np.where(_easy_terms(expansion, prepared), 1.0, share)
    return replace(expansion, coefficients=expansion.coefficients * weight)


def _easy_terms(expansion: PauliExpansion, prepared: PreparedSystem) -> np.ndarray:
    """Strings of which the reference is an eigenstate: of Z alone for a basis state, of X alone for all plus, within a pair for singlets."""
    x, z = expansion.x, expansion.z
    if prepared.reference_kind == "plus":
        return z == 0
    if prepared.reference_kind != "singlets":
        return x == 0
    within = (x | z) == 0
    for a, b in prepared.reference_pairs:
        pair = np.uint64(1 << a | 1 << b)
        within |= ((x | z) & ~pair) == 0
    return within
