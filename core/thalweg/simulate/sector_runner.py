"""Runs a planned excitation program: rotations forward, and the adjoint sweep back."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import groupby, pairwise

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation
from thalweg.kernels import sector_pieces as kernels
from thalweg.operators.fermion import WeightedDeterminant
from thalweg.operators.sector_layout import SectorKey, SectorLayout, layout_of
from thalweg.simulate.sector_pairs import OneSpin, one_spin, pair_lists
from thalweg.simulate.sector_plan import order_of, stretches
from thalweg.simulate.sector_views import Move, View
from thalweg.watch import SILENT, Watch

#: Bytes of the amplitudes that factors of one spin pass over again and again: within a second-level cache.
CHUNK_BYTES = 2**19
#: Bytes of a set of connected rows that a group of alpha-beta factors passes over: within a first-level cache.
SET_BYTES = 2**15
#: Pair rotations in one kernel call, so that a stop is heard in time.
PAIRS_PER_CALL = 2e7


@dataclass(frozen=True)
class _Segment:
    """Groups of factors for one kernel call: the arrays that `rotate_groups` takes, and which angles go with them."""

    lists: tuple[IntArray | FloatArray | int, ...]
    first: int
    last: int


@dataclass(frozen=True)
class _Compiled:
    """A program as kernel calls; the same for all geometries of a scan.

    Attributes:
        order: positions in the program in the order of the calls, shape (F,).
        start: the first view.
        segments: kernel calls of each stretch.
        moves, returns: to the view of the next stretch (after the last: home) and back; None where the views agree.
    """

    order: IntArray
    start: View
    segments: tuple[tuple[_Segment, ...], ...]
    moves: tuple[Move | None, ...]
    returns: tuple[Move | None, ...]


@lru_cache(maxsize=4)
def compiled(excitations: tuple[Excitation, ...], key: SectorKey) -> _Compiled:
    """The program on the sector with this key; recent ones are kept."""
    layout = layout_of(key)
    plan = stretches(list(excitations), layout.alpha, layout.beta, layout.irrep)
    home = View(layout.alpha, layout.beta, layout.irrep, True)
    views = [stretch.view for stretch in plan]
    segments = []
    row_pairs: dict[bool, _RowPairs] = {}
    begun = 0
    for stretch in plan:
        where = stretch.view
        factors = [excitations[f] for f in stretch.factors]
        if where.rows_are_alpha not in row_pairs:
            row_pairs[where.rows_are_alpha] = _RowPairs(where, list(excitations))
        segments.append(tuple(_segments(where, factors, row_pairs[where.rows_are_alpha], begun)))
        begun += len(factors)
    steps = list(pairwise([*views, home]))
    moves, returns = tuple(_move(a, b) for a, b in steps), tuple(_move(b, a) for a, b in steps)
    return _Compiled(order_of(plan), views[0] if views else home, tuple(segments), moves, returns)


class SectorRunner:
    """One program on one block of amplitudes. Two buffers a state are kept and used again."""

    def __init__(self, excitations: list[Excitation], layout: SectorLayout) -> None:
        self._program = compiled(tuple(excitations), layout.key)
        self._buffers = [np.empty(layout.size) for _ in range(2)]

    def forward(self, begins: tuple[WeightedDeterminant, ...], angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """The state from this combination of determinants, in the home layout; valid until the next call."""
        psi, spare = self._buffers[:2]
        psi[:] = 0.0
        for term in begins:
            place, sign = self._place((term.alpha, term.beta))
            psi[place] = sign * term.amplitude
        cosines, sines = np.cos(angles[self._program.order]), np.sin(angles[self._program.order])
        for segments, move in zip(self._program.segments, self._program.moves, strict=True):
            for s in segments:
                watch.check()
                kernels.rotate_groups(psi, *s.lists, cosines[s.first : s.last], sines[s.first : s.last])
            if move is not None:
                psi, spare = move(psi, spare)
        return psi

    def backward(self, psi: FloatArray, dual: FloatArray, angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """2 <dual|A_f|psi> of each factor with the later ones undone, shape (F,).

        psi comes from `forward`; psi and dual are used up.
        """
        spare = self._buffers[1] if psi is self._buffers[0] else self._buffers[0]
        own = dual
        cosines, sines = np.cos(angles[self._program.order]), np.sin(angles[self._program.order])
        slopes = np.zeros(angles.size)
        for segments, move in zip(reversed(self._program.segments), reversed(self._program.returns), strict=True):
            if move is not None:
                psi, spare = move(psi, spare)
                own, spare = move(own, spare)
            for s in reversed(segments):
                watch.check()
                part = slopes[s.first : s.last]
                kernels.sweep_groups(psi, own, *s.lists, cosines[s.first : s.last], sines[s.first : s.last], part)
        ordered = np.empty_like(slopes)
        ordered[self._program.order] = slopes
        return ordered

    def _place(self, masks: tuple[int, int]) -> tuple[int, float]:
        """Where the determinant stands in the first view, and its sign there."""
        view = self._program.start
        rows, columns = masks if view.rows_are_alpha else masks[::-1]
        sign = view.phase[view.columns.strings == np.uint64(columns)][0]
        return view.layout.index(rows, columns), float(sign)


class _RowPairs:
    """Row pairs of every row excitation of a program in one orientation, and the schedules of its groups."""

    def __init__(self, where: View, excitations: list[Excitation]) -> None:
        parts = [part for e in excitations if (part := one_spin(e, where.rows_are_alpha)) != ((), ())]
        self._which = {part: n for n, part in enumerate(dict.fromkeys(parts))}
        self._pairs, _ = pair_lists(where.rows, list(self._which), rows=True)
        self._rows, self._row_start = where.rows, where.layout.row_start
        self._schedules: dict[tuple[int, ...], _Schedule] = {}

    def schedule(self, parts: list[OneSpin]) -> _Schedule:
        """The schedule of a group of factors with these row excitations, in this order."""
        ids = tuple(self._which[part] for part in parts)
        if ids not in self._schedules:
            self._schedules[ids] = self._scheduled(ids)
        return self._schedules[ids]

    def _scheduled(self, ids: tuple[int, ...]) -> _Schedule:
        pairs = self._pairs
        picked = np.concatenate([np.arange(pairs.first[e, 0], pairs.first[e, -1]) for e in ids])
        factor = np.repeat(np.arange(len(ids)), [pairs.first[e, -1] - pairs.first[e, 0] for e in ids])
        start = pairs.start[picked]
        sets, sizes = kernels.row_sets(start, pairs.end[picked], self._rows.size)
        irreps = self._rows.irreps[start]
        order = np.lexsort((factor, sets, irreps))
        first = np.searchsorted(irreps[order], np.arange(self._rows.n_irreps + 1))
        picked = picked[order]
        lists = (self._row_start[pairs.start[picked]], self._row_start[pairs.end[picked]], pairs.sign[picked], factor[order])
        return _Schedule(len(self._schedules), first, lists, int(sizes.max(initial=1)))


@dataclass(frozen=True)
class _Schedule:
    """Row pairs of a group, set by set; `first` (G + 1,) by irrep; `largest`: rows of the largest set."""

    number: int
    first: IntArray
    lists: tuple[IntArray | FloatArray, ...]
    largest: int

    @property
    def size(self) -> int:
        return int(self.first[-1])


def _joined(schedules: list[_Schedule]) -> tuple[IntArray | FloatArray, ...]:
    """Schedules behind each other, as `rotate_groups` takes them."""
    shifts = np.concatenate([[0], np.cumsum([s.size for s in schedules])])
    first = np.stack([s.first + shift for s, shift in zip(schedules, shifts[:-1], strict=True)])
    return (first, *(np.concatenate(column) for column in zip(*(s.lists for s in schedules), strict=True)))


def _move(source: View, target: View) -> Move | None:
    same = source.rows_are_alpha == target.rows_are_alpha and source.last == target.last
    return None if same else Move(source, target)


def _segments(where: View, factors: list[Excitation], rows: _RowPairs, begun: int) -> list[_Segment]:
    """The kernel calls of one stretch; groups are neighbours with one column excitation."""
    columns = _ColumnChunks(where, factors)
    schedules: dict[int, _Schedule] = {}
    calls: list[list[tuple[int, int, int, int]]] = [[]]
    bounds, work, f = [0], 0.0, 0
    for part, members in groupby(factors, key=lambda e: one_spin(e, not where.rows_are_alpha)):
        group = list(members)
        schedule = rows.schedule([one_spin(e, where.rows_are_alpha) for e in group])
        schedules[schedule.number] = schedule
        first, last, pairs = columns.chunks(part, schedule.largest)
        cost = schedule.size * pairs / max(where.rows.n_irreps, 1)
        if calls[-1] and work + cost > PAIRS_PER_CALL:
            calls.append([])
            bounds.append(f)
            work = 0.0
        calls[-1].append((f - bounds[-1], schedule.number, first, last))
        work += cost
        f += len(group)
    bounds.append(f)
    place = {number: n for n, number in enumerate(schedules)}
    lists = (where.irrep, *_joined(list(schedules.values())), *columns.arrays())
    found = []
    for call, low, high in zip(calls, bounds[:-1], bounds[1:], strict=True):
        groups = np.array([(first, place[number], *chunks) for first, number, *chunks in call], np.int64)
        found.append(_Segment((*lists, groups), begun + low, begun + high))
    return found


class _ColumnChunks:
    """Pieces of the column excitations of one view, in chunks that stay in the cache."""

    def __init__(self, where: View, factors: list[Excitation]) -> None:
        self._where = where
        parts = list(dict.fromkeys(one_spin(e, not where.rows_are_alpha) for e in factors))
        self._number = {part: n for n, part in enumerate(parts)}
        self._pairs, _ = pair_lists(where.columns, parts, rows=False, phase=where.phase)
        self._tables: list[list[list[int]]] = []
        self._pieces: list[IntArray] = []
        self._total = 0
        self._cut: dict[tuple[OneSpin, int], tuple[int, int, int]] = {}

    def chunks(self, part: OneSpin, rows: int) -> tuple[int, int, int]:
        """(first chunk, last chunk, pairs of columns) of a column excitation for sets of so many rows."""
        bytes_a_row = CHUNK_BYTES // rows if part == ((), ()) else SET_BYTES // (2 * rows)  # two columns a pair
        limit = max(16, bytes_a_row // 64 * 8)
        if (part, limit) not in self._cut:
            self._cut[part, limit] = self._cut_up(self._number[part], limit)
        return self._cut[part, limit]

    def arrays(self) -> tuple[IntArray, IntArray]:
        n_irreps = self._where.columns.n_irreps
        pieces = np.concatenate(self._pieces) if self._pieces else np.empty(0, np.int64)
        return np.array(self._tables, np.int64).reshape(-1, n_irreps, 9), pieces

    def _cut_up(self, n: int, limit: int) -> tuple[int, int, int]:
        first = self._pairs.first[n].tolist()
        longest = max(high - low for low, high in pairwise(first))
        count = -(-longest // limit)
        step = -(-longest // max(count, 1))  # chunks of about equal size
        begin = len(self._tables)
        for start in range(0, longest, max(step, 1)):
            bounds = [(min(low + start, high), min(low + start + step, high)) for low, high in pairwise(first)]
            self._tables.append([self._cut_pieces(low, high) for low, high in bounds])
        return begin, len(self._tables), first[-1] - first[0]

    def _cut_pieces(self, low: int, high: int) -> list[int]:
        pairs = self._pairs
        scratch = np.empty((3, high - low), np.int64)
        bounds = kernels.cut_pieces(pairs.start[low:high], pairs.end[low:high], pairs.sign[low:high], *scratch)
        self._pieces.append(scratch[2, : bounds[-1]].copy())
        found = [self._total + int(b) for b in bounds]
        self._total = found[-1]
        return found
