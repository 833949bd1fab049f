"""The search for the lowest level and the first one above it, block by block."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from thalweg.exact.lanczos import DENSE_STATES, Enough, Level, dense_levels, lowest_state, random_start
from thalweg.exact.spin_blocks import Block
from thalweg.watch import Watch

#: Relative to the sum of |coefficients|: the residual that counts as converged.
RESIDUAL = 1e-10
#: The same for a level that is already known to lie above the lowest one: its energy errs by about the square of this.
RESIDUAL_ABOVE = 1e-7
#: Relative to the same sum: the distance within which levels are one.
SAME_LEVEL = 1e-9
#: An energy is taken to be at most this many residuals from the level.
DISTANCE = 10.0
#: Copies of a level looked for in one block.
MAX_COPIES = 40
#: Vectors that a search holds beside the chain that it keeps.
WORKING_VECTORS = 6


@dataclass(frozen=True)
class Found:
    """One eigenstate met; only those of the lowest level keep their vector and block."""

    energy: float
    residual: float
    converged: bool
    block: Block | None
    vector: Any


@dataclass
class LevelSearch:
    """Levels found so far."""

    scale: float
    budget_bytes: int
    watch: Watch
    levels: list[Found] = field(default_factory=list)
    best: float = np.inf
    n_blocks: int = 0
    largest: int = 0
    has_more: bool = False

    @property
    def same(self) -> float:
        return SAME_LEVEL * self.scale

    def visit(self, block: Block) -> None:
        """Finds the copies of the lowest level so far that the block holds, and its first level above."""
        if block.dimension == 0:
            return
        self.n_blocks, self.largest = self.n_blocks + 1, max(self.largest, block.dimension)
        levels = self._dense(block) if block.dimension <= DENSE_STATES else self._searched(block)
        self.best = min(self.best, *(level.energy for level in levels))
        self.levels += [Found(level.energy, level.residual, level.converged, block, level.vector) for level in levels]
        limit = self.best + self.same
        self.levels = [found if found.energy <= limit else replace(found, block=None, vector=None) for found in self.levels]

    def ground(self) -> list[tuple[Block, Any]]:
        """(block, vector) of each copy of the lowest level."""
        return [(found.block, found.vector) for found in self.levels if found.block is not None]

    def ground_residual(self) -> float:
        return max(found.residual for found in self.levels if found.block is not None)

    def gap(self) -> float | None:
        above = [found.energy for found in self.levels if found.block is None]
        return min(above) - self.best if above else None

    def _judge(self, lowest: float) -> Enough:
        """A level above the lowest need not be sharp, and one above the first excited level need not be known at all."""
        first_above = min((found.energy for found in self.levels if found.energy > lowest + self.same), default=np.inf)

        def is_enough(energy: float, residual: float) -> bool:
            bound = energy - DISTANCE * residual
            above = bound > lowest + self.same and residual <= RESIDUAL_ABOVE * self.scale
            return residual <= RESIDUAL * self.scale or above or bound > max(first_above, lowest + self.same)

        return is_enough

    def _dense(self, block: Block) -> list[Level]:
        levels = dense_levels(block.apply, block.dimension, block.dtype, self.watch)
        lowest = min(self.best, levels[0].energy)
        kept = [level for level in levels if level.energy <= lowest + self.same]
        return kept + levels[len(kept) : len(kept) + 1]

    def _searched(self, block: Block) -> list[Level]:
        found: list[Level] = []
        while len(found) < block.dimension:
            room = int(0.5 * self.budget_bytes / (block.dimension * block.dtype.itemsize)) - WORKING_VECTORS - len(found)
            start = random_start(block.dimension, block.dtype, seed=1 + len(found), watch=self.watch)
            vectors = [level.vector for level in found]
            enough = self._judge(min([self.best, *(level.energy for level in found)]))
            level = lowest_state(block.apply, start, is_enough=enough, watch=self.watch, found=vectors, room=room)
            found.append(level)
            if level.energy > min([self.best, *(level.energy for level in found)]) + self.same:
                break
            if len(found) > MAX_COPIES:
                self.has_more = True
                break
        return found
