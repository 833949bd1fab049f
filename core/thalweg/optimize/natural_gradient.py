"""Quantum natural gradient (Stokes, Izaac, Killoran and Carleo 2020)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import METRIC
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option

MetricPart = Literal["full", "block-diagonal", "diagonal"]


class NaturalGradient(OptimizerSettings):
    title: ClassVar[str] = "Quantum natural gradient"
    about: ClassVar[str] = "Steps by distance between states, not parameters; the metric costs many circuits a step (Stokes et al. 2020)."
    needs: ClassVar[frozenset[str]] = frozenset({METRIC})

    key: Literal["natural-gradient"] = "natural-gradient"
    step: float = option(0.2, "Step", "theta <- theta - step * (g + regularisation)^-1 * gradient.", gt=0)
    metric: MetricPart = option("full", "Metric", "All of the tensor, its blocks of parameters that commute and follow each other, or its diagonal.")
    regularisation: float = option(1e-4, "Regularisation", "Added to the diagonal of the metric.", ge=0)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x = start.copy()
        for _ in range(self.max_iterations):
            _, gradient = objective.value_and_gradient(x)
            objective.iterate(x)
            metric = part_of(objective.metric(x), self.metric, objective.structure.layer)
            x = x - self.step * regularised_solution(metric, gradient, self.regularisation)
        return "iterations"


def part_of(metric: FloatArray, part: str, layer: np.ndarray) -> FloatArray:
    """The metric, or its blocks by `layer`, shape (K,), or its diagonal."""
    if part == "full":
        return metric
    kept = np.eye(layer.size, dtype=bool) if part == "diagonal" else layer[:, None] == layer[None, :]
    return np.where(kept, metric, 0.0)


def regularised_solution(metric: FloatArray, gradient: FloatArray, regularisation: float) -> FloatArray:
    """(g + regularisation)^-1 gradient; directions in which the regularised metric vanishes are left out."""
    values, vectors = np.linalg.eigh(metric)
    values = np.maximum(values, 0.0) + regularisation
    along = vectors.T @ gradient
    safe = values > 1e-12 * max(1.0, float(values.max(initial=0.0)))
    solution: FloatArray = vectors[:, safe] @ (along[safe] / values[safe])
    return solution
