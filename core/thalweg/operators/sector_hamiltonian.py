"""H applied to real amplitudes of one electron sector, point-group irrep by irrep.

Small blocks become a sparse matrix by rows; large ones are applied without a matrix as
H_alpha psi + psi H_beta^T + sum (pq|rs) E^alpha_pq E^beta_rs psi (Knowles and Handy 1984; Olsen et al. 1988).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import comb
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.kernels import sector_matrix as matrix_kernels
from thalweg.kernels import sector_product as product_kernels
from thalweg.kernels import spin_strings
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.operators.sector_layout import SectorLayout, StringSpace, sector_layout, sector_spaces
from thalweg.watch import SILENT, Watch

#: Largest block, in determinants, that becomes a sparse matrix.
SPARSE_LIMIT = 10_000
#: Multiplications in one kernel call.
WORK_PER_CALL = 1e9


@dataclass(frozen=True)
class SpinPart:
    """One spin's strings and what H does among them (tuples in the form that the kernels take)."""

    space: StringSpace
    diagonal: FloatArray
    singles: tuple[Any, ...]
    doubles: tuple[Any, ...]

    @cached_property
    def pairs(self) -> tuple[Any, ...]:
        """Row pairs of E_pq + E_qp, as `sector_product.row_pairs_of` gives them."""
        first, end, pq, sign, _ = self.singles
        return product_kernels.row_pairs_of(self.space.strings, self.space.first, first, end, pq, sign, self.space.n_orbitals)

    @cached_property
    def lists(self) -> tuple[Any, ...]:
        """Elements of sum_rs v_rs E_rs, as `sector_product.column_lists_of` gives them."""
        first, end, pq, sign, _ = self.singles
        return product_kernels.column_lists_of(self.space.first, self.space.local, first, end, pq, sign)

    @cached_property
    def dense(self) -> tuple[FloatArray, ...]:
        """H among the strings of each irrep, one matrix an irrep."""
        return tuple(self._dense_block(g) for g in range(self.space.n_irreps))

    def _dense_block(self, g: int) -> FloatArray:
        begin, end = int(self.space.first[g]), int(self.space.first[g + 1])
        block = np.diag(self.diagonal[begin:end])
        first, to, _, _, value = self.singles
        rows = np.repeat(np.arange(end - begin), first[begin:end, 1])
        keep = np.arange(to.shape[1])[None, :] < first[begin:end, 1][:, None]
        block[rows, to[begin:end][keep] - begin] = value[begin:end][keep]
        pointer, to2, value2 = self.doubles
        rows = np.repeat(np.arange(end - begin), np.diff(pointer[begin : end + 1]))
        block[rows, to2[pointer[begin] : pointer[end]] - begin] = value2[pointer[begin] : pointer[end]]
        return block


def _spin_part(space: StringSpace, hamiltonian: FermionHamiltonian, irreps: IntArray) -> SpinPart:
    h, eri = np.ascontiguousarray(hamiltonian.one_body), np.ascontiguousarray(hamiltonian.two_body)
    common = (space.strings, space.inverse, space.binomial, irreps)
    singles = spin_strings.singles(*common, space.n_irreps, h, eri)
    counts = spin_strings.count_doubles(space.strings, irreps, h.shape[0])
    pointer = np.concatenate([[0], np.cumsum(counts)]).astype(np.int64)
    doubles = spin_strings.doubles(*common, eri, pointer)
    return SpinPart(space, spin_strings.diagonal(space.strings, h, eri), singles, (pointer, *doubles))


