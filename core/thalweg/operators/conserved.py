"""What a Pauli expansion commutes with: spin along an axis, parities, permutations of the qubits. Worked out on the strings."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.arrays import MaskArray
from thalweg.operators.pauli import PauliExpansion, collect_terms

#: Coefficients that should cancel may leave this much of the largest one behind.
ROUNDING = 1e-13


def conserved_quantities(expansion: PauliExpansion) -> tuple[str, ...]:
    """Which of total spin, S_x, S_y, S_z and the three parities commute with H, as words."""
    along = {axis: conserves_total_spin_along(expansion, axis) for axis in "xyz"}
    if all(along.values()):
        return ("total spin S", "S_z")
    names = tuple(f"S_{axis}" for axis in "zxy" if along[axis])
    parities = tuple(f"parity prod {axis.upper()}" for axis in "zxy" if not along[axis] and conserves_parity(expansion, axis))
    return names + parities


def conserves_total_spin_along(expansion: PauliExpansion, axis: str) -> bool:
    """Whether [H, sum_q sigma^axis_q] vanishes, worked out on the strings themselves.

    [P, s_q] is 2 P s_q where P and s_q anticommute and zero elsewhere, so the commutator is again a sum of strings.
    """
    x, z = expansion.x, expansion.z
    found_x, found_z, found_c = [], [], []
    for q in range(expansion.n_qubits):
        bit = np.uint64(1) << np.uint64(q)
        sx, sz = (bit if axis in "xy" else np.uint64(0)), (bit if axis in "yz" else np.uint64(0))
        clash = (np.bitwise_count(x & sz) + np.bitwise_count(z & sx)) % 2 == 1
        # phase of P s = i^k (P'), from P = i^|x&z| X^x Z^z: real up to the common factor i of an anticommuting product
        power = _y_count(x, z) + _y_count(sx, sz) + 2 * np.bitwise_count(z & sx) - _y_count(x ^ sx, z ^ sz)
        sign = np.where((power.astype(np.int64) % 4) == 1, 1.0, -1.0)
        found_x.append((x ^ sx)[clash])
        found_z.append((z ^ sz)[clash])
        found_c.append((sign * expansion.coefficients)[clash])
    scale = float(np.abs(expansion.coefficients).max(initial=0.0))
    left = collect_terms(expansion.n_qubits, np.concatenate(found_x), np.concatenate(found_z), np.concatenate(found_c), ROUNDING * scale)
    return len(left) == 0


def conserves_parity(expansion: PauliExpansion, axis: str) -> bool:
    """Whether H commutes with the product of sigma^axis over all qubits."""
    masks = {"x": expansion.z, "z": expansion.x, "y": expansion.x ^ expansion.z}
    return bool(np.all(np.bitwise_count(masks[axis]) % 2 == 0))


def _y_count(x: np.ndarray | np.uint64, z: np.ndarray | np.uint64) -> np.ndarray:
    return np.bitwise_count(x & z).astype(np.int64)


def permuted_masks(masks: MaskArray, permutation: Sequence[int]) -> MaskArray:
    """Masks with bit q moved to bit permutation[q]."""
    moved = np.zeros_like(masks)
    for q, target in enumerate(permutation):
        moved |= ((masks >> np.uint64(q)) & np.uint64(1)) << np.uint64(target)
    return moved


def is_invariant(expansion: PauliExpansion, permutation: Sequence[int]) -> bool:
    """Whether H is unchanged when qubit q becomes qubit permutation[q]."""
    x, z = permuted_masks(expansion.x, permutation), permuted_masks(expansion.z, permutation)
    scale = float(np.abs(expansion.coefficients).max(initial=0.0))
    both = (np.concatenate([expansion.x, x]), np.concatenate([expansion.z, z]))
    difference = np.concatenate([expansion.coefficients, -expansion.coefficients])
    return len(collect_terms(expansion.n_qubits, *both, difference, ROUNDING * scale)) == 0


def is_real(expansion: PauliExpansion) -> bool:
    """Whether H is a real matrix in the computational basis: every string has an even number of Y."""
    return bool(np.all(np.bitwise_count(expansion.x & expansion.z) % 2 == 0))


def is_diagonal(expansion: PauliExpansion) -> bool:
    """Whether H is diagonal in the computational basis."""
    return bool(np.all(expansion.x == 0))
