"""Matrix elements of a fermionic Hamiltonian between a few determinants (Slater 1929; Condon 1930)."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from thalweg.arrays import FloatArray

if TYPE_CHECKING:
    from thalweg.operators.fermion import FermionHamiltonian

#: Occupied (alpha, beta) orbital masks.
Masks = tuple[int, int]


def determinant_matrix(hamiltonian: FermionHamiltonian, determinants: Sequence[Masks]) -> FloatArray:
    """<D_i|H|D_j>, shape (L, L), Eh, with the signs of the order in which sector states are written (alpha left of beta)."""
    matrix = np.diag([hamiltonian.determinant_energy(*masks) for masks in determinants])
    for i, bra in enumerate(determinants):
        for j, ket in enumerate(determinants[:i]):
            matrix[i, j] = matrix[j, i] = coupling(hamiltonian, bra, ket)
    return matrix


def coupling(hamiltonian: FermionHamiltonian, bra: Masks, ket: Masks) -> float:
    """<bra|H|ket> of two different determinants of one sector, Eh; zero where more than two electrons differ."""
    moved = [(_orbitals(k & ~b), _orbitals(b & ~k)) for b, k in zip(bra, ket, strict=True)]
    if sum(len(source) for source, _ in moved) > 2:
        return 0.0
    sign = 1
    for mask, (source, target) in zip(ket, moved, strict=True):
        for p, q in zip(source, target, strict=True):
            sign *= _sign(mask, p, q)
            mask ^= 1 << p | 1 << q
    moves = [(s, p, q) for s, (source, target) in enumerate(moved) for p, q in zip(source, target, strict=True)]
    if len(moves) == 2:
        return sign * _double(hamiltonian.two_body, *moves)
    return sign * _single(hamiltonian, ket, *moves[0])


def _single(hamiltonian: FermionHamiltonian, ket: Masks, spin: int, p: int, q: int) -> float:
    value, eri = float(hamiltonian.one_body[q, p]), hamiltonian.two_body
    for s, mask in enumerate(ket):
        for r in _orbitals(mask):
            value += float(eri[q, p, r, r])
            if s == spin:
                value -= float(eri[q, r, r, p])  # for r = p it takes back the electron's field on itself
    return value


def _double(eri: FloatArray, first: tuple[int, int, int], second: tuple[int, int, int]) -> float:
    (s, p1, q1), (t, p2, q2) = first, second
    value = float(eri[q1, p1, q2, p2])
    return value - float(eri[q1, p2, q2, p1]) if s == t else value


def _sign(mask: int, p: int, q: int) -> int:
    """Sign of a+_q a_p on a string: one for each occupied orbital between them."""
    low, high = min(p, q), max(p, q)
    between = mask & ((1 << high) - 1) & ~((1 << (low + 1)) - 1)
    return -1 if between.bit_count() & 1 else 1


def _orbitals(mask: int) -> list[int]:
    return [p for p in range(mask.bit_length()) if mask >> p & 1]
