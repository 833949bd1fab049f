"""Runs a plan forwards on a state, and backwards on a state and its adjoint."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.kernels import register as kernels
from thalweg.kernels.register_phases import table_scratch
from thalweg.simulate.register_passes import Pass, Plan
from thalweg.simulate.register_plan import FIRST
from thalweg.watch import Watch

#: Operations times amplitudes between two looks at the watch, about 5 ms; an operation on both states counts four times.
PART = 2**24


class PlanRunner:
    """Holds the scratch memory of a plan; not to be used by two threads at a time."""

    def __init__(self, plan: Plan) -> None:
        self._plan = plan
        tile = 1 << plan.largest_tile
        self._scratch = [aligned(tile << plan.unit) for _ in range(2)]
        self._tables = aligned(plan.table_rows * 2 * tile)
        self._made = np.zeros(plan.table_rows, dtype=bool)
        self._moments = aligned(tile)
        self._table_scratch = table_scratch()

    @staticmethod
    def bytes_needed(plan: Plan) -> int:
        """What the scratch memory takes."""
        return (16 * plan.table_rows + 40) << plan.largest_tile

    def forward(self, state: FloatArray, angles: FloatArray, watch: Watch) -> None:
        """Applies the gates in place."""
        entries = self._plan.rotations.entries(angles)
        for part in self._plan.passes:
            self._run(part, part.operations, (state, state), 0, entries, np.empty(len(entries)), watch)

    def backward(self, state: FloatArray, adjoint: FloatArray, angles: FloatArray, watch: Watch) -> FloatArray:
        """Undoes the gates on both; returns dE/d(angle) of each rotation for adjoint = H state, shape of the angles."""
        entries = self._plan.rotations.entries(-angles)
        gradient = np.zeros(len(entries))
        for part in reversed(self._plan.passes):
            self._run(part, np.ascontiguousarray(part.operations[::-1]), (state, adjoint), 1, entries, gradient, watch)
        return gradient[FIRST:]

    def _run(self, part: Pass, operations: Any, states: Any, both: int, entries: FloatArray, gradient: FloatArray, watch: Watch) -> None:
        if part.streamed:
            for first, last in _parts(states[0].size >> 4, 16 << 2 * both):
                watch.check()
                kernels.turn_parts(states, both, first, last, operations[0], entries, gradient)
            return
        size, unit = 1 << part.local_bits, self._plan.unit
        scratch = states if part.tiles == 1 else tuple(buffer[: size << unit] for buffer in self._scratch)
        tables = self._tables[: part.table_rows * 2 * size].reshape(part.table_rows, 2 * size)
        work = (tables, self._made, self._moments[:size], self._table_scratch)
        self._made[:] = False
        layout = (unit, part.fixed, part.offsets, part.chunk)
        for first, last in _parts(part.tiles, part.cost * size << 2 * both):
            watch.check()
            kernels.run_tiles(states, scratch, both, first, last, *layout, operations, part.groups, work, entries, gradient)


def aligned(size: int) -> FloatArray:
    """Uninitialised doubles that begin on a cache line."""
    raw = np.empty(8 * size + 64, dtype=np.uint8)
    start = -raw.ctypes.data % 64
    return raw[start : start + 8 * size].view(np.float64)


def _parts(count: int, cost: int) -> Iterator[tuple[int, int]]:
    """Ranges of 0:count whose cost, that of one item times their length, stays near PART."""
    step = max(1, PART // cost)
    for first in range(0, count, step):
        yield first, min(count, first + step)
