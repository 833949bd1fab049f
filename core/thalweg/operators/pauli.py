"""A Hermitian operator as a real-weighted sum of Pauli strings on up to 62 qubits."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray, MaskArray

MAX_QUBITS = 62


@dataclass(frozen=True)
class PauliExpansion:
    """sum_l c_l P_l. Qubit q is bit q of the masks (least significant bit is qubit 0).

    A string has X on bits of x only, Z on bits of z only, Y on bits of both: P = i^|x&z| X^x Z^z, which is Hermitian.

    Attributes:
        n_qubits: register size.
        x, z: masks, shape (L,), uint64, no pair repeated, sorted by (x, z).
        coefficients: shape (L,), float64. The identity (x = z = 0) is a term like any other.
        cut: terms with |c| at or below this were dropped.
    """

    n_qubits: int
    x: MaskArray
    z: MaskArray
    coefficients: FloatArray
    cut: float = 0.0

    def __len__(self) -> int:
        return int(self.coefficients.size)

    @property
    def identity(self) -> float:
        """Coefficient of the identity."""
        return float(self.coefficients[(self.x == 0) & (self.z == 0)].sum())

    @property
    def one_norm(self) -> float:
        """sum |c_l| without the identity."""
        return float(np.abs(self.coefficients[(self.x != 0) | (self.z != 0)]).sum())

    @property
    def largest_weight(self) -> int:
        """The largest number of qubits that one string acts on."""
        return int(np.bitwise_count(self.x | self.z).max(initial=0))

    def labels(self) -> Iterator[str]:
        """Strings such as `X0 Z1 Y3`, the identity as `I`."""
        for x, z in zip(self.x.tolist(), self.z.tolist(), strict=True):
            yield pauli_label(x, z)


@lru_cache(maxsize=1 << 14)  # the points of a scan list the same strings
def pauli_label(x: int, z: int) -> str:
    """`X0 Z1 Y3` for the string with these masks; `I` for the identity."""
    support = x | z
    parts = []
    for q in range(support.bit_length()):
        if support >> q & 1:
            parts.append("IXZY"[(x >> q & 1) + 2 * (z >> q & 1)] + str(q))
    return " ".join(parts) or "I"


def collect_terms(n_qubits: int, x: MaskArray, z: MaskArray, coefficients: FloatArray, cut: float = 0.0) -> PauliExpansion:
    """Adds up equal strings, drops those with |c| <= cut, and sorts by (x, z)."""
    order = np.lexsort((z, x))
    x, z, coefficients = x[order], z[order], coefficients[order]
    if x.size == 0:
        return PauliExpansion(n_qubits, x.astype(np.uint64), z.astype(np.uint64), coefficients.astype(float), cut)
    first = np.concatenate([[True], (x[1:] != x[:-1]) | (z[1:] != z[:-1])])
    starts = np.flatnonzero(first)
    summed = np.add.reduceat(coefficients, starts)
    keep = np.abs(summed) > cut
    return PauliExpansion(n_qubits, x[starts][keep].astype(np.uint64), z[starts][keep].astype(np.uint64), summed[keep], cut)


def basis_matrix(expansion: PauliExpansion, states: Sequence[int]) -> ComplexArray:
    """<b_i|H|b_j> between a few basis states, shape (L, L)."""
    matrix = np.zeros((len(states), len(states)), complex)
    phases = expansion.coefficients * np.array([1, 1j, -1, -1j])[np.bitwise_count(expansion.x & expansion.z) % 4]
    for j, ket in enumerate(states):
        values = np.where(np.bitwise_count(expansion.z & np.uint64(ket)) % 2 == 1, -phases, phases)
        for i, bra in enumerate(states):
            matrix[i, j] = values[expansion.x == np.uint64(bra ^ ket)].sum()
    return matrix
