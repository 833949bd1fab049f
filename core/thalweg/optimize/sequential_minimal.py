"""Sequential minimal optimisation: one parameter at a time, each to its lowest point in closed form."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.estimate import HARMONICS
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.optimize.sines import lowest_of_sines, sample_places
from thalweg.options import option

Order = Literal["in-turn", "shuffled"]


class SequentialMinimal(OptimizerSettings):
    """Nakanishi, Fujii and Todo 2020; Parrish et al. 2019; Ostaszewski et al. 2021. One iteration is one sweep over all parameters.

    A rotation gate takes three energies, an excitation five, a parameter of several gates two for each frequency and one more.
    """

    title: ClassVar[str] = "Sequential minimal optimisation"
    about: ClassVar[str] = "Needs no gradient and no step size; goes along the axes, so it may creep or stop in poor minima (Nakanishi et al. 2020)."
    needs: ClassVar[frozenset[str]] = frozenset({HARMONICS})

    key: Literal["sequential-minimal"] = "sequential-minimal"
    order: Order = option("in-turn", "Order", "Parameters one after another, or in a random order that changes with each sweep.")
    reuse: bool = option(True, "Reuse the minimum", "Take the energy that the last step predicts as known within a sweep, which saves an evaluation.")
    tolerance: float = option(1e-10, "Tolerance", "Stop when two sweeps in a row change the energy by less than this.", unit="Eh", gt=0)

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        degrees = structure.degree[structure.degree > 0]
        return 2 * int(degrees.sum()) + (1 if self.reuse else degrees.size)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, last, small = start.copy(), np.inf, 0
        for _ in range(self.max_iterations):
            x, lowest = self.sweep(objective, x, rng)
            objective.iterate(x)
            small = small + 1 if abs(last - lowest) < self.tolerance else 0
            if small == 2:
                return "converged"
            last = lowest
        return "iterations"

    def sweep(self, objective: Objective, x: FloatArray, rng: np.random.Generator) -> tuple[FloatArray, float]:
        """Every parameter once; the new point and the energy that the last step predicts."""
        known: float | None = None
        turns = rng.permutation(x.size) if self.order == "shuffled" else np.arange(x.size)
        for k in turns.tolist():
            x, known = lowest_along(objective, x, k, known if self.reuse else None)
        return x, objective.value(x) if known is None else known


def lowest_along(objective: Objective, x: FloatArray, k: int, known: float | None) -> tuple[FloatArray, float | None]:
    """The lowest point along parameter k and its predicted energy; `known` is the energy at x where one is known."""
    degree = int(objective.structure.degree[k])
    if degree == 0:
        return x, known
    scale = 1.0 / objective.structure.base[k]
    values = []
    for place in sample_places(degree).tolist():
        there = x.copy()
        there[k] += scale * place
        values.append(known if known is not None and place == 0.0 else objective.value(there))
    place, lowest = lowest_of_sines(np.array(values))
    moved = x.copy()
    moved[k] += scale * place
    return moved, lowest
