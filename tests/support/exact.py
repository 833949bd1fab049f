"""The exact energy of a prepared Hamiltonian by PySCF's determinant code, as an oracle."""

from __future__ import annotations

import numpy as np

from thalweg.operators.fermion import FermionHamiltonian


def exact_energy(hamiltonian: FermionHamiltonian) -> float:
    """Lowest energy of the Hamiltonian's sector, Eh."""
    from pyscf import fci, lib

    sector = hamiltonian.sector
    if sector.dimension == 1:
        return hamiltonian.reference_energy
    solver = fci.direct_spin1.FCI()
    solver.verbose, solver.conv_tol, solver.max_cycle, solver.pspace_size = 0, 1e-12, 300, 50
    shape, electrons = sector.n_orbitals, (sector.n_alpha, sector.n_beta)
    with lib.with_omp_threads(1):
        energy, _ = solver.kernel(np.array(hamiltonian.one_body), np.array(hamiltonian.two_body), shape, electrons, ecore=hamiltonian.core_energy)
    return float(energy)
