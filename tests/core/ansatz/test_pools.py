"""Pools of adaptive growth: what they hold, what they conserve, their slopes, and the choice among them."""

from __future__ import annotations

from dataclasses import replace
from math import comb

import numpy as np
import pytest
from support.dense import expansion_matrix, string_matrix
from support.hamiltonians import chain, molecule, random_molecule
from support.second_quantised import excitation_matrix

from thalweg.ansatz import Adaptive, Ground
from thalweg.ansatz.adaptive import FERMIONIC, ON_QUBITS
from thalweg.ansatz.pools import spin_adapted
from thalweg.ansatz.preparation import reference_program
from thalweg.ansatz.string_pools import MAX_POOL
from thalweg.circuit.program import Excitation
from thalweg.encoding import ENCODINGS, BravyiKitaev, JordanWigner
from thalweg.encoding.encoded import encode_fermions, encode_spins
from thalweg.encoding.symmetry import Symmetry
from thalweg.errors import StudyError
from thalweg.operators import Sector
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.operators.product import ExpansionProduct
from thalweg.simulate.pool_slopes import ExcitationSlopes, StringSlopes
from thalweg.simulate.register import RegisterEngine
from thalweg.simulate.sector import SectorEngine, SectorHamiltonian

ENCODING_KEYS = [cls().key for cls in ENCODINGS]


def ground(hamiltonian, encoding=None) -> Ground:
    encoded = encode_fermions(hamiltonian, encoding or JordanWigner())
    return Ground(hamiltonian, encoded.working, encoded.reference_bits, encoded)


def spin_ground(expansion: PauliExpansion, kind: str = "bits", bits: int = 0, pairs=()) -> Ground:
    encoded = encode_spins(expansion, JordanWigner(taper=False), bits)
    return Ground(None, encoded.working, encoded.reference_bits, encoded, kind, pairs)


def ising(n: int, field: float = 0.7) -> PauliExpansion:
    """-sum Z Z - h sum X on an open chain."""
    x = np.array([1 << q for q in range(n)] + [0] * (n - 1), np.uint64)
    z = np.array([0] * n + [3 << q for q in range(n - 1)], np.uint64)
    return collect_terms(n, x, z, np.array([-field] * n + [-1.0] * (n - 1)))


def heisenberg(n: int) -> PauliExpansion:
    """sum X X + Y Y + Z Z on an open chain."""
    pairs = [3 << q for q in range(n - 1)]
    return collect_terms(
        n, np.array(pairs + pairs + [0] * (n - 1), np.uint64), np.array([0] * (n - 1) + pairs + pairs, np.uint64), np.ones(3 * (n - 1))
    )


def engine_of(base: Ground, program):
    return (
        SectorEngine(base.fermions, program)
        if base.fermions is not None and hasattr(program, "excitations")
        else RegisterEngine(base.qubits, program)
    )


def slopes(base: Ground, pool, program, theta) -> np.ndarray:
    state = engine_of(base, program).state(theta)
    if hasattr(pool, "excitations"):
        return pool.slopes(ExcitationSlopes(base.fermions, pool.excitations, SectorHamiltonian(base.fermions)).at(state))
    return pool.slopes(StringSlopes(ExpansionProduct(base.qubits), pool.x, pool.z).at(state))


def grown_at_random(base: Ground, settings: Adaptive, seed: int = 1, count: int = 3):
    pool = settings.operators(base)
    rng = np.random.default_rng(seed)
    program = pool.grown(settings.build(base), rng.choice(len(pool), count, replace=False).tolist())
    return pool, program, rng.normal(0.0, 0.5, count)


@pytest.mark.parametrize("key", [*FERMIONIC, *ON_QUBITS])
@pytest.mark.parametrize("hamiltonian", [molecule(chain(4, 1.5)), random_molecule(3, 2, 1)], ids=["H4", "random"])
def test_slopes_of_the_whole_pool_are_central_differences_of_appended_operators(key, hamiltonian):
    base = ground(hamiltonian)
    pool, program, theta = grown_at_random(base, Adaptive(pool=key))
    found = slopes(base, pool, program, theta)
    assert found.shape == (len(pool),)
    step = 1e-5
    for i in np.random.default_rng(2).choice(len(pool), min(len(pool), 12), replace=False):
        engine = engine_of(base, pool.grown(program, [int(i)]))
        ends = [engine.energy(np.append(theta, t)) for t in (step, -step)]
        assert found[i] == pytest.approx((ends[0] - ends[1]) / (2 * step), abs=2e-8)


def dense(operator, sector: Sector) -> np.ndarray:
    total = np.zeros((sector.dimension, sector.dimension))
    for e, w in zip(operator.excitations, operator.weights, strict=True):
        t = excitation_matrix(e, sector)
        total += w * (t - t.T)
    return total


def total_spin(sector: Sector) -> np.ndarray:
    """S^2 = S_z^2 + N/2 - sum_pq E^alpha_pq E^beta_qp, from the matrices of single excitations and number operators."""
    exchange = np.zeros((sector.dimension, sector.dimension))
    for p in range(sector.n_orbitals):
        for q in range(sector.n_orbitals):
            exchange += excitation_matrix(Excitation((q,), (p,), (p,), (q,)), sector)
    return (sector.s_z**2 + 0.5 * sector.n_electrons) * np.eye(sector.dimension) - exchange


