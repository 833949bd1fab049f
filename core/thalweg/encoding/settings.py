"""Settings that every linear encoding shares."""

from __future__ import annotations

from abc import abstractmethod

import numpy as np

from thalweg.options import Options, option


class EncodingSettings(Options):
    """Base of the encodings; each one adds `matrix(n)`: the GF(2) matrix A of b = A n."""

    taper: bool = option(True, "Taper Z2 symmetries", "Remove one qubit for each Z2 symmetry, in the sector of the reference state.")
    cut: float = option(1e-10, "Cut", "Pauli terms with a smaller coefficient are dropped.", unit="Eh", ge=0, advanced=True)

    @abstractmethod
    def matrix(self, n: int) -> np.ndarray:
        """A over GF(2), shape (n, n), uint8: qubits b = A n hold the occupations n of the modes."""
