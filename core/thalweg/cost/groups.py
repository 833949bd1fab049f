"""Sets of Pauli strings that one measurement setting reads together."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import overload

import numpy as np

from thalweg.arrays import IntArray, MaskArray
from thalweg.kernels.grouping import members_of, place_commuting, place_qubit_wise
from thalweg.operators.pauli import PauliExpansion
from thalweg.watch import SILENT, Watch

#: Strings placed between two looks at the watch; the largest registers take about 50 ms for so many.
PIECE = 1000


@dataclass(frozen=True, eq=False)
class Groups(Sequence[IntArray]):
    """Sets of indices into an expansion. A set is cut out of `members` when it is asked for: their number alone is wanted more often.

    Attributes:
        members: the indices, set by set.
        ends: where each set ends, shape (number of sets,).
    """

    members: IntArray
    ends: IntArray

    def __len__(self) -> int:
        return self.ends.size

    def __iter__(self) -> Iterator[IntArray]:
        stops = self.ends.tolist()
        return map(self.members.__getitem__, map(slice, [0, *stops], stops))

    @overload
    def __getitem__(self, place: int) -> IntArray: ...
    @overload
    def __getitem__(self, place: slice) -> Sequence[IntArray]: ...
    def __getitem__(self, place: int | slice) -> IntArray | Sequence[IntArray]:
        return tuple(self)[place]


def qubit_wise_groups(expansion: PauliExpansion, *, largest_first: bool = False, watch: Watch = SILENT) -> Groups:
    """Sets whose strings have the same letter wherever two of them act on one qubit: read by one-qubit rotations alone.

    First fit. Strings of many letters go first, which gives few sets; with `largest_first` the large coefficients do
    (sorted insertion, Crawford et al. 2021), which needs fewer shots for the same error.

    Returns:
        Indices into the expansion, ascending within a set. The identity needs no measurement and is in none.
    """
    order = _by_coefficient(expansion) if largest_first else _by_weight(expansion)
    size = len(expansion)
    group = np.empty(size, np.int64)
    # one column a letter and qubit
    clash = np.zeros((1 + size // 64, 3 * expansion.n_qubits), np.uint64)

    def place(begin: int, end: int, count: int) -> int:
        return place_qubit_wise(expansion.x, expansion.z, order, begin, end, group, clash, count)

    return _collect(expansion, group, _in_pieces(place, order.size, watch))


def commuting_groups(expansion: PauliExpansion, watch: Watch = SILENT) -> Groups:
    """Sets whose strings all commute, by sorted insertion (Crawford et al., Quantum 5, 385 (2021)); read after a Clifford circuit.

    Returns:
        Indices into the expansion, ascending within a set. The identity needs no measurement and is in none.
    """
    order = _by_coefficient(expansion)
    size = len(expansion)
    group, newest, older = np.empty(size, np.int64), np.full(size + 1, -1, np.int64), np.full(size, -1, np.int64)

    def place(begin: int, end: int, count: int) -> int:
        return place_commuting(expansion.x, expansion.z, order, begin, end, group, newest, older, count)

    return _collect(expansion, group, _in_pieces(place, order.size, watch))


def group_bases(expansion: PauliExpansion, groups: Groups) -> tuple[MaskArray, MaskArray]:
    """The letter to measure on each qubit for every qubit-wise set, as x and z masks, shape (number of sets,).

    A qubit in neither mask may be measured in any basis.
    """
    x = np.array([np.bitwise_or.reduce(expansion.x[members]) for members in groups], np.uint64)
    z = np.array([np.bitwise_or.reduce(expansion.z[members]) for members in groups], np.uint64)
    return x, z


def _by_weight(expansion: PauliExpansion) -> IntArray:
    weight = np.bitwise_count(expansion.x | expansion.z)
    order = np.argsort(np.uint8(64) - weight, kind="stable")  # bytes are sorted by counting
    return order[: np.count_nonzero(weight)]


def _by_coefficient(expansion: PauliExpansion) -> IntArray:
    # rounded, so that equal coefficients keep their order whatever the noise in the last digit
    order = np.argsort(-np.round(np.abs(expansion.coefficients), 12), kind="stable")
    return order[(expansion.x | expansion.z)[order] != 0]


def _in_pieces(place: Callable[[int, int, int], int], size: int, watch: Watch) -> int:
    count = 0
    for begin in range(0, size, PIECE):
        if begin:
            watch.stage("Sorting the Pauli strings into measurement sets", begin / size)
        count = place(begin, min(begin + PIECE, size), count)
    return count


def _collect(expansion: PauliExpansion, group: IntArray, count: int) -> Groups:
    members, ends = members_of(group, (expansion.x | expansion.z) != 0, count)
    return Groups(members, ends)
