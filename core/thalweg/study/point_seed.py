"""What one study hands to its neighbour on a curve."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
from thalweg.systems.prepared import MeanFieldSeed


@dataclass(frozen=True)
class PointSeed:
    """Plain data, so that it travels between processes.

    Attributes:
        mean_field: density and orbitals; None for systems without a mean field.
        parameters: of the trial state.
        labels: of those parameters.
    """

    mean_field: MeanFieldSeed | None
    parameters: tuple[float, ...]
    labels: tuple[str, ...]

    def parameters_for(self, program: Program) -> FloatArray | None:
        """The parameters, shape (K,), where the program has the same ones by label; None otherwise."""
        return np.array(self.parameters) if program.labels() == self.labels else None
