"""Studies under shots: shift rules, counts, error bars, verdicts, and optimisers that do not fit."""

from functools import lru_cache

import numpy as np
import pytest
from support.dense import expansion_matrix

from thalweg.ansatz import UCCSD, Adaptive, HardwareEfficient, KUpCCGSD, NumberConserving
from thalweg.encoding import JordanWigner
from thalweg.errors import StudyError
from thalweg.evaluate import Exact, ExactWithError, Shots
from thalweg.optimize import COBYLA, ICANS, OPTIMIZERS, SPSA, Adam, FreeAxis, GradientDescent, ImaginaryTime, NaturalGradient, SequentialMinimal
from thalweg.optimize.natural_gradient import regularised_solution
from thalweg.optimize.objective import CountedObjective, StopRules
from thalweg.study.events import Iteration
from thalweg.study.figures import inspect
from thalweg.study.problem import make_engine, prepare
from thalweg.study.run import run
from thalweg.study.simulator import StudySimulator, search_source
from thalweg.study.spec import StudySpec, Target
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain
from thalweg.systems.pauli_list import PauliList

PAIR = Molecule(name="pair", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7414)))
CHAIN = Molecule(name="four in a row", atoms=tuple(("H", 0.0, 0.0, 0.9 * i) for i in range(4)))
#: Trial states with gates of their own, shared gates, excitations that break a removed symmetry, and rotations.
TRIALS = {
    "uccsd": (CHAIN, UCCSD(), JordanWigner()),
    "uccsd-tied": (CHAIN, UCCSD(spin_tied=True), JordanWigner()),
    "all-irreps": (PAIR, UCCSD(point_group=False), JordanWigner()),
    "k-upccgsd": (CHAIN, KUpCCGSD(k=1), JordanWigner()),
    "number-conserving": (CHAIN, NumberConserving(depth=1), JordanWigner()),
    "hardware-efficient": (PAIR, HardwareEfficient(depth=1, rotations="ry-rz"), JordanWigner(taper=False)),
}


@lru_cache(maxsize=16)
def prepared(trial: str, evaluation=Exact(), optimizer=COBYLA()):  # noqa: B008 - frozen
    system, ansatz, encoding = TRIALS[trial]
    problem = prepare(StudySpec(system=system, ansatz=ansatz, encoding=encoding, evaluation=evaluation, optimizer=optimizer))
    return problem, make_engine(problem)


def source_of(trial: str, evaluation, seed: int = 1):
    problem, engine = prepared(trial, evaluation)
    return search_source(problem, engine, np.random.default_rng(seed))


def some_parameters(n: int) -> np.ndarray:
    return np.random.default_rng(7).normal(scale=0.4, size=n)


@pytest.mark.parametrize("trial", TRIALS)
def test_shift_rules_give_the_adjoint_gradient_and_are_counted_as_a_device_would(trial):
    """Two-term: Mitarai et al. 2018; four-term: Anselmetti et al. 2021; gates that share a parameter are shifted one by one."""
    source = source_of(trial, Exact(gradient="shift-rule"))
    x = some_parameters(source.n_parameters)
    energy, gradient = source.exact_energy_and_gradient(x)
    estimate, slopes = source.energy_and_gradient(x)
    assert estimate.energy == pytest.approx(energy, abs=1e-12)
    assert np.allclose(slopes.gradient, gradient, atol=1e-10)
    gates = len(source.simulator.angles.parameter)
    per_gate = 2 if trial == "hardware-efficient" else 4
    assert slopes.cost.evaluations == per_gate * gates
    assert slopes.cost.circuits == per_gate * gates * source.simulator.set_weights.size
    assert slopes.cost.shots == 0


