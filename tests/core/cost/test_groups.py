"""Measurement sets: valid exactly, few, and in the band of published counts."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference.hamiltonians import PUBLISHED
from support.molecules import computed_molecule

from thalweg.cost.groups import commuting_groups, group_bases, qubit_wise_groups
from thalweg.encoding import BravyiKitaev
from thalweg.encoding.encoded import encode_fermions
from thalweg.errors import Stopped
from thalweg.operators.pauli import PauliExpansion, collect_terms, pauli_label
from thalweg.watch import Watch


@st.composite
def expansions(draw) -> PauliExpansion:
    n = draw(st.sampled_from([1, 2, 3, 5, 31, 62]))
    masks = st.integers(0, (1 << n) - 1)
    pairs = draw(st.lists(st.tuples(masks, masks), min_size=0, max_size=150, unique=True))
    x, z = (np.array([p[i] for p in pairs], np.uint64) for i in (0, 1))
    return collect_terms(n, x, z, np.arange(1.0, len(pairs) + 1) * (-1) ** np.arange(len(pairs)))


def letters(expansion: PauliExpansion, i: int) -> dict[str, str]:
    label = pauli_label(int(expansion.x[i]), int(expansion.z[i]))
    return {part[1:]: part[0] for part in label.split()} if label != "I" else {}


def agree(left: dict[str, str], right: dict[str, str]) -> bool:
    return all(right.get(q, letter) == letter for q, letter in left.items())


def commute(left: dict[str, str], right: dict[str, str]) -> bool:
    return sum(right.get(q, letter) != letter for q, letter in left.items()) % 2 == 0


def holds_each_term_once(expansion: PauliExpansion, groups) -> bool:
    seen = sorted(int(i) for members in groups for i in members)
    return seen == [i for i in range(len(expansion)) if expansion.x[i] or expansion.z[i]]


@settings(max_examples=60, deadline=None)
@given(expansions(), st.booleans())
def test_qubit_wise_sets_agree_on_every_shared_qubit(expansion, largest_first):
    groups = qubit_wise_groups(expansion, largest_first=largest_first)
    assert holds_each_term_once(expansion, groups)
    bases = group_bases(expansion, groups)
    for members, x, z in zip(groups, *(b.tolist() for b in bases), strict=True):
        basis = {part[1:]: part[0] for part in pauli_label(x, z).split()}
        assert all(letters(expansion, i).items() <= basis.items() for i in members)
        assert list(members) == sorted(members)


@settings(max_examples=60, deadline=None)
@given(expansions())
def test_commuting_sets_commute_pair_by_pair(expansion):
    groups = commuting_groups(expansion)
    assert holds_each_term_once(expansion, groups)
    for members in groups:
        texts = [letters(expansion, i) for i in members]
        assert all(commute(a, b) for k, a in enumerate(texts) for b in texts[:k])


@settings(max_examples=40, deadline=None)
@given(expansions())
def test_first_fit_is_the_plain_algorithm(expansion):
    def plain(order, fits):
        sets: list[list[int]] = []
        for i in order:
            home = next((s for s in sets if all(fits(letters(expansion, i), letters(expansion, j)) for j in s)), None)
            if home is None:
                sets.append(home := [])
            home.append(i)
        return [sorted(s) for s in sets]

    terms = [i for i in range(len(expansion)) if expansion.x[i] or expansion.z[i]]
    heavy = sorted(terms, key=lambda i: -len(letters(expansion, i)))
    large = sorted(terms, key=lambda i: -abs(expansion.coefficients[i]))
    assert [list(g) for g in qubit_wise_groups(expansion)] == plain(heavy, agree)
    assert [list(g) for g in qubit_wise_groups(expansion, largest_first=True)] == plain(large, agree)
    assert [list(g) for g in commuting_groups(expansion)] == plain(large, commute)


@pytest.mark.parametrize("name", list(PUBLISHED))
def test_numbers_of_sets_lie_within_five_percent_of_the_published_ones(name):
    expansion = encode_fermions(computed_molecule(name), BravyiKitaev(taper=False, cut=1e-8)).full
    published = PUBLISHED[name]
    assert len(qubit_wise_groups(expansion)) == pytest.approx(published.qubit_wise_sets, rel=0.05)
    assert len(commuting_groups(expansion)) == pytest.approx(published.commuting_sets, rel=0.05)


def test_no_more_qubit_wise_sets_than_openfermion_finds():
    from openfermion.measurements import group_into_tensor_product_basis_sets

    from thalweg.encoding.interchange import to_qubit_operator

    expansion = encode_fermions(computed_molecule("LiH"), BravyiKitaev(taper=False)).full
    assert len(qubit_wise_groups(expansion)) <= 1.02 * len(group_into_tensor_product_basis_sets(to_qubit_operator(expansion), seed=1))


def test_sorting_a_long_list_can_be_stopped():
    rng = np.random.default_rng(0)
    masks = rng.integers(0, 1 << 20, size=(2, 5000), dtype=np.uint64)
    expansion = collect_terms(20, masks[0], masks[1], np.ones(5000))
    said: list[float | None] = []
    whole = qubit_wise_groups(expansion, watch=Watch(say=lambda text, fraction: said.append(fraction)))
    assert holds_each_term_once(expansion, whole)
    assert said == sorted(said)
    assert len(said) == 4
    with pytest.raises(Stopped):
        commuting_groups(expansion, Watch(should_stop=lambda: True))
