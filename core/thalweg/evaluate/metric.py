"""The metric tensor as a device finds it: from overlaps of the state with its own shifted copies.

g_ab = -1/2 d_a d_b |<psi(theta)|psi(theta')>|^2 at theta' = theta (Mari, Bromley and Killoran 2021): off the diagonal by the shift rules of
both angles; on it from one overlap for a rotation and two for an excitation. An overlap is the probability of the reference after the
circuit and the inverse of the shifted one: one circuit. Angles that share a parameter are treated one by one and added up.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.angles import ROTATION, Angles
from thalweg.estimate import Cost, Metric, MetricPart
from thalweg.evaluate.shift import SHIFT_RULES
from thalweg.evaluate.simulator import Simulator

_Terms = list[tuple[float, dict[int, float]]]  # weight and shifts of each overlap


def part_of(metric: FloatArray, part: MetricPart, layer: IntArray) -> FloatArray:
    """The metric, or its blocks by `layer`, shape (K,), or its diagonal."""
    return metric if part == "full" else np.where(_kept(part, layer), metric, 0.0)


def metric_circuits(angles: Angles, part: MetricPart, layer: IntArray) -> int:
    """Overlaps that a device would measure."""
    return sum(len(_terms(angles, a, b)[1]) for a, b in _pairs(angles, part, layer))


def sampled_metric(simulator: Simulator, parameters: FloatArray, part: MetricPart, shots: int, rng: np.random.Generator) -> Metric:
    """Every overlap from `shots` shots; `standard_error` is that of the least certain element."""
    angles, layer = simulator.angles, simulator.structure.layer
    here = angles.of(parameters)
    state = simulator.state(here)
    metric, variance, circuits = np.zeros((parameters.size,) * 2), np.zeros((parameters.size,) * 2), 0
    for a, b in _pairs(angles, part, layer):
        constant, terms = _terms(angles, a, b)
        value, spread = constant, 0.0
        for weight, shifts in terms:
            overlap = _drawn_overlap(simulator, state, here, shifts, shots, rng)
            value += weight * overlap
            spread += weight**2 * overlap * (1 - overlap) / shots
        circuits += len(terms)
        j, k = int(angles.parameter[a]), int(angles.parameter[b])
        scale = float(angles.factor[a] * angles.factor[b])
        for row, column in {(j, k), (k, j)} if a != b else {(j, j)}:
            times = 2 if a != b and j == k else 1  # both (a, b) and (b, a) belong to one element
            metric[row, column] += times * scale * value
            variance[row, column] += (times * scale) ** 2 * spread
    return Metric(metric, float(np.sqrt(variance.max(initial=0.0))), Cost(0, circuits, circuits * shots))


def _kept(part: MetricPart, layer: IntArray) -> np.ndarray:
    if part == "full":
        return np.ones((layer.size,) * 2, bool)
    return np.eye(layer.size, dtype=bool) if part == "diagonal" else layer[:, None] == layer[None, :]


def _pairs(angles: Angles, part: MetricPart, layer: IntArray) -> list[tuple[int, int]]:
    """Pairs of angles, the first not above the second, whose parameters lie within the part; identities are left out."""
    kept, live = _kept(part, layer), np.flatnonzero(angles.highest).tolist()
    return [(a, b) for i, a in enumerate(live) for b in live[i:] if kept[angles.parameter[a], angles.parameter[b]]]


def _terms(angles: Angles, a: int, b: int) -> tuple[float, _Terms]:
    """g_ab = constant + sum of weights times overlaps."""
    if a == b and angles.highest[a] == ROTATION:
        return 0.25, [(-0.25, {a: np.pi})]
    if a == b:  # the overlap is c0 + c1 cos s + c2 cos 2s and 1 at s = 0, and g = (c1 + 4 c2) / 2
        return 0.75, [(-1.0, {a: np.pi / 2}), (0.25, {a: np.pi})]
    first, second = SHIFT_RULES[int(angles.highest[a])], SHIFT_RULES[int(angles.highest[b])]
    terms: _Terms = []
    for s, u in zip(first.shifts, first.weights, strict=True):
        for t, v in zip(second.shifts, second.weights, strict=True):
            terms += [(-0.5 * u * v * i * j, {a: i * s, b: j * t}) for i in (1.0, -1.0) for j in (1.0, -1.0)]
    return 0.0, terms


def _drawn_overlap(simulator: Simulator, state: Any, here: FloatArray, shifts: dict[int, float], shots: int, rng: np.random.Generator) -> float:
    shifted = here.copy()
    for place, shift in shifts.items():
        shifted[place] += shift
    probability = min(1.0, float(abs(np.vdot(state, simulator.state(shifted))) ** 2))
    return float(rng.binomial(shots, probability)) / shots
