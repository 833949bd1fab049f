"""Trainability against closed forms, decays with their verdicts, landscapes, curvatures, spreads."""

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from thalweg.ansatz import UCCSD, HardwareEfficient
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import Stopped, StudyError
from thalweg.optimize import LBFGSB
from thalweg.simulate.register import RegisterEngine
from thalweg.study.decay import decays_of, fitted_decay
from thalweg.study.diagnosis import diagnose
from thalweg.study.diagnosis_result import GradientSpread, LandscapeResult, TrainabilityResult
from thalweg.study.diagnosis_spec import Direction, Landscape, Trainability
from thalweg.study.hessian import curvature, curvature_of, spread_of_starts
from thalweg.study.problem import make_engine, prepare
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.study.trainability import global_cost, gradient_spread, local_cost, spread_of
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain, Ladder, Square
from thalweg.systems.spin_models import Heisenberg, Ising

PAIR = Molecule(name="pair", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7414)))
RING = LatticeModel(lattice=Chain(sites=4), model=Ising())
LAYERED = StudySpec(system=RING, ansatz=HardwareEfficient(depth=1))


def product_ry(n: int) -> GateProgram:
    """One RY on every qubit."""
    masks = np.array([1 << q for q in range(n)], np.uint64)
    return GateProgram(n, 0, np.full(n, Gate.ROTATION, np.uint8), masks, masks, np.arange(n), np.ones(n), n)


@pytest.mark.parametrize("n", [1, 2, 4, 6])
@pytest.mark.parametrize("kind", ["global", "local"])
def test_the_product_circuit_has_the_variances_of_the_closed_forms(kind, n):
    """Cerezo et al., Nat. Commun. 12, 1791 (2021), warm-up example: (1/8)(3/8)^(n-1) global, 1/(8 n^2) local."""
    engine = RegisterEngine(global_cost(n) if kind == "global" else local_cost(n), product_ry(n))
    rng = np.random.default_rng(1)
    slopes = np.array([engine.energy_and_gradient(rng.uniform(-np.pi, np.pi, n))[1] for _ in range(4000)])
    variance, error = spread_of(slopes)
    expected = (1 / 8) * (3 / 8) ** (n - 1) if kind == "global" else 1 / (8 * n**2)
    assert abs(variance - expected) < 5 * error
    assert error < 0.15 * expected


def test_costs_vanish_on_zeros_and_nowhere_else():
    for n in (1, 3):
        program = product_ry(n)
        for cost, at_ones in ((global_cost(n), 1.0), (local_cost(n), 1.0)):
            engine = RegisterEngine(cost, program)
            assert engine.energy(np.zeros(n)) == pytest.approx(0.0, abs=1e-14)
            assert engine.energy(np.full(n, np.pi)) == pytest.approx(at_ones)
    assert RegisterEngine(local_cost(2), product_ry(2)).energy(np.array([np.pi, 0.0])) == pytest.approx(0.5)
    assert RegisterEngine(global_cost(2), product_ry(2)).energy(np.array([np.pi, 0.0])) == pytest.approx(1.0)


def point(n: int, variance: float, layers: int | None = None, relative_error: float = 0.05) -> GradientSpread:
    return GradientSpread(
        qubits=n, layers=layers, parameters=n, samples=100, variance=variance, variance_error=relative_error * variance, cost_deviation=0.1
    )


def test_an_exponential_decay_is_named_with_its_factor():
    decay = fitted_decay([point(n, 0.3 * 0.41**n) for n in range(2, 11)], "qubits")
    assert decay.kind == "exponential"
    assert decay.sentence == "decays exponentially: factor 0.41 a qubit"
    assert decay.factor == pytest.approx(0.41)


def test_a_power_law_is_not_taken_for_an_exponential():
    decay = fitted_decay([point(n, 1 / (8 * n**2)) for n in range(2, 13)], "qubits")
    assert decay.kind == "power"
    assert decay.power == pytest.approx(-2.0)
    assert "qubits^-2.0" in decay.sentence


def test_two_sizes_or_large_errors_leave_it_open():
    assert fitted_decay([point(2, 0.1), point(4, 0.02)], "qubits").kind == "undecided"
    noisy = fitted_decay([point(n, 1 / n**2, relative_error=0.6) for n in (3, 4, 5)], "qubits")
    assert noisy.kind in ("undecided", "flat")
    assert fitted_decay([point(n, 0.1) for n in (2, 3, 4, 5)], "qubits").sentence == "does not decay with qubits"


def test_decays_are_found_along_qubits_and_along_layers():
    points = [point(n, 0.5**n * 0.9**layers, layers) for n in (2, 4, 6) for layers in (1, 2, 3)]
    found = decays_of(points)
    assert [(d.along, d.other) for d in found[:4]] == [("qubit", "3 layers"), ("qubit", "2 layers"), ("qubit", "1 layer"), ("layer", "6 qubits")]
    assert found[0].factor == pytest.approx(0.5)
    assert found[3].factor == pytest.approx(0.9)


