"""Plain functions as sources of energies, for tests of objectives and optimisers."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from thalweg.circuit.structure import Structure
from thalweg.estimate import Cost, Estimate, Metric, Slopes

Function = Callable[[np.ndarray], tuple[float, np.ndarray]]


class PlainSource:
    """A function with its gradient, exact; its metric is the identity, and gradients by shots come without noise.

    Args:
        degree: of the function in every parameter as a trigonometric polynomial of lowest frequency 1; -1 where it is none.
        steepness: bound of its second derivatives.
        triples: parameters of single-qubit gates with free axes.
    """

    is_sampled = begins_by_simulation = False

    def __init__(self, function: Function, n: int, *, degree: int = -1, steepness: float = 1.0, triples: tuple = ()) -> None:
        self._function, self.n_parameters = function, n
        self.structure = Structure(np.ones(n), np.full(n, degree), np.zeros(n, np.int64), triples, steepness)

    def energy(self, x: np.ndarray) -> Estimate:
        return Estimate(self._function(x)[0])

    def energy_and_gradient(self, x: np.ndarray) -> tuple[Estimate, Slopes]:
        value, gradient = self._function(x)
        return Estimate(value), Slopes(gradient)

    def sampled_gradient(self, x: np.ndarray, shots: np.ndarray, *, random_terms: bool) -> Slopes:
        return Slopes(self._function(x)[1], np.zeros(x.size), Cost(1, 1, int(2 * shots.sum())), shots)

    def metric(self, x: np.ndarray, part: str) -> Metric:
        return Metric(np.eye(x.size))

    def exact_energy(self, x: np.ndarray) -> float:
        return self._function(x)[0]

    def exact_energy_and_gradient(self, x: np.ndarray) -> tuple[float, np.ndarray]:
        return self._function(x)


class NoisySource(PlainSource):
    """A function whose energies carry normal noise of a known standard error; every energy takes 100 shots in one circuit."""

    is_sampled = begins_by_simulation = True

    def __init__(self, function: Function, n: int, standard_error: float, seed: int = 1) -> None:
        super().__init__(function, n)
        self._error, self._rng = standard_error, np.random.default_rng(seed)

    def energy(self, x: np.ndarray) -> Estimate:
        return Estimate(self._function(x)[0] + self._rng.normal(0, self._error), self._error, Cost(1, 1, 100))

    def energy_and_gradient(self, x: np.ndarray) -> tuple[Estimate, Slopes]:
        gradient = self._function(x)[1] + self._rng.normal(0, self._error, x.size)
        return self.energy(x), Slopes(gradient, np.full(x.size, self._error**2), Cost(2 * x.size, 2 * x.size, 200 * x.size))
