"""Geometries are read as people write them; anything else gives a sentence."""

import string

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thalweg.errors import StudyError
from thalweg.systems.xyz import read_atoms, read_frames

WATER = (("O", 0.0, 0.0, 0.117), ("H", 0.0, 0.757, -0.469), ("H", 0.0, -0.757, -0.469))
PLAIN = "O 0 0 0.117\nH 0 0.757 -0.469\nH 0 -0.757 -0.469"


@pytest.mark.parametrize(
    "text",
    [
        f"3\nwater\n{PLAIN}\n",
        f"3\n\n{PLAIN}",
        f"\n\n 3 \nwater\n{PLAIN}\n\n\n",
        "3\r\nwater\r\n" + PLAIN.replace("\n", "\r\n") + "\r\n",
        "3\rwater\r" + PLAIN.replace("\n", "\r"),
        "\ufeff3\nwater\n" + PLAIN,
        "3\nwater\n" + PLAIN.replace(" ", "\t\t "),
        "3\nwater\n" + PLAIN.replace("O", "oxygen").replace("H", "HYDROGEN"),
        "3\nwater\n" + PLAIN.replace("O", "8").replace("H", "1"),
        "3\nwater\n" + PLAIN.replace("O", "o").replace("H", "h"),
        "3\nwater\n" + PLAIN.replace("O", "O1").replace("H", "H_2"),
        "3\nwater\n" + PLAIN.replace("\n", " 0.1 0.2 0.3\n") + " 1 2 3",
        f"3\n{PLAIN}",
        PLAIN,
        f"# water\n{PLAIN}\n! end",
        PLAIN.replace("\n", "; "),
        PLAIN.replace(" ", ", "),
        "O 0,0 0,0 0,117\nH 0,0 0,757 -0,469\nH 0,0 -0,757 -0,469",
        "O 0 0 1.17D-01\nH 0 7.57d-1 -.469\nH 0 -757e-3 -4.69E-1",
        "1 O 0 0 0.117\n2 H 0 0.757 -0.469\n3 H 0 -0.757 -0.469",
        f"3\nfirst\n{PLAIN}\n3\nsecond\n{PLAIN.replace('757', '800')}\n",
        PLAIN.replace("-", "\u2212"),
        "3\nwater\nO\u00a00 0 0.117\nH 0 0.757 -0.469\nH 0 -0.757 -0.469",
    ],
)
def test_the_many_ways_to_write_water(text):
    assert read_atoms(text).atoms == WATER


def test_units_and_the_shortest_distance_are_echoed_in_both_units():
    notes = " ".join(read_atoms("H 0 0 0\nH 0 0 1.4", unit="bohr").notes)
    assert "read as bohr" in notes
    assert "0.7408 angstrom = 1.4000 bohr" in notes


@pytest.mark.parametrize(
    ("text", "note"),
    [
        (f"3\nfirst\n{PLAIN}\n3\nsecond\n{PLAIN}\n3\nthird\n{PLAIN}", "holds 3 geometries; the first is used"),
        (f"3\nwater\n{PLAIN}\nthe end\n", "after the last atom are ignored"),
        (f"3\n{PLAIN}", "comment line is missing"),
        ("O 0,0 0,0 0,0\nH 0,0 0,0 0,96", "Decimal commas"),
        ("O 0 0 0 7\nH 0 0 0.96 8", "Columns after"),
        ("O1 0 0 0\nH2 0 0 0.96", "Labels after"),
        ("O 0 0 0\nD 0 0 0.96", "Deuterium"),
        ("1 O 0 0 0\n2 H 0 0 0.96", "Numbers before"),
    ],
)
def test_what_was_passed_over_is_told(text, note):
    assert any(note in n for n in read_atoms(text).notes)


def test_charge_and_multiplicity_are_taken_from_the_comment():
    read = read_atoms("1\nan ion charge=+1 Multiplicity = 3\nO 0 0 0")
    assert (read.charge, read.multiplicity) == (1, 3)
    assert len([n for n in read.notes if "comment line" in n]) == 2
    assert read_atoms("1\nno word of it\nO 0 0 0").charge is None