@pytest.mark.parametrize("trial", TRIALS)
def test_the_measured_sets_give_the_energy_of_the_engine(trial):
    """Also where the sector state is written on the working register, or on the full one."""
    source = source_of(trial, Shots(shots=10_000))
    x = some_parameters(source.n_parameters)
    simulator = source.simulator
    sums = simulator.sample(simulator.angles.of(x), np.full(simulator.set_weights.size, 20_000), np.random.default_rng(3))
    variances = simulator.set_variances(simulator.angles.of(x))
    error = np.sqrt(variances.sum() / 20_000)
    assert abs(simulator.constant + sums.means().sum() - source.exact_energy(x)) < 5 * error
    assert np.allclose(sums.variances(), variances, rtol=0.1, atol=1e-3 * variances.max())


@pytest.mark.parametrize("settings", [Shots(), Shots(allocation="uniform"), Shots(allocation="by-variance"), Shots(sets="single-terms")])
def test_sampled_energies_are_unbiased_and_their_error_bars_true(settings):
    """200 energies: the mean within five standard errors, their spread as the error bars say to 25 percent."""
    source = source_of("uccsd-tied", settings)
    x = some_parameters(source.n_parameters)
    found = [source.energy(x) for _ in range(200)]
    exact, energies = source.exact_energy(x), np.array([e.energy for e in found])
    bars = np.array([e.standard_error for e in found])
    assert abs(energies.mean() - exact) < 5 * energies.std() / 200**0.5
    assert energies.std() == pytest.approx(bars.mean(), rel=0.25)
    assert all(e.cost.shots == settings.shots for e in found)


def test_random_terms_are_unbiased_even_with_two_shots_an_energy():
    source = source_of("all-irreps", Shots())
    x = some_parameters(source.n_parameters)
    _, gradient = source.exact_energy_and_gradient(x)
    few = [source.sampled_gradient(x, np.full(x.size, 2.0), random_terms=True) for _ in range(150)]
    found = np.array([s.gradient for s in few])
    assert np.all(np.abs(found.mean(axis=0) - gradient) < 5 * found.std(axis=0) / 150**0.5 + 1e-12)
    assert few[0].cost.shots == 2 * few[0].cost.evaluations
    many = source.sampled_gradient(x, np.full(x.size, 4000.0), random_terms=True)
    assert np.all(np.abs(many.gradient - gradient) < 5 * np.sqrt(many.variance))


def test_allocation_by_variance_beats_the_others_where_spreads_differ():
    errors = {
        a: source_of("uccsd", ExactWithError(allocation=a)).energy(np.zeros(prepared("uccsd")[0].program.n_parameters)).standard_error
        for a in ("uniform", "by-weight", "by-variance")
    }
    assert errors["by-variance"] < 0.95 * min(errors["uniform"], errors["by-weight"])


def test_exact_energies_carry_the_error_that_shots_have_on_average():
    expected = source_of("uccsd-tied", ExactWithError(shots=10_000))
    sampled = source_of("uccsd-tied", Shots(shots=10_000))
    x = some_parameters(expected.n_parameters)
    estimate = expected.energy(x)
    assert estimate.energy == expected.exact_energy(x)
    assert np.mean([sampled.energy(x).standard_error for _ in range(30)]) == pytest.approx(estimate.standard_error, rel=0.03)


@pytest.mark.parametrize("trial", ["uccsd-tied", "number-conserving", "hardware-efficient"])
@pytest.mark.parametrize("part", ["full", "block-diagonal", "diagonal"])
def test_sampled_metrics_lie_around_the_exact_one_and_every_overlap_is_counted(trial, part):
    """From overlaps with shifted copies (Mari, Bromley and Killoran 2021), also of excitations and of gates that share a parameter."""
    sampled, exact = source_of(trial, Shots(shots=100_000)), source_of(trial, Exact(gradient="shift-rule"))
    x = some_parameters(sampled.n_parameters)
    found, expected = sampled.metric(x, part), exact.metric(x, part)
    assert np.all(np.abs(found.tensor - expected.tensor) < 5 * found.standard_error + 1e-12)
    assert 0 < found.standard_error < 0.02
    assert found.cost.circuits == expected.cost.circuits > 0
    assert found.cost.shots == 100_000 * found.cost.circuits
    if part == "diagonal":
        assert np.count_nonzero(expected.tensor - np.diag(np.diag(expected.tensor))) == 0


