"""The mean field is stable, uses the point group rightly, and comes out the same however it was found."""

import numpy as np
import pytest
from reference.molecular_energies import bent, line, pyramid
from support.exact import exact_energy

from thalweg.systems import Molecule
from thalweg.systems.orbital_order import _turned_to_standard

AMMONIA = pyramid("N", 1.0325, 104.16)


def square(side):
    half = side / 2
    return tuple(("H", x * half, y * half, 0.0) for x, y in ((1, 1), (-1, 1), (-1, -1), (1, -1)))


def test_orbitals_are_ordered_by_occupation_then_energy():
    prepared = Molecule(atoms=line("N O", 1.15), multiplicity=2).prepare()
    occupation = [row.occupation for row in prepared.ladder]
    assert occupation == [2.0] * 7 + [1.0] + [0.0] * 2
    energies = np.array([row.energy for row in prepared.ladder])
    assert (np.diff(energies[:7]) >= -1e-6).all()
    assert (np.diff(energies[8:]) >= -1e-6).all()


def test_the_same_settings_give_the_same_bits():
    first, second = (Molecule(atoms=AMMONIA).prepare().fermions for _ in range(2))
    np.testing.assert_array_equal(first.one_body, second.one_body)
    np.testing.assert_array_equal(first.two_body, second.two_body)


@pytest.mark.parametrize("point_group", [True, False])
def test_orbitals_do_not_depend_on_the_seed_of_the_mean_field(point_group):
    spec = Molecule(atoms=AMMONIA, point_group=point_group)
    neighbour = Molecule(atoms=pyramid("N", 1.05, 105.0), point_group=point_group).prepare()
    plain, seeded = spec.prepare(), spec.prepare(neighbour=neighbour.seed)
    np.testing.assert_allclose(plain.mean_field.mo_coeff, seeded.mean_field.mo_coeff, atol=1e-5)
    np.testing.assert_allclose(plain.fermions.two_body, seeded.fermions.two_body, atol=1e-5)


def test_a_neighbour_saves_iterations():
    spec = Molecule(atoms=line("Li H", 1.61))
    neighbour = Molecule(atoms=line("Li H", 1.60)).prepare().seed
    alone, seeded = spec.prepare().facts, spec.prepare(neighbour=neighbour).facts
    assert seeded["mean_field_iterations"] < alone["mean_field_iterations"]


def test_a_neighbour_with_other_functions_is_of_no_use_and_does_no_harm():
    neighbour = Molecule(atoms=line("Li H", 1.60), basis="6-31g").prepare().seed
    assert Molecule(atoms=line("Li H", 1.5957)).prepare(neighbour=neighbour).reference_energy == pytest.approx(-7.8620020742, abs=1e-9)


def test_degenerate_orbitals_take_a_form_that_does_not_depend_on_how_they_were_mixed():
    rng = np.random.default_rng(5)
    orbitals, _ = np.linalg.qr(rng.normal(size=(9, 3)))
    for _ in range(5):
        mixed, _ = np.linalg.qr(rng.normal(size=(3, 3)))
        turned = _turned_to_standard(orbitals @ mixed)
        np.testing.assert_allclose(turned, _turned_to_standard(orbitals), atol=1e-12)
        np.testing.assert_allclose(turned @ turned.T, orbitals @ orbitals.T, atol=1e-12)


@pytest.mark.parametrize(
    ("atoms", "settings", "group", "size"),
    [
        (line("N N", 1.1), {}, "D∞h (used as D2h)", 8),
        (line("Li H", 1.6), {}, "C∞v (used as C2v)", 4),
        (bent("O", 0.96, 104.5), {}, "C2v", 4),
        (AMMONIA, {}, "C3v (used as Cs)", 2),
        (line("N", 0.0)[:1], {"multiplicity": 4, "basis": "6-31g*"}, "K (used as D2h)", 8),
    ],
)
def test_irreps_compose_by_exclusive_or_and_forbid_integrals(atoms, settings, group, size):
    prepared = Molecule(atoms=atoms, **settings).prepare()
    fermions = prepared.fermions
    labels = fermions.orbital_irreps
    assert prepared.facts["point_group"] == group
    assert len(fermions.irrep_names) == size
    assert labels.max() < size
    product = labels[:, None, None, None] ^ labels[:, None, None] ^ labels[:, None] ^ labels
    assert np.all(fermions.two_body[product != 0] == 0.0)
    assert np.all(fermions.one_body[labels[:, None] != labels] == 0.0)
    assert [row.irrep for row in prepared.ladder] == [fermions.irrep_names[i] for i in labels]


