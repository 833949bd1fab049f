"""Multiplets of total spin, built up from their members of lowest |S_z| with the raising operator."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from thalweg.exact.spin_basis import STEP, SpinBasis, basis_of
from thalweg.kernels import spin as kernels
from thalweg.watch import Watch


@dataclass(frozen=True)
class Multiplets:
    """The ground space of a Hamiltonian that conserves total spin.

    Attributes:
        rungs: (sector, orthonormal vectors on it, whether the sector of reversed S_z counts too), S_z ascending.
        spins: S of each multiplet, ascending.
    """

    rungs: list[tuple[SpinBasis, list[Any], bool]]
    spins: tuple[float, ...]

    def states(self) -> list[tuple[SpinBasis, Any, bool]]:
        return [(basis, vector, mirrored) for basis, vectors, mirrored in self.rungs for vector in vectors]

    @property
    def s_squared(self) -> float | None:
        """S (S + 1) where all multiplets have one spin; otherwise the mixture is arbitrary and there is none."""
        return self.spins[0] * (self.spins[0] + 1.0) if len(set(self.spins)) == 1 else None

    def words(self) -> str:
        listed = ", ".join(f"{s:g}" for s in self.spins[:8]) + (", ..." if len(self.spins) > 8 else "")
        return f"Total spin S = {listed}" if len(self.spins) == 1 else f"{len(self.spins)} multiplets of total spin S = {listed}"


def multiplets(states: list[tuple[SpinBasis, Any, bool]], *, with_ladder: bool, watch: Watch) -> Multiplets:
    """Sorts the states of one sector by total spin; `with_ladder` adds the members of higher S_z and counts the reversed ones.

    S- S+ = S(S + 1) - m(m + 1) on a state of S_z = m, so the overlaps of the raised states give S, and what the raising leaves
    is the sector of m + 1.
    """
    basis, vectors = states[0][0], [vector for _, vector, _ in states]
    rungs: list[tuple[SpinBasis, list[Any], bool]] = []
    spins: list[float] = []
    while vectors:
        raised = _raised(basis, vectors, watch)
        squares, turn = _overlaps(raised, len(vectors))
        s_z = basis.s_z
        assert s_z is not None
        if not rungs:
            spins = sorted(_spin_of(s_z * (s_z + 1.0) + square) for square in squares)
        rungs.append((basis, vectors, with_ladder and s_z > 0))
        if not with_ladder or raised is None:
            break
        kept = [(square, turn[:, i]) for i, square in enumerate(squares) if square > 0.5]  # the smallest non-zero one is 1
        basis = raised[0]
        vectors = [sum(c * v for c, v in zip(column, raised[1], strict=True)) / np.sqrt(square) for square, column in kept]
    return Multiplets(rungs, tuple(spins))


def _raised(basis: SpinBasis, vectors: list[Any], watch: Watch) -> tuple[SpinBasis, list[Any]] | None:
    """S+ v for each vector and the sector that they lie in; None at the top."""
    assert basis.down is not None
    if basis.down == 0:
        return None
    above = basis_of(basis.n_sites, basis.down - 1)
    found = []
    for vector in vectors:
        out = np.empty(above.dimension, dtype=vector.dtype)
        for first in range(0, above.dimension, STEP):
            watch.check()
            last = min(above.dimension, first + STEP)
            kernels.raise_spin(vector, out, first, last, basis.n_sites, above.states, basis.bits, basis.offset, basis.rank)
        found.append(out)
    return above, found


def _overlaps(raised: tuple[SpinBasis, list[Any]] | None, count: int) -> tuple[Any, Any]:
    if raised is None:
        return np.zeros(count), np.eye(count)
    matrix = np.array([[np.vdot(a, b) for b in raised[1]] for a in raised[1]])
    return np.linalg.eigh(matrix)


def _spin_of(square: float) -> float:
    """The half-integer S with S(S + 1) nearest to the value."""
    return round(np.sqrt(max(0.0, 4.0 * square + 1.0)) - 1.0) / 2.0
