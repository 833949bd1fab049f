"""Fermi-Hubbard: closed forms, published rings, both sets of orbitals, fillings that do not fit."""

from __future__ import annotations

import numpy as np
import pytest
from reference.lattice_energies import HUBBARD_RING_6, LIEB_WU, hubbard_dimer
from support.exact import exact_energy

from thalweg.errors import StudyError
from thalweg.systems.bond_list import BondList
from thalweg.systems.hubbard import Hubbard, hopping_matrix, hopping_orbitals
from thalweg.systems.lattice import Chain, Kagome, Square
from thalweg.systems.lattice_model import LatticeModel

ORBITALS = ("hopping", "site")


@pytest.mark.parametrize("orbitals", ORBITALS)
@pytest.mark.parametrize("u", [0.5, 4.0, 12.0])
def test_the_dimer_has_its_closed_form(u, orbitals):
    graph = Chain(sites=2, periodic=False).build()
    assert exact_energy(Hubbard(u=u, orbitals=orbitals).hamiltonian(graph)) == pytest.approx(hubbard_dimer(u), abs=1e-10)


@pytest.mark.parametrize("orbitals", ORBITALS)
@pytest.mark.parametrize("u", HUBBARD_RING_6)
def test_the_six_ring_has_the_published_energies(u, orbitals):
    graph = Chain(sites=6).build()
    assert exact_energy(Hubbard(u=u, orbitals=orbitals).hamiltonian(graph)) == pytest.approx(HUBBARD_RING_6[u], abs=1e-9)


def test_rings_of_closed_shells_approach_the_infinite_chain_from_below():
    for u, limit in LIEB_WU.items():
        two, six = (exact_energy(Hubbard(u=u).hamiltonian(Chain(sites=n).build())) / n for n in (2, 6))
        assert two < six < limit


def test_without_repulsion_the_reference_is_exact():
    fermions = Hubbard(u=0.0, electrons=4, s_z=1.0).hamiltonian(Square(columns=3, rows=2, periodic_x=False, periodic_y=False).build())
    levels = fermions.orbital_energies
    assert fermions.reference_energy == pytest.approx(levels[:3].sum() + levels[:1].sum())
    assert fermions.reference_energy == pytest.approx(exact_energy(fermions), abs=1e-10)


def test_the_chemical_potential_shifts_a_sector():
    graph = Chain(sites=4, periodic=False).build()
    plain, shifted = (exact_energy(Hubbard(mu=mu, electrons=3, s_z=0.5).hamiltonian(graph)) for mu in (0.0, 0.7))
    assert shifted == pytest.approx(plain - 3 * 0.7, abs=1e-10)


def test_bond_weights_multiply_the_hopping():
    graph = BondList(bonds="0 1 2.0\n1 2 -0.5\n0 2 9 second").build()
    assert np.allclose(hopping_matrix(graph, 1.5), [[0, -3, 0], [-3, 0, 0.75], [0, 0.75, 0]])


def test_a_two_site_ring_hops_twice():
    ring, chain = Chain(sites=2).build(), Chain(sites=2, periodic=False).build()
    assert np.allclose(hopping_matrix(ring, 1.0), 2 * hopping_matrix(chain, 1.0))


@pytest.mark.parametrize("lattice", [Chain(sites=8), Square(columns=2, rows=2, periodic_x=False, periodic_y=False), Kagome()], ids=lambda v: v.key)
def test_integrals_are_symmetric_and_do_not_depend_on_the_eigensolver(lattice):
    graph = lattice.build()
    hopping = hopping_matrix(graph, 1.0)
    energies, orbitals = hopping_orbitals(hopping)
    assert np.allclose(orbitals.T @ orbitals, np.eye(graph.n_sites), atol=1e-12)
    assert np.allclose(orbitals.T @ hopping @ orbitals, np.diag(energies), atol=1e-12)
    _, again = hopping_orbitals(hopping + 1e-13 * np.random.default_rng(1).normal(size=hopping.shape))
    assert np.allclose(orbitals, again, atol=1e-6)
    two = Hubbard().hamiltonian(graph).two_body
    for order in ((1, 0, 2, 3), (0, 1, 3, 2), (2, 3, 0, 1)):
        assert np.allclose(two, two.transpose(order), atol=1e-14)


def test_site_orbitals_start_from_alternating_spins():
    fermions = Hubbard(orbitals="site").hamiltonian(Chain(sites=4).build())
    assert fermions.reference == (0b0101, 0b1010)
    assert fermions.reference_energy == 0.0
    assert fermions.orbital_energies.size == 0


def test_an_open_shell_of_free_fermions_is_told():
    open_shell = LatticeModel(lattice=Chain(sites=4), model=Hubbard()).prepare()
    assert "partly filled" in open_shell.warnings[0]
    assert LatticeModel(lattice=Chain(sites=6), model=Hubbard()).prepare().warnings == ()


@pytest.mark.parametrize(
    ("fields", "why"),
    [
        ({"electrons": 3}, "odd halves"),
        ({"electrons": 4, "s_z": 0.5}, "whole numbers"),
        ({"electrons": 4, "s_z": 0.3}, "whole numbers"),
        ({"electrons": 4, "s_z": 3.0}, "5 up and -1 down"),
        ({"electrons": 9, "s_z": 0.5}, "5 up and 4 down"),
    ],
)
def test_fillings_that_do_not_fit_are_refused(fields, why):
    with pytest.raises(StudyError, match=why) as caught:
        LatticeModel(lattice=Chain(sites=4), model=Hubbard(**fields)).prepare()
    assert caught.value.field.startswith("model.")


def test_sectors_of_odd_and_full_filling_are_made():
    for electrons, s_z, up, down in ((3, 0.5, 2, 1), (3, -0.5, 1, 2), (8, 0.0, 4, 4), (0, 0.0, 0, 0), (-1, 0.0, 2, 2)):
        sector = Hubbard(electrons=electrons, s_z=s_z).sector(Chain(sites=4).build())
        assert (sector.n_alpha, sector.n_beta) == (up, down)


def test_lattices_beyond_the_register_or_the_budget_are_refused():
    with pytest.raises(StudyError, match="62 are the most"):
        LatticeModel(lattice=Chain(sites=32), model=Hubbard()).prepare()
    with pytest.raises(StudyError, match="memory budget"):
        LatticeModel(lattice=Chain(sites=20), model=Hubbard()).prepare(budget_bytes=2**20)


def test_spin_references_are_refused_for_electrons():
    with pytest.raises(StudyError, match="is for spins"):
        LatticeModel(model=Hubbard(), reference="neel").prepare()


def test_facts_name_convention_filling_and_sector():
    prepared = LatticeModel(lattice=Chain(sites=6), model=Hubbard(electrons=4)).prepare()
    assert prepared.energy_unit == "t"
    assert prepared.facts["filling"] == pytest.approx(1 / 3)
    assert prepared.facts["S_z"] == 0.0
    assert "U = 4" in prepared.facts["convention"]
    assert "2 up electrons" in prepared.facts["conserved"]
