"""Total spin of a sector state."""

from __future__ import annotations

from thalweg.arrays import FloatArray
from thalweg.kernels.sector_density import spin_exchange
from thalweg.operators.fermion import Sector
from thalweg.operators.sector_hamiltonian import SymmetryBlock


def s_squared(block: SymmetryBlock, sector: Sector, psi: FloatArray) -> float:
    """<S^2> = S_z^2 + N/2 - sum_pq <E^alpha_pq E^beta_qp>, hbar = 1."""
    layout = block.layout
    grid = layout.to_grid(psi)
    exchange = spin_exchange(grid, layout.alpha.strings, block.alpha_singles, layout.beta.strings, block.beta_singles, sector.n_orbitals)
    return max(0.0, float(sector.s_z**2 + 0.5 * sector.n_electrons - exchange))  # rounding may fall below zero
