"""Bond lists: typed, from CSV, from TOML; nothing that is typed crashes the reader."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from support.refusals import read_or_refusal

from thalweg.errors import StudyError
from thalweg.systems.bond_list import BondList, BondRow, bond_list_from_csv, bond_list_from_toml, parse_bonds, write_bonds
from thalweg.systems.lattice_graph import Bond

names = st.text(st.characters(whitelist_categories=("Lu", "Ll")), min_size=1, max_size=6).map(lambda s: s + "q") | st.integers(0, 99).map(str)
weights = st.floats(allow_nan=False, allow_infinity=False)
kinds = st.sampled_from(["nearest", "second", "x", "y", "z", "dimer", "bridge"])


def test_lines_give_sites_weight_and_class():
    assert parse_bonds("0 1\n1,2, 0.5\n 2;0 -1.5 second # closing\n\n# nothing\n3\t0 dimer") == (
        BondRow("0", "1"),
        BondRow("1", "2", 0.5),
        BondRow("2", "0", -1.5, "second"),
        BondRow("3", "0", 1.0, "dimer"),
    )


def test_numbered_sites_keep_their_numbers():
    graph = BondList(bonds="0 3\n3 1 0.5").build()
    assert graph.n_sites == 4
    assert graph.bonds == (Bond(0, 3), Bond(1, 3, "nearest", 0.5))
    assert graph.site_names == ()
    assert graph.site_name(2) == "2"


def test_named_sites_are_numbered_as_they_appear():
    graph = BondList(bonds="Weir Mill 2\nMill Lock").build()
    assert graph.site_names == ("Weir", "Mill", "Lock")
    assert graph.bonds == (Bond(0, 1, "nearest", 2.0), Bond(1, 2))


def test_places_put_sites_where_they_are_said_to_be():
    graph = BondList(bonds="a b\nb c", places="b 2.5 -1\n a 0,0").build()
    assert np.allclose(graph.coordinates[:2], [[0, 0], [2.5, -1]])


def test_a_repeated_pair_adds_its_weights_and_says_so():
    graph = BondList(bonds="0 1 2\n1 0 3\n0 1 1 second").build()
    assert graph.bonds == (Bond(0, 1, "nearest", 5.0), Bond(0, 1, "second", 1.0))
    assert "repeat" in graph.notes[0]


def test_two_colours_become_the_sublattices():
    assert BondList(bonds="0 1\n1 2\n2 3\n3 0").build().sublattice.tolist() == [0, 1, 0, 1]
    assert BondList(bonds="0 1\n1 2\n2 0").build().sublattice.tolist() == [0, 0, 0]


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("", "no site"),
        ("0", "1 entries"),
        ("0 1 2 x y", "5 entries"),
        ("0 1 nan", "nan"),
        ("0 1 inf", "inf"),
        ("0 1 heavy dimer", "not a number"),
        ("0 1 2 3", "number"),
        ("0 0", "two ends"),
        ("0 99999", "may not reach"),
        ("0 99999999999999999999", "may not reach"),
        ("a=b c", "separates"),
    ],
)
def test_bad_lines_are_named(text, why):
    with pytest.raises(StudyError, match=why) as caught:
        BondList(bonds=text).build()
    assert caught.value.field == "bonds"


@pytest.mark.parametrize("text", ["a 1", "a 1 x", "a 1 2 3", "a nan 0"])
def test_bad_places_are_named(text):
    with pytest.raises(StudyError, match="Place 1") as caught:
        BondList(bonds="a b", places=text).build()
    assert caught.value.field == "places"


@given(st.lists(st.builds(BondRow, names, names, weights, kinds), max_size=12).map(tuple))
def test_what_is_written_is_read_back(rows):
    assert parse_bonds(write_bonds(rows)) == rows


@given(st.text(max_size=60))
def test_any_text_is_read_or_refused_in_words(text):
    for read in (lambda: BondList(bonds=text).build(), lambda: bond_list_from_csv(text), lambda: bond_list_from_toml(text)):
        _, refusal = read_or_refusal(read)
        assert refusal is None or (refusal.what and refusal.why and refusal.fix)


@pytest.mark.parametrize(
    "text",
    [
        "site,site,weight,class\n0,1,2.5,nearest\n1,2,1,second\n",
        "from;to;w;kind\r\n0;1;2.5;nearest\r\n1;2;1;second\r\n",
        "\ufeffsource\ttarget\n0\t1\t2.5\tnearest\n1\t2\t1\tsecond\n",
        "# ours\n0, 1, 2.5, nearest, extra, columns\n\n1, 2, , second\n",
    ],
)
def test_csv_edge_lists_of_all_spellings_are_read(text):
    graph = bond_list_from_csv(text).build()
    assert graph.bonds == (Bond(0, 1, "nearest", 2.5), Bond(1, 2, "second", 1.0))


def test_csv_names_may_hold_blanks():
    assert bond_list_from_csv("a,b\nOld Mill,Weir,3\n").build().site_names == ("Old_Mill", "Weir")


def test_toml_edge_lists_are_read():
    graph = bond_list_from_toml('bonds = [["a", "b"], ["b", "c", 0.5], ["c", "a", 1, "second"]]').build()
    assert graph.bonds == (Bond(0, 1), Bond(1, 2, "nearest", 0.5), Bond(0, 2, "second", 1.0))


@pytest.mark.parametrize("text", ["bonds = 3", "bonds = [1, 2]", "x = 1", "bonds = [", "bonds = []"])
def test_other_toml_is_refused(text):
    with pytest.raises(StudyError, match="edge list"):
        bond_list_from_toml(text)


def test_an_empty_csv_is_refused():
    with pytest.raises(StudyError, match="empty"):
        bond_list_from_csv("a,b,weight\n")


@given(st.lists(st.tuples(names, names, weights), min_size=1, max_size=8))
def test_csv_of_names_and_weights_is_read_in_full(rows):
    text = "\n".join(f"{a},{b},{w!r}" for a, b, w in rows)
    found = parse_bonds(bond_list_from_csv("site,site,weight\n" + text).bonds)
    assert [(r.first, r.second, r.weight) for r in found] == rows
