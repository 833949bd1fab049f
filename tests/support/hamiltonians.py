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


def random_molecule(m: int, n_alpha: int, n_beta: int, irreps: tuple[int, ...] = (), seed: int = 1) -> FermionHamiltonian:
    """Normal integrals with the symmetries of real ones: 8-fold, and zero where the product of irreps is not 0."""
    rng = np.random.default_rng(seed)
    labels = np.array(irreps or (0,) * m, np.int64)
    h = rng.normal(size=(m, m))
    g = rng.normal(size=(m, m, m, m))
    g = g + g.transpose(1, 0, 2, 3)
    g = g + g.transpose(0, 1, 3, 2)
    g = g + g.transpose(2, 3, 0, 1)
    pair = labels[:, None] ^ labels[None, :]
    h = np.where(pair == 0, h + h.T, 0.0)
    g = np.where(pair[:, :, None, None] == pair[None, None, :, :], g, 0.0)
    reference = ((1 << n_alpha) - 1, (1 << n_beta) - 1)
    return FermionHamiltonian(rng.normal(), h, g, labels, Sector(m, n_alpha, n_beta), reference, np.diag(h).copy())
