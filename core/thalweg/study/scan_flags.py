"""Where a curve is not smooth: jumps between neighbours, stalled points, and changes of spin."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

#: A jump is this many times larger than the steps on either side of it.
JUMP_RATIO = 4.0
#: Two values of <S^2> that differ by more than this are different spins.
SPIN_STEP = 0.25


@dataclass(frozen=True)
class SpinCrossing:
    """The exact ground state changes its spin between two neighbouring points."""

    left: float
    right: float
    left_s_squared: float
    right_s_squared: float

    def sentence(self) -> str:
        return f"the exact state changes from S^2 = {self.left_s_squared:.2f} at {self.left:g} to {self.right_s_squared:.2f} at {self.right:g}"


def jumps(values: Sequence[float | None], tolerance: float) -> tuple[int, ...]:
    """Indices of points that jump against their neighbours: the higher end of every step that neither side explains.

    `values` are errors (variational minus exact) in order along the curve, None where a point is missing. A step counts when it is
    larger than `tolerance`, larger than JUMP_RATIO times the steps beside it, and not foreseen by a straight line from either side.
    """
    known = [(i, v) for i, v in enumerate(values) if v is not None]
    found: set[int] = set()
    for n in range(len(known) - 1):
        (i, y0), (j, y1) = known[n], known[n + 1]
        step = y1 - y0
        before = y0 - known[n - 1][1] if n > 0 else None
        after = known[n + 2][1] - y1 if n + 2 < len(known) else None
        beside = [abs(s) for s in (before, after) if s is not None]
        if abs(step) <= tolerance or not beside:
            continue
        spike = after is not None and abs(step + after) < 0.5 * abs(step)  # up and down again: the next step is the same jump
        if spike:
            beside = [abs(before)] if before is not None else [0.0]
        came_down = before is not None and abs(step + before) < 0.5 * abs(step)
        if came_down:
            beside = [abs(after)] if after is not None else [0.0]
        if abs(step) > JUMP_RATIO * max(beside) and all(abs(step - s) > tolerance for s in (before, after) if s is not None):
            found.add(j if step > 0 else i)
    return tuple(sorted(found))


def spin_crossings(coordinates: Sequence[float], s_squared: Sequence[float | None]) -> tuple[SpinCrossing, ...]:
    """Neighbouring points between which the exact state changes its spin."""
    known = [(x, s) for x, s in zip(coordinates, s_squared, strict=True) if s is not None]
    pairs = itertools.pairwise(known)
    return tuple(SpinCrossing(a[0], b[0], a[1], b[1]) for a, b in pairs if abs(a[1] - b[1]) > SPIN_STEP)


def extremum_of_second_derivative(coordinates: Sequence[float], energies: Sequence[float]) -> float | None:
    """Where |d2E/dx2| is largest inside the curve (a quantum phase transition shows there); None with fewer than 5 points."""
    x, e = np.asarray(coordinates, float), np.asarray(energies, float)
    if x.size < 5:
        return None
    second = np.gradient(np.gradient(e, x), x)[2:-2]
    return float(x[2:-2][int(np.argmax(np.abs(second)))]) if second.size else None
