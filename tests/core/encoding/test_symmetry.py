"""Z2 symmetries on masks: found completely, removed exactly."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from support.dense import expansion_matrix

from thalweg.encoding.symmetry import Tapering, commuting_z_masks, independent, lightest, sector_value, taper_by
from thalweg.operators.pauli import collect_terms


def span(masks: list[int]) -> set[int]:
    elements = {0}
    for mask in masks:
        elements |= {mask ^ other for other in elements}
    return elements


@st.composite
def symmetric_expansions(draw):
    """Random strings on 5 qubits, all commuting with some products of Z."""
    n = 5
    symmetries = draw(st.lists(st.integers(1, 31), max_size=3))
    every = [x for x in range(32) if all((x & s).bit_count() % 2 == 0 for s in symmetries)]
    pairs = draw(st.lists(st.tuples(st.sampled_from(every), st.integers(0, 31)), min_size=1, max_size=12, unique=True))
    x, z = (np.array([p[i] for p in pairs], np.uint64) for i in (0, 1))
    return collect_terms(n, x, z, np.linspace(-1, 1.3, len(pairs)))


@settings(max_examples=60, deadline=None)
@given(symmetric_expansions())
def test_all_products_of_z_that_commute_are_found(expansion):
    found = commuting_z_masks(expansion)
    expected = {m for m in range(32) if not np.any(np.bitwise_count(expansion.x & np.uint64(m)) & 1)}
    assert span(found) == expected
    assert len(expected) == 1 << len(found)


@settings(max_examples=60, deadline=None)
@given(symmetric_expansions())
def test_sectors_together_hold_the_whole_spectrum(expansion):
    masks = commuting_z_masks(expansion)
    sectors: dict[tuple[int, ...], Tapering] = {}
    for bits in range(32):
        tapering = taper_by(5, masks, bits)
        sectors[tapering.values] = tapering
    found = [np.linalg.eigvalsh(expansion_matrix(t.expansion(expansion))) for t in sectors.values()]
    assert np.allclose(np.sort(np.concatenate(found)), np.linalg.eigvalsh(expansion_matrix(expansion)), atol=1e-10)


@settings(max_examples=60, deadline=None)
@given(symmetric_expansions(), st.integers(0, 31))
def test_bits_are_restored_from_the_rest_and_the_sector(expansion, reference):
    tapering = taper_by(5, commuting_z_masks(expansion), reference)
    states = np.arange(32, dtype=np.uint64)
    inside = states[tapering.holds(states)]
    assert reference in inside
    assert inside.size == 1 << tapering.n_working
    assert np.array_equal(tapering.restore(tapering.strip(inside)), inside)
    assert np.array_equal(np.sort(tapering.strip(inside)), np.arange(inside.size))


def test_a_term_that_leaves_the_sector_gives_none():
    tapering = taper_by(2, [0b11], 0)
    assert tapering.expansion(collect_terms(2, np.array([1], np.uint64), np.array([0], np.uint64), np.ones(1))) is None


def test_one_qubit_is_always_kept():
    tapering = taper_by(2, [0b01, 0b10], 0b10)
    assert (tapering.n_working, tapering.values) == (1, (1,))


def test_candidates_outside_the_space_or_dependent_are_passed_over():
    assert independent([0b0001, 0b0011, 0b1100, 0b1111, 0], [0b0011, 0b1100]) == [0b0011, 0b1100]


def test_lightest_basis_does_not_depend_on_the_one_given():
    assert lightest([0b0111, 0b1011]) == lightest([0b1100, 0b1011]) == [0b1100, 0b0111]
    wide = [0b11 << i for i in range(14)]
    assert len(lightest(wide)) == 14
    assert len({m.bit_length() for m in lightest(wide)}) == 14


@pytest.mark.parametrize(("mask", "bits", "value"), [(0b11, 0b01, -1), (0b11, 0b11, 1), (0b100, 0b011, 1)])
def test_value_of_a_product_of_z_is_the_parity_of_its_bits(mask, bits, value):
    assert sector_value(mask, bits) == value
