"""Lattices: counts, distances, closing of edges, translations, colourings, dimer coverings."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.systems.lattice import LATTICES, Chain, Honeycomb, Kagome, Ladder, ShastrySutherland, Square, Triangular, Unconnected
from thalweg.systems.lattice_graph import Bond, LatticeGraph, pairing, two_colouring

# lattice, sites, bonds of each class, neighbours of each site by first-kind bonds
TORI = [
    (Chain(sites=8), 8, {"nearest": 8, "second": 8}, 2),
    (Ladder(rungs=5), 10, {"leg": 10, "rung": 5, "second": 10}, 3),
    (Square(columns=4, rows=3), 12, {"nearest": 24, "second": 24}, 4),
    (Triangular(columns=4, rows=5), 20, {"nearest": 60, "second": 60}, 6),
    (Honeycomb(columns=3, rows=3), 18, {"x": 9, "y": 9, "z": 9, "second": 54}, 3),
    (Kagome(columns=3, rows=3), 27, {"nearest": 54, "second": 54}, 4),
    (ShastrySutherland(columns=2, rows=3), 24, {"nearest": 48, "dimer": 12}, 5),
]


@pytest.mark.parametrize(("lattice", "sites", "bonds", "neighbours"), TORI, ids=lambda v: getattr(v, "key", None))
def test_a_torus_has_as_many_bonds_as_its_lattice(lattice, sites, bonds, neighbours):
    graph = lattice.build()
    assert graph.n_sites == sites
    assert graph.bonds_per_class() == bonds
    ends = Counter(site for bond in graph.first_bonds for site in (bond.first, bond.second))
    assert set(ends.values()) == {neighbours}
    assert graph.notes == ()


@pytest.mark.parametrize("lattice", [row[0] for row in TORI], ids=lambda v: v.key)
def test_translations_map_bonds_to_bonds(lattice):
    graph = lattice.build()
    bonds = {(b.first, b.second, b.kind): b.weight for b in graph.bonds}
    assert graph.translations
    for move in graph.translations:
        assert sorted(move) == list(range(graph.n_sites))
        moved = {(*sorted((move[a], move[b])), kind): weight for (a, b, kind), weight in bonds.items()}
        assert moved == bonds


@pytest.mark.parametrize("lattice", [row[0] for row in TORI], ids=lambda v: v.key)
def test_bonds_of_one_class_have_one_length_up_to_the_torus(lattice):
    graph = lattice.build()
    for kind in graph.bonds_per_class():
        lengths = set()
        for bond in graph.bonds:
            if bond.kind == kind:
                steps = graph.coordinates[bond.second] - graph.coordinates[bond.first]
                images = [steps + a * graph.torus[0] + b * graph.torus[1] for a in (-1, 0, 1) for b in (-1, 0, 1)]
                lengths.add(round(min(float(np.hypot(*image)) for image in images), 6))
        expected = {"dimer": 1.414214, "second": {"chain": 2.0, "ladder": 1.414214, "square": 1.414214}.get(lattice.key, 1.732051)}
        assert lengths == {expected.get(kind, 1.0)}


@pytest.mark.parametrize("lattice", [row[0] for row in TORI], ids=lambda v: v.key)
def test_open_edges_lose_bonds_and_translations(lattice):
    fields = {name: False for name in ("periodic", "periodic_x", "periodic_y") if name in type(lattice).model_fields}
    graph, torus = lattice.model_copy(update=fields).build(), lattice.build()
    assert len(graph.bonds) < len(torus.bonds)
    assert graph.translations == ()
    assert not graph.torus.any()
    assert not any(bond.wraps for bond in graph.bonds)
    assert {(b.first, b.second, b.kind) for b in graph.bonds} <= {(b.first, b.second, b.kind) for b in torus.bonds}


def test_a_cylinder_is_closed_one_way():
    graph = Square(columns=4, rows=3, periodic_y=False).build()
    assert graph.bonds_per_class() == {"nearest": 12 + 8, "second": 16}
    assert len(graph.translations) == 1
    assert "cylinder" in graph.name
    assert sum(bond.wraps for bond in graph.bonds if bond.kind == "nearest") == 3


def test_a_tilted_torus_closes_with_a_shift():
    graph = Triangular(columns=6, rows=2, shift=2).build()
    ends = Counter(site for bond in graph.first_bonds for site in (bond.first, bond.second))
    assert set(ends.values()) == {6}
    assert all(bond.weight == 1.0 for bond in graph.first_bonds)
    up = graph.translations[1]
    assert up[up[0]] == 6 - 2  # twice up is a turn, which moves back by the shift


def test_a_shift_needs_a_torus():
    with pytest.raises(StudyError, match="shift") as caught:
        Square(shift=1, periodic_x=False).build()
    assert caught.value.field == "shift"


def test_a_two_site_ring_counts_its_bond_twice_and_says_so():
    graph = Chain(sites=2).build()
    assert graph.bonds == (Bond(0, 1, "nearest", 2.0),)
    assert "already bonded" in graph.notes[0]
    assert "as often" in graph.notes[0]
    once = Chain(sites=2, doubled="once").build()
    assert once.bonds == (Bond(0, 1, "nearest", 1.0),)
    assert "counts once" in once.notes[0]


def test_a_bond_to_itself_is_left_out_and_said():
    graph = Square(columns=4, rows=1).build()
    assert graph.bonds_per_class()["nearest"] == 4
    assert any("to itself" in note for note in graph.notes)


def test_notes_on_second_neighbours_stand_apart():
    graph = Chain(sites=4).build()
    assert graph.notes == ()
    assert "second" in graph.second_notes[0]


def test_weights_reach_the_bonds():
    assert {b.weight for b in Ladder(rung_weight=0.3).build().bonds if b.kind == "rung"} == {0.3}
    assert {b.weight for b in ShastrySutherland(dimer_weight=2.5).build().bonds if b.kind == "dimer"} == {2.5}


def test_a_ring_is_drawn_on_a_circle_with_neighbours_one_unit_apart():
    graph = Chain(sites=7).build()
    steps = np.diff(np.vstack([graph.drawing, graph.drawing[:1]]), axis=0)
    assert np.allclose(np.hypot(*steps.T), 1.0)
    assert np.allclose(np.hypot(*graph.drawing.T), np.hypot(*graph.drawing[0]))
    assert not any(bond.wraps for bond in graph.bonds)


@pytest.mark.parametrize(
    ("lattice", "has_two_colours"),
    [(Chain(sites=8), True), (Chain(sites=7), False), (Square(), True), (Square(columns=3), False), (Honeycomb(), True), (Kagome(), False)],
    ids=str,
)
def test_only_lattices_without_odd_loops_have_two_colours(lattice, has_two_colours):
    graph = lattice.build()
    colour = two_colouring(graph)
    assert (colour is not None) == has_two_colours
    if colour is not None:
        assert all(colour[b.first] != colour[b.second] for b in graph.first_bonds)


@pytest.mark.parametrize("lattice", [row[0] for row in TORI if row[1] % 2 == 0], ids=lambda v: v.key)
def test_a_dimer_covering_uses_each_site_once_along_bonds(lattice):
    graph = lattice.build()
    pairs = pairing(graph)
    assert sorted(site for pair in pairs for site in pair) == list(range(graph.n_sites))
    assert {tuple(sorted(pair)) for pair in pairs} <= {(b.first, b.second) for b in graph.first_bonds}


def test_dimers_are_paired_first():
    graph = ShastrySutherland().build()
    dimers = {(b.first, b.second) for b in graph.bonds if b.kind == "dimer"}
    assert {tuple(sorted(pair)) for pair in pairing(graph)} == dimers


def test_a_star_has_no_dimer_covering():
    places = np.zeros((4, 2))
    bonds = tuple(Bond(0, leaf) for leaf in (1, 2, 3))
    star = LatticeGraph("star", places, bonds, np.zeros(4, dtype=np.int64), (), (), places, np.zeros((2, 2)))
    assert pairing(star) is None
    assert pairing(Chain(sites=5).build()) is None


def test_backtracking_finds_the_one_covering():
    places = np.zeros((6, 2))
    bonds = tuple(Bond(a, b) for a, b in ((0, 1), (1, 2), (2, 3), (3, 4), (4, 5), (1, 4)))
    graph = LatticeGraph("path with a chord", places, bonds, np.zeros(6, dtype=np.int64), (), (), places, np.zeros((2, 2)))
    assert {tuple(sorted(p)) for p in pairing(graph)} == {(0, 1), (2, 3), (4, 5)}


def test_free_sites_have_no_bonds():
    graph = Unconnected(sites=5).build()
    assert graph.n_sites == 5
    assert graph.bonds == ()


@pytest.mark.parametrize("kind", list(LATTICES), ids=lambda c: c.key if hasattr(c, "key") else c.__name__)
def test_every_lattice_builds_from_its_defaults(kind):
    graph = kind().build()
    assert graph.drawing.shape == graph.coordinates.shape == (graph.n_sites, 2)
    assert graph.sublattice.shape == (graph.n_sites,)
    assert all(0 <= b.first < b.second < graph.n_sites for b in graph.bonds)
    assert kind.title
    assert kind.about


def test_a_large_lattice_builds_and_a_huge_one_is_refused():
    assert Square(columns=60, rows=50).build().n_sites == 3000
    with pytest.raises(StudyError, match="too large"):
        Square(columns=1000, rows=1000).build()
