"""Exact levels of spin models: published and closed forms, every sector against dense matrices, symmetry by symmetry."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference import lattice_energies as published
from support.dense import sparse_matrix

from thalweg.errors import Stopped, StudyError
from thalweg.exact.spin_sector import lowest_level_spins
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.systems.bond_list import BondList
from thalweg.systems.clauses import Clauses, WeightedCut
from thalweg.systems.lattice import Chain, Honeycomb, Kagome, Ladder, ShastrySutherland, Square, Triangular, Unconnected
from thalweg.systems.lattice_model import LatticeModel
from thalweg.systems.pauli_list import PauliList
from thalweg.systems.spin_models import J1J2, XXZ, XY, Heisenberg, Ising, Kitaev, RandomCouplings
from thalweg.systems.toric_code import ToricCode
from thalweg.watch import SILENT, Watch

BUDGET = 2**32


def solve(model, lattice, **options):
    prepared = LatticeModel(model=model, lattice=lattice).prepare()
    return lowest_level_spins(prepared.spins, watch=SILENT, budget_bytes=BUDGET, translations=prepared.translations, **options)


# ---------------------------------------------------------------- published values and closed forms


@pytest.mark.parametrize(("sites", "field"), published.ISING_RING)
def test_the_transverse_ising_ring(sites, field):
    answer = solve(Ising(transverse=field), Chain(sites=sites))
    assert answer.energy == pytest.approx(published.ISING_RING[sites, field], abs=1e-9)
    assert answer.energy == pytest.approx(published.ising_ring(sites, field), abs=1e-9)
    if field == 1.0:
        assert answer.energy == pytest.approx(published.ising_critical_ring(sites), abs=1e-9)


@pytest.mark.parametrize("sites", [5, 8, 11])
def test_the_open_transverse_ising_chain(sites):
    answer = solve(Ising(), Chain(sites=sites, periodic=False))
    assert answer.energy == pytest.approx(published.ising_critical_open(sites), abs=1e-9)
    assert answer.energy == pytest.approx(published.ISING_OPEN.get(sites, answer.energy), abs=1e-9)


@pytest.mark.parametrize("sites", published.HEISENBERG_RING)
def test_the_heisenberg_ring(sites):
    answer = solve(Heisenberg(), Chain(sites=sites))
    assert answer.energy / sites == pytest.approx(published.HEISENBERG_RING[sites], abs=1e-9)
    assert (answer.degeneracy, answer.s_squared) == (1, 0.0)
    assert answer.energy / sites < published.BETHE_LIMIT
    momentum = "pi" if sites % 4 else "0"  # Marshall's sign rule; common knowledge of the trade
    assert f"momentum {momentum}," in answer.remarks[0]


def test_rings_approach_the_bethe_limit_with_the_square_of_their_length():
    lengths = (8, 12, 16)
    distance = [(solve(Heisenberg(), Chain(sites=n)).energy / n - published.BETHE_LIMIT) * n * n for n in lengths]
    assert max(distance) - min(distance) < 0.04 * abs(distance[0])


@pytest.mark.parametrize("sites", published.HEISENBERG_OPEN)
def test_the_open_heisenberg_chain(sites):
    assert solve(Heisenberg(), Chain(sites=sites, periodic=False)).energy == pytest.approx(published.HEISENBERG_OPEN[sites], abs=1e-9)


@pytest.mark.parametrize("sites", published.XX_RING)
def test_the_xx_ring_is_a_filled_band(sites):
    assert solve(XY(), Chain(sites=sites)).energy == pytest.approx(published.XX_RING[sites], abs=1e-9)


@pytest.mark.parametrize("sites", [6, 8, 10, 12, 14, 16])
def test_majumdar_and_ghosh_have_two_dimer_states(sites):
    answer = solve(J1J2(j2=0.5), Chain(sites=sites))
    assert answer.energy == pytest.approx(-3 * sites / 8, abs=1e-9)
    assert answer.degeneracy == 2
    assert answer.s_squared == 0.0
    assert "momentum 0" in answer.remarks[0]
    assert "momentum pi" in answer.remarks[0]
    assert answer.gap > 0.1


def test_the_square_torus_of_16():
    assert solve(Heisenberg(), Square()).energy / 16 == pytest.approx(published.SQUARE_16, abs=1e-9)
    for j2, energy in published.J1J2_16.items():
        assert solve(J1J2(j2=j2), Square()).energy / 16 == pytest.approx(energy, abs=1e-7)


def test_the_frustrated_tori_of_12():
    assert solve(Heisenberg(), Triangular(columns=6, rows=2, shift=2)).energy / 12 == pytest.approx(published.TRIANGULAR_12, abs=1e-8)
    assert solve(Heisenberg(), Kagome()).energy / 12 == pytest.approx(published.KAGOME_12, abs=1e-8)


@pytest.mark.parametrize("sign", ["+", "-"])
def test_the_kitaev_honeycomb_of_8(sign):
    assert solve(Kitaev(sign=sign), Honeycomb()).energy == pytest.approx(published.KITAEV_8, abs=1e-9)


@pytest.mark.parametrize("ratio", [2.5, 4.0])
def test_orthogonal_dimers_are_exact_for_strong_dimers(ratio):
    """Shastry and Sutherland, Physica B+C 108, 1069 (1981): a product of singlets, -3/8 J_dimer a site."""
    answer = solve(Heisenberg(), ShastrySutherland(columns=2, rows=1, dimer_weight=ratio))
    assert answer.energy == pytest.approx(-3 / 8 * ratio * 8, abs=1e-9)
    assert answer.degeneracy == 1


def test_the_toric_code_has_four_states_on_a_torus_and_one_in_the_open():
    """Kitaev, Annals of Physics 303, 2 (2003): -(stars + plaquettes), gap of two defects."""
    closed = solve(ToricCode(), Square(columns=2, rows=3))
    assert (closed.energy, closed.degeneracy, closed.gap) == (pytest.approx(-12), 4, pytest.approx(4))
    opened = solve(ToricCode(), Square(columns=3, rows=2, periodic_x=False, periodic_y=False))
    assert (opened.energy, opened.degeneracy) == (pytest.approx(-8), 1)


def test_a_ferromagnet_is_one_large_multiplet():
    answer = solve(Heisenberg(sign="-"), Chain(sites=8))
    assert answer.energy == pytest.approx(-2.0)
    assert answer.degeneracy == 9
    assert answer.s_squared == 20.0
    assert answer.gap == pytest.approx(1 - np.cos(2 * np.pi / 8))  # one magnon (Bloch 1930)


# ---------------------------------------------------------------- against dense matrices

LATTICES = [
    Chain(sites=2),
    Chain(sites=3),
    Chain(sites=8),
    Chain(sites=7, periodic=False),
    Ladder(rungs=4),
    Square(columns=4, rows=2),
    Square(columns=3, rows=3, periodic_y=False),
    Triangular(columns=3, rows=3),
    Honeycomb(),
    Kagome(columns=3, rows=1, periodic_y=False),
    BondList(bonds="0 1\n1 2 0.7\n2 0\n2 3 -0.4\n4 5"),
]
MODELS = [
    Heisenberg(),
    Heisenberg(sign="-", field=0.4),
    XXZ(delta=0.5, field=0.3),
    XXZ(delta=-2.0),
    XY(anisotropy=0.3),
    Ising(),
    Ising(longitudinal=0.2),
    RandomCouplings(field_spread=0.4),
    RandomCouplings(field_spread=0.4, field_axis="x", distribution="normal"),
]


def hold_against_dense(expansion: PauliExpansion, answer) -> None:
    matrix = sparse_matrix(expansion).toarray()
    levels = np.linalg.eigvalsh(matrix)
    degeneracy = int(np.sum(levels < levels[0] + 1e-8))
    assert answer.energy == pytest.approx(levels[0], abs=1e-9)
    assert answer.degeneracy == degeneracy
    assert answer.gap == (pytest.approx(levels[degeneracy] - levels[0], abs=1e-8) if degeneracy < levels.size else None)
    vectors = answer.vectors
    assert vectors.shape == (degeneracy, levels.size)
    assert np.allclose(vectors.conj() @ vectors.T, np.eye(degeneracy), atol=1e-9)
    assert np.abs(vectors @ matrix.T - answer.energy * vectors).max() < 1e-7
    assert answer.residual < 1e-7


@pytest.mark.parametrize("lattice", LATTICES, ids=lambda v: v.build().name)
def test_levels_are_those_of_the_dense_matrix(lattice):
    for model in MODELS:
        prepared = LatticeModel(model=model, lattice=lattice).prepare()
        hold_against_dense(prepared.spins, solve(model, lattice))


@pytest.mark.parametrize(
    ("model", "lattice"),
    [
        (Kitaev(), Honeycomb()),
        (Kitaev(field=0.3, heisenberg=0.2), Honeycomb()),
        (ToricCode(field_z=0.2), Square(columns=2, rows=2)),
        (PauliList(terms="X0 Y1 - Y0 X1 + 0.3 Z0 Z1 + X2 Z1 Z3"), Unconnected(sites=5)),
        (PauliList(terms="X0 Y1 - Y0 X1 + 0.3 Z0 Z1 + X2 X3 + Y2 Y3"), Unconnected(sites=5)),
        (PauliList(terms="X0 X1 X2 + 0.5 Y0 - Z1 Z2 + 3"), Unconnected()),
        (PauliList(terms="X0 X1 X2 X3 + Y0 Y1 Y2 Y3 + X0 Y1 X2 Y3 + Z0 Z3"), Unconnected()),
        (PauliList(terms="X0"), Unconnected()),
        (PauliList(terms="2.5"), Unconnected(sites=2)),
    ],
    ids=lambda v: v.key,
)
def test_levels_of_other_operators_are_those_of_the_dense_matrix(model, lattice):
    prepared = LatticeModel(model=model, lattice=lattice).prepare()
    hold_against_dense(prepared.spins, solve(model, lattice))


@pytest.mark.parametrize("model", [Heisenberg(), XXZ(delta=0.4, field=0.3), RandomCouplings(field_spread=0.8), XY()], ids=lambda m: m.key)
def test_each_s_z_sector_has_its_own_lowest_level(model):
    lattice = Chain(sites=7)
    matrix = sparse_matrix(model.hamiltonian(lattice)).toarray()
    down = np.bitwise_count(np.arange(128))
    for count in range(8):
        block = np.linalg.eigvalsh(matrix[np.ix_(down == count, down == count)])
        answer = solve(model, lattice, target_s_z=3.5 - count)
        assert answer.energy == pytest.approx(block[0], abs=1e-9)
        assert answer.degeneracy == np.sum(block < block[0] + 1e-8)
        assert not answer.vectors[:, down != count].any()


def test_blocks_of_all_kinds_agree_on_larger_lattices():
    """Runs without symmetries, orbits with them, and the register: one energy, one gap."""
    lattice = Chain(sites=12)
    expansion = Heisenberg().hamiltonian(lattice)
    with_moves = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET, translations=lattice.build().translations)
    without = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET)
    assert "one block of up to 924 states" in without.method
    assert with_moves.energy == pytest.approx(without.energy, abs=1e-9)
    assert with_moves.gap == pytest.approx(without.gap, abs=1e-9)
    assert abs(np.vdot(with_moves.vectors[0], without.vectors[0])) == pytest.approx(1.0, abs=1e-8)
    ising = Ising(transverse=0.8, longitudinal=0.0).hamiltonian(lattice)
    moved = lowest_level_spins(ising, watch=SILENT, budget_bytes=BUDGET, translations=lattice.build().translations)
    halves = lowest_level_spins(ising, watch=SILENT, budget_bytes=BUDGET)
    assert "2 symmetry blocks of up to 2,048 states" in halves.method
    assert moved.energy == pytest.approx(halves.energy, abs=1e-8)
    assert moved.gap == pytest.approx(halves.gap, abs=1e-8)


def test_translations_that_h_does_not_have_are_left_out():
    expansion = RandomCouplings().hamiltonian(Chain(sites=6))
    moves = Chain(sites=6).build().translations
    answer = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET, translations=[*moves, (0, 0, 1, 2, 3, 4), (1, 0)])
    hold_against_dense(expansion, answer)
    assert "momentum" not in answer.remarks[0]


def test_a_power_of_a_translation_may_be_a_symmetry():
    bonds = "\n".join(f"{i} {(i + 1) % 8} {1.0 if i % 2 else 0.6}" for i in range(8))
    expansion = Heisenberg().hamiltonian(BondList(bonds=bonds))
    answer = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET, translations=Chain(sites=8).build().translations)
    hold_against_dense(expansion, answer)
    assert "momentum 0" in answer.remarks[0]


def test_opposite_momenta_are_given_as_two_real_states():
    answer = solve(Heisenberg(), Chain(sites=5))
    assert answer.degeneracy == 4
    assert answer.vectors.dtype == np.float64
    assert answer.s_squared == pytest.approx(0.75)
    assert "momentum +-" in answer.remarks[0]


def test_different_spins_at_one_energy_have_no_common_square():
    bonds = BondList(bonds="0 1\n2 3 -1")  # a singlet beside a triplet pair
    answer = solve(Heisenberg(), bonds)
    assert answer.degeneracy == 3
    assert answer.s_squared == 2.0
    free = solve(PauliList(terms="X0 X1 + Y0 Y1 + Z0 Z1"), Unconnected(sites=4))
    assert free.degeneracy == 4
    assert free.s_squared is None
    assert "2 multiplets of total spin S = 0, 1" in free.remarks[1]


# ---------------------------------------------------------------- diagonal costs


def test_all_best_cuts_of_a_square_are_listed():
    answer = solve(WeightedCut(), BondList(bonds="0 1\n1 2\n2 3\n3 0\n0 2"))
    assert (answer.energy, answer.degeneracy, answer.gap) == (-4.0, 2, 1.0)
    assert "0101" in answer.remarks[0]
    assert set(np.flatnonzero(answer.vectors.any(axis=0))) == {0b0101, 0b1010}


@settings(max_examples=25, deadline=None)
@given(st.lists(st.tuples(st.integers(0, 255), st.integers(-8, 8).filter(bool)), min_size=1, max_size=12, unique_by=lambda t: t[0]))
def test_listing_finds_the_lowest_diagonal_element(terms):
    z, c = np.array([t[0] for t in terms], dtype=np.uint64), np.array([t[1] for t in terms], dtype=float)
    expansion = collect_terms(8, np.zeros_like(z), z, c)
    states = np.arange(256, dtype=np.uint64)
    energies = sum(ci * np.where(np.bitwise_count(states & zi) % 2, -1.0, 1.0) for ci, zi in zip(c, z, strict=True))
    answer = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET)
    assert answer.energy == energies.min()
    assert answer.degeneracy == np.sum(energies == energies.min())
    higher = energies[energies > energies.min()]
    assert answer.gap == (higher.min() - energies.min() if higher.size else None)


def test_listing_spans_blocks_and_keeps_to_a_sector(monkeypatch):
    from thalweg.exact import spin_diagonal

    monkeypatch.setattr(spin_diagonal, "BLOCK_BITS", 3)
    expansion = WeightedCut().hamiltonian(Ladder(rungs=4))
    whole = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET)
    assert (whole.energy, whole.degeneracy) == (-12.0, 2)
    sector = lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET, target_s_z=3.0)
    assert (sector.energy, sector.degeneracy) == (-3.0, 8)


def test_clauses_are_met_where_they_can_be():
    answer = solve(Clauses(clauses="a or b\nnot a or c\nnot b or not c"), Unconnected())
    assert answer.energy == pytest.approx(0.0, abs=1e-12)
    assert answer.degeneracy == 2


# ---------------------------------------------------------------- limits


def test_states_beyond_the_budget_are_refused_with_the_figure():
    with pytest.raises(StudyError, match=r"601,080,390 basis states need .* GiB") as caught:
        lowest_level_spins(Heisenberg().hamiltonian(Chain(sites=32)), watch=SILENT, budget_bytes=BUDGET)
    assert caught.value.field == "memory_gib"
    with pytest.raises(StudyError, match="GiB"):
        lowest_level_spins(Ising().hamiltonian(Chain(sites=40)), watch=SILENT, budget_bytes=BUDGET)


def test_ground_states_that_do_not_fit_are_left_out_and_said():
    expansion = Heisenberg().hamiltonian(Chain(sites=14, periodic=False))
    answer = lowest_level_spins(expansion, watch=SILENT, budget_bytes=250_000)
    assert answer.vectors is None
    assert "memory budget" in answer.method
    assert answer.energy == pytest.approx(lowest_level_spins(expansion, watch=SILENT, budget_bytes=BUDGET).energy, abs=1e-8)


@pytest.mark.parametrize(("model", "s_z", "why"), [(Ising(), 0.0, "does not conserve"), (XY(), 0.5, "whole steps"), (XY(), 9.0, "whole steps")])
def test_sectors_that_do_not_exist_are_refused(model, s_z, why):
    with pytest.raises(StudyError, match=why):
        solve(model, Chain(sites=8), target_s_z=s_z)


def test_progress_is_told_and_a_stop_is_heeded():
    said: list[tuple[str, float | None]] = []
    expansion, moves = Heisenberg().hamiltonian(Chain(sites=10)), Chain(sites=10).build().translations
    lowest_level_spins(expansion, watch=Watch(say=lambda text, part: said.append((text, part))), budget_bytes=BUDGET, translations=moves)
    assert any("S_z = 0, momentum pi" in text for text, _ in said)
    parts = [part for _, part in said]
    assert parts == sorted(parts)
    with pytest.raises(Stopped):
        lowest_level_spins(expansion, watch=Watch(should_stop=lambda: len(said) > 0), budget_bytes=BUDGET)
