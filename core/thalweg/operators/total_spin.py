"""S_z and S^2 of spins 1/2 on a register, hbar = 1; bit 1 of a qubit is spin down (Z = -1)."""

from __future__ import annotations

import numpy as np

from thalweg.operators.pauli import PauliExpansion, collect_terms


def total_s_z(n: int) -> PauliExpansion:
    """sum_q Z_q / 2."""
    z = np.array([1 << q for q in range(n)], np.uint64)
    return collect_terms(n, np.zeros_like(z), z, np.full(n, 0.5))


def total_s_squared(n: int) -> PauliExpansion:
    """(sum_q S_q)^2 = 3n/4 + sum_p<q (XX + YY + ZZ) / 2."""
    pairs = np.array([1 << p | 1 << q for q in range(n) for p in range(q)], np.uint64)
    none = np.zeros_like(pairs)
    x, z = np.concatenate([[np.uint64(0)], pairs, pairs, none]), np.concatenate([[np.uint64(0)], none, pairs, pairs])
    return collect_terms(n, x, z, np.concatenate([[0.75 * n], np.full(3 * pairs.size, 0.5)]))
