"""Exact levels: published energies, every irrep, degeneracy, gap, spin, and refusals."""

from __future__ import annotations

import numpy as np
import pytest
from reference.fermion_energies import FULL_CI, WATER_FULL_CI
from support.hamiltonians import chain, molecule, random_molecule, water
from support.second_quantised import hamiltonian_matrix

from thalweg.errors import Stopped, StudyError
from thalweg.exact import determinant
from thalweg.exact.determinant import lowest_level, lowest_levels, spin_name
from thalweg.operators.sector_hamiltonian import SectorHamiltonian
from thalweg.watch import Watch

BUDGET = 2**32


@pytest.mark.parametrize("name", FULL_CI)
def test_energies_are_those_of_full_ci(name):
    atoms, spin, energy = FULL_CI[name]
    answer = lowest_level(molecule(atoms, spin=spin), budget_bytes=BUDGET)
    assert answer.energy == pytest.approx(energy, abs=2e-8)
    assert answer.degeneracy == 1
    assert answer.s_squared == pytest.approx(spin / 2 * (spin / 2 + 1), abs=1e-8)
    assert answer.residual <= 1e-7
    assert answer.remarks == ()


def test_water_is_that_of_full_ci():
    assert lowest_level(molecule(water()), budget_bytes=BUDGET).energy == pytest.approx(WATER_FULL_CI, abs=2e-6)  # geometry is rounded


@pytest.mark.parametrize(
    ("m", "n_alpha", "n_beta", "irreps"), [(1, 1, 0, ()), (2, 1, 1, (0, 1)), (3, 3, 3, ()), (4, 3, 1, (0, 1, 2, 3)), (5, 2, 3, (0, 1, 0, 1, 1))]
)
def test_levels_agree_with_the_dense_spectrum(m, n_alpha, n_beta, irreps):
    h = random_molecule(m, n_alpha, n_beta, irreps)
    matrix = hamiltonian_matrix(h)
    spectrum = np.linalg.eigvalsh(matrix)
    levels = lowest_levels(h, 4, budget_bytes=BUDGET)
    distinct = spectrum[np.concatenate([[True], np.diff(spectrum) > 1e-7])]
    assert np.allclose([level.energy for level in levels], distinct[:4], atol=1e-9)
    for level in levels:
        assert len(level.irreps) == np.sum(np.abs(spectrum - level.energy) < 1e-7)
        vectors = level.vectors.reshape(len(level.irreps), -1)
        assert np.allclose(vectors @ vectors.T, np.eye(len(vectors)), atol=1e-10)
        assert np.allclose(vectors @ matrix, level.energy * vectors, atol=1e-7)


@pytest.mark.parametrize("symmetry", [True, False])
def test_davidson_and_dense_agree_with_degeneracy_across_and_within_irreps(symmetry, monkeypatch):
    h = molecule("O 0 0 0", symmetry=symmetry)
    dense = lowest_level(h, budget_bytes=BUDGET)
    monkeypatch.setattr(determinant, "DENSE_LIMIT", 1)
    iterated = lowest_level(h, budget_bytes=BUDGET)
    for answer in (dense, iterated):
        assert answer.degeneracy == 3  # the P term of the oxygen atom with S_z = 0
        assert answer.s_squared == pytest.approx(2.0, abs=1e-6)
    assert iterated.energy == pytest.approx(dense.energy, abs=1e-9)
    assert iterated.gap == pytest.approx(dense.gap, abs=1e-7)


def test_a_lower_state_of_another_irrep_and_spin_is_found_and_told():
    h = molecule("C 0 0 0; H 0 .99 .3; H 0 -.99 .3")  # closed-shell reference, triplet ground state
    answer = lowest_level(h, budget_bytes=BUDGET)
    assert answer.energy == pytest.approx(lowest_level(molecule("C 0 0 0; H 0 .99 .3; H 0 -.99 .3", spin=2), budget_bytes=BUDGET).energy, abs=1e-8)
    assert "The lowest state of the sector is a triplet, S^2 = 2.00." in answer.remarks
    assert any("symmetry" in remark for remark in answer.remarks)