class SymmetryBlock:
    """H among the determinants of one irrep. Vectors are flat, in the order of `layout`; the core energy is left out."""

    def __init__(self, layout: SectorLayout, alpha: SpinPart, beta: SpinPart, eri: FloatArray, sparse_limit: int = SPARSE_LIMIT) -> None:
        self.layout, self._alpha, self._beta, self._eri = layout, alpha, beta, eri
        self._sparse_limit = sparse_limit

    @property
    def alpha_singles(self) -> tuple[Any, ...]:
        """Single replacements of the alpha strings, as `kernels.spin_strings.singles` gives them."""
        return self._alpha.singles

    @property
    def beta_singles(self) -> tuple[Any, ...]:
        """Single replacements of the beta strings."""
        return self._beta.singles

    @property
    def is_sparse(self) -> bool:
        """Whether a matrix is kept."""
        return self.layout.size <= self._sparse_limit

    @cached_property
    def diagonal(self) -> FloatArray:
        """<D|H|D> of every determinant, shape (size,)."""
        m = self.layout.alpha.n_orbitals
        coulomb = np.ascontiguousarray(self._eri[:: m + 1, :: m + 1])
        return matrix_kernels.block_diagonal_of_h(
            *self._rows, self._alpha.space.strings, self._beta.space.strings, self._alpha.diagonal, self._beta.diagonal, coulomb, self.layout.size
        )

    @cached_property
    def rows(self) -> tuple[IntArray, IntArray, FloatArray]:
        """The sparse matrix by rows: pointer (size + 1,), columns, values."""
        a, b = self._alpha, self._beta
        pointer = matrix_kernels.count_elements(*self._rows, a.singles[0], b.singles[0], a.doubles[0], b.doubles[0], self.layout.size)
        column, value = np.empty(pointer[-1], np.uint32), np.empty(pointer[-1])
        parts = [(part.space.strings, part.singles, part.doubles) for part in (a, b)]
        matrix_kernels.fill_elements(pointer, column, value, self.diagonal, *self._rows, *parts, self._eri)
        return pointer, column, value

    def dense_matrix(self) -> FloatArray:
        """The whole matrix, shape (size, size); for small blocks."""
        pointer, column, value = self.rows
        matrix = np.zeros((self.layout.size, self.layout.size))
        matrix[np.repeat(np.arange(self.layout.size), np.diff(pointer)), column] = value
        return matrix

    def apply(self, vector: FloatArray, out: FloatArray | None = None, watch: Watch = SILENT) -> FloatArray:
        """H vector, shape (size,), written to `out` where it is given; may raise Stopped."""
        out = np.empty(self.layout.size) if out is None else out
        if self.is_sparse:
            matrix_kernels.multiply_rows(*self.rows, vector, out)
            return out
        self._apply_one_spin(vector, out, watch)
        pairs = self._pair_integrals.shape[0]
        for first in range(0, pairs, self._pairs_per_call):
            watch.check()
            last = min(first + self._pairs_per_call, pairs)
            product_kernels.add_pairs(vector, out, first, last, *self._cross)
        return out

    def _apply_one_spin(self, vector: FloatArray, out: FloatArray, watch: Watch) -> None:
        """out = H_alpha vector + vector H_beta, block by block and some rows at a time."""
        layout = self.layout
        for h in range(layout.n_irreps):
            block, target = layout.block(vector, h), layout.block(out, h)
            rows, columns = target.shape
            if target.size == 0:
                continue
            step = max(1, int(WORK_PER_CALL / (columns * (rows + columns))))
            alpha, beta = self._alpha.dense[h], self._beta.dense[h ^ layout.irrep]
            for first in range(0, rows, step):
                watch.check()
                part = slice(first, first + step)
                np.matmul(alpha[part], block, out=target[part])
                target[part] += block[part] @ beta

    @cached_property
    def _cross(self) -> tuple[Any, ...]:
        """What `add_pairs` takes behind the pair range."""
        layout = self.layout
        columns = layout.beta
        return (
            self._pair_irreps,
            layout.irrep,
            layout.row_start,
            *self._alpha.pairs,
            columns.strings,
            columns.first,
            *self._beta.lists,
            self._pair_integrals,
        )

    @cached_property
    def _pair_integrals(self) -> FloatArray:
        """(pq|rs) for p >= q, shape (M (M + 1) / 2, M M)."""
        p, q = np.tril_indices(self.layout.alpha.n_orbitals)
        return np.ascontiguousarray(self._eri[p * self.layout.alpha.n_orbitals + q])

    @cached_property
    def _pair_irreps(self) -> IntArray:
        p, q = np.tril_indices(self.layout.alpha.n_orbitals)
        labels = self.layout.alpha.orbital_irreps
        return labels[p] ^ labels[q]

    @cached_property
    def _pairs_per_call(self) -> int:
        """Pairs p >= q in one kernel call, so that a stop is heard in time."""
        n, m = self.layout.beta.n_electrons, self.layout.beta.n_orbitals
        work = self.layout.size * (n * (m - n) + 1) / 2
        return max(1, int(WORK_PER_CALL / max(work, 1.0)))

    @cached_property
    def _rows(self) -> tuple[IntArray, IntArray, IntArray, int]:
        layout = self.layout
        return layout.row_start, layout.alpha.irreps, layout.beta.first, layout.irrep


