"""How fast the energy falls along each operator of a pool, appended to a state: all of them from one H psi.

For a factor exp(theta A) that acts last, dE/dtheta at theta = 0 is 2 <H psi|A|psi> (Grimsley, Economou, Barnes and Mayhall 2019).
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray, MaskArray
from thalweg.circuit.program import Excitation
from thalweg.kernels import slopes as kernels
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.product import ExpansionProduct
from thalweg.operators.sector_hamiltonian import SectorHamiltonian
from thalweg.simulate.sector_pairs import pair_lists
from thalweg.watch import SILENT, Watch

#: Amplitudes looked at between two questions whether to stop.
STEP = 1 << 24


class ExcitationSlopes:
    """Derivatives along excitations of one sector; the lists of pairs are made once."""

    def __init__(self, hamiltonian: FermionHamiltonian, excitations: Sequence[Excitation], product: SectorHamiltonian) -> None:
        labels = hamiltonian.orbital_irreps.tolist()
        symmetric = all(e.irrep(labels) == 0 for e in excitations)
        self._block = product.block(product.reference_irrep) if symmetric else product.whole
        layout = self._block.layout
        alpha, alpha_ids = pair_lists(layout.alpha, [(e.alpha_source, e.alpha_target) for e in excitations], rows=True)
        beta, beta_ids = pair_lists(layout.beta, [(e.beta_source, e.beta_target) for e in excitations], rows=False)
        self._factors = np.stack([alpha_ids, beta_ids], axis=1).astype(np.int64).reshape(-1, 2)
        self._lists = (
            *(layout.row_start, layout.irrep),
            *(alpha.first, alpha.start, alpha.end, alpha.sign),
            *(beta.first, beta.start, beta.end, beta.sign),
        )

    def at(self, state: FloatArray, watch: Watch = SILENT) -> FloatArray:
        """The derivatives at a normalised state (Na, Nb), strings ascending; shape (F,)."""
        psi = self._block.layout.from_matrix(state)
        dual = self._block.apply(psi)
        slopes = np.empty(len(self._factors))
        chunk = max(1, STEP // max(1, psi.size))
        for first in range(0, slopes.size, chunk):
            watch.check()
            kernels.excitation_slopes(psi, dual, *self._lists, self._factors[first : first + chunk], slopes[first : first + chunk])
        return slopes


class StringSlopes:
    """Derivatives along rotations exp(-i angle/2 P) of one register, with respect to the angle."""

    def __init__(self, product: ExpansionProduct, x: MaskArray, z: MaskArray) -> None:
        self._product, self._x, self._z = product, x, z

    def at(self, state: ComplexArray, watch: Watch = SILENT) -> FloatArray:
        """The derivatives at a normalised state (2^n,); shape (S,)."""
        dual = np.empty_like(state)
        self._product.apply(state, dual, watch)
        slopes = np.empty(self._x.size)
        chunk = max(1, STEP // state.size)
        for first in range(0, slopes.size, chunk):
            watch.check()
            part = slice(first, first + chunk)
            kernels.string_slopes(state, dual, self._x[part], self._z[part], slopes[part])
        return slopes
