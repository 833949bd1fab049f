"""The Jordan-Wigner encoding of fermionic modes on qubits."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.encoding.settings import EncodingSettings


class JordanWigner(EncodingSettings):
    title: ClassVar[str] = "Jordan-Wigner"
    about: ClassVar[str] = "Each qubit holds one occupation; strings grow with the distance of orbitals (Jordan and Wigner 1928)."

    key: Literal["jordan-wigner"] = "jordan-wigner"

    def matrix(self, n: int) -> np.ndarray:
        """A = 1, shape (n, n), uint8: each qubit holds one occupation."""
        return np.eye(n, dtype=np.uint8)
