"""Small dense matrices: the slow, plain ground that fast paths are held against. Basis index bit q = qubit q."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from thalweg.circuit.program import Excitation, Gate, GateProgram
from thalweg.operators.pauli import PauliExpansion

PAULI = {"I": np.eye(2), "X": np.array([[0, 1], [1, 0]]), "Y": np.array([[0, -1j], [1j, 0]]), "Z": np.diag([1, -1])}


def string_matrix(n: int, x: int, z: int) -> np.ndarray:
    """The Pauli string with these masks on n qubits, shape (2^n, 2^n)."""
    matrix = np.eye(1)
    for q in range(n):
        matrix = np.kron(PAULI["IXZY"[(x >> q & 1) + 2 * (z >> q & 1)]], matrix)
    return matrix


def expansion_matrix(expansion: PauliExpansion) -> np.ndarray:
    """Shape (2^n, 2^n)."""
    terms = zip(expansion.x.tolist(), expansion.z.tolist(), expansion.coefficients, strict=True)
    matrix = np.zeros((1 << expansion.n_qubits,) * 2, complex)
    for x, z, c in terms:
        matrix += c * string_matrix(expansion.n_qubits, x, z)
    return matrix


def sparse_matrix(expansion: PauliExpansion):
    """The same as a scipy CSR matrix, for registers of up to 14 qubits."""
    from scipy.sparse import csr_matrix

    size = 1 << expansion.n_qubits
    columns = np.arange(size)
    values = {0: np.zeros(size, complex)}
    for x, z, c in zip(expansion.x.tolist(), expansion.z.tolist(), expansion.coefficients, strict=True):
        sign = 1.0 - 2.0 * (np.bitwise_count(columns & z) & 1)
        values[x] = values.get(x, 0.0) + c * 1j ** (x & z).bit_count() * sign
    rows = np.concatenate([columns ^ x for x in values])
    return csr_matrix((np.concatenate(list(values.values())), (rows, np.tile(columns, len(values)))), shape=(size, size))


def lowest_energy(expansion: PauliExpansion) -> float:
    """The lowest eigenvalue of the whole register of an operator without odd numbers of Y, up to 12 qubits."""
    from scipy.sparse.linalg import eigsh

    matrix = sparse_matrix(expansion).real
    if matrix.shape[0] <= 1024:
        return float(np.linalg.eigvalsh(matrix.toarray())[0])
    return float(eigsh(matrix, k=1, which="SA", tol=1e-9, v0=np.ones(matrix.shape[0]))[0][0])


def gate_state(program: GateProgram, parameters: np.ndarray) -> np.ndarray:
    """The state of a program of Pauli rotations and CNOTs, shape (2^n,)."""
    n, index = program.n_qubits, np.arange(1 << program.n_qubits)
    state = np.zeros(index.size, complex)
    state[program.reference] = 1
    for kind, x, z, k, factor in zip(program.kind, program.x, program.z, program.parameter, program.factor, strict=True):
        if kind == Gate.CNOT:
            state = state[np.where(index & int(x), index ^ int(z), index)]
            continue
        assert kind == Gate.ROTATION
        angle = factor if k < 0 else factor * parameters[k]
        state = np.cos(angle / 2) * state - 1j * np.sin(angle / 2) * (string_matrix(n, int(x), int(z)) @ state)
    return state


@lru_cache(maxsize=8)
def annihilators(n: int) -> tuple[np.ndarray, ...]:
    """a_p of n interleaved spin orbitals on |n_0 n_1 ...> = (a+_0)^n_0 (a+_1)^n_1 ... |vacuum>, bit p of the index = n_p."""
    size = 1 << n
    found = []
    for p in range(n):
        matrix = np.zeros((size, size))
        for state in range(size):
            if state >> p & 1:
                matrix[state ^ 1 << p, state] = (-1) ** (state & ((1 << p) - 1)).bit_count()
        found.append(matrix)
    return tuple(found)


def excitation_matrix(excitation: Excitation, n: int) -> np.ndarray:
    """A = T - T+ on the occupation basis of n spin orbitals, from its definition."""
    a = annihilators(n)
    matrix = np.eye(1 << n)
    for spin, source, target in ((0, excitation.alpha_source, excitation.alpha_target), (1, excitation.beta_source, excitation.beta_target)):
        for p in target:
            matrix = matrix @ a[2 * p + spin].T
        for p in reversed(source):
            matrix = matrix @ a[2 * p + spin]
    return matrix - matrix.T
