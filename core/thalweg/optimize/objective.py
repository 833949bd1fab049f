"""The objective: all that an optimiser sees, and the one place that counts, reports, remembers and stops."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import Stopped
from thalweg.options import Options, option


class Objective(Protocol):
    """Values are energies minus a fixed offset (so that tolerances act on the interesting digits)."""

    n_parameters: int

    def value(self, parameters: FloatArray) -> float: ...

    def value_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]: ...

    def iterate(self, parameters: FloatArray) -> None:
        """The optimiser calls this once an iteration, at the point that it accepts. May raise Stopped."""
        ...


class StopRules(Options):
    """When a minimisation ends. Each rule that is set is tested at every iterate; 0 switches a rule off."""

    gradient: float = option(1e-6, "Gradient", "Stop when the largest gradient component falls below this.", unit="Eh", ge=0)
    energy_change: float = option(
        0.0, "Energy change", "Stop when the energy falls by less than this over one iteration, twice in a row.", unit="Eh", ge=0
    )
    evaluations: int = option(20000, "Evaluations", "Stop after this many energy evaluations.", ge=0)
    seconds: float = option(0.0, "Seconds", "Stop after this time.", unit="s", ge=0)
    at_target: bool = option(False, "At the target", "Stop as soon as the error falls below the target accuracy.")


@dataclass(frozen=True)
class Progress:
    """One iterate, as reported."""

    iteration: int
    evaluations: int
    energy: float
    gradient_norm: float | None
    seconds: float


class CountedObjective:
    """Counts evaluations, keeps the best point, reports each iterate and raises Stopped when a rule is met."""

    def __init__(
        self,
        energy: Callable[[FloatArray], float],
        energy_and_gradient: Callable[[FloatArray], tuple[float, FloatArray]],
        n_parameters: int,
        *,
        offset: float,
        rules: StopRules,
        target_energy: float | None,
        report: Callable[[Progress], None],
        should_stop: Callable[[], bool],
    ) -> None:
        self._energy, self._energy_and_gradient = energy, energy_and_gradient
        self.n_parameters, self.offset, self._rules = n_parameters, offset, rules
        self._target, self._report, self._should_stop = target_energy, report, should_stop
        self._begun = time.perf_counter()
        self.evaluations = self.gradient_evaluations = self.iterations = 0
        self.best_energy, self.best_parameters = np.inf, np.zeros(n_parameters)
        self.best_gradient_norm: float | None = None
        self._last: tuple[FloatArray, float, float | None] = (np.empty(0), np.inf, None)  # parameters, energy, gradient norm of the latest evaluation
        self._gradient: FloatArray | None = None  # at the parameters of _last, where it was worked out
        self._reported, self._small_changes = np.inf, 0

    def begin(self, start: FloatArray) -> None:
        """Evaluates and reports the start as iterate 0, so that a stationary start is seen at once."""
        self.value_and_gradient(start)
        _, energy, norm = self._last
        self._report(Progress(0, self.evaluations, energy, norm, self.seconds))
        self._test_rules(energy, norm)

    def value(self, parameters: FloatArray) -> float:
        if np.array_equal(self._last[0], parameters):
            return self._last[1] - self.offset
        self._before()
        energy = self._energy(parameters)
        self._after(parameters, energy, None)
        return energy - self.offset

    def value_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        if self._gradient is not None and np.array_equal(self._last[0], parameters):
            return self._last[1] - self.offset, self._gradient.copy()  # optimisers ask again for their own start
        self._before()
        energy, gradient = self._energy_and_gradient(parameters)
        self.gradient_evaluations += 1
        self._after(parameters, energy, float(np.abs(gradient).max(initial=0.0)))
        self._gradient = gradient.copy()
        return energy - self.offset, gradient

    def iterate(self, parameters: FloatArray) -> None:
        seen, energy, norm = self._last
        if not np.array_equal(seen, parameters):
            energy = self.best_energy if np.array_equal(self.best_parameters, parameters) else self._energy(parameters)
            norm = self.best_gradient_norm if energy == self.best_energy else None
        self.iterations += 1
        self._report(Progress(self.iterations, self.evaluations, energy, norm, self.seconds))
        self._test_rules(energy, norm)

    @property
    def seconds(self) -> float:
        return time.perf_counter() - self._begun

    def _before(self) -> None:
        if self._should_stop():
            raise Stopped("stopped-by-person")
        if self._rules.evaluations and self.evaluations >= self._rules.evaluations:
            raise Stopped("evaluations")
        if self._rules.seconds and self.seconds >= self._rules.seconds:
            raise Stopped("seconds")

    def _after(self, parameters: FloatArray, energy: float, norm: float | None) -> None:
        self.evaluations += 1
        if not np.isfinite(energy):
            raise Stopped("not-finite")
        self._last, self._gradient = (parameters.copy(), energy, norm), None
        if energy < self.best_energy:
            self.best_energy, self.best_parameters, self.best_gradient_norm = energy, parameters.copy(), norm

    def _test_rules(self, energy: float, norm: float | None) -> None:
        rules = self._rules
        if rules.at_target and self._target is not None and energy <= self._target:
            raise Stopped("target")
        if rules.gradient and norm is not None and norm <= rules.gradient:
            raise Stopped("gradient")
        if rules.energy_change:
            fell = self._reported - energy
            self._small_changes = self._small_changes + 1 if abs(fell) < rules.energy_change else 0
            if self._small_changes >= 2:
                raise Stopped("energy-change")
        self._reported = energy