def test_deep_circuits_with_a_global_cost_lose_their_gradients_exponentially():
    spec = Trainability(study=LAYERED, cost="global", qubits=(2, 3, 4, 5, 6), layers=(4,), samples=300)
    result = diagnose(spec)
    assert isinstance(result, TrainabilityResult)
    assert [p.qubits for p in result.points] == [2, 3, 4, 5, 6]
    assert result.decays[0].kind in ("exponential", "undecided")
    assert result.decays[0].factor < 0.6
    assert result.verdict == result.decays[0].sentence
    assert TrainabilityResult.model_validate_json(result.model_dump_json()) == result


def test_a_local_cost_of_a_shallow_circuit_keeps_more_of_its_gradient():
    shallow = [diagnose(Trainability(study=LAYERED, cost=cost, qubits=(2, 4, 6, 8), samples=200)).decays[0].factor for cost in ("local", "global")]
    assert shallow[0] > 1.3 * shallow[1]


def test_starts_can_be_those_of_the_trial_state():
    """Near the zeros of this circuit the gradient is a product of small angles; over the whole circle it is not small."""
    study = StudySpec(system=RING, ansatz=HardwareEfficient(depth=1, start="small-random"))
    uniform, small = (diagnose(Trainability(study=study, samples=60, cost="local", starts=s)).points[0] for s in ("uniform", "as-set"))
    assert small.variance < 0.1 * uniform.variance


def test_one_point_shows_no_decay():
    assert "one point shows no decay" in diagnose(Trainability(study=LAYERED, samples=8)).verdict


def test_the_energy_of_lattices_grows_with_the_sizes_asked_for():
    for lattice, sizes in ((Chain(sites=4), (3, 5)), (Ladder(rungs=3), (6, 8)), (Square(columns=3, rows=2), (4, 6))):
        system = LatticeModel(lattice=lattice, model=Heisenberg())
        spec = Trainability(study=StudySpec(system=system, ansatz=HardwareEfficient(depth=1)), qubits=sizes, samples=8)
        assert [p.qubits for p in diagnose(spec).points] == list(sizes)


def test_a_molecule_varies_its_layers_and_an_executor_gives_the_same_numbers():
    spec = Trainability(study=StudySpec(system=PAIR, ansatz=HardwareEfficient(depth=1)), layers=(1, 2, 3), samples=20)
    here = diagnose(spec)
    with ThreadPoolExecutor(2) as pool:
        there = diagnose(spec, pool)
    assert [p.layers for p in here.points] == [1, 2, 3]
    assert here == there


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"study": StudySpec(system=PAIR), "layers": (1, 2)}, "has no layers"),
        ({"study": StudySpec(system=PAIR), "qubits": (2, 4)}, "size of this system is fixed"),
        ({"study": StudySpec(system=PAIR), "starts": "as-set"}, "all the same"),
        ({"study": StudySpec(system=PAIR), "cost": "local"}, "for circuits of gates"),
        ({"cost": "global", "qubits": (30,), "study": StudySpec(system=PAIR, ansatz=HardwareEfficient())}, "too large"),
        ({"study": StudySpec(system=LatticeModel(lattice=Ladder()), ansatz=HardwareEfficient()), "qubits": (7,)}, "no such lattice"),
    ],
)
def test_what_cannot_be_varied_is_refused(changes, words):
    with pytest.raises(StudyError, match=words):
        diagnose(Trainability(**({"samples": 8} | changes)))


def test_a_point_depends_on_its_seed_and_size_alone():
    spec = Trainability(study=LAYERED, samples=10)
    assert gradient_spread(spec, 4, 2) == gradient_spread(spec, 4, 2)
    other = spec.model_copy(update={"study": LAYERED.model_copy(update={"seed": 2})})
    assert gradient_spread(other, 4, 2) != gradient_spread(spec, 4, 2)


# --- landscape ----------------------------------------------------------------------------------------------------------


def test_the_energy_of_h2_along_its_one_parameter_is_a_sine():
    """E(theta) = a + b cos(2 theta) + c sin(2 theta): the double excitation acts between two determinants."""
    study = StudySpec(system=PAIR)
    result = diagnose(Landscape(study=study, directions=(Direction(kind="parameter"),), points=41))
    assert isinstance(result, LandscapeResult)
    theta, energies = np.array(result.steps[0]), np.array(result.energies)[:, 0]
    basis = np.stack([np.ones_like(theta), np.cos(2 * theta), np.sin(2 * theta)], axis=1)
    assert np.linalg.lstsq(basis, energies, rcond=None)[1][0] < 1e-20
    assert result.centre_energy == pytest.approx(run(study).reference_energy)
    assert result.minima == 2
    assert energies.min() >= result.exact_energy - 1e-12
    assert LandscapeResult.model_validate_json(result.model_dump_json()) == result


