"""Typed sums of Pauli strings: read, written, refused in words; any text is survived."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from support.dense import expansion_matrix, string_matrix
from support.refusals import read_or_refusal

from thalweg.errors import StudyError
from thalweg.systems.lattice import Chain, Unconnected
from thalweg.systems.pauli_list import PauliList, needed_qubits, parse_paulis, write_paulis

masks = st.integers(0, 2**12 - 1)
terms = st.tuples(st.floats(allow_nan=False, allow_infinity=False), masks, masks)


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("0.5 X0 X1 - Z2", ((0.5, 0b11, 0), (-1.0, 0, 0b100))),
        ("-Y1", ((-1.0, 0b10, 0b10),)),
        ("+ 1e-3*Z0*Z3 + 2", ((1e-3, 0, 0b1001), (2.0, 0, 0))),
        ("x0y1z2", ((1.0, 0b011, 0b110),)),
        ("Z0\n- \u2212 .5 I + -3. X2", ((1.0, 0, 1), (0.5, 0, 0), (-3.0, 0b100, 0))),
        ("2e2 I", ((200.0, 0, 0),)),
        ("I", ((1.0, 0, 0),)),
        ("X0 - I", ((1.0, 1, 0), (-1.0, 0, 0))),
    ],
)
def test_sums_are_read(text, found):
    assert parse_paulis(text) == found


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("", "no term"),
        ("   \n", "no term"),
        ("0.5 X0 X0", "twice"),
        ("X0 0.5", "after a factor"),
        ("0.5 0.3 X0", "after a factor"),
        ("X0 +", "nothing after"),
        ("X0 * + Z1", "nothing after"),
        ("* X0", "nothing before"),
        ("X0 ** X1", "nothing before"),
        ("X0 + - - Z1", "too many signs"),
        ("X", "no number"),
        ("0.5 A1", "no number"),
        ("X62", "from 0 to 61"),
        ("X99999999999999999999", "from 0 to 61"),
        ("1e999 X0", "not finite"),
        ("X-1", "no number"),
    ],
)
def test_other_texts_are_refused_in_words(text, why):
    with pytest.raises(StudyError, match=why) as caught:
        parse_paulis(text)
    assert caught.value.field == "model.terms"
    assert "such as" in caught.value.fix


@given(st.lists(terms, min_size=1, max_size=10).map(tuple))
def test_what_is_written_is_read_back(sum_of_terms):
    assert parse_paulis(write_paulis(sum_of_terms)) == sum_of_terms


@given(st.text(max_size=80) | st.text("XYZI0123456789.e+-* \n", max_size=40))
def test_any_text_is_read_or_refused_in_words(text):
    found, refusal = read_or_refusal(lambda: parse_paulis(text))
    if refusal is not None:
        assert refusal.what
        assert refusal.fix
    else:
        assert all(np.isfinite(c) and 0 <= x < 2**62 and 0 <= z < 2**62 for c, x, z in found)
        assert needed_qubits(found) >= 1


def test_the_matrix_is_the_sum_of_the_strings():
    expansion = PauliList(terms="0.5 X0 Y1 - Z2 + 0.25 + X0 Y1").hamiltonian(Unconnected())
    want = 1.5 * string_matrix(3, 0b011, 0b010) - string_matrix(3, 0, 0b100) + 0.25 * np.eye(8)
    assert np.allclose(expansion_matrix(expansion), want)


def test_the_register_follows_the_list_or_the_lattice():
    assert PauliList(terms="Z4").hamiltonian(Unconnected()).n_qubits == 5
    assert PauliList(terms="Z4").hamiltonian(Chain(sites=8)).n_qubits == 8
    with pytest.raises(StudyError, match="qubit 4"):
        PauliList(terms="Z4").hamiltonian(Chain(sites=4))


def test_a_long_list_is_shortened_in_its_convention():
    text = PauliList(terms=" + ".join(f"Z{q}" for q in range(40))).convention()
    assert "..." in text
    assert len(text) < 200
