"""Spin models: dense matrices from the formulas, conserved quantities, conventions in words."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from support.dense import PAULI, expansion_matrix

from thalweg.errors import StudyError
from thalweg.systems.bond_list import BondList
from thalweg.systems.lattice import Chain, Honeycomb, Ladder, Square, Unconnected
from thalweg.systems.lattice_model import MODELS, LatticeModel
from thalweg.systems.spin_models import J1J2, XXZ, XY, Heisenberg, Ising, Kitaev, RandomCouplings
from thalweg.systems.spin_terms import SpinTerms
from thalweg.systems.toric_code import ToricCode

TRIANGLE = BondList(bonds="0 1 1\n1 2 0.5\n2 0 -2\n0 3 1.5 x\n1 3 1 second")


def site(n: int, axis: str, q: int) -> np.ndarray:
    """sigma^axis on one of n sites; site 0 is the least significant bit."""
    matrix = np.eye(1)
    for p in range(n):
        matrix = np.kron(PAULI[axis if p == q else "I"], matrix)
    return matrix


def coupled(n: int, bonds, xx: float, yy: float, zz: float) -> np.ndarray:
    total = np.zeros((1 << n, 1 << n), complex)
    for a, b, w in bonds:
        for axis, c in zip("XYZ", (xx, yy, zz), strict=True):
            total += w * c * site(n, axis, a) @ site(n, axis, b)
    return total


def along(n: int, axis: str) -> np.ndarray:
    return sum(site(n, axis, q) for q in range(n))


FIRST = [(0, 1, 1.0), (1, 2, 0.5), (0, 2, -2.0), (0, 3, 1.5)]
SECOND = [(1, 3, 1.0)]
FORMULAS = [
    (Ising(j=0.7, transverse=0.3, longitudinal=0.2), coupled(4, FIRST, 0, 0, -0.7) - 0.3 * along(4, "X") - 0.2 * along(4, "Z")),
    (Ising(operators="S.S", sign="+"), coupled(4, FIRST, 0, 0, 0.25) - 0.5 * along(4, "X")),
    (XY(j=2, anisotropy=0.4, field=0.6), coupled(4, FIRST, 2 * 1.4 / 4, 2 * 0.6 / 4, 0) - 0.3 * along(4, "Z")),
    (XXZ(j=1.5, delta=-0.5, field=0.2), coupled(4, FIRST, 1.5 / 4, 1.5 / 4, -0.75 / 4) - 0.1 * along(4, "Z")),
    (Heisenberg(j=3, field=1), coupled(4, FIRST, 0.75, 0.75, 0.75) - 0.5 * along(4, "Z")),
    (Heisenberg(operators="sigma.sigma", sign="-"), coupled(4, FIRST, -1, -1, -1)),
    (J1J2(j1=2, j2=0.3), coupled(4, FIRST, 0.5, 0.5, 0.5) + coupled(4, SECOND, 0.075, 0.075, 0.075)),
    (J1J2(sign="-", operators="sigma.sigma"), -coupled(4, FIRST, 1, 1, 1) - coupled(4, SECOND, 0.5, 0.5, 0.5)),
]


@pytest.mark.parametrize(("model", "matrix"), FORMULAS, ids=[f"{i}-{m.key}" for i, (m, _) in enumerate(FORMULAS)])
def test_the_matrix_is_that_of_the_formula(model, matrix):
    assert np.allclose(expansion_matrix(model.hamiltonian(TRIANGLE)), matrix, atol=1e-14)


def test_kitaev_couples_the_axis_of_each_bond():
    bonds = BondList(bonds="0 1 1 x\n1 2 2 y\n2 3 1 z")
    model = Kitaev(jx=0.5, jy=0.7, jz=-1, heisenberg=0.1, field=0.3)
    found = expansion_matrix(model.hamiltonian(bonds))
    want = -coupled(4, [(0, 1, 0.5)], 1, 0, 0) - coupled(4, [(1, 2, 1.4)], 0, 1, 0) + coupled(4, [(2, 3, 1.0)], 0, 0, 1)
    want -= 0.1 * coupled(4, [(0, 1, 1), (1, 2, 2), (2, 3, 1)], 1, 1, 1) + 0.3 / np.sqrt(3) * sum(along(4, a) for a in "XYZ")
    assert np.allclose(found, want, atol=1e-14)


def test_kitaev_needs_bonds_of_class_x_y_z():
    with pytest.raises(StudyError, match="bonds of class nearest") as caught:
        Kitaev().hamiltonian(Chain())
    assert caught.value.field == "lattice"


SYMMETRIES = [
    (Heisenberg(), "xyz"),
    (J1J2(), "xyz"),
    (RandomCouplings(), "xyz"),
    (Heisenberg(field=0.5), "z"),
    (XXZ(delta=0.5), "z"),
    (XY(), "z"),
    (RandomCouplings(field_spread=1.0), "z"),
    (RandomCouplings(interaction="zz", j_spread=1.0), "z"),
    (Ising(transverse=0.0), "z"),
    (XY(anisotropy=0.5), ""),
    (XY(anisotropy=1.0), "x"),
    (Ising(), ""),
    (RandomCouplings(field_spread=1.0, field_axis="x"), "x"),
]


@pytest.mark.parametrize(("model", "axes"), SYMMETRIES, ids=[f"{i}-{m.key}" for i, (m, _) in enumerate(SYMMETRIES)])
def test_spin_commutes_with_h_where_it_is_said_to(model, axes):
    lattice = Chain(sites=5)
    matrix = expansion_matrix(model.hamiltonian(lattice))
    said = LatticeModel(lattice=lattice, model=model).prepare().facts["conserved"]
    for axis in "xyz":
        spin = along(5, axis.upper())
        commutes = np.allclose(matrix @ spin, spin @ matrix, atol=1e-12)
        assert commutes == (axis in axes)
        assert commutes == (f"S_{axis}" in said or "total spin" in said)
        flip = np.linalg.multi_dot([site(5, axis.upper(), q) for q in range(5)])
        if f"parity prod {axis.upper()}" in said:
            assert np.allclose(matrix @ flip, flip @ matrix, atol=1e-12)


def test_ising_conserves_the_parity_of_x_alone():
    said = LatticeModel(lattice=Chain(sites=5), model=Ising()).prepare().facts["conserved"]
    assert said == "parity prod X"


def test_random_couplings_repeat_with_their_seed():
    lattice, model = Ladder(), RandomCouplings(field_spread=0.7, seed=3)
    first, again = model.hamiltonian(lattice), model.hamiltonian(lattice)
    other = model.model_copy(update={"seed": 4}).hamiltonian(lattice)
    assert np.array_equal(first.coefficients, again.coefficients)
    assert not np.allclose(first.coefficients, other.coefficients)


def test_random_couplings_follow_their_distribution():
    lattice = Square(columns=7, rows=8)
    for distribution in ("uniform", "normal", "two-valued"):
        model = RandomCouplings(interaction="zz", operators="sigma.sigma", j=2.0, j_spread=0.5, distribution=distribution)
        couplings = model.hamiltonian(lattice).coefficients
        assert couplings.mean() == pytest.approx(2.0, abs=0.2)
        if distribution == "two-valued":
            assert set(np.round(couplings, 12)) == {1.5, 2.5}
        if distribution == "uniform":
            assert 1.5 <= couplings.min() < 1.6 < 2.4 < couplings.max() <= 2.5


@pytest.mark.parametrize("model", [m() for m in MODELS], ids=lambda m: m.key)
def test_every_model_states_its_convention_with_numbers(model):
    text = model.convention()
    assert text.startswith("H = ")
    assert "\n" not in text
    if hasattr(model, "operators"):
        assert ("S = sigma/2" in text) == (model.operators == "S.S")
        assert f"favours {'antiparallel' if model.sign == '+' else 'parallel'}" in text


@pytest.mark.parametrize("model", [Ising(), Heisenberg(), XXZ(), J1J2(), XY(), RandomCouplings()], ids=lambda m: m.key)
def test_a_model_needs_bonds(model):
    with pytest.raises(StudyError, match="no bonds"):
        model.hamiltonian(Unconnected(sites=3))


def test_j2_needs_second_bonds():
    with pytest.raises(StudyError, match="class `second`"):
        J1J2().hamiltonian(BondList(bonds="0 1"))
    assert len(J1J2(j2=0).hamiltonian(BondList(bonds="0 1"))) == 3


def test_couplings_that_vanish_or_explode_are_refused():
    with pytest.raises(StudyError, match="is zero"):
        Heisenberg(j=0).hamiltonian(Chain())
    with pytest.raises(StudyError, match="not finite"):
        Heisenberg(j=1e308, operators="sigma.sigma").hamiltonian(BondList(bonds="0 1 1e308"))


def test_a_lattice_beyond_the_register_is_refused():
    with pytest.raises(StudyError, match="63 sites"):
        Heisenberg().hamiltonian(Chain(sites=63))
    assert Heisenberg().hamiltonian(Chain(sites=62)).n_qubits == 62
    with pytest.raises(StudyError, match="no site"):
        SpinTerms(0)


@pytest.mark.parametrize(("columns", "rows", "closed"), [(2, 2, True), (3, 2, True), (3, 3, False), (2, 4, False)])
def test_stars_and_plaquettes_commute_and_multiply_to_one(columns, rows, closed):
    lattice = Square(columns=columns, rows=rows, periodic_x=closed, periodic_y=closed)
    expansion = ToricCode(star=2.0, plaquette=0.5).hamiltonian(lattice)
    stars, squares = expansion.x[expansion.x != 0], expansion.z[expansion.z != 0]
    assert all(int(s & p).bit_count() % 2 == 0 for s, p in product(stars, squares))
    assert np.bitwise_xor.reduce(stars) == 0
    assert len(stars) == columns * rows
    assert len(squares) == (columns * rows if closed else (columns - 1) * (rows - 1))
    if closed:
        assert np.bitwise_xor.reduce(squares) == 0
        assert set(np.bitwise_count(stars)) == set(np.bitwise_count(squares)) == {4}
    assert set(expansion.coefficients) == {-2.0, -0.5}


def test_toric_code_qubits_sit_on_edges():
    graph = ToricCode().graph(Square(columns=3, rows=3))
    assert graph.n_sites == 18
    assert len({tuple(place) for place in graph.coordinates.tolist()}) == 18
    assert all(sorted(move) == list(range(18)) for move in graph.translations)


def test_toric_code_refuses_other_lattices_and_narrow_tori():
    with pytest.raises(StudyError, match="square lattice"):
        ToricCode().hamiltonian(Honeycomb())
    with pytest.raises(StudyError, match="closes an edge on itself"):
        ToricCode().hamiltonian(Square(columns=1))
    with pytest.raises(StudyError, match="no qubit"):
        ToricCode().hamiltonian(Square(columns=1, rows=1, periodic_x=False, periodic_y=False))
