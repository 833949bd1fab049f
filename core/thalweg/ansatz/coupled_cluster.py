"""Unitary coupled cluster with singles and doubles in product (Trotter) form."""

from __future__ import annotations

from itertools import combinations, product
from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.ground import Ground
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import Options, option


class UCCSD(Options):
    """Settings of the UCCSD product (source of the form: Bartlett et al. 1989; Peruzzo et al. 2014)."""

    title: ClassVar[str] = "UCCSD"
    about: ClassVar[str] = "Accurate near equilibrium; fails where several determinants share the weight, as in broken bonds (Peruzzo et al. 2014)."

    key: Literal["uccsd"] = "uccsd"
    order: Literal["doubles-first", "singles-first"] = option(
        "doubles-first", "Factor order", "Which factors act on the reference first; the energy depends on it."
    )
    spin_tied: bool = option(False, "Spin-tied amplitudes", "Give mirror-image alpha and beta excitations one shared amplitude.")
    point_group: bool = option(True, "Point group", "Keep only totally symmetric excitations.")
    start: Literal["zero", "mp2"] = option("zero", "Start", "Start from zero or from MP2 amplitudes.")

    def build(self, ground: Ground) -> ExcitationProgram:
        """The product for the reference of `ground`; StudyError for a system without electrons."""
        hamiltonian = _fermions(ground)
        singles, doubles = _singles(hamiltonian), _doubles(hamiltonian)
        factors = doubles + singles if self.order == "doubles-first" else singles + doubles
        if self.point_group:
            factors = [e for e in factors if _irrep(e, hamiltonian.orbital_irreps.tolist()) == 0]
        parameter = _tied(factors) if self.spin_tied else list(range(len(factors)))
        return ExcitationProgram(
            sector=hamiltonian.sector,
            reference=hamiltonian.reference,
            excitations=tuple(factors),
            parameter=np.array(parameter, np.int64),
            factor=np.ones(len(factors)),
            n_parameters=len(set(parameter)),
            order=ORDERS[self.order],
        )

    def start_parameters(self, ground: Ground, program: ExcitationProgram, rng: np.random.Generator) -> FloatArray:
        """Zeros, or first-order amplitudes, shape (K,)."""
        if self.start == "zero":
            return np.zeros(program.n_parameters)
        return first_order_amplitudes(_fermions(ground), program)


#: Largest amplitude, in radians, that a perturbative start may take; and matrix elements below which it is zero, Eh.
LARGEST_START = 0.5
SMALLEST_ELEMENT = 1e-10

_DOUBLES = "doubles aa, bb, ab"
_SINGLES = "singles a, b"
_WITHIN = "in each group ascending by source orbitals, then target orbitals, alpha before beta"
ORDERS = {
    "doubles-first": f"{_DOUBLES} act first, then {_SINGLES}; {_WITHIN}",
    "singles-first": f"{_SINGLES} act first, then {_DOUBLES}; {_WITHIN}",
}


def first_order_amplitudes(hamiltonian: FermionHamiltonian, program: ExcitationProgram) -> FloatArray:
    """First-order amplitudes <T ref|H|ref> / (E0(ref) - E0(T ref)), averaged over the factors of a parameter, shape (K,).

    E0 adds the diagonal Fock elements of each spin, taken from the reference's own alpha and beta densities. For a closed
    shell these are the MP2 amplitudes (Moller and Plesset 1934) and singles vanish; for an open shell it is the
    spin-orbital form with separate Fock operators, singles included. Amplitudes are cut at `LARGEST_START`, where
    perturbation theory has lost its meaning.
    """
    fock = tuple(_fock(hamiltonian, spin) for spin in (0, 1))
    amplitudes = np.array([_first_order(e, hamiltonian.two_body, fock) for e in program.excitations])
    amplitudes = np.clip(amplitudes / np.where(program.factor == 0.0, 1.0, program.factor), -LARGEST_START, LARGEST_START)
    totals = np.bincount(program.parameter, weights=amplitudes, minlength=program.n_parameters)
    counts = np.bincount(program.parameter, minlength=program.n_parameters)
    averages: FloatArray = totals / np.maximum(counts, 1)
    return averages


def _fock(hamiltonian: FermionHamiltonian, spin: int) -> FloatArray:
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


def _fermions(ground: Ground) -> FermionHamiltonian:
    if ground.fermions is None:
        raise StudyError("No UCCSD for this system", "it has spins instead of electrons", "Choose another trial state", "ansatz.key")
    return ground.fermions


def _orbitals(hamiltonian: FermionHamiltonian, spin: int) -> tuple[list[int], list[int]]:
    """Occupied and virtual orbitals of one spin in the reference."""
    mask = hamiltonian.reference[spin]
    every = range(hamiltonian.n_orbitals)
    return [p for p in every if mask >> p & 1], [p for p in every if not mask >> p & 1]


def _singles(hamiltonian: FermionHamiltonian) -> list[Excitation]:
    (oa, va), (ob, vb) = _orbitals(hamiltonian, 0), _orbitals(hamiltonian, 1)
    return [Excitation((i,), (a,)) for i, a in product(oa, va)] + [Excitation((), (), (i,), (a,)) for i, a in product(ob, vb)]


def _doubles(hamiltonian: FermionHamiltonian) -> list[Excitation]:
    (oa, va), (ob, vb) = _orbitals(hamiltonian, 0), _orbitals(hamiltonian, 1)
    same_a = [Excitation(ij, ab) for ij, ab in product(combinations(oa, 2), combinations(va, 2))]
    same_b = [Excitation((), (), ij, ab) for ij, ab in product(combinations(ob, 2), combinations(vb, 2))]
    mixed = [Excitation((i,), (a,), (j,), (b,)) for i, j, a, b in product(oa, ob, va, vb)]
    return same_a + same_b + mixed


def _irrep(excitation: Excitation, labels: list[int]) -> int:
    result = 0
    for p in (*excitation.alpha_source, *excitation.alpha_target, *excitation.beta_source, *excitation.beta_target):
        result ^= labels[p]
    return result


def _tied(factors: list[Excitation]) -> list[int]:
    """One parameter for an excitation and its mirror image under exchange of the spins."""
    known: dict[Excitation, int] = {}
    count = 0
    for e in factors:
        mirror = Excitation(e.beta_source, e.beta_target, e.alpha_source, e.alpha_target)
        known[e] = known.get(mirror, count)
        count = max(count, known[e] + 1)
    return [known[e] for e in factors]
