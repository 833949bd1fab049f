"""Quantum natural gradient (Stokes, Izaac, Killoran and Carleo 2020)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import Metric, MetricPart
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class NaturalGradient(OptimizerSettings):
    title: ClassVar[str] = "Quantum natural gradient"
    about: ClassVar[str] = "Steps by distance between states, not parameters; the metric costs many circuits a step (Stokes et al. 2020)."

    key: Literal["natural-gradient"] = "natural-gradient"
    step: float = option(0.2, "Step", "theta <- theta - step * (g + regularisation)^-1 * gradient.", gt=0)
    metric: MetricPart = option("full", "Metric", "All of the tensor, its blocks of parameters that commute and follow each other, or its diagonal.")
    regularisation: float = option(1e-4, "Regularisation", "Added to the diagonal of the metric.", ge=0)

    def metric_a_step(self) -> MetricPart | None:
        return self.metric

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x = start.copy()
        for _ in range(self.max_iterations):
            _, gradient = objective.value_and_gradient(x)
            objective.iterate(x)
            x = x - self.step * regularised_solution(objective.metric(x, self.metric), gradient, self.regularisation)
        return "iterations"


def regularised_solution(metric: Metric, gradient: FloatArray, regularisation: float) -> FloatArray:
    """(g + regularisation)^-1 gradient; directions in which the regularised metric vanishes are left out.

    A sampled metric is regularised by the size of its noise as well: the norm of a symmetric matrix of K x K errors, 2 sigma sqrt(K).
    """
    values, vectors = np.linalg.eigh(metric.tensor)
    values = np.maximum(values, 0.0) + regularisation + 2 * metric.standard_error * np.sqrt(gradient.size)
    along = vectors.T @ gradient
    safe = values > 1e-12 * max(1.0, float(values.max(initial=0.0)))
    solution: FloatArray = vectors[:, safe] @ (along[safe] / values[safe])
    return solution
