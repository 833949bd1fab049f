"""The state that a search begins at, from the command line."""

from __future__ import annotations

import json

import pytest


def solved(thalweg, *words: str) -> dict:
    status, out, err = thalweg("solve", *words, "--quiet", "--json", "-", "--set", "stop.evaluations=1")
    assert status == 0, err
    return json.loads(out)


@pytest.mark.parametrize(
    ("reference", "name"),
    [
        ("1100", "determinant 20"),
        ("20", "determinant 20"),
        ("20,02", "0.9936*20 - 0.1128*02"),
        ("-0.6*20 + 0.8*02", "- 0.6*20 + 0.8*02"),
    ],
)
def test_a_molecule_begins_at_what_is_written_out(thalweg, reference, name):
    found = solved(thalweg, "H2", "--reference", reference)
    assert found["reference_name"] == name
    assert found["starts"][0]["trace"]["energy"][0] == pytest.approx(found["reference_energy"], abs=1e-9)


@pytest.mark.parametrize(
    ("reference", "name"), [("neel", "Neel state"), ("Singlets", "dimer singlets"), ("01010101 - 10101010", "0.7071*01010101 - 0.7071*10101010")]
)
def test_spins_begin_at_a_named_state_or_at_what_is_written_out(thalweg, reference, name):
    found = solved(thalweg, "ring_8_heisenberg", "--ansatz", "hardware-efficient", "--depth", "3", "--start", "zero", "--reference", reference)
    assert found["reference_name"] == name
    assert found["starts"][0]["trace"]["energy"][0] == pytest.approx(found["reference_energy"], abs=1e-9)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("H2", "--reference", "1010"), "2 alpha and 0 beta electrons where the system has 1 and 1"),
        (("LiH", "--reference", "2200"), "'2200' is not an occupation of 6 orbitals"),
        (("LiH", "--reference", "0.5"), "'0.5' is not an occupation of 6 orbitals"),
        (("H4_line", "--reference", "2200, 2ab0"), "The determinants have different symmetries"),
        (("LiH", "--reference", "neel"), "Molecule has no setting 'reference'"),
        (("ring_8_heisenberg", "--reference", "01010101,10101010"), "no one lowest state"),
    ],
)
def test_what_fits_no_system_is_refused_in_one_sentence(thalweg, arguments, words):
    status, _, err = thalweg("solve", *arguments, "--quiet")
    assert status == 2
    assert words in err
    assert "Traceback" not in err


@pytest.mark.parametrize(
    ("words", "remark"),
    [
        (["river_crews_cut", "--reference", "11110000"], "begins from all plus, not from basis state 11110000"),
        (["river_crews_cut", "--reference", "11110000,00001110"], "begins from all plus, not from"),
        (["river_crews_cut", "--reference", "11110000", "--ansatz-set", "initial=reference"], ""),
        (["river_crews_cut", "--reference", "11110000", "--ansatz-set", "mixer=ring"], ""),
        (["river_crews_cut"], ""),
        (["ring_8_heisenberg", "--reference", "01010101"], "begins from dimer singlets, not from basis state 01010101"),
        (["ring_8_heisenberg", "--reference", "01010101 - 10101010"], ""),
    ],
)
def test_a_typed_reference_that_the_circuit_does_not_begin_with_is_remarked(thalweg, words, remark):
    found = solved(thalweg, *words, "--ansatz", "alternating-operators", "--start", "zero")
    remarks = [text for text in found["remarks"] if "begins from" in text]
    assert len(remarks) == bool(remark)
    assert remark in " ".join(remarks)
    at_reference = found["starts"][0]["trace"]["energy"][0] == pytest.approx(found["reference_energy"], abs=1e-9)
    assert at_reference == (not remark)
