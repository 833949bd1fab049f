"""Alternating operators: published optima of cuts, exactness of the split, symmetries, gradients, interpolated angles."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from reference.alternating_operators import CUBIC, ring_of_disagrees, triangle_free_regular
from scipy.linalg import expm
from scipy.optimize import minimize
from support.dense import expansion_matrix

from thalweg.ansatz import AlternatingOperators
from thalweg.ansatz.commuting_groups import by_bond, by_flip, by_type, commutes
from thalweg.ansatz.ground import Ground
from thalweg.circuit.angles import angles_of, one_parameter_an_angle
from thalweg.encoding import JordanWigner
from thalweg.encoding.encoded import encode_fermions
from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.operators.total_spin import total_s_squared, total_s_z
from thalweg.simulate.register import RegisterEngine
from thalweg.systems import LatticeModel
from thalweg.systems.bond_list import BondList
from thalweg.systems.clauses import WeightedCut
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain, Kagome, Square, Triangular
from thalweg.systems.spin_models import J1J2, XXZ, XY, Heisenberg, Ising


def ground_of(model, lattice=None, **settings) -> Ground:
    prepared = LatticeModel(model=model, lattice=Chain(sites=6) if lattice is None else lattice, **settings).prepare()
    if prepared.fermions is not None:
        encoded = encode_fermions(prepared.fermions, JordanWigner(taper=False))
        return Ground(prepared.fermions, encoded.working, encoded.reference_bits, encoded)
    return Ground(None, prepared.spins, prepared.reference_bits, None, prepared.reference_kind, prepared.reference_pairs)


def bipartite(d: int) -> BondList:
    """The complete bipartite graph of d + d sites: d-regular, without triangles."""
    return BondList(bonds="\n".join(f"a{i} b{j}" for i, j in product(range(d), repeat=2)))


def optimum(settings: AlternatingOperators, ground: Ground, start: np.ndarray | None = None) -> tuple[float, np.ndarray]:
    program = settings.build(ground)
    engine = RegisterEngine(ground.qubits, program)
    start = settings.start_parameters(ground, program, np.random.default_rng(1)) if start is None else start
    found = minimize(engine.energy_and_gradient, start, jac=True, method="L-BFGS-B", options={"ftol": 1e-15, "gtol": 1e-9})
    return float(found.fun), found.x


@pytest.mark.parametrize("p", [1, 2, 3])
@pytest.mark.parametrize("extra", [0, 2])
def test_the_ring_of_disagrees_reaches_the_published_ratio_from_the_ramp(p, extra):
    n = 2 * p + 2 + extra
    energy, _ = optimum(AlternatingOperators(depth=p), ground_of(WeightedCut(), Chain(sites=n)))
    assert -energy / n == pytest.approx(ring_of_disagrees(p), abs=1e-7)


def test_a_shorter_ring_is_cut_whole():
    """Beyond N = 2p + 1 sites the light cone closes, and the state is the exact one (Wang et al. 2018)."""
    energy, _ = optimum(AlternatingOperators(depth=3), ground_of(WeightedCut(), Chain(sites=6)))
    assert energy == pytest.approx(-6.0, abs=1e-7)


@pytest.mark.parametrize("d", [2, 3, 4])
def test_one_layer_on_triangle_free_regular_graphs_has_the_published_closed_form(d):
    energy, angles = optimum(AlternatingOperators(depth=1), ground_of(WeightedCut(), bipartite(d)))
    assert -energy / d**2 == pytest.approx(triangle_free_regular(d), abs=1e-8)
    assert d != 3 or -energy / 9 == pytest.approx(CUBIC, abs=1e-8)
    assert abs(np.sin(2 * angles[1])) == pytest.approx(1.0, abs=1e-6)  # beta = pi / 8 in exp(-i beta X)


def test_the_ring_mixer_keeps_the_number_of_ones_and_finds_a_balanced_cut():
    ground = ground_of(WeightedCut(), Chain(sites=7), reference="bits", bits="1101000")
    settings = AlternatingOperators(depth=3, mixer="ring")
    program = settings.build(ground)
    state = RegisterEngine(ground.qubits, program).state(np.random.default_rng(2).normal(size=program.n_parameters))
    assert {int(i).bit_count() for i in np.flatnonzero(np.abs(state) > 1e-14)} == {3}
    assert program.n_parameters == 6
    assert "1101000" in program.order


@pytest.mark.parametrize("bits", ["0000", "1111"])
def test_a_ring_mixer_with_nothing_to_mix_is_refused(bits):
    with pytest.raises(StudyError) as error:
        AlternatingOperators(mixer="ring").build(ground_of(WeightedCut(), Chain(sites=4), reference="bits", bits=bits))
    assert error.value.field == "ansatz.mixer"


def test_a_diagonal_cost_begins_by_its_mixer_whatever_the_reference():
    ground = ground_of(WeightedCut(), Chain(sites=4), reference="up")
    uniform = RegisterEngine(ground.qubits, AlternatingOperators(depth=1).build(ground)).state(np.zeros(2))
    np.testing.assert_allclose(uniform, 0.25, atol=1e-14)
    ring = RegisterEngine(
        ground_of(WeightedCut(), Chain(sites=4)).qubits, AlternatingOperators(depth=1, mixer="ring").build(ground_of(WeightedCut(), Chain(sites=4)))
    )
    assert abs(ring.state(np.zeros(2))[0b1010]) == pytest.approx(1.0)
    kept = AlternatingOperators(depth=1, initial="reference").build(ground)
    assert abs(RegisterEngine(ground.qubits, kept).state(np.zeros(2))[0]) == pytest.approx(1.0)


SPLITS = [
    (Ising(longitudinal=0.3), Chain(sites=5)),
    (XXZ(delta=0.7, field=0.4), Chain(sites=6)),
    (XY(anisotropy=0.5), Chain(sites=5)),
    (J1J2(), Chain(sites=7)),
    (Heisenberg(), Kagome(columns=1, rows=2)),
    (Heisenberg(), Triangular(columns=3, rows=2)),
]


@pytest.mark.parametrize("split", [by_type, by_bond, by_flip])
@pytest.mark.parametrize(("model", "lattice"), SPLITS)
def test_groups_commute_within_themselves_and_add_up_to_the_hamiltonian(split, model, lattice):
    h = model.hamiltonian(lattice)
    groups = split(h)
    for g in groups:
        assert commutes(g.x, g.z, g.x, g.z)
        assert np.array_equal(np.unique(g.cell), np.arange(g.n_cells))
    x, z, c = (np.concatenate([getattr(g, name) for g in groups]) for name in ("x", "z", "coefficients"))
    whole = collect_terms(h.n_qubits, x, z, c)
    np.testing.assert_array_equal(whole.x, h.x)
    np.testing.assert_array_equal(whole.z, h.z)
    np.testing.assert_allclose(whole.coefficients, h.coefficients)


def test_strings_of_one_bond_that_do_not_commute_come_apart():
    h = collect_terms(2, np.array([3, 3, 1], np.uint64), np.array([0, 1, 2], np.uint64), np.array([1.0, 2.0, 3.0]))  # XX, YX, XZ
    for split in (by_type, by_bond, by_flip):
        assert all(commutes(g.x, g.z, g.x, g.z) for g in split(h))
        assert sum(g.x.size for g in split(h)) == 3


@pytest.mark.parametrize(
    ("model", "lattice", "expected"),
    [
        (Ising(), Chain(sites=8), ["ZZ on 8 bonds", "X on 8 sites"]),
        (Heisenberg(), Chain(sites=8), ["XX+YY+ZZ on 4 bonds", "XX+YY+ZZ on 4 bonds"]),
        (WeightedCut(), Chain(sites=5), ["5 ZZ terms", "mixer -X on 5 sites"]),
        (Heisenberg(), Square(columns=4, rows=4, periodic_x=False, periodic_y=False), None),
    ],
)
def test_the_description_names_the_parts_in_their_order(model, lattice, expected):
    order = AlternatingOperators(depth=2).build(ground_of(model, lattice)).order
    if expected is None:
        assert order.count("on 8 bonds") + order.count("on 4 bonds") >= 2
    else:
        assert f"2 times: {', then '.join(expected)}; one angle for each part" in order


@pytest.mark.parametrize("multi", [False, True])
def test_a_layer_is_the_product_of_the_exponentials_of_its_parts(multi):
    """Against dense exponentials: one Trotter step of the transverse Ising chain with angle 2 |c| t."""
    ground = ground_of(Ising(j=0.8, transverse=1.3), Chain(sites=4, periodic=False))
    settings = AlternatingOperators(depth=1, multi_angle=multi)
    program = settings.build(ground)
    t = 0.37
    theta = np.array([1.6 * t] * 3 + [2.6 * t] * 4 if multi else [1.6 * t, 2.6 * t])
    state = RegisterEngine(ground.qubits, program).state(theta)
    h = ground.qubits
    zz, x = (expansion_matrix(PauliExpansion(4, h.x[k], h.z[k], h.coefficients[k])) for k in (h.x == 0, h.x != 0))
    expected = expm(-1j * t * x) @ expm(-1j * t * zz) @ np.full(16, 0.25)
    np.testing.assert_allclose(state, expected, atol=1e-12)


def expectation(operator: PauliExpansion, state: np.ndarray) -> float:
    return float(np.vdot(state, expansion_matrix(operator) @ state).real)


@pytest.mark.parametrize("multi", [False, True])
@pytest.mark.parametrize(
    ("model", "settings"), [(Heisenberg(), {}), (Heisenberg(), {"reference": "singlets"}), (XXZ(delta=0.3), {}), (J1J2(), {}), (XY(), {})]
)
def test_bonds_that_stay_together_keep_s_z_and_total_spin(model, settings, multi):
    ground = ground_of(model, **settings)
    ansatz = AlternatingOperators(depth=2, multi_angle=multi)
    program = ansatz.build(ground)
    state = RegisterEngine(ground.qubits, program).state(np.random.default_rng(5).normal(size=program.n_parameters))
    weights = np.abs(state) ** 2
    ones = np.bitwise_count(np.arange(64, dtype=np.uint64))
    assert weights[ones != 3].sum() < 1e-24
    assert expectation(total_s_z(6), state) == pytest.approx(0.0, abs=1e-12)
    if isinstance(model, Heisenberg | J1J2):
        assert "dimer singlets" in program.order
        assert expectation(total_s_squared(6), state) == pytest.approx(0.0, abs=1e-12)


def test_ferromagnetic_exchange_keeps_its_own_reference():
    assert "basis state" in AlternatingOperators().build(ground_of(Heisenberg(sign="-"))).order


@pytest.mark.parametrize("orbitals", ["site", "hopping"])
def test_electrons_keep_their_number_and_s_z(orbitals):
    ground = ground_of(Hubbard(orbitals=orbitals, s_z=0.5), Chain(sites=3, periodic=False), reference="auto")
    program = AlternatingOperators(depth=2, multi_angle=True).build(ground)
    state = RegisterEngine(ground.qubits, program).state(np.random.default_rng(7).normal(size=program.n_parameters))
    up, down = (np.bitwise_count(np.arange(64, dtype=np.uint64) & np.uint64(mask)) for mask in (0b010101, 0b101010))
    inside = (up == ground.fermions.sector.n_alpha) & (down == ground.fermions.sector.n_beta)
    assert np.sum(np.abs(state[~inside]) ** 2) < 1e-24
    assert np.count_nonzero(np.abs(state) > 1e-6) > 3


@pytest.mark.parametrize("multi", [False, True])
@pytest.mark.parametrize(("model", "lattice"), [(Ising(), Chain(sites=4)), (WeightedCut(), bipartite(2)), (Heisenberg(), Chain(sites=4))])
def test_gradients_agree_with_the_two_term_shift_rule_of_every_gate(model, lattice, multi):
    """d E/d angle = [E(+pi/2) - E(-pi/2)] / 2 (Mitarai et al. 2018; Schuld et al. 2019), summed by the factors."""
    ground = ground_of(model, lattice)
    program = AlternatingOperators(depth=2, multi_angle=multi).build(ground)
    theta = np.random.default_rng(3).uniform(-2, 2, program.n_parameters)
    angles = angles_of(program)
    engine = RegisterEngine(ground.qubits, one_parameter_an_angle(program))
    at = angles.of(theta)
    shifts = [(engine.energy(at + 0.5 * np.pi * e) - engine.energy(at - 0.5 * np.pi * e)) / 2 for e in np.eye(at.size)]
    gradient = RegisterEngine(ground.qubits, program).energy_and_gradient(theta)[1]
    np.testing.assert_allclose(gradient, angles.to_parameters(np.array(shifts)), atol=1e-10)


def test_interpolated_angles_follow_the_published_formula():
    """u_i = (i - 1)/p u_(i-1) + (p - i + 1)/p u_i for i = 1 ... p + 1 (Zhou et al. 2020, appendix B)."""
    two, three = AlternatingOperators(depth=2), AlternatingOperators(depth=3)
    gamma, beta = [0.4, 0.7], [0.6, 0.2]
    longer = three.from_shallower(np.array([gamma[0], beta[0], gamma[1], beta[1]]), 6)
    np.testing.assert_allclose(longer[0::2], [0.4, 0.55, 0.7])
    np.testing.assert_allclose(longer[1::2], [0.6, 0.4, 0.2])
    np.testing.assert_allclose(two.from_shallower(np.array([0.3, 0.5]), 4), [0.3, 0.5, 0.3, 0.5])


@pytest.mark.parametrize("multi", [False, True])
@pytest.mark.parametrize(("model", "lattice"), [(WeightedCut(), bipartite(3)), (Heisenberg(), Chain(sites=6)), (Ising(), Chain(sites=6))])
def test_one_layer_more_from_interpolated_angles_does_not_raise_the_energy(model, lattice, multi):
    ground = ground_of(model, lattice)
    energy, angles = optimum(AlternatingOperators(depth=1, multi_angle=multi), ground)
    for depth in (2, 3):
        deeper = AlternatingOperators(depth=depth, multi_angle=multi)
        below = energy
        energy, angles = optimum(deeper, ground, deeper.from_shallower(angles, deeper.build(ground).n_parameters))
        assert energy <= below + 1e-9


@pytest.mark.parametrize("start", ["ramp", "zero", "small-random", "uniform-random"])
def test_starts_fit_the_program_and_name_every_parameter(start):
    ground = ground_of(J1J2(), Chain(sites=6))
    settings = AlternatingOperators(depth=3, start=start, multi_angle=True)
    program = settings.build(ground)
    angles = settings.start_parameters(ground, program, np.random.default_rng(1))
    assert angles.shape == (program.n_parameters,)
    assert len(set(program.labels())) == program.n_parameters
    assert np.any(angles != 0) == (start != "zero")


def test_the_ramp_turns_the_cost_on_and_the_mixer_off():
    ground = ground_of(WeightedCut(), Chain(sites=8))
    settings = AlternatingOperators(depth=5)
    ramp = settings.start_parameters(ground, settings.build(ground), np.random.default_rng(1))
    assert np.all(np.diff(ramp[0::2]) > 0)
    assert np.all(np.diff(ramp[1::2]) < 0)
