"""Runs a scipy minimiser on an objective. Stopped passes through scipy untouched."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective


def minimise_with_scipy(
    method: str,
    objective: Objective,
    start: FloatArray,
    options: dict[str, Any],
    *,
    gradient: bool,
    iterate_on_call: bool = False,
    curvature: FloatArray | None = None,
) -> Any:
    """scipy.optimize.minimize; returns its result object.

    `iterate_on_call` is for methods without a true iteration: each evaluation counts as one. With `curvature`, shape (K,), a method
    with gradients works on parameters times sqrt(curvature), in which all directions are about equally steep.
    """
    if curvature is not None and gradient:
        return _minimise_scaled(method, objective, start, options, np.sqrt(curvature))
    from scipy.optimize import minimize

    calls: Callable[[FloatArray], Any] = objective.value_and_gradient if gradient else objective.value
    if iterate_on_call:
        plain = calls

        def calls(x: FloatArray) -> Any:
            answer = plain(x)
            objective.iterate(x)
            return answer

    def callback(intermediate: Any) -> None:
        objective.iterate(np.array(intermediate, copy=True))

    return minimize(calls, start, method=method, jac=gradient, callback=None if iterate_on_call else callback, options=options)


def reason_from_scipy(result: Any, limit: int) -> str:
    """A key of STOP_REASONS for a scipy result that ended by itself."""
    if result.success:
        return "converged"
    return "iterations" if result.nit >= limit else "line-search"


def _minimise_scaled(method: str, objective: Objective, start: FloatArray, options: dict[str, Any], scales: FloatArray) -> Any:
    from scipy.optimize import minimize

    def calls(y: FloatArray) -> tuple[float, FloatArray]:
        value, gradient = objective.value_and_gradient(y / scales)
        return value, gradient / scales

    return minimize(calls, start * scales, method=method, jac=True, callback=lambda y: objective.iterate(y / scales), options=options)
