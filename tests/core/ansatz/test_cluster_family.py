"""Every trial state of excitations: exactness on two electrons, conserved quantities, gates, gradients, orders, Trotter formulas."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm
from scipy.optimize import minimize
from support.exact import exact_energy
from support.hamiltonians import GEOMETRIES, chain, molecule, random_molecule
from support.second_quantised import excitation_matrix, program_state

from thalweg.ansatz import ANSATZE, PUCCD, UCCD, UCCGSD, UCCSD, Ground, KUpCCGSD, NumberConserving
from thalweg.ansatz.first_order import amplitudes_of
from thalweg.circuit.compile import excitation_gates
from thalweg.circuit.program import ExcitationProgram
from thalweg.encoding import JordanWigner
from thalweg.encoding.encoded import encode_fermions
from thalweg.errors import StudyError
from thalweg.operators.product import ExpansionProduct
from thalweg.simulate.register import RegisterEngine
from thalweg.simulate.sector import SectorEngine

FAMILY = [cls for cls in ANSATZE if issubclass(cls, (UCCSD, UCCD, UCCGSD, PUCCD, KUpCCGSD, NumberConserving))]
SMALL = {KUpCCGSD: {"k": 1}, NumberConserving: {"depth": 2}}
SYSTEMS = {
    "closed": lambda: random_molecule(4, 2, 2, (0, 1, 0, 1)),
    "open": lambda: random_molecule(3, 2, 1),
    "chain": lambda: molecule(chain(4, 1.5)),
}


def ground(hamiltonian) -> Ground:
    encoded = encode_fermions(hamiltonian, JordanWigner())
    return Ground(hamiltonian, encoded.working, encoded.reference_bits)


def angles(program, seed=5, width=0.4):
    return np.random.default_rng(seed).normal(0.0, width, program.n_parameters)


def lowest(hamiltonian, ansatz, seeds=(1,)) -> float:
    base = ground(hamiltonian)
    program = ansatz.build(base)
    engine = SectorEngine(hamiltonian, program)
    energies = []
    for seed in seeds:
        start = ansatz.start_parameters(base, program, np.random.default_rng(seed))
        found = minimize(engine.energy_and_gradient, start, jac=True, method="L-BFGS-B", options={"ftol": 1e-15, "gtol": 1e-8, "maxiter": 2000})
        energies.append(found.fun)
    return min(energies)


@pytest.mark.parametrize("cls", FAMILY, ids=lambda cls: cls.__name__)
@pytest.mark.parametrize("system", SYSTEMS)
def test_states_energies_and_gradients_agree_with_dense_exponentials_gates_and_differences(cls, system):
    hamiltonian = SYSTEMS[system]()
    base = ground(hamiltonian)
    program = cls(**SMALL.get(cls, {})).build(base)
    assert len(program.labels()) == program.n_parameters == len(set(program.labels()))
    theta = angles(program)
    engine = SectorEngine(hamiltonian, program)
    np.testing.assert_allclose(engine.state(theta), program_state(program, theta), atol=1e-12)
    energy, gradient = engine.energy_and_gradient(theta)
    for k in range(0, program.n_parameters, max(1, program.n_parameters // 7)):
        step = np.zeros(program.n_parameters)
        step[k] = 1e-5
        assert gradient[k] == pytest.approx((engine.energy(theta + step) - engine.energy(theta - step)) / 2e-5, abs=1e-7)
    assert energy >= exact_energy(hamiltonian) - 1e-9

    encoded = encode_fermions(hamiltonian, JordanWigner(taper=False))
    gates = excitation_gates(program, encoded)
    state = RegisterEngine(encoded.working, gates).state(theta)
    assert ExpansionProduct(encoded.working).expectation(state) == pytest.approx(energy, abs=1e-10)
    assert ExpansionProduct(encoded.number).expectation(state) == pytest.approx(hamiltonian.sector.n_electrons, abs=1e-12)
    assert ExpansionProduct(encoded.s_z).expectation(state) == pytest.approx(hamiltonian.sector.s_z, abs=1e-12)


def test_number_conserving_layers_keep_the_total_spin():
    for hamiltonian in (molecule(chain(4, 1.5)), molecule(GEOMETRIES["H3"], spin=1)):
        program = NumberConserving(depth=3).build(ground(hamiltonian))
        facts = SectorEngine(hamiltonian, program).facts(angles(program, width=2.0), None)
        s = 0.5 * (hamiltonian.sector.n_alpha - hamiltonian.sector.n_beta)
        assert facts.s_squared == pytest.approx(s * (s + 1), abs=1e-12)


TWO_ELECTRONS = molecule("H 0 0 0; H 0 0 1.2", basis="6-31g")


@pytest.mark.parametrize("ansatz", [UCCSD(), UCCGSD(), KUpCCGSD(k=1), KUpCCGSD(k=3, order="singles-first"), NumberConserving(depth=4)], ids=repr)
def test_two_electrons_are_described_exactly(ansatz):
    assert lowest(TWO_ELECTRONS, ansatz) == pytest.approx(exact_energy(TWO_ELECTRONS), abs=1e-8)


def test_one_layer_with_singles_first_does_not_reach_two_electrons_and_more_layers_do():
    exact = exact_energy(TWO_ELECTRONS)
    errors = [lowest(TWO_ELECTRONS, KUpCCGSD(k=k, order="singles-first"), seeds=(1, 2)) - exact for k in (1, 2)]
    assert errors[0] > 1e-6 > errors[1]


def test_pair_doubles_are_exact_where_no_pair_can_break():
    hydrogen = molecule(GEOMETRIES["H2"])
    assert lowest(hydrogen, PUCCD()) == pytest.approx(exact_energy(hydrogen), abs=1e-9)
    assert lowest(TWO_ELECTRONS, PUCCD()) > exact_energy(TWO_ELECTRONS) + 1e-6


def test_larger_families_of_excitations_lie_no_higher():
    """Doubles alone span less than with singles, pair doubles less than all doubles, and generalised ones span more (Lee et al. 2019)."""
    four = molecule(chain(4, 2.0))
    energies = {type(a).__name__: lowest(four, a) for a in (PUCCD(), UCCD(), UCCSD(), UCCGSD())}
    assert energies["PUCCD"] > energies["UCCD"] > energies["UCCSD"] > energies["UCCGSD"] >= exact_energy(four) - 1e-9


@pytest.mark.parametrize("m", [3, 4, 5])
def test_counts_follow_from_the_definitions(m):
    base = ground(random_molecule(m, 2, 1))
    pairs = m * (m - 1) // 2
    same, mixed = pairs * (pairs - 1) // 2, m**2 * (m**2 - 1) // 2
    assert UCCGSD(point_group=False).build(base).n_parameters == 2 * pairs + 2 * same + mixed
    assert KUpCCGSD(k=3).build(base).n_parameters == 3 * 2 * pairs
    assert KUpCCGSD(k=3, spin_tied=False).build(base).n_parameters == 3 * 3 * pairs
    assert PUCCD().build(base).n_parameters == m - 2
    assert NumberConserving(depth=4).build(base).n_parameters == 4 * 2 * (m - 1)


def product_of(program: ExcitationProgram) -> list[tuple[str, float]]:
    return [(e.label(), float(f)) for e, f in zip(program.excitations, program.factor, strict=True)]


@pytest.mark.parametrize("order", ["doubles-first", "singles-first", "mp2-size", "random"])
def test_every_order_holds_the_same_factors_and_says_which_it_is(order):
    base = ground(molecule(GEOMETRIES["LiH"]))
    usual, other = UCCSD().build(base), UCCSD(order=order).build(base)
    assert sorted(product_of(other)) == sorted(product_of(usual))
    assert other.order
    assert (other.order == usual.order) == (order == "doubles-first")


def test_largest_first_order_amplitude_acts_first():
    base = ground(molecule(GEOMETRIES["LiH"]))
    program = UCCSD(order="mp2-size").build(base)
    sizes = np.abs(amplitudes_of(base.fermions, program.excitations))
    assert np.all(np.diff(sizes) <= 1e-7)
    assert sizes[0] > sizes[-1]


def test_a_random_order_is_that_of_its_seed():
    base = ground(molecule(GEOMETRIES["LiH"]))
    one, again, other = (product_of(UCCSD(order="random", order_seed=seed).build(base)) for seed in (3, 3, 4))
    assert one == again
    assert one != other


@pytest.mark.parametrize(("order", "power"), [("first", 1), ("second", 2)])
def test_trotter_steps_approach_the_exponential_of_the_sum_at_the_rate_of_their_order(order, power):
    """Error of the first-order product falls as 1/n, of the symmetric one as 1/n^2 (Suzuki 1976)."""
    hamiltonian = random_molecule(4, 2, 2)
    base = ground(hamiltonian)
    plain = UCCSD().build(base)
    theta = angles(plain, width=0.3)
    generator = sum(x * (t - t.T) for x, t in zip(theta, (excitation_matrix(e, hamiltonian.sector) for e in plain.excitations), strict=True))
    exact = expm(generator)[:, 0]
    errors = []
    for steps in (8, 16):
        program = UCCSD(trotter_steps=steps, trotter_order=order).build(base)
        assert program.n_parameters == plain.n_parameters
        assert program.labels() == plain.labels()
        assert f"{steps} Trotter steps of {order} order" in program.order
        errors.append(np.linalg.norm(SectorEngine(hamiltonian, program).state(theta).ravel() - exact))
    assert errors[0] / errors[1] == pytest.approx(2.0**power, rel=0.1)


def test_trotter_steps_leave_first_order_amplitudes_as_they_are():
    base = ground(molecule(chain(4, 0.9)))
    one, many = UCCSD(start="mp2"), UCCSD(start="mp2", trotter_steps=5, trotter_order="second")
    rng = np.random.default_rng(0)
    np.testing.assert_allclose(many.start_parameters(base, many.build(base), rng), one.start_parameters(base, one.build(base), rng), atol=1e-14)


@pytest.mark.parametrize("ansatz", [UCCGSD(start="mp2"), KUpCCGSD(start="mp2"), PUCCD(start="mp2"), UCCD(start="mp2")], ids=repr)
def test_first_order_starts_lie_below_the_reference_also_for_generalised_excitations(ansatz):
    hamiltonian = molecule(chain(4, 0.9))
    base = ground(hamiltonian)
    program = ansatz.build(base)
    start = ansatz.start_parameters(base, program, np.random.default_rng(0))
    assert SectorEngine(hamiltonian, program).energy(start) < hamiltonian.reference_energy - 1e-3


@pytest.mark.parametrize("cls", [KUpCCGSD, NumberConserving])
def test_one_layer_more_gives_the_same_state_from_the_parameters_of_fewer(cls):
    hamiltonian = molecule(chain(4, 1.5))
    base = ground(hamiltonian)
    shallow, deep = cls(**{cls.depth_field: 2}), cls(**{cls.depth_field: 3})
    small, large = shallow.build(base), deep.build(base)
    theta = angles(small)
    longer = deep.from_shallower(theta, large.n_parameters)
    np.testing.assert_allclose(SectorEngine(hamiltonian, large).state(longer), SectorEngine(hamiltonian, small).state(theta), atol=1e-13)


@pytest.mark.parametrize("cls", FAMILY, ids=lambda cls: cls.__name__)
def test_spin_models_are_refused_in_words(cls):
    with pytest.raises(StudyError, match="spins instead of electrons"):
        cls().build(Ground(None, None, 0))
