"""Elements, distances and bonds."""

import pytest
from reference.molecular_energies import bent, line

from thalweg.errors import StudyError
from thalweg.systems.elements import ELEMENTS, core_orbitals, find_element, formula
from thalweg.systems.geometry import bonds, check_geometry, coordinates_in_bohr, describe_shortest, shortest_distance
from thalweg.units import BOHR_IN_ANGSTROM


def test_the_table_of_elements_agrees_with_an_independent_one():
    from pyscf.data.elements import COMMON_ISOTOPE_MASSES
    from pyscf.data.elements import ELEMENTS as SYMBOLS

    assert [e.symbol for e in ELEMENTS] == SYMBOLS[1:]
    for element in ELEMENTS[:54]:
        assert element.mass == pytest.approx(COMMON_ISOTOPE_MASSES[element.number], abs=1e-5)


@pytest.mark.parametrize("text", ["Li", "li", "LI", "lithium", "Lithium", "3", " 3 "])
def test_elements_are_found_by_symbol_name_and_number(text):
    assert find_element(text).symbol == "Li"


@pytest.mark.parametrize("text", ["", "0", "119", "-3", "3.0", "Lx", "²", "1000000"])
def test_what_is_no_element_is_not_found(text):
    assert find_element(text) is None


def test_spellings_and_isotopes_are_known():
    assert [find_element(t).symbol for t in ("sulphur", "aluminum", "cesium", "D")] == ["S", "Al", "Cs", "H"]


def test_the_core_is_that_of_the_preceding_noble_gas():
    assert [core_orbitals(z) for z in (1, 2, 3, 10, 11, 18, 19, 36, 37, 55)] == [0, 0, 1, 1, 5, 5, 9, 9, 18, 27]


@pytest.mark.parametrize(
    ("symbols", "written"),
    [("H Li", "LiH"), ("F H", "HF"), ("H H N H", "NH3"), ("O H H", "H2O"), ("H C H H H", "CH4"), ("O C", "CO"), ("Cl Na", "NaCl"), ("N N", "N2")],
)
def test_formulas_are_written_in_the_usual_order(symbols, written):
    assert formula(tuple(symbols.split())) == written


def test_distances_come_in_both_units():
    pair = shortest_distance(line("H H H", 0.9, 0.7), "angstrom")
    assert (pair.first, pair.second) == (1, 2)
    assert pair.angstrom == pytest.approx(0.7)
    assert pair.bohr == pytest.approx(0.7 / BOHR_IN_ANGSTROM)
    assert shortest_distance(line("H H", 1.4), "bohr").angstrom == pytest.approx(1.4 * BOHR_IN_ANGSTROM)
    assert describe_shortest((("H", 0.0, 0.0, 0.0),), "bohr") == ""
    assert coordinates_in_bohr(line("H H", 1.4), "bohr")[1, 2] == 1.4


def test_bonds_join_neighbours_alone():
    assert bonds(bent("O", 0.96, 104.5), "angstrom") == ((0, 1), (0, 2))
    assert bonds(line("H H H H", 0.9, 0.9, 0.9), "angstrom") == ((0, 1), (1, 2), (2, 3))
    assert bonds(line("H H", 5.0), "angstrom") == ()
    assert bonds(line("O", 0.0), "angstrom") == ()


def test_too_many_atoms_are_refused():
    with pytest.raises(StudyError, match="2000 atoms"):
        check_geometry(tuple(("H", 2.0 * i, 0.0, 0.0) for i in range(2000)), "angstrom")
