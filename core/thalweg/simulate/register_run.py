"""Runs a plan forwards on a state, and backwards on a state and its adjoint."""

from __future__ import annotations

from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.kernels import register as kernels
from thalweg.kernels.register_phases import table_scratch
from thalweg.parts import run_parts
from thalweg.simulate.register_passes import Pass, Plan
from thalweg.simulate.register_plan import FIRST
from thalweg.watch import Watch

#: Operations times amplitudes between two looks at the watch, about 5 ms; an operation on both states counts four times.
PART = 2**24


class PlanRunner:
    """Holds the scratch memory of a plan; not to be used by two callers at a time."""

    def __init__(self, plan: Plan, threads: int = 1) -> None:
        self._plan, self._threads = plan, threads if plan.n_qubits > plan.largest_tile else 1
        self._workers = [_Worker(plan) for _ in range(self._threads)]

    @staticmethod
    def bytes_needed(plan: Plan, threads: int = 1) -> int:
        """What the scratch memory takes."""
        return threads * ((16 * plan.table_rows + 40) << plan.largest_tile)

    def forward(self, state: FloatArray, angles: FloatArray, watch: Watch) -> None:
        """Applies the gates in place."""
        entries = self._plan.rotations.entries(angles)
        for part in self._plan.passes:
            self._run(part, part.operations, (state, state), 0, entries, watch)

    def backward(self, state: FloatArray, adjoint: FloatArray, angles: FloatArray, watch: Watch) -> FloatArray:
        """Undoes the gates on both; returns dE/d(angle) of each rotation for adjoint = H state, shape of the angles."""
        entries = self._plan.rotations.entries(-angles)
        for worker in self._workers:
            worker.gradient[:] = 0.0
        for part in reversed(self._plan.passes):
            self._run(part, np.ascontiguousarray(part.operations[::-1]), (state, adjoint), 1, entries, watch)
        total: FloatArray = sum((worker.gradient for worker in self._workers[1:]), self._workers[0].gradient)[FIRST:].copy()
        return total

    def _run(self, part: Pass, operations: Any, states: Any, both: int, entries: FloatArray, watch: Watch) -> None:
        size, unit = 1 << part.local_bits, self._plan.unit
        layout = (unit, part.fixed, part.offsets, part.chunk)
        works = [worker.for_tiles(part) for worker in self._workers]

        def tiles(first: int, last: int, number: int) -> float:
            worker = self._workers[number]
            scratch = states if part.tiles == 1 else worker.tiles(size << unit)
            kernels.run_tiles(states, scratch, both, first, last, *layout, operations, part.groups, works[number], entries, worker.gradient)
            return 0.0

        def stream(first: int, last: int, number: int) -> float:
            kernels.turn_parts(states, both, first, last, operations[0], entries, self._workers[number].gradient)
            return 0.0

        if part.streamed:
            run_parts(stream, states[0].size >> 4, 16 << 2 * both, PART, watch, self._threads)
        else:
            run_parts(tiles, part.tiles, part.cost * size << 2 * both, PART, watch, self._threads)


class _Worker:
    """Scratch memory of one thread."""

    def __init__(self, plan: Plan) -> None:
        tile = 1 << plan.largest_tile
        self._scratch = [aligned(tile << plan.unit) for _ in range(2)]
        self._tables = aligned(plan.table_rows * 2 * tile)
        self._made = np.zeros(plan.table_rows, dtype=bool)
        self._moments = aligned(tile)
        self._table_scratch = table_scratch()
        self.gradient = np.zeros(FIRST + plan.rotations.factor.size)

    def tiles(self, positions: int) -> tuple[FloatArray, FloatArray]:
        return self._scratch[0][:positions], self._scratch[1][:positions]

    def for_tiles(self, part: Pass) -> tuple[Any, ...]:
        """`work` of `kernels.register_phases`, with no table made."""
        if part.streamed:
            return ()
        size = 1 << part.local_bits
        self._made[:] = False
        tables = self._tables[: part.table_rows * 2 * size].reshape(part.table_rows, 2 * size)
        return tables, self._made, self._moments[:size], self._table_scratch


def aligned(size: int) -> FloatArray:
    """Uninitialised doubles that begin on a cache line."""
    raw = np.empty(8 * size + 64, dtype=np.uint8)
    start = -raw.ctypes.data % 64
    return raw[start : start + 8 * size].view(np.float64)
