"""The lowest eigenpairs of a large symmetric matrix that is only known by its products (Davidson 1975; Liu 1978)."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.watch import Watch

#: Vectors of the search space for each wanted pair before it is collapsed.
SPACE_PER_PAIR = 12


@dataclass(frozen=True)
class Eigenpairs:
    """Ascending values (k,), vectors (k, n) by rows, residual norms (k,)."""

    values: FloatArray
    vectors: FloatArray
    residuals: FloatArray


def lowest_pairs(
    apply: Callable[[FloatArray], FloatArray],
    diagonal: FloatArray,
    guesses: FloatArray,
    tolerances: FloatArray,
    watch: Watch,
    max_products: int = 4000,
) -> Eigenpairs:
    """The lowest pairs, as many as there are `tolerances`, until the residual norm of each is at most its own.

    guesses: (g, n), g >= count, rows need not be orthonormal. The best pairs are returned, with the residuals that were
    reached, also when `max_products` products did not suffice.
    """
    count = tolerances.size
    limit = max(SPACE_PER_PAIR * count, guesses.shape[0] + count)
    space = _Space(apply, min(limit, diagonal.size), diagonal.size)
    products = sum(space.grow(guess) for guess in guesses)
    while True:
        watch.check()
        values, coefficients = np.linalg.eigh(space.projected)
        values, coefficients = values[:count], coefficients[:, :count]
        ritz = coefficients.T @ space.vectors
        residual_vectors = coefficients.T @ space.products - values[:, None] * ritz
        residuals = np.linalg.norm(residual_vectors, axis=1)
        open_pairs = np.flatnonzero(residuals > tolerances)
        if open_pairs.size == 0 or products >= max_products or space.size >= diagonal.size:
            return Eigenpairs(values, ritz, residuals)
        if space.size + open_pairs.size > limit:
            space.collapse(coefficients)
        grown = sum(space.grow(_corrected(residual_vectors[k], diagonal, values[k], ritz[k])) for k in open_pairs)
        products += grown
        if grown == 0:
            return Eigenpairs(values, ritz, residuals)


def _corrected(residual: FloatArray, diagonal: FloatArray, value: float, ritz: FloatArray) -> FloatArray:
    """Davidson's correction, kept orthogonal to the Ritz vector (Olsen 1990)."""
    gap = value - diagonal
    gap = np.where(np.abs(gap) < 1e-4, np.copysign(1e-4, gap), gap)
    step, along = residual / gap, ritz / gap
    overlap = float(ritz @ along)
    return step if abs(overlap) < 1e-12 else step - (float(ritz @ step) / overlap) * along


class _Space:
    """Orthonormal vectors, their products with the matrix, and the projected matrix."""

    def __init__(self, apply: Callable[[FloatArray], FloatArray], capacity: int, dimension: int) -> None:
        self._apply, self.size = apply, 0
        self._vectors, self._products = np.empty((capacity, dimension)), np.empty((capacity, dimension))
        self._projected = np.empty((capacity, capacity))

    @property
    def vectors(self) -> FloatArray:
        return self._vectors[: self.size]

    @property
    def products(self) -> FloatArray:
        return self._products[: self.size]

    @property
    def projected(self) -> FloatArray:
        return self._projected[: self.size, : self.size]

    def grow(self, vector: FloatArray) -> int:
        """Adds the part of `vector` outside the space; returns the number of products made, 0 or 1."""
        norm = float(np.linalg.norm(vector))
        if norm == 0.0 or self.size >= len(self._vectors):
            return 0
        vector = vector / norm
        for _ in range(2):  # twice is enough (Parlett)
            vector -= (self.vectors @ vector) @ self.vectors
            norm = float(np.linalg.norm(vector))
            if norm < 1e-10:
                return 0
            vector /= norm
        n = self.size
        self._vectors[n], self._products[n] = vector, self._apply(vector)
        self.size = n + 1
        self._projected[n, : n + 1] = self._projected[: n + 1, n] = self.vectors @ self._products[n]
        return 1

    def collapse(self, coefficients: FloatArray) -> None:
        """Keeps only the wanted Ritz vectors."""
        kept = coefficients.shape[1]
        self._vectors[:kept], self._products[:kept] = coefficients.T @ self.vectors, coefficients.T @ self.products
        self._projected[:kept, :kept] = coefficients.T @ self.projected @ coefficients
        self.size = kept
