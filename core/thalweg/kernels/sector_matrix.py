"""The Hamiltonian of one symmetry block as a sparse matrix by rows, and its products."""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def block_diagonal_of_h(
    row_start: np.ndarray,
    row_irrep: np.ndarray,
    beta_first: np.ndarray,
    irrep: int,
    alpha_strings: np.ndarray,
    beta_strings: np.ndarray,
    alpha_diagonal: np.ndarray,
    beta_diagonal: np.ndarray,
    coulomb: np.ndarray,
    size: int,
) -> np.ndarray:
    """<D|H|D> without the core energy of every determinant of the block; `coulomb` is (pp|rr), shape (M, M)."""
    m = coulomb.shape[0]
    out = np.empty(size)
    field = np.empty(m)
    one = np.uint64(1)
    for a in range(alpha_strings.size):
        field[:] = 0.0
        for p in range(m):
            if (alpha_strings[a] >> np.uint64(p)) & one:
                field += coulomb[p]
        k = row_irrep[a] ^ irrep
        for b in range(beta_first[k], beta_first[k + 1]):
            value = alpha_diagonal[a] + beta_diagonal[b]
            for r in range(m):
                if (beta_strings[b] >> np.uint64(r)) & one:
                    value += field[r]
            out[row_start[a] + b - beta_first[k]] = value
    return out


@njit(cache=True, nogil=True)
def count_elements(
    row_start: np.ndarray,
    row_irrep: np.ndarray,
    beta_first: np.ndarray,
    irrep: int,
    alpha_singles: np.ndarray,
    beta_singles: np.ndarray,
    alpha_doubles: np.ndarray,
    beta_doubles: np.ndarray,
    size: int,
) -> np.ndarray:
    """Row pointer of the block, shape (size + 1,): where each row's elements begin."""
    n_irreps = alpha_singles.shape[1] - 1
    pointer = np.zeros(size + 1, np.int64)
    for a in range(row_start.size):
        k = row_irrep[a] ^ irrep
        for b in range(beta_first[k], beta_first[k + 1]):
            n = 1 + alpha_singles[a, 1] + beta_singles[b, 1]
            n += alpha_doubles[a + 1] - alpha_doubles[a] + beta_doubles[b + 1] - beta_doubles[b]
            for g in range(n_irreps):
                n += (alpha_singles[a, g + 1] - alpha_singles[a, g]) * (beta_singles[b, g + 1] - beta_singles[b, g])
            pointer[row_start[a] + b - beta_first[k] + 1] = n
    for i in range(size):
        pointer[i + 1] += pointer[i]
    return pointer


@njit(cache=True, nogil=True)
def fill_elements(
    pointer: np.ndarray,
    column: np.ndarray,
    value: np.ndarray,
    diagonal: np.ndarray,
    row_start: np.ndarray,
    row_irrep: np.ndarray,
    beta_first: np.ndarray,
    irrep: int,
    alpha: Any,
    beta: Any,
    eri: np.ndarray,
) -> None:
    """Fills column and value of every row. `alpha`, `beta`: (strings, singles, doubles) of each spin.

    eri: (pq|rs) as a matrix, shape (M M, M M).
    """
    alpha_strings, (a_first, a_end, a_pq, a_sign, a_value), (ad_first, ad_end, ad_value) = alpha
    beta_strings, (b_first, b_end, b_pq, b_sign, b_value), (bd_first, bd_end, bd_value) = beta
    m = int(np.sqrt(eri.shape[0]))
    n_irreps = a_first.shape[1] - 1
    for a in range(row_start.size):
        k = row_irrep[a] ^ irrep
        begin = beta_first[k]
        for b in range(begin, beta_first[k + 1]):
            here = b - begin
            row = row_start[a] + here
            n = pointer[row]
            column[n], value[n] = row, diagonal[row]
            n += 1
            for x in range(a_first[a, 1]):
                field = _mean(eri, a_pq[a, x], beta_strings[b], m)
                column[n], value[n] = row_start[a_end[a, x]] + here, a_value[a, x] + a_sign[a, x] * field
                n += 1
            for y in range(b_first[b, 1]):
                field = _mean(eri, b_pq[b, y], alpha_strings[a], m)
                column[n], value[n] = row_start[a] + b_end[b, y] - begin, b_value[b, y] + b_sign[b, y] * field
                n += 1
            for x in range(ad_first[a], ad_first[a + 1]):
                column[n], value[n] = row_start[ad_end[x]] + here, ad_value[x]
                n += 1
            for y in range(bd_first[b], bd_first[b + 1]):
                column[n], value[n] = row_start[a] + bd_end[y] - begin, bd_value[y]
                n += 1
            for g in range(n_irreps):
                other = beta_first[k ^ g]
                for x in range(a_first[a, g], a_first[a, g + 1]):
                    base = row_start[a_end[a, x]] - other
                    for y in range(b_first[b, g], b_first[b, g + 1]):
                        column[n] = base + b_end[b, y]
                        value[n] = a_sign[a, x] * b_sign[b, y] * eri[a_pq[a, x], b_pq[b, y]]
                        n += 1


@njit(cache=True, nogil=True)
def _mean(eri: np.ndarray, pq: int, mask: np.uint64, m: int) -> float:
    """sum over r in the mask of (pq|rr)."""
    total = 0.0
    for r in range(m):
        if (mask >> np.uint64(r)) & np.uint64(1):
            total += eri[pq, r * (m + 1)]
    return total


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def multiply_rows(pointer: np.ndarray, column: np.ndarray, value: np.ndarray, vector: np.ndarray, out: np.ndarray) -> None:
    """out = H vector for the sparse matrix by rows."""
    for i in range(out.size):
        total = 0.0
        for k in range(np.uint64(pointer[i]), np.uint64(pointer[i + 1])):  # signed counters would block vectorisation
            total += value[k] * vector[column[k]]
        out[i] = total
