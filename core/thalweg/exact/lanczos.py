"""The lowest states of a Hermitian operator that is known by its action alone (Lanczos 1950).

The three-term recurrence runs without reorthogonalisation: orthogonality is lost only along states that have converged (Paige
1971), and the search ends there. The residual is then worked out from the definition; when it is not small enough, the search
starts again from the state found. Further states come from searches that are kept orthogonal to those found before, so that
every copy of a degenerate level is found.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from thalweg.kernels import lanczos as kernels
from thalweg.watch import SILENT, Watch

#: Writes H v into `out`; looks at the watch where that takes long.
Apply = Callable[[Any, Any], None]

#: Told an energy and its residual: whether the search may end there.
Enough = Callable[[float, float], bool]

#: Steps between two looks at the tridiagonal matrix.
TEST_EVERY = 4
#: Random numbers drawn between two looks at the watch.
START_STEP = 2**21
#: Steps after which a search starts again from the best state so far.
CHAIN_STEPS = 300
RESTARTS = 20
#: The estimate of a residual is multiplied by this before it is judged.
MARGIN = 3.0
#: Below this many states the whole matrix is diagonalised.
DENSE_STATES = 160


@dataclass(frozen=True)
class Level:
    """One eigenstate.

    Attributes:
        energy: Rayleigh quotient of the vector.
        vector: unit vector, shape (dimension,).
        residual: |H v - E v|, from the definition.
        steps: applications of H that were spent.
        converged: whether the search ended because the state was good enough.
    """

    energy: float
    vector: Any
    residual: float
    steps: int
    converged: bool = True


def lowest_state(apply: Apply, start: Any, *, is_enough: Enough, watch: Watch, found: Sequence[Any] = (), room: int = CHAIN_STEPS) -> Level:
    """The lowest eigenstate orthogonal to the unit vectors `found`.

    Args:
        apply: H as an action on vectors of the dtype of `start`.
        start: shape (dimension,); must not be orthogonal to the state looked for.
        is_enough: told an energy and its residual |H v - E v|, says whether the search may end there.
        found: states to stay orthogonal to.
        room: how many vectors of the chain may be kept; later ones are made again for the state.

    Raises Stopped when asked to stop.
    """
    vector = _unit(_projected(start.copy(), found))
    steps = 0
    level = Level(np.inf, vector, np.inf, 0, False)
    for _ in range(RESTARTS):
        chain = _Chain(apply, found, watch, room)
        chain.grow(level.vector, is_enough)
        vector = _unit(_projected(chain.lowest_vector(), found))
        energy, residual = rayleigh(apply, vector, found)
        steps += chain.spent + 1
        level = Level(energy, vector, residual, steps, is_enough(energy, residual))
        if level.converged:
            break
    return level


def dense_levels(apply: Apply, dimension: int, dtype: Any, watch: Watch) -> list[Level]:
    """All eigenstates, ascending, by diagonalising the whole matrix."""
    matrix = np.empty((dimension, dimension), dtype=dtype)
    column, out = np.zeros(dimension, dtype=dtype), np.empty(dimension, dtype=dtype)
    for j in range(dimension):
        watch.check()
        column[j] = 1.0
        apply(column, out)
        matrix[:, j] = out
        column[j] = 0.0
    energies, vectors = np.linalg.eigh(0.5 * (matrix + matrix.conj().T))
    errors = np.linalg.norm(matrix @ vectors - vectors * energies, axis=0)
    return [Level(float(e), np.ascontiguousarray(vectors[:, i]), float(errors[i]), dimension) for i, e in enumerate(energies)]


def rayleigh(apply: Apply, vector: Any, found: Sequence[Any] = ()) -> tuple[float, float]:
    """<v|H|v> and |H v - <H> v| of a unit vector, the part along `found` left out."""
    image = np.empty_like(vector)
    apply(vector, image)
    image = _projected(image, found)
    energy = float(np.vdot(vector, image).real)
    return energy, float(np.sqrt(kernels.subtract(image, vector, energy)))


def random_start(dimension: int, dtype: Any, seed: int, watch: Watch = SILENT) -> Any:
    """A vector with a component along everything, the same for the same seed."""
    rng = np.random.default_rng(seed)
    start = np.empty(dimension, dtype=dtype)
    for first in range(0, dimension, START_STEP):
        watch.check()
        part = start[first : first + START_STEP]
        part[:] = rng.random(part.size) - 0.5
        if part.dtype.kind == "c":
            part += 1j * (rng.random(part.size) - 0.5)
    return start


class _Chain:
    """One run of the recurrence: the tridiagonal matrix, and the first `room` vectors of the chain."""

    def __init__(self, apply: Apply, found: Sequence[Any], watch: Watch, room: int) -> None:
        self._apply, self._found, self._watch, self._room = apply, found, watch, max(2, room)
        self._kept: list[Any] = []
        self._alpha: list[float] = []
        self._beta: list[float] = []
        self.spent = 0
        self._weights = np.ones(1)

    def grow(self, start: Any, is_enough: Enough) -> None:
        """Runs until the estimated residual |beta_m s_m| of the lowest state is small enough (with a margin), or the chain ends."""
        previous, vector, beta, size = None, start, 0.0, 0.0
        limit = min(CHAIN_STEPS, start.size - len(self._found))
        while True:
            following, alpha, beta = self._step(previous, vector, beta)
            if len(self._kept) < self._room:
                self._kept.append(vector)
            self._alpha.append(alpha)
            size = max(size, abs(alpha), beta)
            done = len(self._alpha) >= limit or beta <= 1e-13 * size
            if done or len(self._alpha) % TEST_EVERY == 0:
                energy, self._weights = self._lowest_ritz()
                done = done or is_enough(energy, MARGIN * beta * abs(float(self._weights[-1])))
            if done:
                return
            self._beta.append(beta)
            previous, vector = vector, following

    def _step(self, previous: Any, vector: Any, beta: float) -> tuple[Any, float, float]:
        """(next unit vector, alpha, beta) of w = H v - alpha v - beta u."""
        self._watch.check()
        image = np.empty_like(vector)
        self._apply(vector, image)
        self._watch.check()
        self.spent += 1
        alpha = float(np.vdot(vector, image).real)
        square = kernels.subtract(image, vector, alpha) if previous is None else kernels.subtract_two(image, vector, alpha, previous, beta)
        if self._found:
            image = _projected(image, self._found)
            square = float(np.vdot(image, image).real)
        norm = float(np.sqrt(square))
        if norm > 0.0:
            image *= 1.0 / norm
        return image, alpha, norm

    def _lowest_ritz(self) -> tuple[float, Any]:
        """Lowest eigenvalue and eigenvector of the tridiagonal matrix."""
        from scipy.linalg import eigh_tridiagonal

        if len(self._alpha) == 1:
            return self._alpha[0], np.ones(1)
        off_diagonal = np.array(self._beta[: len(self._alpha) - 1])
        energies, weights = eigh_tridiagonal(np.array(self._alpha), off_diagonal, select="i", select_range=(0, 0))
        return float(energies[0]), weights[:, 0]

    def lowest_vector(self) -> Any:
        """sum_j s_j v_j; vectors beyond the room are made again by the same arithmetic."""
        state = self._weights[0] * self._kept[0]
        for weight, vector in zip(self._weights[1:], self._kept[1:], strict=False):
            self._watch.check()
            kernels.subtract(state, vector, -float(weight))
        j = len(self._kept)
        if j >= len(self._weights):
            return state
        previous, vector = self._kept[-2], self._kept[-1]
        while j < len(self._weights):
            following, _, _ = self._step(previous, vector, self._beta[j - 2])
            kernels.subtract(state, following, -float(self._weights[j]))
            previous, vector, j = vector, following, j + 1
        return state


def _projected(vector: Any, found: Sequence[Any]) -> Any:
    """The vector without its parts along `found`, taken out twice where there are several (Gram-Schmidt, in place)."""
    for _ in range(min(2, len(found))):
        for other in found:
            kernels.subtract(vector, other, np.vdot(other, vector))
    return vector


def _unit(vector: Any) -> Any:
    return vector / np.linalg.norm(vector)
