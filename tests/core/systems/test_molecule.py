"""Prepared molecules meet published energies, and refuse what cannot be with a sentence."""

import json
import sys

import numpy as np
import pytest
from reference.molecular_energies import EXACT, HARTREE_FOCK, TEXTBOOK_H2, bent, line
from support.exact import exact_energy

from thalweg.errors import Stopped, StudyError
from thalweg.systems import Molecule
from thalweg.units import BOHR_IN_ANGSTROM
from thalweg.watch import Watch

LIH = line("Li H", 1.5957)


@pytest.mark.parametrize("name", HARTREE_FOCK)
def test_mean_field_energies_are_the_published_ones(name):
    case = HARTREE_FOCK[name]
    prepared = Molecule(atoms=case.atoms, **case.settings).prepare()
    assert prepared.reference_energy == pytest.approx(case.energy, abs=case.within)
    assert prepared.facts["mean_field_energy"] == pytest.approx(prepared.reference_energy, abs=1e-10)


@pytest.mark.parametrize("name", EXACT)
def test_integrals_give_the_recomputed_exact_energies(name):
    case = EXACT[name]
    prepared = Molecule(atoms=case.atoms, **case.settings).prepare()
    assert exact_energy(prepared.fermions) == pytest.approx(case.energy, abs=case.within)


def test_hydrogen_has_the_integrals_of_the_textbook():
    prepared = Molecule(atoms=line("H H", 1.4), unit="bohr").prepare()
    h, g, book = prepared.fermions.one_body, prepared.fermions.two_body, TEXTBOOK_H2
    found = {
        "hartree_fock": prepared.reference_energy,
        "full_ci": exact_energy(prepared.fermions),
        "h11": h[0, 0],
        "h22": h[1, 1],
        "J11": g[0, 0, 0, 0],
        "J12": g[0, 0, 1, 1],
        "J22": g[1, 1, 1, 1],
        "K12": g[0, 1, 0, 1],
        "e1": prepared.fermions.orbital_energies[0],
        "e2": prepared.fermions.orbital_energies[1],
    }
    for name, value in book.items():
        digits = 3 if name in ("e1", "e2") else 4
        assert found[name] == pytest.approx(value, abs=0.6 * 10**-digits), name


@pytest.mark.parametrize(
    ("atoms", "settings", "n_active", "electrons", "chosen"),
    [
        (bent("O", 0.96, 104.5), {"active_space": "4e,4o"}, 4, 4, None),
        (bent("O", 0.96, 104.5), {"active_space": "2,4-5,7"}, 4, 6, [2, 4, 5, 7]),
        (bent("C", 1.0748, 133.84), {"active_space": "frozen-core", "multiplicity": 3}, 6, 6, None),
        (bent("C", 1.0748, 133.84), {"active_space": "(2e, 3o)", "multiplicity": 3}, 3, 2, None),
        (line("O H", 0.97), {"active_space": "3,5,6", "multiplicity": 2}, 3, 3, [3, 5, 6]),
        (line("N N", 1.1), {"active_space": "6e,6o", "basis": "6-31g"}, 6, 6, None),
    ],
)
def test_active_spaces_agree_with_an_independent_complete_active_space(atoms, settings, n_active, electrons, chosen):
    from pyscf import ao2mo, mcscf

    prepared = Molecule(atoms=atoms, **settings).prepare()
    space = mcscf.CASCI(prepared.mean_field, n_active, electrons)
    orbitals = np.asarray(space.sort_mo(chosen) if chosen else prepared.mean_field.mo_coeff)
    one_body, core = space.get_h1eff(orbitals)
    two_body = ao2mo.restore(1, space.get_h2eff(orbitals), n_active)
    assert prepared.fermions.core_energy == pytest.approx(core, abs=1e-10)
    np.testing.assert_allclose(prepared.fermions.one_body, one_body, atol=1e-10)
    np.testing.assert_allclose(prepared.fermions.two_body, two_body, atol=1e-10)
    assert prepared.fermions.sector.n_electrons == electrons
    assert prepared.fermions.n_orbitals == n_active


def test_the_exact_energy_of_an_active_space_is_that_of_a_complete_active_space_calculation():
    from pyscf import mcscf

    prepared = Molecule(atoms=line("N N", 1.1), active_space="6e,6o", basis="6-31g").prepare()
    oracle = mcscf.CASCI(prepared.mean_field, 6, 6)
    oracle.verbose = 0
    assert exact_energy(prepared.fermions) == pytest.approx(oracle.kernel()[0], abs=1e-9)


def test_frozen_and_active_orbitals_are_marked_on_the_ladder():
    ladder = Molecule(atoms=LIH, active_space="2e,2o").prepare().ladder
    assert [row.number for row in ladder] == [1, 2, 3, 4, 5, 6]
    assert [row.frozen for row in ladder] == [True, False, False, False, False, False]
    assert [row.active for row in ladder] == [False, True, True, False, False, False]
    assert [row.occupation for row in ladder] == [2, 2, 0, 0, 0, 0]


def test_energy_does_not_change_with_the_active_reference():
    whole = Molecule(atoms=bent("O", 0.96, 104.5)).prepare()
    frozen = Molecule(atoms=bent("O", 0.96, 104.5), active_space="frozen-core").prepare()
    assert frozen.reference_energy == pytest.approx(whole.reference_energy, abs=1e-10)
    assert frozen.facts["frozen_orbitals"] == 1


