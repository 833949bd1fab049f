"""A linear encoding worked out as bit masks, and the fermionic operators that it turns into Pauli strings."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from thalweg.arrays import FloatArray, MaskArray
from thalweg.encoding.settings import EncodingSettings
from thalweg.errors import StudyError
from thalweg.kernels import pauli as kernels
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import MAX_QUBITS, PauliExpansion, collect_terms
from thalweg.watch import SILENT, Watch

ONE = np.uint64(1)


@dataclass(frozen=True, eq=False)  # one object for each encoding and size, so that identity is equality
class LinearEncoding:
    """b = A n over GF(2) on n qubits, as masks (see `thalweg.kernels.pauli` for the formulas).

    Attributes:
        update: U_p, the qubits that mode p flips, shape (n,), uint64.
        flip: F_p, the qubits whose parity is the occupation of mode p, shape (n,).
        parity: P_p, the qubits whose parity is that of the modes before p, shape (n,).
    """

    n_qubits: int
    update: MaskArray
    flip: MaskArray
    parity: MaskArray

    def encode(self, occupations: MaskArray) -> MaskArray:
        """Register basis states of these occupation masks (bit = mode), any shape."""
        return _combine(self.update, np.asarray(occupations, np.uint64))

    def decode(self, bits: MaskArray) -> MaskArray:
        """Occupation masks of these register basis states, any shape."""
        return _parities(self.flip, np.asarray(bits, np.uint64))

    def z_mask(self, modes: int) -> int:
        """The Z string that measures the parity of the modes of this mask."""
        return int(_combine(self.flip, np.array([modes], np.uint64))[0])

    def modes_of(self, z_mask: int) -> int:
        """The modes whose parity the Z string measures; undoes `z_mask`."""
        return int(_parities(self.update, np.array([z_mask], np.uint64))[0])


def linear_encoding(settings: EncodingSettings, n_qubits: int) -> LinearEncoding:
    """The masks of an encoding; StudyError past 62 qubits."""
    if n_qubits > MAX_QUBITS:
        raise StudyError(
            f"{n_qubits} spin orbitals cannot be encoded",
            f"Pauli strings are held in masks of at most {MAX_QUBITS} qubits",
            f"Choose an active space of at most {MAX_QUBITS // 2} orbitals",
            "system.active_space",
        )
    return _linear_encoding(type(settings), n_qubits)


@lru_cache(maxsize=32)
def _linear_encoding(kind: type[EncodingSettings], n_qubits: int) -> LinearEncoding:
    update, flip, parity, invertible = kernels.encoding_masks(kind().matrix(n_qubits))
    if not invertible:
        raise ValueError(f"{kind.__name__}.matrix({n_qubits}) is singular")
    return LinearEncoding(n_qubits, update, flip, parity)


def map_hamiltonian(hamiltonian: FermionHamiltonian, encoding: LinearEncoding, cut: float = 0.0, watch: Watch = SILENT) -> PauliExpansion:
    """The Hamiltonian on qubits; terms with |c| <= cut are dropped. Raises Stopped when asked to stop."""
    x, z, coefficients = kernels.map_hamiltonian(
        float(hamiltonian.core_energy),
        np.ascontiguousarray(hamiltonian.one_body, float),
        np.ascontiguousarray(hamiltonian.two_body, float),
        encoding.update,
        encoding.flip,
        encoding.parity,
        cut,
    )
    watch.check()
    n = encoding.n_qubits
    order = np.argsort(x << np.uint64(n) | z) if 2 * n <= 64 else np.lexsort((z, x))
    watch.check()
    return PauliExpansion(n, x[order], z[order], coefficients[order], cut)


def mapping_bytes(n_orbitals: int) -> int:
    """What `map_hamiltonian` takes at most, bytes: strings as they are found, cut, sorted, and the order."""
    return 4 * 24 * int(kernels.count_bound.py_func(n_orbitals))


def number_operator(encoding: LinearEncoding) -> PauliExpansion:
    """N = sum_p n_p, n_p = (1 - Z^F_p) / 2."""
    n = encoding.n_qubits
    z = np.concatenate([[np.uint64(0)], encoding.flip])
    return collect_terms(n, np.zeros_like(z), z, np.concatenate([[0.5 * n], np.full(n, -0.5)]))


def s_z_operator(encoding: LinearEncoding) -> PauliExpansion:
    """S_z = (N_alpha - N_beta) / 2 in units of hbar."""
    n = encoding.n_qubits
    weights = np.where(np.arange(n) % 2 == 0, -0.25, 0.25)
    return collect_terms(n, np.zeros(n, np.uint64), encoding.flip, weights)


def s_squared_operator(encoding: LinearEncoding) -> PauliExpansion:
    """S^2 = S_z^2 + N/2 - sum_pq (a+_pa a_qa)(a+_qb a_pb), units of hbar squared (Szabo and Ostlund, section 2.5).

    With t = a+_p a_q + h.c. and d = a+_p a_q - h.c. the sum over p and q is sum_p n_pa n_pb + 1/2 sum_p<q (t_a t_b - d_a d_b).
    """
    n, flip, parity = encoding.n_qubits, encoding.flip, encoding.parity
    m = n // 2
    zero = np.zeros(1, np.uint64)
    pieces: list[tuple[MaskArray, MaskArray, FloatArray]] = [(zero, zero, np.array([0.375 * m]))]
    i, j = np.triu_indices(n, 1)
    diagonal = np.where((i + j) % 2 == 0, 0.125, -0.125) - np.where((i % 2 == 0) & (j == i + 1), 0.25, 0.0)
    pieces.append((np.zeros(i.size, np.uint64), flip[i] ^ flip[j], diagonal))
    p, q = np.triu_indices(m, 1)
    hops = []
    for spin in (0, 1):
        a, b = 2 * p + spin, 2 * q + spin
        between = parity[b] ^ parity[a] ^ flip[a]
        hops.append((encoding.update[a] ^ encoding.update[b], between, between ^ flip[a] ^ flip[b], between ^ flip[a], between ^ flip[b]))
    (u, t0, t1, d0, d1), (v, s0, s1, e0, e1) = hops
    for left, right, weight in (
        (t0, s0, -0.125), (t0, s1, 0.125), (t1, s0, 0.125), (t1, s1, -0.125),
        (d0, e0, 0.125), (d0, e1, -0.125), (d1, e0, -0.125), (d1, e1, 0.125),
    ):  # fmt: skip
        pieces.append(_product(u, left, v, right, weight))
    x, z, c = (np.concatenate(parts) for parts in zip(*pieces, strict=True))
    return collect_terms(n, x, z, c * real_phase(x, z))


def real_phase(x: MaskArray, z: MaskArray) -> FloatArray:
    """s with X^x Z^z = s P for strings with an even number of Y."""
    return 1.0 - (np.bitwise_count(x & z) & 2).astype(float)


def _product(u: MaskArray, a: MaskArray, v: MaskArray, b: MaskArray, weight: float) -> tuple[MaskArray, MaskArray, FloatArray]:
    """weight X^u Z^a X^v Z^b in the form X^x Z^z."""
    sign = 1.0 - 2.0 * (np.bitwise_count(a & v) & 1)
    return u ^ v, a ^ b, weight * sign


def _combine(masks: MaskArray, chosen: MaskArray) -> MaskArray:
    """xor of the masks whose bit is set in `chosen`."""
    result = np.zeros_like(chosen)
    for p, mask in enumerate(masks):
        result ^= (chosen >> np.uint64(p) & ONE) * mask
    return result


def _parities(masks: MaskArray, bits: MaskArray) -> MaskArray:
    """Mask whose bit p is the parity of bits & masks[p]."""
    result = np.zeros_like(bits)
    for p, mask in enumerate(masks):
        result |= (np.bitwise_count(bits & mask).astype(np.uint64) & ONE) << np.uint64(p)
    return result
