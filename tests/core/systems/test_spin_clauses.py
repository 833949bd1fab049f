"""Discrete costs: the energy of every basis state is the cost of its assignment; the best one is read off a state."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from support.refusals import read_or_refusal

from thalweg.errors import StudyError
from thalweg.operators.conserved import is_diagonal
from thalweg.systems.bond_list import BondList
from thalweg.systems.clauses import Clauses, WeightedCut, clause_names, parse_clauses
from thalweg.systems.diagonal import best_bits, cost_of
from thalweg.systems.lattice import Chain, Unconnected

GRAPH = BondList(bonds="a b 3\nb c 2\nc a 4\nc d 1.5")


def test_the_energy_of_a_state_is_minus_the_weight_cut():
    expansion = WeightedCut().hamiltonian(GRAPH)
    assert is_diagonal(expansion)
    for bits in range(16):
        a, b, c, d = (bits >> q & 1 for q in range(4))
        cut = 3 * (a != b) + 2 * (b != c) + 4 * (c != a) + 1.5 * (c != d)
        assert cost_of(expansion, bits) == pytest.approx(-cut, abs=1e-12)


def test_a_cut_is_told_in_names():
    graph = WeightedCut().graph(GRAPH)
    assert WeightedCut().assignment(0b0101, graph) == "cut of weight 6.5 | part 0: b, d | part 1: a, c"
    assert "part 1: none" in WeightedCut().assignment(0, graph)


def test_a_ring_of_disagrees_is_cut_everywhere():
    expansion = WeightedCut().hamiltonian(Chain(sites=6))
    assert cost_of(expansion, 0b010101) == -6.0
    assert cost_of(expansion, 0b000111) == -2.0


def unmet(text: str, value: dict[str, bool]) -> float:
    total = 0.0
    for line in text.splitlines():
        words, _, weight = line.partition(":")
        met = any(value[w.removeprefix("not ").strip()] != w.strip().startswith("not ") for w in words.split(" or "))
        total += 0.0 if met else float(weight or 1.0)
    return total


literals = st.tuples(st.booleans(), st.sampled_from("abcde")).map(lambda p: ("not " if p[0] else "") + p[1])
clauses = st.tuples(st.lists(literals, min_size=1, max_size=4), st.integers(1, 9)).map(lambda p: f"{' or '.join(p[0])} : {p[1]}")


@given(st.lists(clauses, min_size=1, max_size=6).map("\n".join))
def test_the_energy_of_a_state_is_the_weight_of_the_unmet_clauses(text):
    model = Clauses(clauses=text)
    graph = model.graph(Unconnected())
    expansion, refusal = read_or_refusal(lambda: model.hamiltonian(Unconnected()))
    if refusal is not None:  # clauses that are always met cost nothing
        assert "zero" in refusal.what
        return
    for bits in range(1 << graph.n_sites):
        value = {graph.site_name(q): bool(bits >> q & 1) for q in range(graph.n_sites)}
        cost = unmet(text, value)
        assert cost_of(expansion, bits) == pytest.approx(cost, abs=1e-9)
        assert ("every clause is met" in model.assignment(bits, graph)) == (cost == 0)


def test_clauses_are_read():
    found = parse_clauses("a or not b : 2.5  # first\n\nNOT c_1 OR d\ne")
    assert [c.literals for c in found] == [(("a", False), ("b", True)), (("c_1", True), ("d", False)), (("e", False),)]
    assert [c.weight for c in found] == [2.5, 1.0, 1.0]
    assert clause_names(found) == ("a", "b", "c_1", "d", "e")


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("", "empty"),
        ("a or", "not a name"),
        ("or a", "not a name"),
        ("a and b", "not a name"),
        ("a : x", "not a number"),
        ("a : -1", "from 0 up"),
        ("a : inf", "from 0 up"),
        ("not", "not a name"),
        ("a or not or b", "not a name"),
        (" or ".join(f"v{i}" for i in range(13)), "12 are the most"),
        ("\n".join(f"v{i}" for i in range(70)), "62 qubits"),
    ],
)
def test_other_clauses_are_refused_in_words(text, why):
    with pytest.raises(StudyError, match=why) as caught:
        Clauses(clauses=text).hamiltonian(Unconnected())
    assert caught.value.field == "model.clauses"


@given(st.text(max_size=60) | st.text("ab or not:1.\n#", max_size=40))
def test_any_text_is_read_or_refused_in_words(text):
    _, refusal = read_or_refusal(lambda: parse_clauses(text))
    assert refusal is None or (refusal.what and refusal.why and refusal.fix)


def test_an_assignment_names_what_is_unmet():
    model = Clauses(clauses="a or not b\nb : 2")
    graph = model.graph(Unconnected())
    assert model.assignment(0b01, graph) == "a = true, b = false | unmet: b (weight 2)"
    assert model.assignment(0b11, graph) == "a = true, b = true | every clause is met"


def test_the_best_state_is_found_among_those_that_show():
    expansion = WeightedCut().hamiltonian(GRAPH)
    amplitudes = np.full(16, 0.01)
    amplitudes[[0b0010, 0b0101]] = 0.8, 0.5
    bits, cost, weight = best_bits(expansion, amplitudes)
    assert (bits, weight) == (0b0101, pytest.approx(0.25))
    assert cost == pytest.approx(-6.5)


def test_without_a_heavy_state_the_heaviest_is_taken():
    expansion = WeightedCut().hamiltonian(GRAPH)
    amplitudes = np.full(16, 0.02 + 0j)
    amplitudes[0b0011] = 0.03
    assert best_bits(expansion, amplitudes, floor=0.5)[0] == 0b0011
