"""Reading an answer off a diagonal cost: the best basis state that a trial state holds."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray
from thalweg.operators.pauli import PauliExpansion


def cost_of(expansion: PauliExpansion, bits: int) -> float:
    """Energy of one basis state; meant for diagonal expansions (strings with X or Y are passed over)."""
    sign = np.where(np.bitwise_count(expansion.z & np.uint64(bits)) % 2 == 1, -1.0, 1.0)
    return float(np.where(expansion.x == 0, sign * expansion.coefficients, 0.0).sum())


def best_bits(expansion: PauliExpansion, amplitudes: ComplexArray | FloatArray, floor: float = 1e-3, most: int = 4096) -> tuple[int, float, float]:
    """The lowest-cost basis state among those that measurements would show: (bits, cost, weight).

    Looks at the `most` heaviest states of weight at least `floor`, and always at the heaviest one.
    """
    weights = np.abs(amplitudes) ** 2
    most = min(most, weights.size)
    heaviest = np.argpartition(weights, -most)[-most:]
    heaviest = heaviest[np.argsort(-weights[heaviest], kind="stable")]
    shown = heaviest[weights[heaviest] >= floor] if weights[heaviest[0]] >= floor else heaviest[:1]
    costs = [cost_of(expansion, int(bits)) for bits in shown]
    best = int(np.argmin(costs))
    return int(shown[best]), costs[best], float(weights[shown[best]])
