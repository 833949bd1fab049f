"""Symmetry blocks of a spin Hamiltonian: what each one offers is its action on vectors and the way back to the sector."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from thalweg.errors import StudyError
from thalweg.exact.spin_basis import STEP, SortedStrings, SpinBasis, in_steps
from thalweg.exact.spin_symmetry import Character, SymmetryGroup, byte_tables
from thalweg.kernels import spin as kernels
from thalweg.kernels import spin_orbits as orbits
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.operators.product import ExpansionProduct
from thalweg.watch import Watch


class Block(Protocol):
    """One invariant subspace. `pairs`: how many equal blocks it stands for by complex conjugation."""

    basis: SpinBasis
    dimension: int
    dtype: Any
    label: str
    pairs: int

    def apply(self, vector: Any, out: Any) -> None:
        """out <- H vector; shapes (dimension,)."""
        ...

    def expand(self, vector: Any) -> Any:
        """The same state on the states of `basis`, shape (basis.dimension,)."""
        ...


class RunsBlock:
    """A whole S_z sector under exchange terms of constant strength, applied without a matrix (see `kernels.spin`)."""

    def __init__(self, basis: SpinBasis, strings: SortedStrings, watch: Watch) -> None:
        self.basis, self._watch = basis, watch
        self.dimension, self.dtype, self.label, self.pairs = basis.dimension, np.dtype(np.float64), "", 1
        self._diagonal = np.empty(self.dimension)
        terms = (basis.states, strings.diagonal_z, strings.diagonal_values)
        in_steps(self.dimension, watch, lambda a, b: kernels.diagonal_values(self._diagonal, a, b, *terms))
        self._tables = _run_tables(basis, strings)
        highs = np.flatnonzero(basis.offset >= 0)
        self._order = highs[np.argsort(np.bitwise_count(highs), kind="stable")]
        self._step = max(4, highs.size * STEP // max(1, self.dimension))

    def apply(self, vector: Any, out: Any) -> None:
        basis = self.basis
        fixed = (basis.down, self._order, basis.offset, basis.start, self._diagonal, *self._tables)
        in_steps(self._order.size, self._watch, lambda a, b: kernels.apply_exchange(vector, out, a, b, *fixed), self._step)

    def expand(self, vector: Any) -> Any:
        return vector


class RegisterBlock:
    """The whole register, or one half of it under spin inversion: |s> + p |inverse of s> with the last spin up."""

    def __init__(self, basis: SpinBasis, expansion: PauliExpansion, inversion: int, watch: Watch) -> None:
        self.basis, self._watch, self._inversion = basis, watch, inversion
        self._product = ExpansionProduct(inverted_half(expansion, inversion) if inversion else expansion)
        self.dimension = 1 << (expansion.n_qubits - (1 if inversion else 0))
        self.dtype = np.dtype(np.float64 if self._product.is_real else np.complex128)
        self.label = {0: "", 1: "even under spin inversion", -1: "odd under spin inversion"}[inversion]
        self.pairs = 1

    def apply(self, vector: Any, out: Any) -> None:
        self._product.apply(vector, out, self._watch)

    def expand(self, vector: Any) -> Any:
        if not self._inversion:
            return vector
        return np.concatenate([vector, self._inversion * vector[::-1]]) / np.sqrt(2.0)


def inverted_half(expansion: PauliExpansion, inversion: int) -> PauliExpansion:
    """H on the states |s> + p |inverse of s>, s with the last bit 0: strings on one qubit less.

    A string that flips the last spin leads to the inverse of the state with all other bits flipped instead, with sign p.
    """
    n = expansion.n_qubits - 1
    top, rest = np.uint64(1) << np.uint64(n), np.uint64((1 << n) - 1)
    flips = (expansion.x & top) != 0
    x = np.where(flips, ~expansion.x, expansion.x) & rest
    z = expansion.z & rest
    change = (np.bitwise_count(expansion.x & expansion.z).astype(np.int64) - np.bitwise_count(x & z)) % 4  # 0 or 2: z has even weight
    sign = np.where(change == 2, -1.0, 1.0) * np.where(flips, float(inversion), 1.0)
    return collect_terms(n, x, z, sign * expansion.coefficients, 1e-15 * float(np.abs(expansion.coefficients).max(initial=0.0)))


@dataclass(frozen=True)
class OrbitTables:
    """Orbits of a sector under a symmetry group, and where H leads from the first state of each; shared by all characters.

    Attributes:
        orbit_of, element_of: for each state its orbit and a group element that makes it from the first state.
        representatives, stabilisers: for each orbit its first state and the elements that leave it alone, as bits.
        diagonal: <r|H|r> from the strings without X or Y.
        starts, link_orbit, link_element, link_value: for each orbit the states that H leads to.
    """

    basis: SpinBasis
    group: SymmetryGroup
    orbit_of: Any
    element_of: Any
    representatives: Any
    stabilisers: Any
    diagonal: Any
    starts: Any
    link_orbit: Any
    link_element: Any
    link_value: Any


def orbit_tables(basis: SpinBasis, strings: SortedStrings, group: SymmetryGroup, budget_bytes: int, watch: Watch) -> OrbitTables:
    """Raises StudyError when the links between orbits do not fit the budget."""
    size = basis.dimension
    refuse_beyond(size * 29, budget_bytes, size)
    orbit_of, element_of = np.full(size, -1, dtype=np.int32), np.zeros(size, dtype=np.uint8)
    representatives, stabilisers = np.empty(size, dtype=np.uint64), np.empty(size, dtype=np.uint64)
    tables = np.array([byte_tables(p) for p in group.permutations])
    ones = np.uint64((1 << basis.n_sites) - 1)
    place = (basis.bits, basis.offset, basis.rank)
    count = 0
    for first in range(0, size, STEP):
        watch.check()
        last = min(size, first + STEP)
        fixed = (basis.states, tables, group.inverts, ones, *place, orbit_of, element_of, representatives, stabilisers)
        count = orbits.mark_orbits(first, last, count, *fixed)
    representatives, stabilisers = representatives[:count].copy(), stabilisers[:count].copy()
    diagonal, counts = np.empty(count), np.empty(count, dtype=np.int64)
    flip = (strings.x, strings.pointer, strings.z, strings.values, strings.threshold)
    in_steps(count, watch, lambda a, b: kernels.diagonal_values(diagonal, a, b, representatives, strings.diagonal_z, strings.diagonal_values))
    in_steps(count, watch, lambda a, b: orbits.count_links(a, b, representatives, *flip, counts), STEP // 8)
    starts = np.concatenate([[0], np.cumsum(counts)])
    links, item = int(starts[-1]), strings.values.dtype.itemsize
    refuse_beyond(links * (5 + 2 * item + 4) + size * 8, budget_bytes, size)
    link_orbit, link_element, link_value = np.empty(links, np.int32), np.empty(links, np.uint8), np.empty(links, strings.values.dtype)
    where = (*place, orbit_of, element_of, starts, link_orbit, link_element, link_value)
    in_steps(count, watch, lambda a, b: orbits.fill_links(a, b, representatives, *flip, *where), STEP // 8)
    return OrbitTables(basis, group, orbit_of, element_of, representatives, stabilisers, diagonal, starts, link_orbit, link_element, link_value)


class OrbitBlock:
    """The states of one character: sums over orbits with its phases, H as stored rows."""

    def __init__(self, tables: OrbitTables, character: Character, watch: Watch) -> None:
        self.basis, self._tables, self._watch = tables.basis, tables, watch
        self._character, self.label, self.pairs = character.values, character.label(), character.pairs
        self.dtype = np.result_type(character.values.dtype, tables.link_value.dtype, np.float64)
        words, which = np.unique(tables.stabilisers, return_inverse=True)
        survives = np.array([_is_trivial(int(word), character.values) for word in words], dtype=bool)[which]
        kept = np.flatnonzero(survives)
        self.dimension = int(kept.size)
        self._number = np.full(survives.size, -1, dtype=np.int64)
        self._number[kept] = np.arange(kept.size)
        self._root = np.sqrt(np.bitwise_count(tables.stabilisers[kept]).astype(float))
        self._diagonal = tables.diagonal[kept]
        self._rows = self._stored_rows(kept)

    def _stored_rows(self, kept: Any) -> tuple[Any, Any, Any]:
        t = self._tables
        counts = np.empty(self.dimension, dtype=np.int64)
        in_steps(self.dimension, self._watch, lambda a, b: orbits.block_counts(a, b, kept, t.starts, t.link_orbit, self._number, counts))
        row_start = np.concatenate([[0], np.cumsum(counts)])
        columns, values = np.empty(row_start[-1], np.uint32), np.empty(row_start[-1], self.dtype)
        fixed = (kept, t.starts, t.link_orbit, t.link_element, t.link_value, self._number, self._root, self._character, row_start, columns, values)
        in_steps(self.dimension, self._watch, lambda a, b: orbits.block_fill(a, b, *fixed), STEP // 4)
        return row_start, columns, values

    def apply(self, vector: Any, out: Any) -> None:
        in_steps(self.dimension, self._watch, lambda a, b: orbits.apply_rows(vector, out, a, b, self._diagonal, *self._rows), STEP // 8)

    def expand(self, vector: Any) -> Any:
        t = self._tables
        out = np.zeros(t.basis.dimension, dtype=self.dtype)
        weight = self._root / np.sqrt(t.group.order)
        fixed = (t.orbit_of, t.element_of, self._number, weight, self._character)
        in_steps(out.size, self._watch, lambda a, b: orbits.spread_orbits(vector, out, a, b, *fixed))
        return out


def refuse_beyond(needed: int, budget_bytes: int, states: int) -> None:
    """StudyError when the exact solver would need more than the budget."""
    if needed > budget_bytes:
        raise StudyError(
            "No exact energy",
            f"{states:,} basis states need {needed / 2**30:.2g} GiB, and the budget is {budget_bytes / 2**30:.2g} GiB",
            "Raise the memory budget, use a smaller lattice, or switch the exact energy off",
            "memory_gib",
        )


def constant_exchange(strings: SortedStrings) -> Any | None:
    """f_e of each x mask on the states where half of its bits are set, when that is all it depends on; otherwise None."""
    if strings.values.dtype.kind == "c":
        return None
    found = []
    for e, x in enumerate(strings.x.tolist()):
        own = slice(strings.pointer[e], strings.pointer[e + 1])
        if x.bit_count() % 2 or not all(z in (0, x) for z in strings.z[own].tolist()):
            return None
        sign = np.where((strings.z[own] != 0) & (x.bit_count() // 2 % 2 == 1), -1.0, 1.0)
        found.append(float(np.dot(sign, strings.values[own])))
    return np.array(found)


def _is_trivial(stabiliser: int, values: Any) -> bool:
    elements = [g for g in range(values.size) if stabiliser >> g & 1]
    return bool(np.all(np.abs(values[elements] - 1.0) < 1e-9))


def _run_tables(basis: SpinBasis, strings: SortedStrings) -> tuple[Any, ...]:
    """The arrays that `kernels.spin.apply_exchange` takes after the diagonal."""
    strength = constant_exchange(strings)
    assert strength is not None
    low = np.uint64((1 << basis.bits) - 1)
    x_low, x_high = strings.x & low, strings.x >> np.uint64(basis.bits)
    within, above = x_high == 0, x_low == 0
    cross = ~within & ~above
    return (
        *_low_rows(basis, x_low[within], strength[within]),
        x_high[above],
        strength[above],
        *_crossings(basis, x_low[cross], x_high[cross], strength[cross]),
    )


def _low_rows(basis: SpinBasis, x: Any, strength: Any) -> tuple[Any, Any, Any]:
    words = basis.words.astype(np.uint64)
    rows, columns, values = [], [], []
    for mask, value in zip(x, strength, strict=True):
        flips = np.flatnonzero(2 * np.bitwise_count(words & mask) == np.bitwise_count(mask))
        rows.append(flips)
        columns.append(basis.rank[(words[flips] ^ mask).astype(np.int64)])
        values.append(np.full(flips.size, value))
    if not rows:
        return np.zeros(words.size + 1, dtype=np.int64), np.empty(0, dtype=np.uint32), np.empty(0)
    row = np.concatenate(rows)
    order = np.argsort(row, kind="stable")
    pointer = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=words.size))])
    return pointer, np.concatenate(columns)[order], np.concatenate(values)[order]


def _crossings(basis: SpinBasis, x_low: Any, x_high: Any, strength: Any) -> tuple[Any, ...]:
    words = basis.words.astype(np.uint64)
    half = (np.bitwise_count(x_low) + np.bitwise_count(x_high)).astype(np.int64) // 2
    lines = np.bitwise_count(x_low).astype(np.int64) + 1
    base = np.concatenate([[0], np.cumsum(lines)])
    pointer = np.zeros((int(base[-1]), basis.bits + 2), dtype=np.int64)
    here, there, filled = [], [], 0
    for e, mask in enumerate(x_low):
        for low_set in range(int(lines[e])):
            matches = np.flatnonzero(np.bitwise_count(words & mask) == low_set)
            here.append(basis.rank[words[matches].astype(np.int64)])
            there.append(basis.rank[(words[matches] ^ mask).astype(np.int64)])
            pointer[base[e] + low_set] = filled + np.searchsorted(matches, basis.start)
            filled += matches.size
    joined = [np.concatenate(part).astype(np.uint32) if part else np.empty(0, dtype=np.uint32) for part in (here, there)]
    return x_high, half, strength, base, pointer, *joined
