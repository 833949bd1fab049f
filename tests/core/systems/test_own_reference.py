"""A reference typed by the person: read, checked against the sector, and put in place of the system's own."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.operators import Sector
from thalweg.operators.slater_condon import determinant_matrix
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain
from thalweg.systems.own_reference import determinant_text, read_determinant, with_reference
from thalweg.systems.spin_models import Heisenberg
from thalweg.watch import SILENT

SECTOR = Sector(4, 2, 2)


@pytest.mark.parametrize(
    ("text", "masks"),
    [
        ("2200", (0b0011, 0b0011)),
        ("22 00", (0b0011, 0b0011)),
        ("2ab0", (0b0011, 0b0101)),
        ("AABB", (0b0011, 0b1100)),
        ("11110000", (0b0011, 0b0011)),
        ("1110 0100", (0b0011, 0b0101)),
    ],
)
def test_occupations_are_read_in_either_form(text, masks):
    assert read_determinant(text, SECTOR) == masks


@pytest.mark.parametrize("masks", [(0b0011, 0b1100), (0b1001, 0b0101)])
def test_the_text_of_a_determinant_is_read_back(masks):
    assert read_determinant(determinant_text(masks, 4), SECTOR) == masks


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("220", "not an occupation of 4 orbitals"),
        ("22x0", "not an occupation"),
        ("0011001", "not an occupation"),
        ("", "not an occupation"),
        ("2220", "3 alpha and 3 beta"),
        ("22a0", "3 alpha and 2 beta"),
        ("aaaa", "4 alpha and 0 beta"),
    ],
)
def test_a_text_that_does_not_fit_is_refused_with_the_reason(text, words):
    with pytest.raises(StudyError, match=words) as error:
        read_determinant(text, SECTOR)
    assert error.value.field == "reference"


@pytest.fixture(scope="module")
def four():
    return Molecule(atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4))).prepare(SILENT, budget_bytes=2**31)


def test_the_usual_determinant_typed_out_changes_nothing_but_the_name(four):
    own = with_reference(four, "2200")
    assert own.fermions.reference == four.fermions.reference
    assert own.reference_energy == pytest.approx(four.reference_energy, abs=1e-9)
    assert own.reference_name == "determinant 2200"


def test_the_energy_of_the_determinant_becomes_the_reference_energy(four):
    own = with_reference(four, "2020")
    assert own.reference_energy == pytest.approx(four.fermions.determinant_energy(0b0101, 0b0101))
    assert own.reference_energy > four.reference_energy


@pytest.mark.parametrize("reference", ["auto", "singlets"])
def test_a_bit_string_is_a_spin_reference(reference):
    prepared = LatticeModel(reference=reference).prepare(SILENT, budget_bytes=2**31)
    own = with_reference(prepared, "0000 0000")
    assert (own.reference_bits, own.reference_kind, own.reference_pairs) == (0, "bits", ())
    assert own.reference_energy == pytest.approx(8 * 0.25)  # eight parallel bonds of S.S
    neel = with_reference(prepared, "01010101")
    assert neel.reference_energy == pytest.approx(-8 * 0.25)
    assert neel.reference_bits == sum(1 << q for q in range(1, 8, 2))
    assert np.array_equal(own.spins.coefficients, prepared.spins.coefficients)


def test_a_bit_string_of_another_length_is_refused_at_its_field():
    prepared = LatticeModel().prepare(SILENT, budget_bytes=2**31)
    with pytest.raises(StudyError) as error:
        with_reference(prepared, "0101")
    assert error.value.field == "reference"


def test_a_list_of_determinants_becomes_the_lowest_state_among_them(four):
    own = with_reference(four, "2200, 2020, 2002")
    matrix = determinant_matrix(four.fermions, [(t.alpha, t.beta) for t in own.fermions.reference_terms])
    assert own.reference_energy == pytest.approx(np.linalg.eigvalsh(matrix)[0], abs=1e-12)
    assert own.reference_energy < four.reference_energy - 1e-3
    assert own.fermions.reference == four.fermions.reference  # excitations count from the first
    assert sum(t.amplitude**2 for t in own.fermions.reference_terms) == pytest.approx(1.0)


def test_an_open_shell_singlet_is_two_determinants_half_an_exchange_integral_apart(four):
    """Textbook (Szabo and Ostlund, Modern Quantum Chemistry, 2.5.2): singlet and triplet lie 2 K apart around the single determinant."""
    h = four.fermions
    exchange = h.two_body[0, 2, 2, 0]
    middle = h.determinant_energy(0b0011, 0b0110)
    # with alpha left of beta in every determinant the singlet is the sum
    assert with_reference(four, "a2b0 + b2a0").reference_energy == pytest.approx(middle + exchange, abs=1e-10)
    assert with_reference(four, "a2b0 - b2a0").reference_energy == pytest.approx(middle - exchange, abs=1e-10)


def test_determinants_of_different_symmetries_are_refused(four):
    with pytest.raises(StudyError, match="2200 has Ag and 2ab0 has B1u") as error:
        with_reference(four, "2200, 2ab0")
    assert error.value.field == "reference"


def test_basis_states_of_spins_combine_to_a_singlet():
    pair = LatticeModel(lattice=Chain(sites=2, periodic=False), model=Heisenberg()).prepare(SILENT, budget_bytes=2**31)
    singlet, triplet = with_reference(pair, "01 - 10"), with_reference(pair, "01 + 10")
    assert singlet.reference_energy == pytest.approx(-0.75)  # S.S of a singlet and of a triplet
    assert triplet.reference_energy == pytest.approx(0.25)
    found = with_reference(pair, "01, 10").reference_terms
    assert [bits for _, bits in found] == [bits for _, bits in singlet.reference_terms]
    assert [c for c, _ in found] == pytest.approx([c for c, _ in singlet.reference_terms])
    assert (singlet.reference_kind, singlet.reference_name) == ("combination", "0.7071*01 - 0.7071*10")
