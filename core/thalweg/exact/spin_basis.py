"""Basis states of a spin sector, and the strings of a Hamiltonian sorted for acting on them."""

from __future__ import annotations

from dataclasses import dataclass
from math import comb
from typing import Any

import numpy as np

from thalweg.arrays import IntArray, MaskArray
from thalweg.kernels import spin as kernels
from thalweg.operators.pauli import PauliExpansion
from thalweg.watch import Watch

#: States between two looks at the watch.
STEP = 2**19


@dataclass(frozen=True)
class SpinBasis:
    """All states with `down` spins down, ascending, or the whole register (down None; the tables are then empty).

    Attributes:
        n_sites, down: the sector.
        bits: number of low bits of the split.
        rank: rank of each low word in its class, shape (2^bits,), uint32.
        start: first low word of each class in `words`, shape (bits + 2,).
        words: low words sorted by class.
        offset: first state of each high part, -1 where there is none.
        states: masks, shape (dimension,), uint64.
    """

    n_sites: int
    down: int | None
    bits: int
    rank: Any
    start: IntArray
    words: IntArray
    offset: IntArray
    states: MaskArray

    @property
    def dimension(self) -> int:
        return int(self.states.size) if self.down is not None else 1 << self.n_sites

    @property
    def s_z(self) -> float | None:
        return None if self.down is None else 0.5 * self.n_sites - self.down

    def register_indices(self) -> Any:
        """Where the amplitudes go in a register vector: an index array or a slice."""
        return slice(None) if self.down is None else self.states.astype(np.int64)


def basis_of(n_sites: int, down: int | None) -> SpinBasis:
    if down is None:
        none = np.empty(0, dtype=np.int64)
        return SpinBasis(n_sites, None, 0, np.empty(0, dtype=np.uint32), none, none, none, np.empty(0, dtype=np.uint64))
    bits = n_sites // 2
    rank, start = np.empty(1 << bits, dtype=np.uint32), np.zeros(bits + 2, dtype=np.int64)
    kernels.rank_words(bits, rank, start)
    words = np.argsort(np.bitwise_count(np.arange(1 << bits)), kind="stable").astype(np.int64)
    offset = np.empty(1 << (n_sites - bits), dtype=np.int64)
    states = np.empty(kernels.place_runs(n_sites - bits, bits, down, start, offset), dtype=np.uint64)
    kernels.fill_states(states, down, bits, offset, words, start)
    return SpinBasis(n_sites, down, bits, rank, start, words, offset, states)


def sector_size(n_sites: int, down: int | None) -> int:
    return 1 << n_sites if down is None else comb(n_sites, down)


@dataclass(frozen=True)
class SortedStrings:
    """H as a diagonal part and, for each x mask, the strings that flip it: H|s> = sum_e f_e(s) |s ^ x_e>.

    f_e(s) = sum over pointer[e]:pointer[e + 1] of values (-1)^popcount(z & s). Values are real for a real H.
    """

    diagonal_z: MaskArray
    diagonal_values: Any
    x: MaskArray
    pointer: IntArray
    z: MaskArray
    values: Any

    @property
    def threshold(self) -> float:
        """Matrix elements below this are rounding."""
        return 1e-14 * float(np.abs(self.values).sum()) if self.values.size else 0.0


def sorted_strings(expansion: PauliExpansion) -> SortedStrings:
    """The strings of an expansion (which are kept sorted by x)."""
    y_count = np.bitwise_count(expansion.x & expansion.z) % 4
    values = expansion.coefficients * np.array([1, 1j, -1, -1j])[y_count]
    if np.all(y_count % 2 == 0):
        values = np.ascontiguousarray(values.real)
    flat = expansion.x == 0
    x, first = np.unique(expansion.x[~flat], return_index=True)
    pointer = np.append(first, np.count_nonzero(~flat)).astype(np.int64)
    return SortedStrings(expansion.z[flat], np.ascontiguousarray(values[flat].real), x, pointer, expansion.z[~flat], values[~flat])


def in_steps(count: int, watch: Watch, part: Any, step: int = STEP) -> None:
    """Calls part(first, last) over 0:count, with looks at the watch between."""
    for first in range(0, count, step):
        watch.check()
        part(first, min(count, first + step))
