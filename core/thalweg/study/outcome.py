"""What a minimisation leaves behind for the result."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.study.result import StartRecord


@dataclass
class Outcome:
    """What the minimisation leaves behind: the record of each start and the parameters of the best."""

    starts: list[StartRecord] = field(default_factory=list)
    best_parameters: list[FloatArray] = field(default_factory=list)
    start_parameters: list[FloatArray] = field(default_factory=list)
    start_energies: list[float] = field(default_factory=list)
    start_gradient_norms: list[float] = field(default_factory=list)

    @property
    def best(self) -> int:
        return int(np.argmin([record.energy for record in self.starts]))