def test_settings_in_the_comment_that_cannot_be_are_told():
    read = read_atoms("1\ncharge=many multiplicity=0\nO 0 0 0")
    assert (read.charge, read.multiplicity) == (None, None)
    assert len(read.warnings) == 2


def test_a_comment_that_names_another_unit_warns():
    assert any("unit=bohr" in w for w in read_atoms("2\nunit=bohr\nH 0 0 0\nH 0 0 0.74").warnings)
    assert read_atoms("2\nunit=angstrom\nH 0 0 0\nH 0 0 0.74").warnings == ()


@pytest.mark.parametrize(
    ("text", "unit", "word"),
    [
        ("H 0 0 0\nH 0 0 1.4", "angstrom", "bohr given as angstrom"),
        ("O 0 0 0\nH 0 0 1.83", "angstrom", "bohr given as angstrom"),
        ("O 0 0 0\nH 0 0 0.96", "bohr", "angstrom given as bohr"),
        ("H 0 0 0\nH 0 0 0.4", "angstrom", "shorter than any bond"),
    ],
)
def test_a_doubtful_unit_warns(text, unit, word):
    assert any(word in w for w in read_atoms(text, unit).warnings)


@pytest.mark.parametrize("text", ["H 0 0 0\nH 0 0 0.74", "H 0 0 0\nH 0 0 1.0", "N 0 0 0\nN 0 0 1.1", "Li 0 0 0\nH 0 0 1.6", "H 0 0 0"])
def test_common_lengths_do_not_warn(text):
    assert read_atoms(text).warnings == ()


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("", "empty"),
        (" \n \t \n", "empty"),
        ("# only a comment", "no atoms"),
        ("3\nwater\nO 0 0 0\nH 0 0 1\n", "announces 3 atoms"),
        ("0\nnothing\n", "announces 0 atoms"),
        ("99999999999\nmany\nH 0 0 0", "announces"),
        ("2\nx\nH 0 0 0\nQ 0 0 1", "'Q' is no element"),
        ("119 0 0 0", "'119' is no element"),
        ("H 0 0", "three coordinates"),
        ("H 0 0 zero", "'zero' is no number"),
        ("H 0 0 nan", "'nan' is no number"),
        ("H 0 0 1e999", "out of any range"),
        ("H 0 0 1_0", "'1_0' is no number"),
        ("H 0 0 \u0661", "is no number"),
        ("H 0 0 0\nH 0 0 0.001", "on one spot"),
        ("water\nO 0 0 0", "'water'"),
    ],
)
def test_what_is_no_geometry_gives_a_sentence(text, word):
    with pytest.raises(StudyError, match=word) as caught:
        read_atoms(text)
    assert caught.value.field == "system.atoms"


def test_an_unknown_unit_is_refused():
    with pytest.raises(StudyError, match="parsec"):
        read_atoms(PLAIN, "parsec")


def test_all_frames_are_read_for_a_path():
    frames = read_frames(f"3\na\n{PLAIN}\n\n3\nb charge=1\n{PLAIN.replace('757', '800')}\n")
    assert [f.comment for f in frames] == ["a", "b charge=1"]
    assert [f.charge for f in frames] == [None, 1]
    assert frames[1].atoms[1][2] == 0.8
    assert len(read_frames(PLAIN)) == 1
    with pytest.raises(StudyError):
        read_frames(f"3\na\n{PLAIN}\n3\nb\nO 0 0 0")


_TOKENS = st.sampled_from(
    ["H", "O", "Li1", "8", "0", "3", "1.5", "-2", "0,7", ";", ",", "1e5", "1D-2", "charge=1", "#", "\n", "\r\n", "\t", "nan", "²", "٣"]
)


@settings(max_examples=300, deadline=None)
@given(
    st.text(max_size=80) | st.lists(_TOKENS, max_size=25).map(" ".join) | st.text(alphabet=string.printable, max_size=80),
    st.sampled_from(["angstrom", "bohr"]),
)
def test_any_text_gives_a_geometry_or_a_sentence(text, unit):
    for read in (read_atoms, read_frames):
        try:
            result = read(text, unit)
        except StudyError:
            continue
        for geometry in result if isinstance(result, tuple) else (result,):
            assert geometry.atoms
            assert all(len(atom) == 4 for atom in geometry.atoms)
