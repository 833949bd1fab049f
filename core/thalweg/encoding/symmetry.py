"""Z2 symmetries that are products of Z, and the qubits that they make superfluous (Bravyi, Gambetta, Mezzacapo and Temme 2017).

A linear encoding turns every parity of occupations into a product of Z, so that the symmetries of molecules need no
Clifford rotation: inside a sector the symmetry's value replaces one Z, and the qubit's bit follows from the others.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from thalweg.arrays import FloatArray, MaskArray
from thalweg.kernels import pauli as kernels
from thalweg.operators.pauli import PauliExpansion, collect_terms

ONE = np.uint64(1)
MAX_SEARCHED = 12  # dimensions whose 2^k elements are looked through for the lightest basis


class Symmetry(NamedTuple):
    """A product of Z that commutes with every term.

    Attributes:
        label: what it measures, in words.
        mask: its qubits on the full register.
        value: +1 or -1 in the sector of the reference.
        removed: the qubit of the full register that it made superfluous.
    """

    label: str
    mask: int
    value: int
    removed: int


@dataclass(frozen=True)
class Tapering:
    """How basis states and strings of the full register are written on the working register.

    Attributes:
        n_full, n_working: qubits before and after.
        masks: one product of Z a removed qubit; mask i holds pivot i and no other pivot.
        pivots: the removed qubits.
        values: +1 or -1, the sector.
    """

    n_full: int
    masks: tuple[int, ...] = ()
    pivots: tuple[int, ...] = ()
    values: tuple[int, ...] = ()

    @property
    def n_working(self) -> int:
        return self.n_full - len(self.pivots)

    def strip(self, bits: MaskArray) -> MaskArray:
        """Deletes the pivot bits, any shape."""
        bits = np.asarray(bits, np.uint64)
        for q in sorted(self.pivots, reverse=True):
            low = np.uint64((1 << q) - 1)
            bits = (bits & low) | (bits >> ONE & ~low)
        return bits

    def restore(self, bits: MaskArray) -> MaskArray:
        """The basis states of the full register that belong to these working ones, any shape."""
        bits = np.asarray(bits, np.uint64)
        for q in sorted(self.pivots):
            low = np.uint64((1 << q) - 1)
            bits = (bits & low) | (bits & ~low) << ONE
        for mask, q, value in zip(self.masks, self.pivots, self.values, strict=True):
            odd = np.bitwise_count(bits & np.uint64(mask)).astype(np.uint64) & ONE
            bits = bits | (odd ^ np.uint64(value < 0)) << np.uint64(q)
        return bits

    def holds(self, bits: MaskArray) -> np.ndarray:
        """True for basis states of the full register inside the sector, any shape."""
        inside = np.ones(np.shape(bits), bool)
        for mask, value in zip(self.masks, self.values, strict=True):
            inside &= (np.bitwise_count(np.asarray(bits, np.uint64) & np.uint64(mask)) & 1) == (value < 0)
        return inside

    def keeps(self, x: MaskArray) -> np.ndarray:
        """True for strings with this x mask that commute with every removed symmetry, any shape."""
        even = np.ones(np.shape(x), bool)
        for mask in self.masks:
            even &= (np.bitwise_count(np.asarray(x, np.uint64) & np.uint64(mask)) & 1) == 0
        return even

    def strings(self, x: MaskArray, z: MaskArray) -> tuple[MaskArray, MaskArray, FloatArray]:
        """Working masks of commuting strings of the full register, and the sign that each one takes."""
        x, z = np.asarray(x, np.uint64), np.asarray(z, np.uint64)
        before = np.bitwise_count(x & z).astype(np.int64)
        sign = np.ones(x.shape)
        for mask, q, value in zip(self.masks, self.pivots, self.values, strict=True):
            has_pivot = (z >> np.uint64(q) & ONE).astype(bool)
            z = np.where(has_pivot, z ^ np.uint64(mask), z)
            sign = np.where(has_pivot, sign * value, sign)
        # P = i^|x&z| X^x Z^z: the power of i changes by an even number because the symmetry commutes with P.
        change = before - np.bitwise_count(x & z).astype(np.int64)
        sign = np.where(change % 4 == 2, -sign, sign)
        return self.strip(x), self.strip(z), sign

    def expansion(self, full: PauliExpansion) -> PauliExpansion | None:
        """The operator inside the sector; None where a term leaves the sector."""
        if not self.pivots:
            return full
        if not self.keeps(full.x).all():
            return None
        x, z, sign = self.strings(full.x, full.z)
        return collect_terms(self.n_working, x, z, full.coefficients * sign, full.cut)


def commuting_z_masks(expansion: PauliExpansion) -> list[int]:
    """A basis of the products of Z that commute with every term: z with |z & x| even for all x."""
    n = expansion.n_qubits
    rows = [int(row) for row in kernels.row_space(expansion.x, n)]
    found = []
    for free in range(n):
        if not rows[free]:
            mask = 1 << free
            for q in range(n):
                if rows[q] >> free & 1:
                    mask |= 1 << q
            found.append(mask)
    return found


def independent(candidates: list[int], space: list[int]) -> list[int]:
    """The candidates that lie in the span of `space` and enlarge the span of those before them."""
    whole = _Span(space)
    chosen, span = [], _Span([])
    for mask in candidates:
        if mask and whole.reduce(mask) == 0 and span.add(mask):
            chosen.append(mask)
    return chosen


def lightest(space: list[int]) -> list[int]:
    """A basis of the span with few set bits, the same whatever basis is given; past 12 dimensions an echelon one."""
    if len(space) > MAX_SEARCHED:
        return _Span(space).rows()
    elements = [0]
    for mask in space:
        elements += [mask ^ other for other in elements]
    return independent(sorted(elements, key=lambda mask: (mask.bit_count(), mask)), space)


def taper_by(n_qubits: int, masks: list[int], reference: int) -> Tapering:
    """Tapering by these independent products of Z in the sector of the basis state `reference`.

    Keeps one qubit at least, since a register of none runs no circuit. Each removed qubit is the highest that is left.
    """
    reduced: list[int] = []
    pivots: list[int] = []
    for mask in masks[: n_qubits - 1]:
        for other, q in zip(reduced, pivots, strict=True):
            if mask >> q & 1:
                mask ^= other
        pivot = mask.bit_length() - 1
        reduced = [other ^ mask if other >> pivot & 1 else other for other in reduced]
        reduced.append(mask)
        pivots.append(pivot)
    values = tuple(sector_value(mask, reference) for mask in reduced)
    return Tapering(n_qubits, tuple(reduced), tuple(pivots), values)


def sector_value(mask: int, reference: int) -> int:
    """+1 or -1: the value of the product of Z on a basis state."""
    return -1 if (mask & reference).bit_count() & 1 else 1


class _Span:
    """A growing subspace over GF(2)."""

    def __init__(self, masks: list[int]) -> None:
        self._rows: dict[int, int] = {}
        for mask in masks:
            self.add(mask)

    def reduce(self, mask: int) -> int:
        while mask and mask.bit_length() in self._rows:
            mask ^= self._rows[mask.bit_length()]
        return mask

    def rows(self) -> list[int]:
        """A basis, heads descending."""
        return [self._rows[head] for head in sorted(self._rows, reverse=True)]

    def add(self, mask: int) -> bool:
        """True when the mask was not in the span before."""
        mask = self.reduce(mask)
        if mask:
            self._rows[mask.bit_length()] = mask
        return mask != 0
