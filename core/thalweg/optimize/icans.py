"""Individually coupled adaptive number of shots (Kuebler, Arrasmith, Cincio and Coles 2020)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.frugal import Knowledge, ShotFrugal


class ICANS(ShotFrugal):
    title: ClassVar[str] = "iCANS"
    about: ClassVar[str] = "Few shots while far away, more near the minimum, for each component by itself (Kuebler et al. 2020)."

    key: Literal["icans"] = "icans"

    def next_shots(self, known: Knowledge) -> FloatArray:
        """s_k = 2 L a / (2 - L a) S_k / g_k^2, none above that of the component with the largest expected gain a shot."""
        shots = 2 * known.rate / (2 - known.rate) * known.variance / (known.gradient**2 + known.bias)
        shots = np.maximum(np.ceil(shots), self.least_shots)
        gain = known.step * ((1 - known.rate / 2) * known.gradient**2 - known.rate / 2 * known.variance / shots) / shots
        return np.minimum(shots, shots[np.argmax(gain)])
