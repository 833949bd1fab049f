"""Pools of fermionic operators from which an adaptive trial state grows."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations, combinations_with_replacement
from math import sqrt

import numpy as np

from thalweg.ansatz.excitations import doubles, generalised_doubles, generalised_singles, singles
from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.operators.fermion import FermionHamiltonian


@dataclass(frozen=True)
class ExcitationSum:
    """sum_i weights[i] (T_i - T_i+), squared weights adding up to 1.

    With a parameter theta it acts as the product of exp(weights[i] theta (T_i - T_i+)), the first excitation first: a circuit
    needs no further splitting, and the derivative at theta = 0 is that of the exponential of the sum.
    """

    label: str
    excitations: tuple[Excitation, ...]
    weights: tuple[float, ...]


@dataclass(frozen=True)
class ExcitationPool:
    """Fermionic operators, and how a program grows by them."""

    operators: tuple[ExcitationSum, ...]

    def __len__(self) -> int:
        return len(self.operators)

    @property
    def labels(self) -> tuple[str, ...]:
        return tuple(operator.label for operator in self.operators)

    @cached_property
    def excitations(self) -> tuple[Excitation, ...]:
        """Every different excitation once."""
        return tuple(self._places)

    def slopes(self, of_excitations: FloatArray) -> FloatArray:
        """Derivative along each operator, shape (len(self),), from those along `excitations`."""
        place, weight, owner = self._table
        return np.bincount(owner, weights=weight * of_excitations[place], minlength=len(self)).astype(float)

    @cached_property
    def _places(self) -> dict[Excitation, int]:
        known: dict[Excitation, int] = {}
        for operator in self.operators:
            for e in operator.excitations:
                known.setdefault(e, len(known))
        return known

    @cached_property
    def _table(self) -> tuple[IntArray, FloatArray, IntArray]:
        """Excitation, weight and operator of every term."""
        place = [self._places[e] for operator in self.operators for e in operator.excitations]
        weight = [w for operator in self.operators for w in operator.weights]
        owner = np.repeat(np.arange(len(self)), [len(operator.excitations) for operator in self.operators])
        return np.array(place, np.int64), np.array(weight, float), owner

    def grown(self, program: ExcitationProgram, chosen: list[int]) -> ExcitationProgram:
        """The program with these operators appended, each with a parameter of its own."""
        added = [self.operators[i] for i in chosen]
        counts = [len(operator.excitations) for operator in added]
        numbers = np.arange(program.n_parameters, program.n_parameters + len(added))
        return replace(
            program,
            excitations=program.excitations + tuple(e for operator in added for e in operator.excitations),
            parameter=np.concatenate([program.parameter, np.repeat(numbers, counts)]),
            factor=np.concatenate([program.factor, *(np.array(operator.weights) for operator in added)]),
            n_parameters=program.n_parameters + len(added),
            parameter_labels=program.parameter_labels + tuple(operator.label for operator in added),
        )


def spin_adapted(hamiltonian: FermionHamiltonian) -> ExcitationPool:
    """Generalised singles and doubles that commute with S^2 (Grimsley, Economou, Barnes and Mayhall 2019).

    Singles: (E_qp - E_pq) / sqrt 2. Doubles: from a pair in orbitals p <= q to a pair in r <= s, coupled to singlets
    S+_rs S_pq - h.c., or to triplets sum_m T+_rs(m) T_pq(m) / sqrt 3 - h.c.
    """
    m = hamiltonian.n_orbitals
    operators = [_single(p, q) for p, q in combinations(range(m), 2)]
    for source, target in combinations(combinations_with_replacement(range(m), 2), 2):
        operators.append(_singlet(source, target))
        if source[0] != source[1] and target[0] != target[1]:
            operators.append(_triplet(source, target))
    return ExcitationPool(tuple(operators))


def generalised(hamiltonian: FermionHamiltonian) -> ExcitationPool:
    """Spin-orbital singles and doubles between any orbitals, each an operator of its own."""
    m = hamiltonian.n_orbitals
    return plain(generalised_singles(m) + generalised_doubles(m))


def singles_and_doubles(hamiltonian: FermionHamiltonian) -> ExcitationPool:
    """Spin-orbital singles and doubles from occupied to empty orbitals of the reference."""
    return plain(singles(hamiltonian) + doubles(hamiltonian))


def plain(excitations: list[Excitation]) -> ExcitationPool:
    return ExcitationPool(tuple(ExcitationSum(e.label(), (e,), (1.0,)) for e in excitations))


def symmetric_part(pool: ExcitationPool, hamiltonian: FermionHamiltonian) -> ExcitationPool:
    """The totally symmetric operators; the excitations of one operator have one irrep."""
    labels = hamiltonian.orbital_irreps.tolist()
    return ExcitationPool(tuple(o for o in pool.operators if o.excitations[0].irrep(labels) == 0))


def _single(p: int, q: int) -> ExcitationSum:
    return ExcitationSum(f"{p} -> {q}", (Excitation((p,), (q,)), Excitation((), (), (p,), (q,))), (sqrt(0.5),) * 2)


def _singlet(source: tuple[int, int], target: tuple[int, int]) -> ExcitationSum:
    (p, q), (r, s) = source, target
    norm = 0.5 / sqrt((1 + (p == q)) * (1 + (r == s)))
    weights: dict[Excitation, float] = {}
    for a, b, c, d in ((p, q, r, s), (q, p, s, r), (p, q, s, r), (q, p, r, s)):
        e = Excitation((a,), (c,), (b,), (d,))
        weights[e] = weights.get(e, 0.0) + norm
    return ExcitationSum(f"singlet pair {p} {q} -> {r} {s}", tuple(weights), tuple(weights.values()))


def _triplet(source: tuple[int, int], target: tuple[int, int]) -> ExcitationSum:
    (p, q), (r, s) = source, target
    excitations = (
        Excitation(source, target),
        Excitation((), (), source, target),
        Excitation((p,), (r,), (q,), (s,)),
        Excitation((q,), (s,), (p,), (r,)),
        Excitation((p,), (s,), (q,), (r,)),
        Excitation((q,), (r,), (p,), (s,)),
    )
    weights = np.array([2.0, 2.0, 1.0, 1.0, -1.0, -1.0]) / sqrt(12.0)
    return ExcitationSum(f"triplet pair {p} {q} -> {r} {s}", excitations, tuple(weights.tolist()))
