"""Derivatives from energies at shifted angles, as a device takes them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.circuit.angles import EXCITATION, IDENTITY, ROTATION


@dataclass(frozen=True)
class ShiftRule:
    """dE/da = sum_s weight_s [E(a + shift_s) - E(a - shift_s)]."""

    shifts: tuple[float, ...]
    weights: tuple[float, ...]

    @property
    def evaluations(self) -> int:
        return 2 * len(self.shifts)


_ROOT = np.sqrt(2.0)
#: By the highest frequency of the energy in the angle. The two-term rule for exp(-i a/2 P): Mitarai et al. 2018, Schuld et al. 2019.
#: The four-term rule for generators with eigenvalues -1, 0, 1: Anselmetti et al. 2021, there written for half of our angle.
SHIFT_RULES = {
    IDENTITY: ShiftRule((), ()),
    ROTATION: ShiftRule((np.pi / 2,), (0.5,)),
    EXCITATION: ShiftRule((np.pi / 4, 3 * np.pi / 4), ((_ROOT + 1) / (2 * _ROOT), (1 - _ROOT) / (2 * _ROOT))),
}