class SectorHamiltonian:
    """H of one sector, built piece by piece when first asked for, and shared by whoever works on the same Hamiltonian."""

    def __init__(self, hamiltonian: FermionHamiltonian, sparse_limit: int = SPARSE_LIMIT) -> None:
        self.hamiltonian = hamiltonian
        self._sparse_limit = sparse_limit
        self._parts: dict[bool, tuple[SpinPart, SpinPart]] = {}
        self._blocks: dict[tuple[int, bool], SymmetryBlock] = {}

    @property
    def n_irreps(self) -> int:
        """Order of the point group as the labels use it."""
        return 1 << int(np.max(self.hamiltonian.orbital_irreps, initial=0)).bit_length()

    @property
    def reference_irrep(self) -> int:
        """Irrep of the reference determinant."""
        return self.hamiltonian.irrep_of(*self.hamiltonian.reference)

    def memory_bytes(self) -> int:
        """What all irreps together would take, estimated from the sector alone, bytes."""
        return estimated_bytes(self.hamiltonian.sector, group_order(self.hamiltonian.orbital_irreps), sparse_limit=self._sparse_limit)

    def block(self, irrep: int) -> SymmetryBlock:
        """H among the determinants of one irrep."""
        return self._block(irrep, True)

    @cached_property
    def whole(self) -> SymmetryBlock:
        """H in the whole sector, for states that break the point group."""
        return self._block(0, self.n_irreps == 1)

    def _block(self, irrep: int, symmetric: bool) -> SymmetryBlock:
        key = (irrep, symmetric)
        if key not in self._blocks:
            alpha, beta = self._spin_parts(symmetric)
            m = self.hamiltonian.n_orbitals
            eri = np.ascontiguousarray(self.hamiltonian.two_body).reshape(m * m, m * m)
            self._blocks[key] = SymmetryBlock(sector_layout(alpha.space, beta.space, irrep), alpha, beta, eri, self._sparse_limit)
        return self._blocks[key]

    def _spin_parts(self, symmetric: bool) -> tuple[SpinPart, SpinPart]:
        if symmetric not in self._parts:
            irreps = np.asarray(self.hamiltonian.orbital_irreps, np.int64)
            irreps = irreps if symmetric else np.zeros_like(irreps)
            alpha, beta = sector_spaces(self.hamiltonian.sector, irreps)
            first = _spin_part(alpha, self.hamiltonian, irreps)
            self._parts[symmetric] = (first, first if beta is alpha else _spin_part(beta, self.hamiltonian, irreps))
        return self._parts[symmetric]


def group_order(orbital_irreps: IntArray) -> int:
    """Number of irreps that products of the orbital irreps reach."""
    reached = {0}
    for label in np.asarray(orbital_irreps).tolist():
        reached |= {label ^ other for other in reached}
    return len(reached)


def estimated_bytes(sector: Sector, order: int, blocks: int | None = None, sparse_limit: int = SPARSE_LIMIT) -> int:
    """String tables and matrices of `blocks` of the `order` irreps (all by default), bytes.

    Takes strings to spread evenly over the irreps.
    """
    total, row, product = 0, 1.0, 1
    for n, strings in zip((sector.n_alpha, sector.n_beta), sector.shape, strict=True):
        m = sector.n_orbitals
        singles, doubles = n * (m - n), comb(n, 2) * comb(m - n, 2)
        total += strings * (32 * singles + 16 * doubles // order + 8 * (order + 5))
        row += (singles + doubles) / order
        product *= singles
    if sector.dimension / order <= sparse_limit:
        share = sector.dimension * (order if blocks is None else blocks) / order
        return total + int(12 * share * (row + product / order))
    return total + sum(8 * strings**2 // order for strings in sector.shape)