@pytest.mark.parametrize(("n_alpha", "n_beta"), [(2, 2), (2, 1), (1, 1)])
def test_spin_adapted_operators_commute_with_total_spin_and_are_normalised(n_alpha, n_beta):
    hamiltonian = random_molecule(4, n_alpha, n_beta)
    spin = total_spin(hamiltonian.sector)
    for operator in spin_adapted(hamiltonian).operators:
        generator = dense(operator, hamiltonian.sector)
        assert np.abs(generator @ spin - spin @ generator).max() < 1e-12, operator.label
        assert np.square(operator.weights).sum() == pytest.approx(1.0)


def test_spin_adapted_operators_are_independent_and_counted_by_pairs():
    hamiltonian = random_molecule(3, 2, 2)
    pool = spin_adapted(hamiltonian)
    m = 3
    pairs = m * (m + 1) // 2
    assert len(pool) == comb(m, 2) + comb(pairs, 2) + comb(comb(m, 2), 2)
    vectors = np.array([[dict(zip(o.excitations, o.weights, strict=True)).get(e, 0.0) for e in pool.excitations] for o in pool.operators])
    np.testing.assert_allclose(vectors @ vectors.T, np.eye(len(pool)), atol=1e-12)


def test_the_point_group_leaves_the_operators_that_can_have_a_slope():
    base = ground(molecule(chain(4, 1.5)))
    whole, symmetric = (Adaptive(point_group=on).operators(base) for on in (False, True))
    assert len(symmetric) < len(whole)
    found = dict(zip(whole.labels, slopes(base, whole, Adaptive().build(base), np.zeros(0)), strict=True))
    kept = set(symmetric.labels)
    assert max(abs(s) for label, s in found.items() if label not in kept) < 1e-10
    assert max(abs(s) for label, s in found.items() if label in kept) > 0.1


@pytest.mark.parametrize("key", [*FERMIONIC, "qubit-excitations"])
def test_electron_number_and_spin_projection_are_kept(key):
    hamiltonian = random_molecule(3, 2, 1)
    encoded = encode_fermions(hamiltonian, JordanWigner(taper=False))
    base = Ground(hamiltonian, encoded.working, encoded.reference_bits, encoded)
    _, program, theta = grown_at_random(base, Adaptive(pool=key), count=6)
    if hasattr(program, "excitations"):
        facts = SectorEngine(hamiltonian, program).facts(theta, None)
        found = facts.n_electrons, facts.s_z
    else:
        state = RegisterEngine(encoded.working, program).state(theta)
        found = tuple(ExpansionProduct(o).expectation(state) for o in (encoded.number, encoded.s_z))
    assert found == pytest.approx((3.0, 0.5), abs=1e-12)


def test_qubit_excitations_move_electrons_without_a_sign():
    """exp(theta (Q - Q+)) turns two occupations into each other; the fermionic sign of the electrons between is gone (Yordanov et al. 2021)."""
    hamiltonian = random_molecule(3, 2, 2)
    base = ground(hamiltonian, JordanWigner(taper=False))
    settings = Adaptive(pool="qubit-excitations")
    pool = settings.operators(base)
    checked = 0
    for i, label in enumerate(pool.labels):
        program = pool.grown(settings.build(base), [i])
        state = RegisterEngine(base.qubits, program).state(np.array([0.3]))
        moved = np.flatnonzero(np.abs(state) > 1e-12)
        if moved.size > 1:
            assert sorted(np.abs(state[moved])) == pytest.approx([np.sin(0.3), np.cos(0.3)]), label
            assert np.allclose(state.imag, 0.0)
            assert min(state[moved].real) > 0.0, label  # from the occupied side the sign is that of theta
            checked += 1
    assert checked > 5


@pytest.mark.parametrize("key", ["qubit-excitations", "pauli-strings"])
@pytest.mark.parametrize("taper", [False, True])
def test_pools_on_qubits_hold_the_same_slopes_in_every_encoding(key, taper):
    hamiltonian = molecule(chain(4, 1.5))
    found = []
    for cls in ENCODINGS:
        base = ground(hamiltonian, cls(taper=taper))
        settings = Adaptive(pool=key)
        pool = settings.operators(base)
        found.append(np.sort(np.abs(slopes(base, pool, settings.build(base), np.zeros(0)))))
    largest = [f[-1] for f in found]
    assert largest == pytest.approx([largest[0]] * len(found), abs=1e-10)
    if key == "qubit-excitations":
        assert all(f == pytest.approx(found[0], abs=1e-10) for f in found)


@pytest.mark.parametrize("key", ENCODING_KEYS)
def test_single_strings_are_real_rotations_each_there_once(key):
    base = ground(molecule(chain(4, 1.5)), ENCODINGS.get(key)())
    pool = Adaptive(pool="pauli-strings").operators(base)
    assert np.all(np.bitwise_count(pool.x & pool.z) % 2 == 1)
    assert len(set(zip(pool.x.tolist(), pool.z.tolist(), strict=True))) == len(pool)
    assert int((pool.x | pool.z).max()) < 1 << base.qubits.n_qubits