def test_the_line_between_two_points_passes_through_both():
    found = run(StudySpec(system=PAIR))
    towards = Direction(kind="point", point=found.final_parameters)
    result = diagnose(Landscape(study=found.spec, centre=(0.0,), directions=(towards,), points=5))
    assert result.steps[0] == (-0.5, 0.0, 0.5, 1.0, 1.5)
    assert result.energies[1][0] == pytest.approx(found.reference_energy)
    assert result.energies[3][0] == pytest.approx(found.energy, abs=1e-10)
    assert result.lowest == (3, 0)
    assert "below the centre" in result.verdict


def test_a_map_has_the_steepest_descent_and_a_random_direction_and_any_executor():
    study = LAYERED.model_copy(update={"ansatz": HardwareEfficient(depth=1, start="uniform-random")})
    spec = Landscape(study=study, directions=(Direction(kind="steepest"), Direction()), points=21, reach=0.3)
    result = diagnose(spec)
    with ThreadPoolExecutor(2) as pool:
        assert diagnose(spec, pool).energies == result.energies
    middle = [row[10] for row in result.energies]
    assert len(result.energies) == len(result.energies[0]) == 21
    assert middle[11] < middle[10] < middle[9]
    assert middle[10] == pytest.approx(result.centre_energy)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"centre": (0.0, 1.0)}, "The centre has 2 parameters"),
        ({"directions": (Direction(kind="point", point=(1.0, 2.0)),)}, "The point has 2 parameters"),
        ({"directions": (Direction(kind="parameter", parameter=5),)}, "no parameter 5"),
    ],
)
def test_points_of_another_trial_state_are_refused(changes, words):
    with pytest.raises(StudyError, match=words):
        diagnose(Landscape(study=StudySpec(system=PAIR), **changes))


def test_a_diagnosis_stops_when_asked():
    with pytest.raises(Stopped):
        diagnose(Trainability(study=LAYERED, samples=8), should_stop=lambda: True)


# --- after a run --------------------------------------------------------------------------------------------------------


def test_the_found_point_of_a_molecule_is_a_minimum():
    found = curvature_of(run(StudySpec(system=PAIR)))
    assert found.kind == "minimum"
    assert found.eigenvalues[0] > 1
    assert "minimum" in found.verdict


class Bowl:
    """E = x.A.x / 2 + slope.x, whose second derivatives are A."""

    def __init__(self, matrix: np.ndarray, slope: float = 0.0) -> None:
        self.n_parameters, self._matrix, self._slope = len(matrix), matrix, slope

    def energy_and_gradient(self, x: np.ndarray) -> tuple[float, np.ndarray]:
        return float(x @ self._matrix @ x / 2 + self._slope * x.sum()), self._matrix @ x + self._slope


@pytest.mark.parametrize(
    ("eigenvalues", "slope", "kind"),
    [([0.5, 1.0, 3.0], 0.0, "minimum"), ([-0.5, 1.0, 3.0], 0.0, "saddle"), ([0.0, 1.0, 3.0], 0.0, "flat"), ([0.5, 1.0, 3.0], 0.1, "not-stationary")],
)
def test_points_are_told_apart_by_gradient_and_lowest_curvature(eigenvalues, slope, kind):
    axes = np.linalg.qr(np.random.default_rng(2).normal(size=(3, 3)))[0]
    engine = Bowl(axes @ np.diag(eigenvalues) @ axes.T, slope)
    found = curvature(engine, np.zeros(3), ("a", "b", "c"), "hartree")
    assert found.kind == kind
    assert np.allclose(found.eigenvalues, eigenvalues, atol=1e-8)
    assert abs(np.array(found.direction) @ axes[:, 0]) == pytest.approx(1.0)
    assert found.leading_parameter == "abc"[np.argmax(np.abs(axes[:, 0]))]
    assert found.verdict.startswith(kind.replace("-", " "))


def test_many_parameters_go_by_lanczos_and_agree_with_the_whole_matrix(monkeypatch):
    problem = prepare(LAYERED.model_copy(update={"ansatz": HardwareEfficient(depth=3)}))
    engine, x = make_engine(problem), np.random.default_rng(4).normal(size=16)
    whole = curvature(engine, x, problem.program.labels(), "J")
    monkeypatch.setattr("thalweg.study.hessian.MOST_DENSE", 5)
    lowest = curvature(engine, x, problem.program.labels(), "J")
    assert lowest.eigenvalues[0] == pytest.approx(whole.eigenvalues[0], abs=1e-4)
    assert whole.kind == lowest.kind == "not-stationary"


def test_the_spread_over_starts_is_told():
    study = LAYERED.model_copy(update={"ansatz": HardwareEfficient(depth=2, start="uniform-random"), "starts": 5, "optimizer": LBFGSB()})
    result = run(study)
    spread = spread_of_starts(result)
    assert spread.starts == 5
    assert spread.lowest == min(s.energy for s in result.starts)
    assert 1 <= spread.distinct <= 5
    assert "5 starts" in spread.verdict
    assert spread_of_starts(run(StudySpec(system=PAIR, ansatz=UCCSD()))).deviation == 0.0
