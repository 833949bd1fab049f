"""Globally coupled adaptive number of shots (Gu, Lowe, Dub, Coles and Arrasmith 2021)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.frugal import Knowledge, ShotFrugal


class GCANS(ShotFrugal):
    title: ClassVar[str] = "gCANS"
    about: ClassVar[str] = "Shots from the gain of the whole gradient, so that no component starves; a proof of fast convergence (Gu et al. 2021)."

    key: Literal["gcans"] = "gcans"

    def next_shots(self, known: Knowledge) -> FloatArray:
        """s_k = 2 L a / (2 - L a) sigma_k sum_j sigma_j / |g|^2."""
        deviation = np.sqrt(known.variance)
        squared = float(known.gradient @ known.gradient) + known.bias
        shots: FloatArray = 2 * known.rate / (2 - known.rate) * deviation * deviation.sum() / squared
        return shots
