"""How the amplitudes of one (N_alpha, N_beta) sector and one point-group irrep lie in memory.

Strings of each spin are sorted by irrep, then ascending. Only determinants of the wanted total irrep are kept: block h
is a dense row-major matrix of the alpha strings of irrep h by the beta strings of irrep (total xor h). Without a point
group there is one block, which is the whole sector.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np

from thalweg.arrays import FloatArray, IntArray, MaskArray
from thalweg.kernels.bits import binomials, fill_strings
from thalweg.operators.fermion import Sector

SectorKey = tuple[int, int, int, tuple[int, ...], int]


@dataclass(frozen=True)
class StringSpace:
    """Occupation strings of one spin, sorted by irrep.

    Attributes:
        n_orbitals, n_electrons: of this spin.
        strings: masks, shape (N,), uint64.
        rank: position of each among the ascending masks, shape (N,).
        inverse: position in `strings` of each ascending rank, shape (N,).
        first: first string of each irrep, shape (G + 1,).
        orbital_irreps: shape (M,), labels below G.
    """

    n_orbitals: int
    n_electrons: int
    strings: MaskArray
    rank: IntArray
    inverse: IntArray
    first: IntArray
    orbital_irreps: IntArray

    @property
    def size(self) -> int:
        return int(self.strings.size)

    @property
    def n_irreps(self) -> int:
        return int(self.first.size - 1)

    @cached_property
    def counts(self) -> IntArray:
        """Strings of each irrep, shape (G,)."""
        return np.diff(self.first)

    @cached_property
    def irreps(self) -> IntArray:
        """Irrep of each string, shape (N,)."""
        return np.repeat(np.arange(self.n_irreps), self.counts)

    @cached_property
    def local(self) -> IntArray:
        """Position of each string within its irrep, shape (N,)."""
        return np.arange(self.size) - self.first[self.irreps]

    @cached_property
    def binomial(self) -> IntArray:
        table: IntArray = binomials(self.n_orbitals)
        return table


def string_space(n_orbitals: int, n_electrons: int, orbital_irreps: IntArray, last: int = -1) -> StringSpace:
    """All strings of `n_electrons` on `n_orbitals`, sorted by irrep, then ascending. Recent ones are kept.

    With `last`, that orbital counts as the highest in the order of the strings; phases then go with `reordering_phases`.
    """
    return _string_space(n_orbitals, n_electrons, tuple(np.asarray(orbital_irreps).tolist()), last)


@lru_cache(maxsize=16)
def _string_space(n_orbitals: int, n_electrons: int, irreps_of_orbitals: tuple[int, ...], last: int) -> StringSpace:
    orbital_irreps = np.array(irreps_of_orbitals, np.int64)
    size = int(binomials(n_orbitals)[n_orbitals, n_electrons])
    ascending = np.zeros(size, dtype=np.uint64)
    fill_strings(ascending, n_electrons)
    irreps = np.zeros(size, dtype=np.int64)
    for p, label in enumerate(orbital_irreps.tolist()):
        irreps ^= np.where((ascending >> np.uint64(p)) & np.uint64(1), label, 0)
    rank = np.lexsort((_with_last(ascending, last, n_orbitals), irreps))
    inverse = np.empty(size, dtype=np.int64)
    inverse[rank] = np.arange(size)
    n_irreps = 1 << int(np.max(orbital_irreps, initial=0)).bit_length()
    first = np.concatenate([[0], np.cumsum(np.bincount(irreps, minlength=n_irreps))]).astype(np.int64)
    return StringSpace(n_orbitals, n_electrons, ascending[rank], rank, inverse, first, orbital_irreps)


def reordering_phases(space: StringSpace, last: int) -> FloatArray:
    """Sign of each string when orbital `last` is moved behind all higher ones, shape (N,).

    Strings that hold an odd `last` change sign besides: then strings with both or none of two neighbouring orbitals are the same
    whichever of the two is the last, and need not be touched on the way from one order to the other.
    """
    if last < 0:
        return np.ones(space.size)
    above = np.bitwise_count(space.strings >> np.uint64(last + 1)).astype(np.int64)
    holds = (space.strings >> np.uint64(last)) & np.uint64(1)
    return np.where((holds == 1) & ((above + last) % 2 == 1), -1.0, 1.0)


def _with_last(masks: MaskArray, last: int, n_orbitals: int) -> MaskArray:
    """Masks with bit `last` moved to the top and the bits above it moved down by one."""
    if last < 0:
        return masks
    low = masks & np.uint64((1 << last) - 1)
    return low | (masks >> np.uint64(last + 1) << np.uint64(last)) | (masks >> np.uint64(last) & np.uint64(1)) << np.uint64(n_orbitals - 1)


@dataclass(frozen=True)
class SectorLayout:
    """Amplitudes of one total irrep as one flat array.

    Attributes:
        alpha, beta: the strings.
        irrep: the total irrep.
        offsets: first amplitude of each block, shape (G + 1,); the last is the size.
    """

    alpha: StringSpace
    beta: StringSpace
    irrep: int
    offsets: IntArray

    @property
    def n_irreps(self) -> int:
        return self.alpha.n_irreps

    @property
    def size(self) -> int:
        return int(self.offsets[-1])

    @property
    def shape(self) -> tuple[int, int]:
        return self.alpha.size, self.beta.size

    @property
    def key(self) -> SectorKey:
        """What determines the layout: orbitals, alpha and beta electrons, orbital irreps, total irrep."""
        alpha = self.alpha
        return alpha.n_orbitals, alpha.n_electrons, self.beta.n_electrons, tuple(alpha.orbital_irreps.tolist()), self.irrep

    @cached_property
    def widths(self) -> IntArray:
        """Columns of each block, shape (G,)."""
        return self.beta.counts[np.arange(self.n_irreps) ^ self.irrep]

    @cached_property
    def row_start(self) -> IntArray:
        """First amplitude of each alpha string's row, shape (Na,)."""
        h = self.alpha.irreps
        return self.offsets[h] + self.alpha.local * self.widths[h]

    def block(self, vector: FloatArray, h: int) -> FloatArray:
        """View of block h: alpha strings of irrep h by beta strings of irrep (total xor h)."""
        return vector[self.offsets[h] : self.offsets[h + 1]].reshape(int(self.alpha.counts[h]), int(self.widths[h]))

    def index(self, alpha: int, beta: int) -> int:
        """Position of the determinant with these masks; KeyError where it has another irrep."""
        row = int(np.flatnonzero(self.alpha.strings == np.uint64(alpha))[0])
        column = int(np.flatnonzero(self.beta.strings == np.uint64(beta))[0])
        if int(self.alpha.irreps[row] ^ self.beta.irreps[column]) != self.irrep:
            raise KeyError("the determinant has another irrep")
        return int(self.row_start[row] + self.beta.local[column])

    def masks(self, positions: IntArray) -> tuple[MaskArray, MaskArray]:
        """(alpha, beta) masks of the determinants at these positions."""
        h = np.searchsorted(self.offsets, positions, side="right") - 1
        rows, columns = np.divmod(positions - self.offsets[h], np.maximum(self.widths[h], 1))
        return self.alpha.strings[self.alpha.first[h] + rows], self.beta.strings[self.beta.first[h ^ self.irrep] + columns]

    def to_grid(self, vector: FloatArray) -> FloatArray:
        """The amplitudes as (alpha, beta) with strings in the order of the two spaces, zero outside the irrep."""
        grid = np.zeros(self.shape)
        a, b = self.alpha.first, self.beta.first
        for h in range(self.n_irreps):
            k = h ^ self.irrep
            grid[a[h] : a[h + 1], b[k] : b[k + 1]] = self.block(vector, h)
        return grid

    def to_matrix(self, vector: FloatArray) -> FloatArray:
        """The amplitudes as (alpha, beta) with strings ascending, zero outside the irrep."""
        matrix = np.zeros(self.shape)
        for h in range(self.n_irreps):
            matrix[np.ix_(*self._ranks(h))] = self.block(vector, h)
        return matrix

    def from_matrix(self, matrix: FloatArray) -> FloatArray:
        """The part of an (alpha, beta) matrix that has this irrep."""
        vector = np.empty(self.size)
        for h in range(self.n_irreps):
            self.block(vector, h)[...] = matrix[np.ix_(*self._ranks(h))]
        return vector

    def _ranks(self, h: int) -> tuple[IntArray, IntArray]:
        a, b = self.alpha, self.beta
        k = h ^ self.irrep
        return a.rank[a.first[h] : a.first[h + 1]], b.rank[b.first[k] : b.first[k + 1]]


def sector_layout(alpha: StringSpace, beta: StringSpace, irrep: int) -> SectorLayout:
    """The layout of one total irrep."""
    sizes = alpha.counts * beta.counts[np.arange(alpha.n_irreps) ^ irrep]
    return SectorLayout(alpha, beta, irrep, np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64))


def sector_spaces(sector: Sector, orbital_irreps: IntArray) -> tuple[StringSpace, StringSpace]:
    """Alpha and beta strings; the same object where the numbers agree."""
    alpha = string_space(sector.n_orbitals, sector.n_alpha, orbital_irreps)
    same = sector.n_alpha == sector.n_beta
    return alpha, alpha if same else string_space(sector.n_orbitals, sector.n_beta, orbital_irreps)


def layout_of(key: SectorKey) -> SectorLayout:
    """The layout with this key, strings in natural order."""
    n_orbitals, n_alpha, n_beta, irreps, irrep = key
    return sector_layout(*sector_spaces(Sector(n_orbitals, n_alpha, n_beta), np.array(irreps, np.int64)), irrep)