def test_the_point_group_does_not_change_the_exact_energy():
    with_group = Molecule(atoms=bent("O", 0.96, 104.5), active_space="frozen-core").prepare()
    without = Molecule(atoms=bent("O", 0.96, 104.5), active_space="frozen-core", point_group=False).prepare()
    assert without.fermions.irrep_names == ()
    assert not without.fermions.orbital_irreps.any()
    assert exact_energy(with_group.fermions) == pytest.approx(exact_energy(without.fermions), abs=1e-9)


def test_coordinates_to_six_digits_keep_their_point_group_and_the_energy():
    turn, _ = np.linalg.qr(np.random.default_rng(3).normal(size=(3, 3)))
    atoms = tuple((s, *np.round(np.array(r) @ turn, 6).tolist()) for s, *r in bent("O", 0.96, 104.5))
    rounded, plain = Molecule(atoms=atoms).prepare(), Molecule(atoms=atoms, point_group=False).prepare()
    assert rounded.facts["point_group"] == "C2v"
    assert 1e-9 < rounded.facts["largest_dropped_integral"] < 1e-5
    assert exact_energy(rounded.fermions) == pytest.approx(exact_energy(plain.fermions), abs=1e-9)


def test_an_unstable_mean_field_is_followed_to_a_lower_one_and_said_so():
    # nitrogen pulled apart: the symmetric solution is a saddle point
    symmetric = Molecule(atoms=line("N N", 2.0)).prepare()
    free = Molecule(atoms=line("N N", 2.0), point_group=False).prepare()
    assert free.reference_energy < symmetric.reference_energy - 0.1
    assert free.facts["mean_field_stability"] == "stable after following an instability"
    assert any("lower was followed" in w for w in free.warnings)
    assert any("breaks the point group" in w for w in symmetric.warnings)


def test_a_square_fills_its_degenerate_shell_along_the_lower_axes():
    grouped = Molecule(atoms=square(0.9)).prepare()
    free = Molecule(atoms=square(0.9), point_group=False).prepare()
    assert grouped.facts["point_group"] == "D4h (used as D2h)"
    assert grouped.reference_energy == pytest.approx(free.reference_energy, abs=1e-8)
    assert grouped.warnings == ()


def test_an_open_degenerate_shell_converges_with_the_point_group():
    grouped = Molecule(atoms=line("N O", 1.15), multiplicity=2).prepare()
    free = Molecule(atoms=line("N O", 1.15), multiplicity=2, point_group=False).prepare()
    assert grouped.facts["mean_field_converged"]
    assert grouped.reference_energy == pytest.approx(free.reference_energy, abs=1e-8)
    assert grouped.facts["mean_field"] == "ROHF"


def test_a_mean_field_that_the_plain_iterations_miss_is_finished_and_said_so():
    prepared = Molecule(atoms=bent("O", 2.0, 100.0)).prepare()
    assert prepared.facts["mean_field_converged"]
    assert any("did not converge in" in w for w in prepared.warnings)


def test_systems_without_correlation_are_prepared_too():
    atom = Molecule(atoms=(("H", 0.0, 0.0, 0.0),), multiplicity=2).prepare()
    ion = Molecule(atoms=line("H H", 1.0), charge=1, multiplicity=2)
    assert atom.reference_energy == pytest.approx(-0.4665818, abs=1e-6)  # STO-3G hydrogen atom, Szabo and Ostlund
    assert ion.prepare(neighbour=ion.prepare().seed).fermions.sector.n_electrons == 1
    helium = Molecule(atoms=(("He", 0.0, 0.0, 0.0),)).prepare()
    assert helium.facts["homo_lumo_gap"] is None
    assert helium.fermions.sector.dimension == 1


def test_an_active_space_that_parts_degenerate_orbitals_warns():
    assert Molecule(atoms=line("N N", 1.1), active_space="6e,6o").prepare().warnings == ()
    assert any("Orbitals 8 and 9" in w for w in Molecule(atoms=line("N N", 1.1), active_space="6e,4o").prepare().warnings)