def test_a_layer_of_rotations_takes_one_overlap_an_angle_and_four_a_pair():
    exact = source_of("hardware-efficient", Exact(gradient="shift-rule"))
    gates = 16  # two layers of RY and RZ on four qubits
    x = some_parameters(exact.n_parameters)
    assert exact.metric(x, "diagonal").cost.circuits == gates
    assert exact.metric(x, "full").cost.circuits == gates + 4 * gates * (gates - 1) // 2
    assert exact.metric(x, "block-diagonal").cost.circuits == gates + 4 * 4 * 6  # four layers of four


def study(**changes) -> StudySpec:
    base = {"system": PAIR, "ansatz": UCCSD(point_group=False), "evaluation": Shots(shots=2000), "optimizer": Adam(max_iterations=15, step=0.1)}
    return StudySpec(**(base | changes))


def test_a_study_under_shots_states_both_energies_and_counts_every_shot():
    events = []
    result = run(study(), events.append)
    iterates = [e for e in events if isinstance(e, Iteration)]
    assert result.measured_energy is not None
    assert result.standard_error > 0
    assert result.energy >= result.exact_energy - 1e-12
    assert abs(result.measured_energy - result.energy) < 5 * result.standard_error
    assert result.starts[0].energy == result.measured_energy
    assert iterates[0].shots == 0
    assert iterates[0].standard_error is None
    assert iterates[-1].standard_error > 0
    gradients = 2000 * (1 + 4 * 3) * 15  # three excitations, four shifts each
    assert iterates[-1].shots == gradients
    assert result.shots == gradients + 2000  # the found point is measured once more
    assert result.trace.shots == tuple(e.shots for e in iterates)
    assert [e.noiseless for e in iterates] == list(result.trace.noiseless)


def test_the_same_seed_gives_the_same_numbers_and_another_seed_others():
    one, other, third = (run(study(seed=seed)) for seed in (4, 4, 5))
    assert one.trace.energy == other.trace.energy
    assert one.measured_energy == other.measured_energy
    assert one.trace.energy != third.trace.energy


def test_an_error_bar_wider_than_the_target_is_no_success_however_good_the_state():
    result = run(study(ansatz=UCCSD(), optimizer=SequentialMinimal(max_iterations=3)))
    assert result.error < result.target_error
    assert result.verdict_kind == "uncertain"
    assert not result.reached_target
    assert "Not shown by the shots" in result.verdict
    wide = run(study(ansatz=UCCSD(), optimizer=SequentialMinimal(max_iterations=3), target=Target(error=0.05)))
    assert wide.reached_target
    assert "measured" in wide.verdict
    assert "two standard errors" in wide.verdict


def test_exact_energies_with_an_error_bar_say_what_the_shots_could_show():
    short = run(study(evaluation=ExactWithError(shots=1000), optimizer=COBYLA(max_iterations=60)))
    assert (short.verdict_kind, short.measured_energy) == ("uncertain", None)
    long = run(study(evaluation=ExactWithError(shots=10**8), optimizer=COBYLA(max_iterations=60)))
    assert long.reached_target
    assert "shots would have an error bar" in long.verdict
    assert long.standard_error == pytest.approx(short.standard_error * 1e-5**0.5, rel=0.01)


def test_the_shot_limit_ends_a_search():
    result = run(study(stop=StopRules(shots=100_000), optimizer=SPSA(max_iterations=500)))
    assert result.stop_reason == "shots"
    assert 100_000 <= result.shots <= 104_000


