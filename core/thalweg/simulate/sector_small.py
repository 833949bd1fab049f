"""Runs an excitation program on a small sector: one kernel call for the whole program, one listed pair of amplitudes after another."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation
from thalweg.kernels import sector as kernels
from thalweg.operators.fermion import WeightedDeterminant
from thalweg.operators.sector_layout import SectorKey, SectorLayout, layout_of
from thalweg.simulate.sector_pairs import SpinPairs, one_spin, pair_lists
from thalweg.watch import SILENT, Watch


class SmallRunner:
    """One program on one block of amplitudes, in program order."""

    def __init__(self, excitations: list[Excitation], layout: SectorLayout) -> None:
        self._layout = layout
        self._lists = _lists(tuple(excitations), layout.key)
        self._begins: tuple[WeightedDeterminant, ...] = ()
        self._places: list[int] = []

    def forward(self, begins: tuple[WeightedDeterminant, ...], angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """The state from this combination of determinants."""
        if self._begins != begins:
            self._begins, self._places = begins, [self._layout.index(term.alpha, term.beta) for term in begins]
        psi = np.zeros(self._layout.size)
        for place, term in zip(self._places, begins, strict=True):
            psi[place] = term.amplitude
        kernels.rotate_all(psi, *self._lists, angles)
        return psi

    def backward(self, psi: FloatArray, dual: FloatArray, angles: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """2 <dual|A_f|psi> of each factor with the later ones undone, shape (F,); psi and dual are used up."""
        slopes = np.empty(angles.size)
        kernels.sweep_back(psi, dual, *self._lists, angles, slopes)
        return slopes


@lru_cache(maxsize=4)
def _lists(excitations: tuple[Excitation, ...], key: SectorKey) -> tuple[IntArray, np.ndarray]:
    """Amplitude pairs of every factor; the same for all geometries of a scan."""
    layout = layout_of(key)
    alpha, alpha_ids = pair_lists(layout.alpha, [one_spin(e, True) for e in excitations], rows=True)
    beta, beta_ids = pair_lists(layout.beta, [one_spin(e, False) for e in excitations], rows=False)
    factors = np.stack([alpha_ids, beta_ids], axis=1).astype(np.int64).reshape(-1, 2)
    found: tuple[IntArray, np.ndarray] = kernels.amplitude_pairs(layout.row_start, layout.irrep, *_plain(alpha), *_plain(beta), factors)
    return found


def _plain(pairs: SpinPairs) -> tuple[np.ndarray, ...]:
    return pairs.first, pairs.start, pairs.end, pairs.sign
