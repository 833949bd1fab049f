"""The objective: all that an optimiser sees, and the one place that counts, reports, remembers and stops."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.errors import Stopped
from thalweg.estimate import FREE, Cost, Estimate, Metric, MetricPart, Slopes
from thalweg.options import Options, option


class Objective(Protocol):
    """Values are energies minus a fixed offset (so that tolerances act on the interesting digits); parameters have shape (K,).

    `sampled_gradient` and parts of `structure` exist where the optimiser's `needs` ask for them.
    """

    n_parameters: int

    @property
    def structure(self) -> Structure:
        """What is known of the energy from the program alone."""
        ...

    @property
    def noise(self) -> float:
        """Standard error of the latest value; 0 where values are exact."""
        ...

    def value(self, parameters: FloatArray) -> float: ...

    def value_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]: ...

    def sampled_gradient(self, parameters: FloatArray, shots: FloatArray, *, random_terms: bool = False) -> Slopes:
        """The gradient with shots[k] for each energy that component k needs, its variances and the shots taken."""
        ...

    def metric(self, parameters: FloatArray, part: MetricPart = "full") -> Metric:
        """All of the quantum metric tensor, its blocks of parameters of one layer, or its diagonal; the rest is 0."""
        ...

    def iterate(self, parameters: FloatArray) -> None:
        """The optimiser calls this once an iteration, at the point that it accepts. May raise Stopped."""
        ...


class EnergySource(Protocol):
    """Where the objective's numbers come from.

    Attributes:
        is_sampled: whether energies carry statistical noise.
        begins_by_simulation: whether the start is judged by the simulation alone, as gradients cost shots or evaluations.
    """

    n_parameters: int
    is_sampled: bool
    begins_by_simulation: bool

    @property
    def structure(self) -> Structure: ...

    def energy(self, parameters: FloatArray) -> Estimate: ...

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[Estimate, Slopes]: ...

    def sampled_gradient(self, parameters: FloatArray, shots: FloatArray, *, random_terms: bool) -> Slopes: ...

    def metric(self, parameters: FloatArray, part: MetricPart) -> Metric: ...

    def exact_energy(self, parameters: FloatArray) -> float: ...

    def exact_energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]: ...


class StopRules(Options):
    """When a minimisation ends. Each rule that is set is tested at every iterate; 0 switches a rule off."""

    gradient: float = option(1e-6, "Gradient", "Stop when the largest gradient component falls below this.", unit="Eh", ge=0)
    energy_change: float = option(
        0.0, "Energy change", "Stop when the energy falls by less than this over one iteration, twice in a row.", unit="Eh", ge=0
    )
    evaluations: int = option(20000, "Evaluations", "Stop after this many energy evaluations.", ge=0)
    shots: int = option(0, "Shots", "Stop after this many shots.", ge=0, le=10**15)
    seconds: float = option(0.0, "Seconds", "Stop after this time.", unit="s", ge=0)
    at_target: bool = option(False, "At the target", "Stop as soon as the error falls below the target accuracy.")


@dataclass(frozen=True)
class Progress:
    """One iterate, as reported.

    Attributes:
        evaluations, circuits, shots: totals so far, as a device would count them.
        energy: measured where the optimiser measured it, otherwise that of the simulation.
        standard_error: of a measured energy; None where the energy is exact.
        noiseless: the energy of the simulation, beside sampled ones; None where `energy` is exact by itself.
    """

    iteration: int
    evaluations: int
    energy: float
    gradient_norm: float | None
    seconds: float
    circuits: int = 0
    shots: int = 0
    standard_error: float | None = None
    noiseless: float | None = None


@dataclass(frozen=True)
class _Seen:
    """The latest evaluation. `norm_error`: two standard errors of the largest gradient component."""

    parameters: FloatArray
    estimate: Estimate
    gradient: FloatArray | None = None
    norm: float | None = None
    norm_error: float = 0.0

    def is_at(self, parameters: FloatArray) -> bool:
        return np.array_equal(self.parameters, parameters)


class CountedObjective:
    """Counts evaluations, keeps the best point, reports each iterate and raises Stopped when a rule is met.

    The best point is the lowest one. Where energies are sampled it is the latest iterate, as the lowest of many noisy energies
    would be low by luck; `conclude` measures it afresh.
    """

    def __init__(
        self,
        source: EnergySource,
        *,
        offset: float,
        rules: StopRules,
        target_energy: float | None,
        report: Callable[[Progress], None],
        should_stop: Callable[[], bool],
    ) -> None:
        self._source = source
        self.n_parameters = source.n_parameters
        self.offset, self._rules = offset, rules
        self._target, self._report, self._should_stop = target_energy, report, should_stop
        self._begun = time.perf_counter()
        self.spent, self.iterations = FREE, 0
        self.best_energy, self.best_parameters = np.inf, np.zeros(self.n_parameters)
        self.best_gradient_norm: float | None = None
        self.best_standard_error: float | None = None
        self._seen = _Seen(np.empty(0), Estimate(np.inf))
        self._reported, self._small_changes = np.inf, 0

    def begin(self, start: FloatArray) -> None:
        """Evaluates and reports the start as iterate 0, so that a stationary start is seen at once.

        Where gradients cost shots or evaluations, the simulation judges the start, and nothing is counted.
        """
        if self._source.begins_by_simulation:
            energy, gradient = self._source.exact_energy_and_gradient(start)
            seen = _Seen(start.copy(), Estimate(energy, None, FREE), None, float(np.abs(gradient).max(initial=0.0)))
            self._keep(seen)
        else:
            self.value_and_gradient(start)
            seen = self._seen
        self._tell(seen, 0)

    def value(self, parameters: FloatArray) -> float:
        if self._is_known(parameters):
            return self._seen.estimate.energy - self.offset
        self._before()
        self._after(_Seen(parameters.copy(), self._source.energy(parameters)))
        return self._seen.estimate.energy - self.offset

    def value_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        seen = self._seen
        if seen.gradient is None or not self._is_known(parameters):  # optimisers ask again for their own start
            self._before()
            estimate, slopes = self._source.energy_and_gradient(parameters)
            seen = _Seen(parameters.copy(), estimate, slopes.gradient, *_norm(slopes))
            self._after(seen, slopes.cost)
        assert seen.gradient is not None
        return seen.estimate.energy - self.offset, seen.gradient.copy()

    def sampled_gradient(self, parameters: FloatArray, shots: FloatArray, *, random_terms: bool = False) -> Slopes:
        self._before()
        slopes = self._source.sampled_gradient(parameters, shots, random_terms=random_terms)
        self.spent += slopes.cost
        energy = self._source.exact_energy(parameters)
        self._after(_Seen(parameters.copy(), Estimate(energy, None, FREE), None, *_norm(slopes)))
        return slopes

    def metric(self, parameters: FloatArray, part: MetricPart = "full") -> Metric:
        self._before()
        metric = self._source.metric(parameters, part)
        self.spent += metric.cost
        return metric

    def iterate(self, parameters: FloatArray) -> None:
        seen = self._seen
        if not seen.is_at(parameters):
            seen = self._looked_up(parameters)
        if self._source.is_sampled:
            self._keep(seen)
        self.iterations += 1
        self._tell(seen, self.iterations)

    def conclude(self) -> None:
        """Measures the best point once more where energies have error bars: an energy that no choice has favoured."""
        if self._source.is_sampled or self.best_standard_error is not None:
            estimate = self._source.energy(self.best_parameters)
            self.spent += estimate.cost
            self.best_energy, self.best_standard_error = estimate.energy, estimate.standard_error

    @property
    def structure(self) -> Structure:
        return self._source.structure

    @property
    def noise(self) -> float:
        return (self._seen.estimate.standard_error or 0.0) if self._source.is_sampled else 0.0

    @property
    def evaluations(self) -> int:
        return self.spent.evaluations

    @property
    def seconds(self) -> float:
        return time.perf_counter() - self._begun

    def _looked_up(self, parameters: FloatArray) -> _Seen:
        """An accepted point that was not evaluated last: the simulation tells its energy, and nothing is counted."""
        if not self._source.is_sampled and np.array_equal(self.best_parameters, parameters):
            return _Seen(parameters, Estimate(self.best_energy, self.best_standard_error, FREE), None, self.best_gradient_norm)
        if self._should_stop():
            raise Stopped("stopped-by-person")
        seen = _Seen(parameters.copy(), Estimate(self._source.exact_energy(parameters), None, FREE))
        self._test_finite(seen.estimate.energy)
        if not self._source.is_sampled and seen.estimate.energy < self.best_energy:
            self._keep(seen)
        return seen

    def _is_known(self, parameters: FloatArray) -> bool:
        """Whether the latest evaluation answers for this point; whoever asks again for a sampled energy wants another sample."""
        return not self._source.is_sampled and self._seen.is_at(parameters)

    def _before(self) -> None:
        if self._should_stop():
            raise Stopped("stopped-by-person")
        rules, spent = self._rules, self.spent
        if np.isinf(min(self.best_energy, self._seen.estimate.energy)):
            return  # the first energy is found whatever the limits: without it there is nothing to keep
        if rules.evaluations and spent.evaluations >= rules.evaluations:
            raise Stopped("evaluations")
        if rules.shots and spent.shots >= rules.shots:
            raise Stopped("shots")
        if rules.seconds and self.seconds >= rules.seconds:
            raise Stopped("seconds")

    def _after(self, seen: _Seen, more: Cost = FREE) -> None:
        self.spent += seen.estimate.cost + more
        self._test_finite(seen.estimate.energy)
        self._seen = seen
        if not self._source.is_sampled and seen.estimate.energy < self.best_energy:
            self._keep(seen)

    def _keep(self, seen: _Seen) -> None:
        self.best_energy, self.best_parameters, self.best_gradient_norm = seen.estimate.energy, seen.parameters.copy(), seen.norm
        self.best_standard_error = seen.estimate.standard_error

    def _test_finite(self, energy: float) -> None:
        if not np.isfinite(energy):
            raise Stopped("not-finite")

    def _tell(self, seen: _Seen, iteration: int) -> None:
        estimate, noiseless = seen.estimate, None
        if self._source.is_sampled:
            noiseless = estimate.energy if estimate.standard_error is None else self._source.exact_energy(seen.parameters)
        spent = self.spent
        counts = (spent.circuits, spent.shots, estimate.standard_error, noiseless)
        self._report(Progress(iteration, spent.evaluations, estimate.energy, seen.norm, self.seconds, *counts))
        self._test_rules(seen)

    def _test_rules(self, seen: _Seen) -> None:
        """Rules count what is certain: a measured number must satisfy them by two standard errors."""
        rules, energy = self._rules, seen.estimate.energy
        margin = 2 * (seen.estimate.standard_error or 0.0)
        if rules.at_target and self._target is not None and energy + margin <= self._target:
            raise Stopped("target")
        if rules.gradient and seen.norm is not None and seen.norm + seen.norm_error <= rules.gradient:
            raise Stopped("gradient")
        if rules.energy_change:
            fell = self._reported - energy
            self._small_changes = self._small_changes + 1 if abs(fell) < rules.energy_change else 0
            if self._small_changes >= 2:
                raise Stopped("energy-change")
        self._reported = energy


def _norm(slopes: Slopes) -> tuple[float, float]:
    """The largest component, and two standard errors of the least certain one."""
    error = 0.0 if slopes.variance is None else 2 * float(np.sqrt(slopes.variance.max(initial=0.0)))
    return float(np.abs(slopes.gradient).max(initial=0.0)), error