def test_a_stop_is_obeyed_in_the_middle_of_a_gradient():
    """The chain has a gradient of more than a hundred energies; the stop is asked for after the first iterates were seen."""
    asked = []

    def should_stop() -> bool:
        asked.append(None)
        return len(asked) > 30

    result = run(study(system=CHAIN, ansatz=UCCSD()), should_stop=should_stop)
    assert result.stop_reason == "stopped-by-person"
    assert len(asked) < 35
    assert result.iterations == 0


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"optimizer": ICANS(), "evaluation": Exact()}, "chooses the number of shots itself"),
        ({"optimizer": FreeAxis(), "evaluation": Exact()}, "no single-qubit rotations"),
    ],
)
def test_an_optimiser_that_needs_more_than_is_offered_is_refused_before_anything_is_evaluated(changes, words):
    events = []
    with pytest.raises(StudyError, match=words) as error:
        run(study(**changes), events.append)
    assert error.value.field == "optimizer"
    assert not [e for e in events if isinstance(e, Iteration)]


def test_too_few_shots_for_the_sets_are_refused_with_the_number_needed():
    with pytest.raises(StudyError, match="Give at least 8 shots") as error:
        run(study(evaluation=Shots(shots=7, allocation="by-variance"), ansatz=UCCSD()))
    assert error.value.field == "evaluation.shots"


def test_a_natural_gradient_step_is_an_imaginary_time_step_of_twice_its_length():
    """Stokes et al. 2020: d theta/d tau = -g^-1 gradient / 2."""
    source = source_of("uccsd", Exact())
    rules = StopRules(gradient=0)
    objective = CountedObjective(source, offset=0.0, rules=rules, target_energy=None, report=lambda p: None, should_stop=lambda: False)
    x = some_parameters(source.n_parameters)
    _, gradient = objective.value_and_gradient(x)
    step = regularised_solution(objective.metric(x), gradient, 1e-6)
    assert np.allclose(2.0 * ImaginaryTime(regularisation=1e-6).rate(objective, x, gradient), -1.0 * step, atol=1e-12)


def test_imaginary_time_follows_the_evolved_state_where_the_trial_states_hold_it():
    """Two electrons in two orbitals: doubles reach every state of the symmetry, so that exp(-H tau)|ref> itself is followed."""
    source = source_of("all-irreps", Exact())
    rules = StopRules(gradient=0)
    objective = CountedObjective(source, offset=0.0, rules=rules, target_energy=None, report=lambda p: None, should_stop=lambda: False)
    problem, engine = prepared("all-irreps")
    begin = np.array([0.01, 0.02, -0.05])
    steps, tau = 400, 0.8
    x = begin.copy()
    for _ in range(steps):
        _, gradient = objective.value_and_gradient(x)
        x = x + tau / steps * ImaginaryTime(regularisation=1e-10).rate(objective, x, gradient)
    encoded = StudySimulator(problem, engine).register
    matrix = expansion_matrix(encoded.working)
    values, vectors = np.linalg.eigh(matrix)
    start = encoded.from_sector(engine.state(begin)[None])[0]
    evolved = vectors @ (np.exp(-tau * values) * (vectors.conj().T @ start))
    evolved /= np.linalg.norm(evolved)
    reached = encoded.from_sector(engine.state(x)[None])[0]
    assert abs(np.vdot(evolved, reached)) ** 2 == pytest.approx(1.0, abs=2e-4)


@pytest.mark.parametrize(
    "optimizer", [Adam(), SPSA(step=0.1), SequentialMinimal(), SequentialMinimal(reuse=False), ICANS(), NaturalGradient()], ids=lambda o: o.key
)
def test_the_circuits_of_a_step_are_foretold(optimizer):
    """For the second iteration, past calibration and the like."""
    spec = study(ansatz=UCCSD(spin_tied=True, point_group=False), evaluation=Shots(shots=100))
    two = run(spec.model_copy(update={"optimizer": optimizer.model_copy(update={"max_iterations": 2})})).trace
    figures = inspect(spec.model_copy(update={"optimizer": optimizer}))
    assert two.circuits[2] - two.circuits[1] == figures.circuits_a_step
    assert figures.shots_a_step == (None if "shots" in optimizer.needs else two.shots[2] - two.shots[1])
    assert figures.measurement_sets == 5