def test_davidson_agrees_with_dense_on_a_chain(monkeypatch):
    h = molecule(chain(6, 1.4))
    dense = lowest_levels(h, 3, budget_bytes=BUDGET)
    monkeypatch.setattr(determinant, "DENSE_LIMIT", 10)
    iterated = lowest_levels(h, 3, budget_bytes=BUDGET, sector_hamiltonian=SectorHamiltonian(h, sparse_limit=0))
    assert np.allclose([x.energy for x in iterated], [x.energy for x in dense], atol=1e-9)
    assert [x.irreps for x in iterated] == [x.irreps for x in dense]


def test_a_sector_past_the_budget_is_refused_before_it_is_built():
    h = random_molecule(4, 2, 2)
    with pytest.raises(StudyError, match="determinants, which need about"):
        lowest_level(h, budget_bytes=1000)


def test_stop_is_heard(monkeypatch):
    monkeypatch.setattr(determinant, "DENSE_LIMIT", 10)
    with pytest.raises(Stopped):
        lowest_level(molecule(chain(6, 1.0)), budget_bytes=BUDGET, watch=Watch(should_stop=lambda: True))


@pytest.mark.parametrize(
    ("square", "name"), [(0.0, "singlet"), (0.75, "doublet"), (2.0, "triplet"), (1.0, "state of mixed spin"), (20.0, "state of multiplicity 9")]
)
def test_spins_have_their_names(square, name):
    assert spin_name(square) == name


@pytest.mark.parametrize(
    ("atoms", "gap_to_triplet", "dense_limit"),
    [("O 0 0 0; O 0 0 1.2075", True, 1), ("O 0 0 0; O 0 0 1.2075", True, 400), ("H 0 0 0; H 0 0 .74", False, 400)],
)
def test_the_lowest_singlet_is_found_below_or_above_a_triplet(atoms, gap_to_triplet, dense_limit, monkeypatch):
    from pyscf import fci

    monkeypatch.setattr(determinant, "DENSE_LIMIT", dense_limit)
    h = molecule(atoms)
    answer = lowest_level(h, budget_bytes=BUDGET, fixed_spin=True)
    solver = fci.addons.fix_spin_(fci.direct_spin1.FCI().set(conv_tol=1e-11, max_cycle=200, verbose=0), ss=0)
    electrons = (h.sector.n_alpha, h.sector.n_beta)
    oracle, _ = solver.kernel(np.array(h.one_body), np.array(h.two_body), h.n_orbitals, electrons, ecore=h.core_energy)
    assert answer.energy == pytest.approx(oracle, abs=1e-7)
    assert answer.s_squared == pytest.approx(0.0, abs=1e-6)
    assert bool(answer.remarks) == gap_to_triplet
    if gap_to_triplet:
        assert answer.energy > lowest_level(h, budget_bytes=BUDGET).energy + 1e-3
        assert "a triplet, S^2 = 2.00, lies" in answer.remarks[0]


def test_spins_that_share_a_level_are_told_apart():
    # Two hydrogen atoms 60 angstrom apart: singlet and triplet have one energy, and the solver mixes them at will.
    h = molecule("H 0 0 0; H 0 0 60", symmetry=False)
    level = lowest_levels(h, 1, budget_bytes=BUDGET)[0]
    assert sorted(level.s_squared) == pytest.approx([0.0, 2.0], abs=1e-9)
    answer = lowest_level(h, budget_bytes=BUDGET, fixed_spin=True)
    assert (answer.degeneracy, answer.s_squared) == (1, pytest.approx(0.0, abs=1e-9))


def test_a_spin_that_no_state_has_is_refused():
    h = random_molecule(2, 2, 2)
    assert lowest_level(h, budget_bytes=BUDGET, fixed_spin=True).degeneracy == 1
    with pytest.raises(StudyError, match="No singlet was found"):
        determinant._lowest_of_spin(_OnlyTriplets(), h.sector)


class _OnlyTriplets:
    def levels(self, count):
        level = determinant.Level(-1.0, (0,), np.zeros((1, 1, 1)), (2.0,), 0.0)
        return (level,) * count, None
