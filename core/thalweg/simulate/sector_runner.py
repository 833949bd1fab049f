"""Runs a planned excitation program: rotations forward, and the adjoint sweep back."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import groupby

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation
from thalweg.kernels import sector_pieces as kernels
from thalweg.operators.sector_layout import SectorLayout
from thalweg.simulate.sector_pairs import OneSpin, SpinPairs, one_spin, pair_lists
from thalweg.simulate.sector_plan import order_of, stretches
from thalweg.simulate.sector_views import Move, View
from thalweg.watch import SILENT, Watch

#: Bytes of one chunk of columns of a state; psi and its dual together stay in a second-level cache.
CHUNK_BYTES = 2**19
#: Pair rotations in one kernel call, so that a stop is heard in time.
PAIRS_PER_CALL = 2e7


@dataclass(frozen=True)
class _Segment:
    """Groups of factors for one kernel call: the arrays that `rotate_groups` takes, and which angles go with them."""

    lists: tuple[IntArray | FloatArray | int, ...]
    first: int
    last: int


class SectorRunner:
    """One program on one block of amplitudes. Two buffers a state are kept and used again."""

    def __init__(self, excitations: list[Excitation], layout: SectorLayout) -> None:
        plan = stretches(excitations, layout.alpha, layout.beta, layout.irrep)
        self.order = order_of(plan)
        self._layout = layout
        home = View(layout.alpha, layout.beta, layout.irrep, True)
        self._segments: list[list[_Segment]] = []
        self._moves: list[Move | None] = []
        self._returns: list[Move | None] = []
        row_pairs: dict[bool, _RowPairs] = {}
        begun = 0
        for n, stretch in enumerate(plan):
            where = stretch.view
            factors = [excitations[f] for f in stretch.factors]
            if where.rows_are_alpha not in row_pairs:
                row_pairs[where.rows_are_alpha] = _RowPairs(where, excitations)
            self._segments.append(_segments(where, factors, row_pairs[where.rows_are_alpha], begun))
            begun += len(factors)
            following = plan[n + 1].view if n + 1 < len(plan) else home
            self._moves.append(_move(where, following))
            self._returns.append(_move(following, where))
        self._start_view = plan[0].view if plan else home
        self._buffers = [np.empty(layout.size) for _ in range(4)]

    def forward(self, start: tuple[int, int], angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """The state from the determinant with these (alpha, beta) masks, in the home layout; valid until the next call."""
        psi, spare = self._buffers[:2]
        psi[:] = 0.0
        psi[self._start_place(start)] = self._start_sign(start)
        cosines, sines = np.cos(angles[self.order]), np.sin(angles[self.order])
        for segments, move in zip(self._segments, self._moves, strict=True):
            for s in segments:
                watch.check()
                kernels.rotate_groups(psi, *s.lists, cosines[s.first : s.last], sines[s.first : s.last])
            if move is not None:
                move(psi, spare)
                psi, spare = spare, psi
        return psi

    def backward(self, psi: FloatArray, dual: FloatArray, angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """2 <dual|A_f|psi> of each factor with the later ones undone, shape (F,); psi comes from `forward` and is used up."""
        spare = self._buffers[1] if psi is self._buffers[0] else self._buffers[0]
        own, spare_dual = self._buffers[2:]
        own[:] = dual
        cosines, sines = np.cos(angles[self.order]), np.sin(angles[self.order])
        slopes = np.zeros(angles.size)
        for segments, move in zip(reversed(self._segments), reversed(self._returns), strict=True):
            if move is not None:
                move(psi, spare)
                move(own, spare_dual)
                psi, spare, own, spare_dual = spare, psi, spare_dual, own
            for s in reversed(segments):
                watch.check()
                part = slopes[s.first : s.last]
                kernels.sweep_groups(psi, own, *s.lists, cosines[s.first : s.last], sines[s.first : s.last], part)
        ordered = np.empty_like(slopes)
        ordered[self.order] = slopes
        return ordered

    def _start_place(self, start: tuple[int, int]) -> int:
        rows, columns = start if self._start_view.rows_are_alpha else start[::-1]
        return self._start_view.layout.index(rows, columns)

    def _start_sign(self, start: tuple[int, int]) -> float:
        columns = start[1] if self._start_view.rows_are_alpha else start[0]
        return float(self._start_view.phase[self._start_view.columns.strings == np.uint64(columns)][0])


class _RowPairs:
    """Row pairs of every row excitation of a program in one orientation, shared by all views of that orientation."""

    def __init__(self, where: View, excitations: list[Excitation]) -> None:
        parts = [part for e in excitations if (part := one_spin(e, where.rows_are_alpha)) != ((), ())]
        self._which = {part: n for n, part in enumerate(dict.fromkeys(parts))}
        pairs, _ = pair_lists(where.rows, list(self._which), rows=True)
        start = where.layout.row_start
        self.lists = (pairs.first, start[pairs.start], start[pairs.end], pairs.sign)
        self._pairs = np.diff(pairs.first[:, [0, -1]], axis=1)[:, 0] if len(self._which) else np.zeros(0, np.int64)

    def index(self, part: OneSpin) -> int:
        return self._which[part]

    def count(self, part: OneSpin) -> int:
        return int(self._pairs[self._which[part]])


def _move(source: View, target: View) -> Move | None:
    same = source.rows_are_alpha == target.rows_are_alpha and source.last == target.last
    return None if same else Move(source, target)


def _segments(where: View, factors: list[Excitation], rows: _RowPairs, begun: int) -> list[_Segment]:
    """The kernel calls of one stretch; groups are neighbours with one column excitation."""
    columns = _ColumnChunks(where, factors)
    calls: list[list[tuple[int, int, int, int]]] = [[]]
    work = 0.0
    row_ids, f = [], 0
    for part, members in groupby(factors, key=lambda e: one_spin(e, not where.rows_are_alpha)):
        group = list(members)
        row_ids += [rows.index(one_spin(e, where.rows_are_alpha)) for e in group]
        first, last, pairs = columns.chunks(part)
        cost = sum(rows.count(one_spin(e, where.rows_are_alpha)) for e in group) * pairs / max(where.rows.n_irreps, 1)
        if calls[-1] and work + cost > PAIRS_PER_CALL:
            calls.append([])
            work = 0.0
        calls[-1].append((f, f + len(group), first, last))
        work += cost
        f += len(group)
    chunk_first, pieces = columns.arrays()
    found = []
    ids = np.array(row_ids, np.int64)
    for call in calls:
        groups = np.array(call, np.int64).reshape(-1, 4)
        first, last = call[0][0], call[-1][1]
        groups[:, :2] -= first
        found.append(_Segment((where.irrep, *rows.lists, chunk_first, pieces, groups, ids[first:last]), begun + first, begun + last))
    return found


class _ColumnChunks:
    """Pieces of the column excitations of one view, in chunks that stay in the cache."""

    def __init__(self, where: View, factors: list[Excitation]) -> None:
        self._where = where
        parts = list(dict.fromkeys(one_spin(e, not where.rows_are_alpha) for e in factors))
        pairs, _ = pair_lists(where.columns, parts, rows=False, phase=where.phase)
        self._tables: list[IntArray] = []
        self._pieces: list[IntArray] = []
        self._total = 0
        self._chunks = {part: self._cut(part, pairs, n) for n, part in enumerate(parts)}

    def chunks(self, part: OneSpin) -> tuple[int, int, int]:
        """(first chunk, last chunk, pairs of columns)."""
        return self._chunks[part]

    def arrays(self) -> tuple[IntArray, IntArray]:
        n_irreps = self._where.columns.n_irreps
        pieces = np.concatenate(self._pieces) if self._pieces else np.empty(0, np.int64)
        return np.array(self._tables, np.int64).reshape(-1, n_irreps, 5), pieces

    def _cut(self, part: OneSpin, pairs: SpinPairs, n: int) -> tuple[int, int, int]:
        columns = self._where.columns
        limit = max(8, CHUNK_BYTES // (8 * max(self._where.rows.size, 1)) // 8 * 8)
        if part != ((), ()):
            limit = max(8, limit // 2)  # two columns a pair
        first = pairs.first[n]
        longest = int(np.max(np.diff(first), initial=0))
        begin = len(self._tables)
        for start in range(0, longest, limit):
            table = []
            for k in range(columns.n_irreps):
                low, high = min(first[k] + start, first[k + 1]), min(first[k] + start + limit, first[k + 1])
                table.append(self._cut_piece(pairs, int(low), int(high)))
            self._tables.append(np.array(table))
        return begin, len(self._tables), int(first[-1] - first[0])

    def _cut_piece(self, pairs: SpinPairs, low: int, high: int) -> list[int]:
        scratch = np.empty((3, high - low), np.int64)
        bounds = kernels.cut_pieces(pairs.start[low:high], pairs.end[low:high], pairs.sign[low:high], *scratch)
        self._pieces.append(scratch[2, : bounds[-1]].copy())
        found = [self._total + int(b) for b in bounds]
        self._total = found[-1]
        return found