def test_the_circuits_of_a_choice_of_growth_are_foretold():
    spec = study(system=CHAIN, ansatz=Adaptive(max_operators=1), evaluation=Exact(gradient="shift-rule"), optimizer=COBYLA(max_iterations=5))
    figures = inspect(spec)
    result = run(spec)
    assert figures.pool_operators == len(spec.ansatz.operators(prepare(spec).ground))
    assert result.growth[0].evaluations * figures.measurement_sets == figures.pool_circuits  # the start is judged by the simulation
    assert inspect(study(system=CHAIN)).pool_circuits is None


@pytest.mark.parametrize("reuse", [True, False])
def test_the_circuits_of_a_step_with_free_axes_are_foretold(reuse):
    optimizer = FreeAxis(max_iterations=2, reuse=reuse)
    spec = study(ansatz=HardwareEfficient(depth=1), encoding=JordanWigner(taper=False), evaluation=Shots(shots=100), optimizer=optimizer)
    trace = run(spec).trace
    assert trace.circuits[2] - trace.circuits[1] == inspect(spec).circuits_a_step


@pytest.mark.parametrize("optimizer", [Adam(), ICANS(), NaturalGradient()], ids=lambda o: o.key)
def test_nothing_is_foretold_of_a_step_where_there_is_no_parameter_to_search(optimizer):
    figures = inspect(study(ansatz=Adaptive(), evaluation=Shots(shots=100), optimizer=optimizer))
    assert figures.measurement_sets
    assert (figures.circuits_a_step, figures.shots_a_step) == (None, None)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"optimizer": FreeAxis()}, "single-qubit rotations"),
        ({"optimizer": ICANS(), "evaluation": Exact()}, "draws none"),
        ({"optimizer": Adam()}, ""),
    ],
    ids=["axes", "shots", "fit"],
)
def test_figures_say_what_the_run_would_be_refused_for(changes, words):
    warnings = [text for text in inspect(study(**changes)).warnings if "cannot run like this" in text]
    assert len(warnings) == bool(words)
    assert words in " ".join(warnings)


@pytest.mark.parametrize("key", sorted(set(OPTIMIZERS.keys()) - {"free-axis"}))
def test_every_optimiser_lowers_the_energy_of_a_molecule(key):
    cls = OPTIMIZERS.get(key)
    evaluation = Shots(shots=2000) if "shots" in cls.needs else Exact()
    result = run(study(optimizer=cls(max_iterations=60), evaluation=evaluation))
    assert result.error < 0.3 * (result.reference_energy - result.exact_energy)


@pytest.mark.parametrize(
    "optimizer", [NaturalGradient(max_iterations=15), NaturalGradient(max_iterations=15, metric="diagonal"), ImaginaryTime(max_iterations=15)]
)
def test_the_metric_is_sampled_too_where_energies_are(optimizer):
    result = run(study(optimizer=optimizer, evaluation=Shots(shots=5000)))
    assert result.error < 0.3 * (result.reference_energy - result.exact_energy)
    plain = run(study(optimizer=GradientDescent(max_iterations=15), evaluation=Shots(shots=5000)))
    assert result.circuits / result.iterations > plain.circuits / plain.iterations


def test_free_axes_reach_what_fixed_axes_cannot():
    """RY and CZ give real states, in which Y vanishes; with free axes the same circuit finds the ground state -3 of two fields along Y."""
    fields = LatticeModel(lattice=Chain(sites=2, periodic=False), model=PauliList(terms="Y0 + 2 Y1"))
    spec = study(system=fields, evaluation=Exact(), ansatz=HardwareEfficient(depth=1, start="uniform-random"))
    fixed = run(spec.model_copy(update={"optimizer": SequentialMinimal(max_iterations=50)}))
    free = run(spec.model_copy(update={"optimizer": FreeAxis(max_iterations=50)}))
    assert fixed.energy == pytest.approx(0.0, abs=1e-9)
    assert free.energy == pytest.approx(-3.0, abs=1e-9)
    assert free.parameters == 3 * fixed.parameters
    assert "free axes" in free.operator_order
