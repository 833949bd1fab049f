"""Operators of the openfermion library and text, there and back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from support.molecules import stored_molecule

from thalweg.encoding import JordanWigner
from thalweg.encoding.encoded import encode_fermions
from thalweg.encoding.interchange import from_qubit_operator, from_text, to_fermion_operator, to_qubit_operator, to_text
from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion, collect_terms


def same(left: PauliExpansion, right: PauliExpansion) -> bool:
    return (
        left.n_qubits == right.n_qubits
        and np.array_equal(left.x, right.x)
        and np.array_equal(left.z, right.z)
        and np.array_equal(left.coefficients, right.coefficients)
    )


@st.composite
def expansions(draw) -> PauliExpansion:
    n = draw(st.integers(1, 62))
    masks = st.integers(0, (1 << n) - 1)
    number = st.floats(-1e6, 1e6, allow_nan=False).filter(lambda c: abs(c) > 1e-9)
    terms = draw(st.lists(st.tuples(masks, masks, number), min_size=1, max_size=20, unique_by=lambda t: t[:2]))
    x, z = (np.array([t[i] for t in terms], np.uint64) for i in (0, 1))
    return collect_terms(n, x, z, np.array([t[2] for t in terms]))


@settings(max_examples=50, deadline=None)
@given(expansions())
def test_text_and_qubit_operators_come_back_as_they_were(expansion):
    assert same(from_text(to_text(expansion)), expansion)
    assert same(from_qubit_operator(to_qubit_operator(expansion), expansion.n_qubits), expansion)


def test_stored_molecule_gives_the_fermion_operator_of_openfermion():
    from openfermion import get_fermion_operator, normal_ordered

    data, hamiltonian = stored_molecule("H2_sto-3g_singlet_0.7414")
    difference = normal_ordered(to_fermion_operator(hamiltonian)) - normal_ordered(get_fermion_operator(data.get_molecular_hamiltonian()))
    assert max((abs(c) for c in difference.terms.values()), default=0.0) < 1e-12


def test_text_has_one_line_a_term_under_the_size_of_the_register():
    expansion = collect_terms(4, np.array([0, 3], np.uint64), np.array([0, 1], np.uint64), np.array([-0.5, 0.25]))
    assert to_text(expansion) == "qubits 4\n-0.5 I\n0.25 Y0 X1\n"


def test_reader_takes_comments_blank_lines_case_stars_and_repeats():
    read = from_text("# a comment\r\n\r\n 0.5 * z0 Z2 # here too\n+2.5E-1 X1\n1d0 I\n0.5 Z2 Z0\n")
    assert read.n_qubits == 3
    assert dict(zip(read.labels(), read.coefficients.tolist(), strict=True)) == {"I": 1.0, "Z0 Z2": 1.0, "X1": 0.25}


def test_cut_drops_small_terms_on_reading():
    assert len(from_text("1 Z0\n1e-12 X0", cut=1e-10)) == 1


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "No Pauli terms"),
        ("# nothing\n", "No Pauli terms"),
        ("Z0 0.5", "Line 1 begins with 'Z0'"),
        ("0.5 Z0\nnan X1", "Line 2 begins with 'nan'"),
        ("inf X1", "finite"),
        ("0.5 Q0", "Line 1 holds 'Q0'"),
        ("0.5 Z", "Line 1 holds 'Z'"),
        ("0.5 Z0 X0", "names a qubit twice"),
        ("0.5 Z62", "Qubit 62 is out of range"),
        ("qubits 2\n0.5 Z2", "the register has 2 qubits"),
        ("qubits 63\n0.5 Z2", "Qubit 62 is out of range"),
        ("1+2j Z0", "finite real coefficient"),
    ],
)
def test_bad_text_is_refused_with_a_sentence(text, says):
    with pytest.raises(StudyError, match=says.replace("(", r"\(")):
        from_text(text)


@settings(max_examples=200, deadline=None)
@given(st.text(st.sampled_from("0123456789.eE+-XYZI xyz#\n\t*qubits"), max_size=60))
def test_reader_gives_an_expansion_or_a_sentence(text):
    try:
        size = from_text(text).n_qubits
    except StudyError:
        size = 1
    assert 1 <= size <= 62


def test_complex_coefficients_and_small_registers_are_refused():
    from openfermion import QubitOperator

    with pytest.raises(StudyError, match="complex coefficient"):
        from_qubit_operator(QubitOperator("X0 Y1", 1j))
    with pytest.raises(StudyError, match="out of range"):
        from_qubit_operator(QubitOperator("X5"), n_qubits=3)
    assert from_qubit_operator(QubitOperator("X1", 0.5 + 1e-15j)).coefficients.tolist() == [0.5]


def test_molecule_keeps_every_term_through_openfermion():
    _, hamiltonian = stored_molecule("H1-Li1_sto-3g_singlet_1.45")
    full = encode_fermions(hamiltonian, JordanWigner()).full
    assert same(from_qubit_operator(to_qubit_operator(full), 12), full)
