"""Energies from bit strings drawn as a device would give them."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.structure import Structure
from thalweg.errors import StudyError
from thalweg.estimate import SHOTS, Cost, Estimate, Metric, MetricPart, Slopes
from thalweg.evaluate.allocation import LEAST, smoothed_variance, spread
from thalweg.evaluate.metric import sampled_metric
from thalweg.evaluate.settings import ALLOCATION_HELP, Allocation, EvaluationSettings, Source
from thalweg.evaluate.simulator import SetSums, Simulator
from thalweg.options import option

MeasurementSets = Literal["qubit-wise", "single-terms"]
SETS_HELP = "Which strings one circuit reads: those with equal letters wherever two act on one qubit, or each string by itself."
#: Part of the shots that finds the spread of the sets before the others are shared by it.
PILOT = 0.1


class Shots(EvaluationSettings):
    title: ClassVar[str] = "Shots"
    about: ClassVar[str] = "Bit strings drawn from the state turned to each measurement basis; errors fall as one over the root of the shots."
    is_sampled: ClassVar[bool] = True

    key: Literal["shots"] = "shots"
    shots: int = option(10_000, "Shots", "Shots of one energy, over all measurement sets together.", ge=1, le=10**8)
    allocation: Allocation = option("by-weight", "Allocation", ALLOCATION_HELP)
    sets: MeasurementSets = option("qubit-wise", "Measurement sets", SETS_HELP)

    def offers(self, structure: Structure) -> frozenset[str]:
        return super().offers(structure) | {SHOTS}

    def source(self, simulator: Simulator, rng: np.random.Generator) -> Source:
        """StudyError where the shots do not go round."""
        refuse_too_few(self.shots, simulator, self.allocation)
        return SampledSource(simulator, self, rng)


class SampledSource(Source):
    """Energies and shift-rule gradients from drawn bit strings."""

    is_sampled = begins_by_simulation = True

    def __init__(self, simulator: Simulator, settings: Shots, rng: np.random.Generator) -> None:
        super().__init__(simulator)
        self._settings, self._rng = settings, rng

    def energy(self, parameters: FloatArray) -> Estimate:
        return self._measured(self.simulator.angles.of(parameters), self._settings.shots)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[Estimate, Slopes]:
        return self.energy(parameters), self._shifted(parameters, self._at)

    def metric(self, parameters: FloatArray, part: MetricPart) -> Metric:
        """From overlaps of the state with its shifted copies, each with the shots of one energy."""
        return sampled_metric(self.simulator, parameters, part, self._settings.shots, self._rng)

    def sampled_gradient(self, parameters: FloatArray, shots: FloatArray, *, random_terms: bool) -> Slopes:
        """The gradient with shots[k] for each energy that component k needs, shape (K,), raised where the sets need more.

        With `random_terms` every shot goes to a set drawn with the probability sum |c_l| of the set over that of all (Arrasmith et
        al. 2020), which needs no least number of shots.
        """
        measure = self._drawn if random_terms else self._measured
        return self._shifted(parameters, lambda angles, k: measure(angles, int(shots[k])))

    def _at(self, angles: FloatArray, parameter: int) -> Estimate:
        return self._measured(angles, self._settings.shots)

    def _measured(self, angles: FloatArray, shots: int) -> Estimate:
        weights = self.simulator.set_weights
        if not weights.size:
            return Estimate(self.simulator.constant, 0.0, Cost(1))
        total = max(shots, least_shots(weights.size, self._settings.allocation))
        pilot, plan = self._plan(angles, total, weights)
        sums = self.simulator.sample(angles, plan, self._rng)
        error = float(np.sqrt((sums.variances() / sums.shots).sum()))
        return Estimate(self.simulator.constant + float(sums.means().sum()), error, Cost(1, weights.size, pilot + int(plan.sum())))

    def _plan(self, angles: FloatArray, total: int, weights: FloatArray) -> tuple[int, IntArray]:
        """Shots spent on finding the plan, and the plan. Pilot shots take no part in the mean, which would bias it."""
        if self._settings.allocation == "uniform":
            return 0, spread(total, np.ones_like(weights))
        if self._settings.allocation == "by-weight":
            return 0, spread(total, weights)
        pilot = max(round(PILOT * total), LEAST * weights.size)
        found = self.simulator.sample(angles, spread(pilot, weights), self._rng)
        return pilot, spread(total - pilot, np.sqrt(smoothed_variance(found.variances(), found.shots, weights)))

    def _drawn(self, angles: FloatArray, shots: int) -> Estimate:
        weights, total = self.simulator.set_weights, max(shots, LEAST)
        if not weights.size:
            return Estimate(self.simulator.constant, 0.0, Cost(1))
        norm = float(weights.sum())
        sums = self.simulator.sample(angles, self._rng.multinomial(total, weights / norm), self._rng)
        return _from_drawn_sets(sums, norm / weights, self.simulator.constant)


def _from_drawn_sets(sums: SetSums, scales: FloatArray, constant: float) -> Estimate:
    """Each shot of set g stands for its value times sum |c| / (sum |c| of g): the mean over all shots is unbiased."""
    total = int(sums.shots.sum())
    mean = float(scales @ sums.first) / total
    variance = max(float(scales**2 @ sums.second) / total - mean**2, 0.0) * total / (total - 1)
    return Estimate(constant + mean, float(np.sqrt(variance / total)), Cost(1, int(np.count_nonzero(sums.shots)), total))


def least_shots(n_sets: int, allocation: str) -> int:
    """What one energy needs: two shots a set, and as many for the pilot where there is one."""
    return LEAST * n_sets * (2 if allocation == "by-variance" else 1)


def refuse_too_few(shots: int, simulator: Simulator, allocation: str) -> None:
    count = simulator.set_weights.size
    needed = least_shots(count, allocation)
    if shots < needed:
        raise StudyError(
            f"{shots:,} shots are too few for one energy",
            f"it is read from {count:,} measurement sets and every set needs {needed // count}",
            f"Give at least {needed:,} shots",
            "evaluation.shots",
        )
