"""Fermionic Hamiltonians for tests, made directly with PySCF."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from thalweg.operators import FermionHamiltonian, Sector

GEOMETRIES = {
    "H2": "H 0 0 0; H 0 0 .7414",
    "LiH": "Li 0 0 0; H 0 0 1.5957",
    "BeH2": "Be 0 0 0; H 0 0 1.3264; H 0 0 -1.3264",
    "N2": "N 0 0 0; N 0 0 1.097685",
    "BeH": "Be 0 0 0; H 0 0 1.3426",
    "H3": "H 0 0 0; H 0 0 .9; H 0 0 1.8",
}


def chain(n: int, spacing: float) -> str:
    """n hydrogen atoms on a line, angstrom."""
    return "; ".join(f"H 0 0 {i * spacing}" for i in range(n))


def water(bond: float = 0.9894, angle: float = 100.03) -> str:
    half = np.radians(angle) / 2
    y, z = bond * np.sin(half), bond * np.cos(half)
    return f"O 0 0 0; H 0 {y} {z}; H 0 {-y} {z}"


@lru_cache(maxsize=32)
def molecule(atoms: str, spin: int = 0, charge: int = 0, basis: str = "sto-3g", symmetry: bool = True) -> FermionHamiltonian:
    """All electrons in all orbitals; point-group labels reduced modulo 10 to the Abelian group."""
    from pyscf import gto, scf

    mol = gto.M(atom=atoms, basis=basis, spin=spin, charge=charge, symmetry=symmetry, verbose=0)
    field = (scf.ROHF(mol) if spin else scf.RHF(mol)).set(conv_tol=1e-12, conv_tol_grad=1e-8).run()
    return from_mean_field(field)


def from_mean_field(field) -> FermionHamiltonian:
    from pyscf import ao2mo

    mol, orbitals = field.mol, field.mo_coeff
    m = orbitals.shape[1]
    one = orbitals.T @ field.get_hcore() @ orbitals
    two = ao2mo.restore(1, ao2mo.kernel(mol, orbitals), m)
    labels = np.asarray(getattr(orbitals, "orbsym", np.zeros(m)), np.int64) % 10
    alpha, beta = mol.nelec
    filled = [sum(1 << int(p) for p in np.flatnonzero(field.mo_occ > floor)) for floor in (0.5, 1.5)]
    return FermionHamiltonian(
        core_energy=float(mol.energy_nuc()),
        one_body=one,
        two_body=two,
        orbital_irreps=labels,
        sector=Sector(m, alpha, beta),
        reference=(filled[0], filled[1]),
        orbital_energies=np.asarray(field.mo_energy),
    )