def test_lengths_are_converted_with_the_programs_own_constant():
    angstrom = Molecule(atoms=LIH).prepare()
    bohr = Molecule(atoms=line("Li H", 1.5957 / BOHR_IN_ANGSTROM), unit="bohr").prepare()
    assert angstrom.facts["nuclear_repulsion"] == pytest.approx(3 * BOHR_IN_ANGSTROM / 1.5957, rel=1e-14)
    assert bohr.reference_energy == pytest.approx(angstrom.reference_energy, abs=1e-12)
    assert angstrom.facts["shortest_distance_bohr"] == pytest.approx(1.5957 / BOHR_IN_ANGSTROM)


def test_figures_are_json_and_say_which_functions_were_used():
    spherical = Molecule(atoms=line("H F", 0.92), basis="6-31g*").prepare().facts
    cartesian = Molecule(atoms=line("H F", 0.92), basis="6-31g*", cartesian=True).prepare().facts
    assert json.loads(json.dumps(spherical)) == spherical
    assert (spherical["functions"], spherical["orbitals"]) == ("spherical", 16)
    assert (cartesian["functions"], cartesian["orbitals"]) == ("Cartesian", 17)
    assert spherical["point_group"] == "C∞v (used as C2v)"


def test_labels_are_written_as_in_the_literature():
    assert Molecule(atoms=LIH, name="Lithium hydride").prepare().label == "Lithium hydride, STO-3G"
    assert Molecule(atoms=line("H He", 0.9), charge=1, basis="cc-pvdz").prepare().label == "HeH+, cc-pVDZ"


def test_nothing_is_printed(capfd):
    Molecule(atoms=line("N O", 1.15), multiplicity=2).prepare()
    assert capfd.readouterr() == ("", "")


def test_elements_with_a_core_potential_count_valence_electrons():
    facts = Molecule(atoms=line("Na I", 2.7), basis="lanl2dz", active_space="2e,2o").prepare().facts
    assert facts["electrons"] == 8
    assert facts["core_potential_electrons"] == 56


def test_stopping_ends_the_mean_field():
    asked = iter([False] * 4 + [True] * 100)
    with pytest.raises(Stopped):
        Molecule(atoms=bent("O", 0.96, 104.5)).prepare(Watch(should_stop=lambda: next(asked)))


def test_stages_are_told():
    told: list[str] = []
    Molecule(atoms=LIH).prepare(Watch(say=lambda text, fraction: told.append(text)))
    assert told == ["mean field", "integrals"]


def test_a_distance_shorter_than_any_bond_warns():
    assert any("shorter than any bond" in w for w in Molecule(atoms=line("H H", 0.3)).prepare().warnings)
    assert any("angstrom given as bohr" in w for w in Molecule(atoms=LIH, unit="bohr").prepare().warnings)
    assert Molecule(atoms=LIH).prepare().warnings == ()


@pytest.mark.parametrize(
    ("settings", "field", "word"),
    [
        ({"atoms": ()}, "system.atoms", "no atoms"),
        ({"atoms": (("Qq", 0.0, 0.0, 0.0),)}, "system.atoms", "Qq"),
        ({"atoms": line("H H", 0.0)}, "system.atoms", "one spot"),
        ({"basis": "sto-3h"}, "system.basis", "Unknown basis set"),
        ({"basis": "/etc/hostname"}, "system.basis", "Unknown basis set"),
        ({"basis": "gth-szv"}, "system.basis", "Unknown basis set"),
        ({"basis": "cc-pvdz", "atoms": line("Cs Cs", 4.6)}, "system.basis", "no functions for Cs"),
        ({"charge": 1}, "system.multiplicity", "Multiplicity 1 cannot be"),
        ({"charge": 4}, "system.charge", "no electrons"),
        ({"multiplicity": 2}, "system.multiplicity", "1 or 3"),
        ({"multiplicity": 7}, "system.multiplicity", "6 unpaired electrons"),
        ({"atoms": line("H He", 1.0), "charge": -1, "multiplicity": 5}, "system.basis", "do not fit"),
        ({"active_space": "6e,6o"}, "system.active_space", "the system has 4"),
        ({"active_space": "2e,9o"}, "system.active_space", "5o"),
        ({"active_space": "3e,3o"}, "system.active_space", "4e"),
    ],
)
def test_what_cannot_be_is_refused_with_the_setting_at_fault(settings, field, word):
    with pytest.raises(StudyError, match=word) as caught:
        Molecule(**({"atoms": LIH} | settings)).prepare()
    assert caught.value.field == field
    assert caught.value.what
    assert caught.value.why
    assert caught.value.fix


def test_work_over_the_memory_budget_is_refused_before_it_is_done():
    with pytest.raises(StudyError, match="GiB") as caught:
        Molecule(atoms=tuple(("C", 1.5 * i, 0.0, 0.0) for i in range(100)), basis="cc-pvqz").prepare()
    assert caught.value.field == "system.basis"
    with pytest.raises(StudyError, match="active orbitals") as caught:
        Molecule(atoms=line("N N", 1.1), basis="cc-pvdz").prepare(budget_bytes=3 * 2**20)
    assert caught.value.field == "system.active_space"


def test_without_pyscf_a_sentence_says_why(monkeypatch):
    monkeypatch.setitem(sys.modules, "pyscf", None)
    monkeypatch.setitem(sys.modules, "pyscf.gto", None)
    with pytest.raises(StudyError, match="PySCF"):
        Molecule(atoms=LIH).prepare()
