"""Where a curve is not smooth: jumps between neighbours, stalled points, and changes of spin."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray

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


def jumps(coordinates: Sequence[float], values: Sequence[float | None], tolerance: float) -> tuple[int, ...]:
    """Indices of points that jump against their neighbours: the higher end of every step that neither side explains.

    `values` are errors (variational minus exact) along the curve, None where a point is missing. A step counts when it is larger than
    `tolerance`, larger than JUMP_RATIO times what the slopes beside it foresee over the same distance, and off from both by `tolerance`.
    """
    known = [(i, x, v) for i, (x, v) in enumerate(zip(coordinates, values, strict=True)) if v is not None]
    steps = [_Step(i, j, x1 - x0, y1 - y0) for (i, x0, y0), (j, x1, y1) in itertools.pairwise(known)]
    found: set[int] = set()
    for n, step in enumerate(steps):
        before = steps[n - 1] if n > 0 else None
        after = steps[n + 1] if n + 1 < len(steps) else None
        foreseen = [step.width * other.height / other.width for other in _own_jump_left_out(before, step, after)]
        if abs(step.height) <= tolerance or not (before or after):
            continue
        unusual = abs(step.height) > JUMP_RATIO * max((abs(f) for f in foreseen), default=0.0)
        if unusual and all(abs(step.height - f) > tolerance for f in foreseen):
            found.add(step.last if step.height > 0 else step.first)
    return tuple(sorted(found))


@dataclass(frozen=True)
class _Step:
    """From one known point to the next."""

    first: int
    last: int
    width: float
    height: float


def _own_jump_left_out(before: _Step | None, step: _Step, after: _Step | None) -> list[_Step]:
    """The steps beside, without one that undoes this step: up and down again is one jump, and explains nothing."""
    return [other for other in (before, after) if other is not None and abs(step.height + other.height) >= 0.5 * abs(step.height)]


def spin_crossings(coordinates: Sequence[float], s_squared: Sequence[float | None]) -> tuple[SpinCrossing, ...]:
    """Neighbouring points between which the exact state changes its spin."""
    known = [(x, s) for x, s in zip(coordinates, s_squared, strict=True) if s is not None]
    pairs = itertools.pairwise(known)
    return tuple(SpinCrossing(a[0], b[0], a[1], b[1]) for a, b in pairs if abs(a[1] - b[1]) > SPIN_STEP)


def extremum_of_second_derivative(coordinates: Sequence[float], energies: Sequence[float]) -> float | None:
    """Where |d2E/dx2| has its largest inner maximum, from a parabola through three points (a quantum phase transition shows there).

    None with fewer than 5 points, or where the curvature is largest at an end or vanishes.
    """
    x, e = np.asarray(coordinates, float), np.asarray(energies, float)
    if x.size < 5:
        return None
    curvature = np.abs(_second_derivative(x, e))
    top = int(np.argmax(curvature))
    noise = 1e-9 * np.abs(e).max() / np.diff(x).min() ** 2
    if top in (0, curvature.size - 1) or curvature[top] <= noise:
        return None
    three = slice(top - 1, top + 2)
    bend, slope, _ = np.polyfit(x[1:-1][three] - x[top + 1], curvature[three], 2)
    return float(x[top + 1] - slope / (2 * bend)) if bend < 0 else float(x[top + 1])


def level_crossings(coordinates: Sequence[float], energies: Sequence[float]) -> tuple[float, ...]:
    """Where the lowest level is replaced by another: the slope of the curve jumps by more than the slopes on either side explain.

    Needs three points on both sides. The place is where the two branches, continued from both sides, meet.
    """
    x, e = np.asarray(coordinates, float), np.asarray(energies, float)
    if x.size < 6:
        return ()
    middle, slope = 0.5 * (x[1:] + x[:-1]), np.diff(e) / np.diff(x)
    turn = np.diff(slope) / np.diff(middle)  # turn[i] between the intervals i and i + 1
    noise = 1e-8 * np.abs(e).max() / np.diff(x).min()
    found: list[float] = []
    for i in range(2, slope.size - 2):
        left = slope[i - 1] + turn[i - 2] * (middle[i] - middle[i - 1])
        right = slope[i + 1] - turn[i + 1] * (middle[i + 1] - middle[i])
        usual = max(abs(slope[i - 1] - slope[i - 2]), abs(slope[i + 2] - slope[i + 1]))
        if abs(right - left) <= JUMP_RATIO * usual + noise:
            continue
        place = (e[i + 1] - e[i] + left * x[i] - right * x[i + 1]) / (left - right)
        reach = 0.25 * (x[i + 1] - x[i])
        if x[i] - reach <= place <= x[i + 1] + reach and not (found and place - found[-1] < 2 * reach):
            found.append(float(place))
    return tuple(found)


def _second_derivative(x: FloatArray, e: FloatArray) -> FloatArray:
    """At the inner points, from three points each; the spacing may vary."""
    slope = np.diff(e) / np.diff(x)
    return np.asarray(2.0 * np.diff(slope) / (x[2:] - x[:-2]))
