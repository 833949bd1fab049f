"""Hamiltonians for tests: from the HDF5 files of the openfermion package, from PySCF, and random ones."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np

from thalweg.operators.fermion import FermionHamiltonian, Sector

#: Geometries of Verteletskyi, Yen and Izmaylov, J. Chem. Phys. 152, 124114 (2020): all bonds 1.0 angstrom, HOH 107.6 degrees.
_HALF = np.deg2rad(107.6) / 2
GEOMETRIES = {
    "H2": [("H", (0.0, 0.0, 0.0)), ("H", (0.0, 0.0, 1.0))],
    "LiH": [("Li", (0.0, 0.0, 0.0)), ("H", (0.0, 0.0, 1.0))],
    "BeH2": [("Be", (0.0, 0.0, 0.0)), ("H", (0.0, 0.0, 1.0)), ("H", (0.0, 0.0, -1.0))],
    "H2O": [("O", (0.0, 0.0, 0.0)), ("H", (0.0, np.sin(_HALF), np.cos(_HALF))), ("H", (0.0, -np.sin(_HALF), np.cos(_HALF)))],
}


@lru_cache(maxsize=64)
def stored_molecule(name: str):
    """(openfermion MolecularData, FermionHamiltonian) of an HDF5 file in `openfermion/testing/data`, e.g. `H2_sto-3g_singlet_0.7414`."""
    import openfermion
    from openfermion.chem import MolecularData

    data = MolecularData(filename=str(Path(openfermion.__file__).parent / "testing" / "data" / name))
    data.load()
    m, n = data.n_orbitals, data.n_electrons // 2
    # openfermion stores g[p,q,r,s] = (ps|qr)
    two_body = np.ascontiguousarray(np.transpose(np.asarray(data.two_body_integrals), (0, 3, 1, 2)))
    reference = ((1 << n) - 1, (1 << n) - 1)
    return data, FermionHamiltonian(
        float(data.nuclear_repulsion),
        np.asarray(data.one_body_integrals),
        two_body,
        np.zeros(m, np.int64),
        Sector(m, n, n),
        reference,
        np.asarray(data.orbital_energies),
    )


@lru_cache(maxsize=16)
def computed_molecule(name: str, basis: str = "sto-3g") -> FermionHamiltonian:
    """A molecule of `GEOMETRIES` with all electrons, its point group on, by PySCF."""
    from pyscf import ao2mo, gto, scf

    molecule = gto.M(atom=GEOMETRIES[name], basis=basis, symmetry=True, verbose=0)
    field = scf.RHF(molecule).run(conv_tol=1e-12)
    m, n = field.mo_coeff.shape[1], molecule.nelectron // 2
    one_body = field.mo_coeff.T @ field.get_hcore() @ field.mo_coeff
    two_body = ao2mo.restore(1, ao2mo.kernel(molecule, field.mo_coeff), m)
    # PySCF labels irreps of linear molecules beyond the Abelian subgroup in steps of ten
    irreps = np.array([int(label) % 10 for label in field.orbsym], np.int64)
    return FermionHamiltonian(
        float(molecule.energy_nuc()), one_body, two_body, irreps, Sector(m, n, n), ((1 << n) - 1,) * 2, np.asarray(field.mo_energy)
    )


def random_hamiltonian(m: int, n_alpha: int, n_beta: int, seed: int) -> FermionHamiltonian:
    """Real symmetric one-body and 8-fold symmetric two-body integrals with normal entries."""
    rng = np.random.default_rng(seed)
    h = rng.normal(size=(m, m))
    g = rng.normal(size=(m, m, m, m))
    g = g + g.transpose(1, 0, 2, 3)
    g = g + g.transpose(0, 1, 3, 2)
    g = g + g.transpose(2, 3, 0, 1)
    reference = ((1 << n_alpha) - 1, (1 << n_beta) - 1)
    return FermionHamiltonian(rng.normal(), h + h.T, g, np.zeros(m, np.int64), Sector(m, n_alpha, n_beta), reference, np.empty(0))
