"""A reference typed by the person: read, checked against the sector, and put in place of the system's own."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.operators import Sector
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.own_reference import determinant_text, read_determinant, with_reference
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
