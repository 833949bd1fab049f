"""What one study hands to its neighbour on a curve."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
from thalweg.systems.prepared import MeanFieldSeed


@dataclass(frozen=True)
class PointSeed:
    """Plain data, so that it travels between processes.

    Attributes:
        mean_field: density and orbitals; None for systems without a mean field, and for points that a session has kept.
        parameters: of the trial state.
        labels: of those parameters.
        kept_at: coordinate of a point that a session has kept, whose mean field can be worked out anew; None otherwise.
        kept_facts: what the session knows of that mean field.
    """

    mean_field: MeanFieldSeed | None
    parameters: tuple[float, ...]
    labels: tuple[str, ...]
    kept_at: float | None = None
    kept_facts: Mapping[str, Any] = field(default_factory=dict)

    def parameters_for(self, program: Program) -> FloatArray | None:
        """The parameters, shape (K,), where the program has the same ones by label; None otherwise."""
        return np.array(self.parameters) if program.labels() == self.labels else None
