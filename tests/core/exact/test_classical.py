"""Classical figures rebuilt from the integrals alone agree with PySCF on the molecule itself."""

from __future__ import annotations

import pytest
from support.hamiltonians import GEOMETRIES, molecule, random_molecule, water

from thalweg.exact.classical import classical_energies

METHODS = ("mp2", "ccsd", "ccsd(t)")


@pytest.mark.parametrize(("atoms", "spin"), [(water(), 0), (GEOMETRIES["LiH"], 0), (GEOMETRIES["BeH"], 1)])
def test_figures_are_those_of_the_molecule(atoms, spin):
    from pyscf import cc, gto, mp, scf

    field = scf.RHF(gto.M(atom=atoms, basis="sto-3g", spin=spin, verbose=0)).run(conv_tol=1e-12)
    field = field.to_uhf() if spin else field
    solver = cc.CCSD(field).run(conv_tol=1e-9)
    expected = {"mp2": mp.MP2(field).run().e_tot, "ccsd": solver.e_tot, "ccsd(t)": solver.e_tot + solver.ccsd_t()}
    energies, remarks = classical_energies(molecule(atoms, spin=spin), METHODS)
    assert energies == {method: pytest.approx(value, abs=1e-7) for method, value in expected.items()}
    assert remarks == ()


@pytest.mark.parametrize(("m", "n_alpha", "n_beta"), [(1, 1, 1), (3, 3, 3), (3, 1, 0), (2, 2, 1), (2, 1, 1), (3, 2, 0), (3, 0, 0)])
def test_every_sector_gives_figures_or_a_sentence(m, n_alpha, n_beta):
    energies, remarks = classical_energies(random_molecule(m, n_alpha, n_beta), METHODS)
    assert set(energies) == set(METHODS)
    assert all(value is not None for value in energies.values()) or remarks


def test_one_electron_has_no_correlation():
    from thalweg.exact.determinant import lowest_level

    h = molecule("H 0 0 0; H 0 0 1.06", spin=1, charge=1)
    energies, _ = classical_energies(h, METHODS)
    exact = lowest_level(h, budget_bytes=2**30).energy
    assert all(value == pytest.approx(exact, abs=1e-9) for value in energies.values())
