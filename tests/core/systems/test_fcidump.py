"""FCIDUMP listings in their common variants, and systems made of them."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference.molecular_energies import bent, line
from support.exact import exact_energy
from support.molecules import random_hamiltonian

from thalweg.errors import StudyError
from thalweg.systems import Integrals, Molecule
from thalweg.systems.fcidump import listing_of, read_listing, write_listing

#: H2, STO-3G, 1.4 bohr: integrals of Szabo and Ostlund, Modern Quantum Chemistry, to four digits (from memory); core 1/1.4.
H2_BODY = """
0.6746 1 1 1 1
0.6636 2 2 1 1
0.1813 2 1 2 1
0.6975 2 2 2 2
-1.2528 1 1 0 0
-0.4756 2 2 0 0
0.7142857 0 0 0 0
"""
H2_HEADER = "&FCI NORB=2,NELEC=2,MS2=0,\n ORBSYM=1,5,\n ISYM=1,\n&END"
H2 = H2_HEADER + H2_BODY


@pytest.mark.parametrize(
    "text",
    [
        H2,
        H2.replace("&END", "/"),
        H2.replace("&FCI", " $FCI").replace("&END", " $END"),
        H2.replace("\n", "\r\n"),
        "\ufeff" + H2,
        H2.lower(),
        "&FCI NORB=2, NELEC=2, MS2=0, ORBSYM=1 5, ISYM=1 /" + H2_BODY,
        "&FCI\n NORB = 2 ,\n NELEC= 2\n MS2 =0\n ORBSYM=1,\n 5\n UHF=.FALSE.\n ISYM=1\n /" + H2_BODY,
        "&FCI NORB=2,NELEC=2,ORBSYM=2*1 / " + H2_BODY,
        "&FCI NORB=2,NELEC=2,IUHF=0 ! remark / with a stroke\n&END" + H2_BODY,
        H2.replace("0.6746", "0.6746D+00").replace("-1.2528", "-.12528d1"),
        H2.replace("1 1 1 1", "1 1 1 1\n1.0-300 2 1 1 1"),
        H2.replace("0.6636 2 2 1 1", "0.6636 2 2 1 1\n0.6636 1 1 2 2\n0.1813 2 1 1 2\n0.1813 1 2 1 2\n0.1813 1 2 2 1"),
        H2 + "-0.578 1 0 0 0\n0.670 2 0 0 0\n",
    ],
)
def test_the_common_variants_of_a_listing(text):
    read = read_listing(text)
    assert (read.n_orbitals, read.n_electrons, read.ms2) == (2, 2, 0)
    assert read.core_energy == 0.7142857
    assert read.one_body.tolist() == [[-1.2528, 0.0], [0.0, -0.4756]]
    assert read.two_body[0, 0, 1, 1] == read.two_body[1, 1, 0, 0] == 0.6636
    for place in ((0, 1, 0, 1), (1, 0, 0, 1), (0, 1, 1, 0), (1, 0, 1, 0)):
        assert read.two_body[place] == 0.1813


def test_a_listing_gives_the_textbook_energies():
    prepared = Integrals(listing=H2).prepare()
    assert prepared.reference_energy == pytest.approx(-1.1167, abs=2e-4)
    assert exact_energy(prepared.fermions) == pytest.approx(-1.1373, abs=2e-4)
    assert prepared.fermions.orbital_irreps.tolist() == [0, 4]
    assert prepared.warnings == ()


@pytest.mark.parametrize(
    ("text", "word"),
    [
        (H2_BODY, "no header"),
        (H2.replace("&END", ""), "no end"),
        (H2.replace("NORB=2,", ""), "NORB of the listing is missing"),
        (H2.replace("NORB=2", "NORB=two"), "NORB"),
        (H2.replace("NORB=2", "NORB=0"), "between 1"),
        (H2.replace("NORB=2", "NORB=1000"), "between 1"),
        (H2.replace("NELEC=2", "NELEC=5"), "between 1 and 4"),
        (H2.replace("MS2=0", "MS2=9"), "MS2"),
        (H2.replace("ORBSYM=1,5", "ORBSYM=1,5,1"), "ORBSYM of the listing has 3 labels"),
        (H2.replace("ORBSYM=1,5", "ORBSYM=1,b"), "ORBSYM"),
        (H2.replace("ISYM=1", "ISYM=1, UHF=.TRUE."), "unrestricted"),
        (H2.replace("ISYM=1", "IUHF=1"), "unrestricted"),
        (H2.replace("0.6746", "(0.6746,0.0)"), "complex"),
        (H2.replace("0.6746", "x"), "The line 'X 1 1 1 1' cannot be read"),
        (H2.replace("0.6746", "nan"), "cannot be"),
        (H2.replace("2 2 2 2", "2 2 2 3"), "orbitals run from 1 to 2"),
        (H2.replace("2 2 2 2", "2 2 2 -2"), "orbitals run from 1 to 2"),
        (H2.replace("2 2 2 2", "2 2 2 1.5"), "orbitals run from 1 to 2"),
        (H2.replace("2 2 2 2", "2 2 2 0"), "four, two, one or none"),
        (H2.replace("2 2 2 2", "2 2 2"), "a value and four orbitals"),
        (H2 + "0.5 1 1 2 2\n", "contradicts itself"),
        (H2 + "0.0 0 0 0 0\n", "several core energies"),
        (H2_HEADER, "no integrals"),
    ],
)
def test_what_is_no_listing_gives_a_sentence(text, word):
    with pytest.raises(StudyError, match=word) as caught:
        read_listing(text)
    assert caught.value.field == "system.listing"


@settings(max_examples=300, deadline=None)
@given(
    st.text(max_size=60)
    | st.lists(
        st.sampled_from(["&FCI", "/", "&END", "NORB=2,", "NELEC=2", "ORBSYM=1,1", "MS2=", "0.5 1 1 1 1", "1 0 0 0 0", "\n", "(1,0)", "1D5", "!"])
    ).map(" ".join)
    | st.tuples(st.integers(0, len(H2)), st.text(max_size=6)).map(lambda cut: H2[: cut[0]] + cut[1] + H2[cut[0] :])
)
def test_any_text_gives_a_listing_or_a_sentence(text):
    try:
        read = read_listing(text)
    except StudyError:
        return
    assert np.isfinite(read.two_body).all()
    try:
        Integrals(listing=text).prepare()
    except StudyError:
        return


def test_writing_and_reading_give_back_the_same_bits():
    for hamiltonian in (random_hamiltonian(5, 3, 2, seed=1), Molecule(atoms=line("N N", 1.1), active_space="6e,6o").prepare().fermions):
        read = read_listing(write_listing(listing_of(hamiltonian)))
        symmetric = 0.5 * (hamiltonian.one_body + hamiltonian.one_body.T)
        np.testing.assert_array_equal(read.one_body, np.tril(symmetric) + np.tril(symmetric, -1).T)
        np.testing.assert_allclose(read.two_body, hamiltonian.two_body, rtol=1e-15, atol=1e-15)
        assert read.core_energy == hamiltonian.core_energy
        np.testing.assert_array_equal(read.orbital_energies, hamiltonian.orbital_energies)
        assert (read.n_electrons, read.ms2) == (hamiltonian.sector.n_electrons, hamiltonian.sector.n_alpha - hamiltonian.sector.n_beta)
        assert write_listing(read) == write_listing(listing_of(hamiltonian))


def test_a_molecule_becomes_the_same_system_through_its_listing():
    molecule = Molecule(atoms=bent("C", 1.0748, 133.84), multiplicity=3, active_space="frozen-core").prepare()
    system = Integrals(listing=write_listing(listing_of(molecule.fermions))).prepare()
    assert system.fermions.reference == molecule.fermions.reference
    assert system.reference_energy == pytest.approx(molecule.reference_energy, abs=1e-12)
    np.testing.assert_array_equal(system.fermions.orbital_irreps, molecule.fermions.orbital_irreps)
    assert system.warnings == ()


@pytest.mark.parametrize("point_group", [True, False])
@pytest.mark.parametrize("shifted_labels", [True, False])
def test_listings_written_by_an_independent_program_are_read(tmp_path, point_group, shifted_labels):
    from pyscf import tools

    prepared = Molecule(atoms=line("Li H", 1.6), point_group=point_group).prepare()
    tools.fcidump.from_scf(prepared.mean_field, str(tmp_path / "FCIDUMP"), molpro_orbsym=shifted_labels and point_group, tol=0)
    system = Integrals(listing=(tmp_path / "FCIDUMP").read_text()).prepare()
    assert system.reference_energy == pytest.approx(prepared.reference_energy, abs=1e-10)
    assert exact_energy(system.fermions) == pytest.approx(exact_energy(prepared.fermions), abs=1e-10)
    assert len(set(system.fermions.orbital_irreps.tolist())) == len(set(prepared.fermions.orbital_irreps.tolist()))
    assert system.warnings == ()


def test_an_independent_program_reads_what_is_written(tmp_path):
    from pyscf import ao2mo, tools

    fermions = Molecule(atoms=line("N N", 1.1), active_space="6e,6o").prepare().fermions
    (tmp_path / "FCIDUMP").write_text(write_listing(listing_of(fermions)))
    read = tools.fcidump.read(str(tmp_path / "FCIDUMP"), verbose=False)
    np.testing.assert_allclose(ao2mo.restore(1, read["H2"], 6), fermions.two_body, atol=1e-15)
    np.testing.assert_allclose(read["H1"], fermions.one_body, atol=1e-15)
    assert read["ECORE"] == pytest.approx(fermions.core_energy)


def test_the_reference_is_the_lowest_by_listed_orbital_energies():
    swapped = H2 + "0.5 1 0 0 0\n-0.5 2 0 0 0\n"
    prepared = Integrals(listing=swapped).prepare()
    assert prepared.fermions.reference == (2, 2)
    assert prepared.facts["reference_rule"] == "lowest listed orbital energies"


def test_without_orbital_energies_the_lower_of_order_and_fock_diagonal_is_the_reference():
    turned = H2.replace("-1.2528 1 1", "-1.2528 9 9").replace("-0.4756 2 2", "-0.4756 1 1").replace("9 9", "2 2")
    turned = turned.replace("0.6746 1 1 1 1", "0.6746 9 9 9 9").replace("0.6975 2 2 2 2", "0.6975 1 1 1 1").replace("9 9 9 9", "2 2 2 2")
    prepared, plain = Integrals(listing=turned).prepare(), Integrals(listing=H2).prepare()
    assert prepared.fermions.reference == (2, 2)
    assert prepared.facts["reference_rule"] == "lowest diagonal of the Fock matrix"
    assert prepared.reference_energy == pytest.approx(plain.reference_energy, abs=1e-12)
    assert plain.facts["reference_rule"] == "first orbitals of the listing"


def test_a_reference_that_is_not_stationary_is_told():
    mixed = H2.replace("-1.2528 1 1 0 0", "-1.2528 1 1 0 0\n0.2 2 1 0 0").replace("ORBSYM=1,5", "ORBSYM=1,1")
    assert any("not stationary" in w for w in Integrals(listing=mixed).prepare().warnings)


def test_labels_that_do_not_fit_the_integrals_are_not_used():
    mixed = H2.replace("-1.2528 1 1 0 0", "-1.2528 1 1 0 0\n0.2 2 1 0 0")
    prepared = Integrals(listing=mixed).prepare()
    assert not prepared.fermions.orbital_irreps.any()
    assert any("ORBSYM" in w for w in prepared.warnings)


def test_a_listing_that_asks_for_another_irrep_is_told():
    assert any("asks for irrep 5" in w for w in Integrals(listing=H2.replace("ISYM=1", "ISYM=5")).prepare().warnings)


def test_a_missing_core_energy_is_told():
    prepared = Integrals(listing=H2.replace("0.7142857 0 0 0 0", "")).prepare()
    assert any("no core energy" in w for w in prepared.warnings)


def test_the_multiplicity_can_be_set_and_is_checked():
    triplet = Integrals(listing=H2, multiplicity=3).prepare()
    assert (triplet.fermions.sector.n_alpha, triplet.fermions.sector.n_beta) == (2, 0)
    for multiplicity in (2, 5):
        with pytest.raises(StudyError) as caught:
            Integrals(listing=H2, multiplicity=multiplicity).prepare()
        assert caught.value.field == "system.multiplicity"


def test_active_spaces_of_listings():
    whole = Molecule(atoms=bent("O", 0.96, 104.5)).prepare()
    listing = write_listing(listing_of(whole.fermions))
    part = Integrals(listing=listing, active_space="8e,6o").prepare()
    frozen = Molecule(atoms=bent("O", 0.96, 104.5), active_space="frozen-core").prepare()
    assert part.fermions.core_energy == pytest.approx(frozen.fermions.core_energy, abs=1e-9)
    np.testing.assert_allclose(part.fermions.one_body, frozen.fermions.one_body, atol=1e-9)
    assert [row.frozen for row in part.ladder] == [True] + [False] * 6
    with pytest.raises(StudyError, match="by rule"):
        Integrals(listing=listing, active_space="frozen-core").prepare()


def test_an_empty_or_too_large_listing_is_refused():
    with pytest.raises(StudyError, match="no integrals"):
        Integrals().prepare()
    with pytest.raises(StudyError, match="GiB"):
        Integrals(listing=H2.replace("NORB=2", "NORB=100").replace("ORBSYM=1,5,\n", "")).prepare(budget_bytes=2**20)