def test_strings_of_a_tapered_pool_commute_with_the_symmetries_that_were_removed():
    """Each lifts to strings of the full register that commute: the full pool's commuting strings, written on the working register."""
    hamiltonian = molecule(chain(4, 1.5))
    full, tapered = ground(hamiltonian, BravyiKitaev(taper=False)), ground(hamiltonian, BravyiKitaev())
    whole = Adaptive(pool="pauli-strings").operators(full)
    inside = tapered.encoded.tapering.keeps(whole.x)
    x, z, _ = tapered.encoded.tapering.strings(whole.x[inside], whole.z[inside])
    pool = Adaptive(pool="pauli-strings").operators(tapered)
    assert not inside.all()
    assert set(zip(pool.x.tolist(), pool.z.tolist(), strict=True)) <= set(zip(x.tolist(), z.tolist(), strict=True))


def test_terms_and_commutators_of_a_hamiltonian_are_its_pool():
    expansion = ising(4)
    pool = Adaptive(pool="hamiltonian-terms").operators(spin_ground(expansion))
    own = set(zip(expansion.x.tolist(), expansion.z.tolist(), strict=True))
    found = set(zip(pool.x.tolist(), pool.z.tolist(), strict=True))
    assert own <= found
    matrices = [string_matrix(4, x, z) for x, z in own]
    span = np.array([(a @ b - b @ a).ravel() for a in matrices for b in matrices])
    for x, z in found - own:
        assert np.abs(span.conj() @ string_matrix(4, x, z).ravel()).max() > 1.0
    assert len(found - own) == 2 * 3  # Y Z and Z Y on each bond


def test_at_a_real_state_only_commutators_have_a_slope():
    base = spin_ground(ising(4))
    settings = Adaptive(pool="hamiltonian-terms")
    pool = settings.operators(base)
    found = slopes(base, pool, settings.build(base), np.zeros(0))
    odd = np.bitwise_count(pool.x & pool.z) % 2 == 1
    assert np.abs(found[~odd]).max() < 1e-14
    assert np.abs(found[odd]).max() > 0.1


def test_a_pool_past_the_limit_is_refused():
    rng = np.random.default_rng(1)
    terms = rng.integers(1, 1 << 16, (2000, 2)).astype(np.uint64)
    base = spin_ground(collect_terms(16, terms[:, 0], terms[:, 1], rng.normal(size=2000)))
    with pytest.raises(StudyError, match=f"{MAX_POOL:,}"):
        Adaptive(pool="hamiltonian-terms").operators(base)


@pytest.mark.parametrize("key", [*FERMIONIC, "qubit-excitations", "pauli-strings"])
def test_pools_of_electrons_are_refused_for_spins(key):
    base = spin_ground(ising(3))
    with pytest.raises(StudyError, match="spins"):
        Adaptive(pool=key).operators(base)


def test_the_largest_slopes_are_chosen_equal_ones_in_order_and_none_that_is_barred():
    found = np.array([0.1, -0.4, 0.4 + 1e-12, 0.0, 0.3])
    assert Adaptive().choose(found, (), 1e-9) == [1]
    assert Adaptive().choose(found, (1,), 1e-9) == [2]
    assert Adaptive(at_once=3).choose(found, (), 1e-9) == [1, 2, 4]
    assert Adaptive(at_once=10).choose(found, (2,), 1e-9) == [1, 4, 0]
    assert Adaptive().choose(found, (), 0.5) == []
    assert Adaptive().choose(np.zeros(0), (), 1e-9) == []


def energy(expansion: PauliExpansion, state: np.ndarray) -> float:
    return float((state.conj() @ expansion_matrix(expansion) @ state).real)


def test_plus_and_singlet_references_are_prepared_by_gates():
    plus = RegisterEngine(ising(4), reference_program(spin_ground(ising(4), "plus"))).state(np.zeros(0))
    np.testing.assert_allclose(plus, np.full(16, 0.25), atol=1e-14)
    expansion = heisenberg(4)
    singlets = RegisterEngine(expansion, reference_program(spin_ground(expansion, "singlets", pairs=((0, 1), (2, 3))))).state(np.zeros(0))
    pair = np.array([0.0, -1.0, 1.0, 0.0]) / np.sqrt(2.0)  # |01> - |10>, the first sign is site 0, bit 0 of the index
    assert abs(np.kron(pair, pair) @ singlets) == pytest.approx(1.0)
    assert energy(expansion, singlets) == pytest.approx(-6.0)  # -3 a singlet, 0 between them


def test_a_superposition_is_refused_on_a_tapered_register():
    base = spin_ground(heisenberg(4), "plus")
    tapered = replace(base.encoded, symmetries=(Symmetry("parity of sites 0 1 2 3", 0b1111, 1, 3),))
    base = replace(base, encoded=tapered)
    with pytest.raises(StudyError, match="tapering off"):
        reference_program(base)
