"""The lowest basis states of a diagonal Hamiltonian, by listing all energies block by block."""

from __future__ import annotations

from typing import Any

import numpy as np

from thalweg.errors import StudyError
from thalweg.exact.answer import ExactAnswer
from thalweg.exact.spin_blocks import refuse_beyond
from thalweg.operators.pauli import PauliExpansion
from thalweg.watch import Watch

BLOCK_BITS = 18
MAX_QUBITS = 32
#: Ground states listed in the answer; more are only counted.
MAX_LISTED = 4096
SAME_LEVEL = 1e-11


def lowest_basis_states(expansion: PauliExpansion, down: int | None, *, watch: Watch, budget_bytes: int) -> ExactAnswer:
    """All basis states (or those with `down` bits set) are looked at; the answer is exact to rounding.

    Raises StudyError beyond 32 qubits.
    """
    n = expansion.n_qubits
    if n > MAX_QUBITS:
        raise StudyError("No exact energy", f"listing 2^{n} basis states takes too long", "Use fewer sites, or switch the exact energy off", "exact")
    refuse_beyond(32 << min(n, BLOCK_BITS), budget_bytes, 1 << n)
    same = SAME_LEVEL * max(expansion.one_norm, 1e-300)
    best, above, count, listed = np.inf, np.inf, 0, np.empty(0, dtype=np.int64)
    for base, energies in _blocks(expansion, down, watch):
        lowest = float(energies.min(initial=np.inf))
        if lowest < best - same:
            above, best, count, listed = min(above, best), lowest, 0, listed[:0]
        hits = np.flatnonzero(energies <= best + same)
        count += hits.size
        listed = np.concatenate([listed, base + hits[: MAX_LISTED - listed.size]])
        higher = energies[energies > best + same]
        above = min(above, float(higher.min(initial=np.inf)))
    vectors, note = _unit_vectors(listed, count, n, budget_bytes)
    remark = f"{count:,} basis states share the lowest energy" if count > 1 else "The ground state is a basis state"
    return ExactAnswer(
        energy=best,
        degeneracy=count,
        gap=above - best if np.isfinite(above) else None,
        vectors=vectors,
        s_squared=None,
        method=f"All {2**n:,} energies of the diagonal Hamiltonian listed{note}",
        residual=0.0,
        remarks=(f"{remark}: {', '.join(_bits(s, n) for s in listed[:4].tolist())}{', ...' if count > 4 else ''} (site 0 first)",),
    )


def _blocks(expansion: PauliExpansion, down: int | None, watch: Watch) -> Any:
    """(first state, energies of the states that follow); states outside the sector have infinite energy."""
    bits = min(expansion.n_qubits, BLOCK_BITS)
    low = np.uint64((1 << bits) - 1)
    weight = np.bitwise_count(np.arange(1 << bits, dtype=np.uint64)).astype(np.int64)
    total = 1 << (expansion.n_qubits - bits)
    for high in range(total):
        watch.stage("Exact diagonalisation: listing energies", high / total)
        base = high << bits
        sign = np.where(np.bitwise_count(expansion.z & np.uint64(base)) % 2 == 1, -1.0, 1.0)
        energies = np.zeros(1 << bits)
        np.add.at(energies, (expansion.z & low).astype(np.int64), sign * expansion.coefficients)
        _sum_signs(energies)
        if down is not None:
            energies[weight + high.bit_count() != down] = np.inf
        yield base, energies


def _sum_signs(values: Any) -> None:
    """In place: values[s] <- sum_z (-1)^popcount(s & z) values[z] (Walsh-Hadamard transform); length a power of two."""
    half = 1
    while half < values.size:
        pairs = values.reshape(-1, 2, half)
        total = pairs[:, 0] + pairs[:, 1]
        np.subtract(pairs[:, 0], pairs[:, 1], out=pairs[:, 1])
        pairs[:, 0] = total
        half *= 2


def _unit_vectors(listed: Any, count: int, n: int, budget_bytes: int) -> tuple[Any | None, str]:
    if count > listed.size or (count << n) * 8 > budget_bytes // 2:
        return None, "; the ground states are not kept: on the whole register they would not fit the memory budget"
    vectors = np.zeros((count, 1 << n))
    vectors[np.arange(count), listed] = 1.0
    return vectors, ""


def _bits(state: int, n: int) -> str:
    return "".join(str(state >> q & 1) for q in range(n))
