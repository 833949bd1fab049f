"""Passes over memory as the arrays that the tile kernels read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from thalweg.arrays import IntArray
from thalweg.circuit.program import GateProgram
from thalweg.kernels import register as kernels
from thalweg.kernels.register_phases import KEPT_KEYS
from thalweg.simulate.register_plan import NOTHING, Rotations, Step, fused_steps, is_real, needs_whole_register, passes

COLUMNS = 7
#: The lowest qubits are local in every tile, so that memory is read in whole cache lines.
CHUNK_BITS = 3
#: Steps times amplitudes of a tile: more is split into several passes, so that none runs long without a look at the watch.
MOST_COST = 2**24


@dataclass(frozen=True)
class Pass:
    """One sweep over all tiles.

    Attributes:
        tiles: number of tiles.
        local_bits: t.
        fixed, offsets, chunk, operations, groups: see `kernels.register` and `kernels.register_phases`.
        table_rows: rows of 2^t complex numbers that the diagonal groups need.
        cost: operations on the whole register, to judge how long a part of the pass takes.
        streamed: a single rotation that is done along the whole register instead of by tiles.
    """

    tiles: int
    local_bits: int
    fixed: Any
    offsets: Any
    chunk: int
    operations: Any
    groups: tuple[Any, ...]
    table_rows: int
    cost: int
    streamed: bool


@dataclass(frozen=True)
class Plan:
    """A whole program. `unit` is 1 for complex and 0 for real amplitudes; n_qubits is at least 3 (spare qubits stay in 0)."""

    n_qubits: int
    unit: int
    passes: tuple[Pass, ...]
    rotations: Rotations

    @property
    def largest_tile(self) -> int:
        return max((p.local_bits for p in self.passes if not p.streamed), default=0)

    @property
    def table_rows(self) -> int:
        return max((p.table_rows for p in self.passes), default=0)


def plan(program: GateProgram, tile_bytes_bits: int) -> Plan:
    """Works out the passes. A tile takes 2^tile_bytes_bits bytes, and holds at least one qubit beside the CHUNK_BITS lowest."""
    unit = 0 if is_real(program) else 1
    n = max(program.n_qubits, 3)
    tile_bits = min(n, max(CHUNK_BITS + 1, tile_bytes_bits - 3 - unit))
    steps, rotations = fused_steps(program)
    most_steps = max(1, MOST_COST >> tile_bits)
    made = []
    for local, taken in passes(steps, n, tile_bits, CHUNK_BITS, most_steps):
        streamed = n > tile_bits and needs_whole_register(taken[0], tile_bits, CHUNK_BITS)
        made.append(_pass(taken, local, n, unit, streamed))
    return Plan(n, unit, tuple(made), rotations)


def _pass(steps: list[Step], local: list[int], n: int, unit: int, streamed: bool) -> Pass:
    fixed = [q for q in range(n) if q not in local]
    low = CHUNK_BITS
    while low < len(local) and local[low] == low:  # rows are as long as the lowest local qubits reach without a gap
        low += 1
    offsets = np.zeros(1, dtype=np.int64)
    for q in local[low:]:
        offsets = np.concatenate([offsets, offsets + (1 << q + unit)])
    operations = _Operations(local, fixed, unit)
    for step in steps:
        operations.add(step)
    operations.flush()
    rows = _matrix(operations.rows, COLUMNS)
    groups, table_rows = _phase_groups([step for step in steps if step.kind == "phases"], local, fixed)
    return Pass(1 << len(fixed), len(local), np.array(fixed, np.int64), offsets, 1 << low + unit, rows, groups, table_rows, 2 + len(rows), streamed)


class _Operations:
    """Gathers single-qubit gates that commute, so that three of them share one walk over the tile."""

    def __init__(self, local: list[int], fixed: list[int], unit: int) -> None:
        self._local, self._fixed, self._unit = local, sum(1 << q for q in fixed), unit
        self._place = {q: i for i, q in enumerate(local)}
        self._open: dict[int, int] = {}  # qubit -> gate
        self._groups = 0
        self.rows: list[list[int]] = []

    def add(self, step: Step) -> None:
        opened = sum(1 << q for q in self._open)
        if step.kind == "mix":
            if step.flips & opened:
                self.flush()
            self._open[step.flips.bit_length() - 1] = step.gate
            return
        if step.support & opened:
            self.flush()
        self._row(*self._single(step))

    def flush(self) -> None:
        by_bit = {self._place[q] + self._unit: gate for q, gate in sorted(self._open.items())}
        lanes = {bit: gate for bit, gate in by_bit.items() if bit < 3}
        wide = [(gate, bit) for bit, gate in by_bit.items() if bit >= 3]
        if lanes:
            self._row(kernels.MIX_LANES, *(lanes.get(bit, NOTHING) for bit in range(3)), int(0 not in lanes))
        if len(wide) % 3 == 2:
            spare = [bit for bit in range(3, len(self._local) + self._unit) if bit not in by_bit]
            wide = sorted([*wide, *((NOTHING, bit) for bit in spare[:1])], key=lambda entry: entry[1])  # the kernel takes ascending bits
        while len(wide) >= 3:
            (a, p), (b, q), (c, r) = wide[:3]
            self._row(kernels.MIX_THREE, a, b, c, p, q, r)
            wide = wide[3:]
        for gate, bit in wide:
            self._row(kernels.MIX_ONE, gate, bit)
        self._open = {}

    def _single(self, step: Step) -> tuple[int, ...]:
        if step.kind == "phases":
            self._groups += 1
            return kernels.PHASES, self._groups - 1, int(bool(step.terms))
        if step.kind == "flip":
            control = step.support & ~step.flips
            return kernels.FLIP, self._positions(control), self._positions(step.flips), control & self._fixed
        y_count = (step.flips & step.z).bit_count()
        even = 1 - y_count % 2  # -i P then also exchanges real and imaginary parts
        kappa = 1 if y_count % 4 in (0, 3) else -1
        return kernels.TURN, step.gate, self._positions(step.flips) | even, self._positions(step.z) | even, step.z & self._fixed, kappa

    def _positions(self, mask: int) -> int:
        return compressed(mask, self._local) << self._unit

    def _row(self, *values: int) -> None:
        self.rows.append([*values, *[0] * (COLUMNS - len(values))])


def compressed(mask: int, local: list[int]) -> int:
    """The bits of the mask at the local qubits, pushed together."""
    return sum((mask >> q & 1) << i for i, q in enumerate(local))


def _phase_groups(groups: list[Step], local: list[int], fixed: list[int]) -> tuple[tuple[Any, ...], int]:
    """The tuple that `kernels.register_phases` describes, and the table rows needed."""
    outside, lasting = sum(1 << q for q in fixed), int(bool(fixed))
    terms: list[tuple[int, int, int]] = []
    pairs: list[tuple[int, int]] = []
    keys: list[int] = []
    index, rows = [], 0
    for step in groups:
        starts = len(terms), len(pairs), len(keys)
        terms += sorted((compressed(z, local), z & outside, gate) for z, gate in step.terms)
        pairs += sorted((compressed(pair, local), pair & outside) for pair in step.pairs)
        joining = {row[1] for row in (*terms[starts[0] :], *pairs[starts[1] :]) if row[0] and row[1]}
        keys += sorted(joining)
        index.append((starts[0], len(terms), starts[1], len(pairs), starts[2], len(keys), rows, lasting))
        if lasting:  # otherwise every table serves once, and all groups share the first row
            rows += 1 + (0 if not joining else 1 << len(joining) if len(joining) <= KEPT_KEYS else 1)
    columns = (_matrix(index, 8), _matrix(terms, 3), _matrix(pairs, 2), np.array(keys, dtype=np.int64))
    return columns, rows if lasting else int(bool(groups))


def _matrix(rows: list[Any], columns: int) -> IntArray:
    return np.array(rows, dtype=np.int64).reshape(-1, columns)
