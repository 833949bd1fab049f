"""Searches that start at the final parameters of another run, and trial states that are grown anew."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.ansatz import ANSATZE, UCCD, UCCSD, Adaptive, AlternatingOperators, ExchangeLayers, HardwareEfficient, KUpCCGSD
from thalweg.encoding import BravyiKitaev
from thalweg.errors import StudyError
from thalweg.optimize import FreeAxis
from thalweg.storage.session import Session, load_session, save_session
from thalweg.study.diagnosis import diagnose
from thalweg.study.diagnosis_spec import Direction, Landscape
from thalweg.study.events import Warned
from thalweg.study.figures import inspect
from thalweg.study.hessian import curvature_of
from thalweg.study.neighbour import by_label
from thalweg.study.path import BondPath
from thalweg.study.problem import prepare
from thalweg.study.repeat import repeat
from thalweg.study.result import StudyResult
from thalweg.study.run import run
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.scan_task import solve_point
from thalweg.study.spec import DepthLadder, Neighbour, StudySpec, spec_from_data
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain
from thalweg.systems.spin_models import Heisenberg


def hydrogens(count: int, spacing: float) -> Molecule:
    return Molecule(name="chain", atoms=tuple(("H", 0.0, 0.0, i * spacing) for i in range(count)))


LIH = Molecule(name="LiH", atoms=(("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.6)))
FOUR, WIDER = hydrogens(4, 1.5), hydrogens(4, 1.55)
RING = LatticeModel(lattice=Chain(sites=4), model=Heisenberg())


def start(result: StudyResult) -> Neighbour:
    return result.as_start("run 1")


def study(ansatz=UCCSD(), system=FOUR, **more) -> StudySpec:  # noqa: B008 - settings are frozen
    return StudySpec(system=system, ansatz=ansatz, **more)


def runs_from(first: StudyResult, ansatz=UCCSD(), system=FOUR, **more) -> StudyResult:  # noqa: B008
    return run(study(ansatz, system, neighbour=start(first), **more))


@pytest.fixture(scope="module")
def doubles():
    return run(study(UCCD()))


@pytest.fixture(scope="module")
def singles_too():
    return run(study())


@pytest.fixture(scope="module")
def stopped():
    return run(study(Adaptive(max_operators=4)))


@pytest.fixture(scope="module")
def grown():
    return run(study(Adaptive()))


@pytest.mark.parametrize("ansatz", [cls() for cls in ANSATZE if cls is not AlternatingOperators], ids=lambda a: a.key)
@pytest.mark.parametrize("system", [FOUR, RING], ids=["electrons", "spins"])
def test_every_parameter_of_every_trial_state_has_a_label_of_its_own(ansatz, system):
    try:
        labels = prepare(study(ansatz, system)).program.labels()
    except StudyError:
        return  # not for this kind of system, which the trial state's own tests hold
    assert len(set(labels)) == len(labels)
    assert not any(label.startswith("theta") for label in labels)


def test_a_converged_run_started_from_itself_ends_at_once_at_the_same_energy():
    first = run(study(system=LIH))
    again = runs_from(first, system=LIH)
    assert again.iterations <= 1
    assert again.energy == pytest.approx(first.energy, abs=1e-10)
    assert again.start_parameters == first.final_parameters
    assert any("34 of 34 parameters begin at those of run 1, LiH, STO-3G, UCCSD." in text for text in again.remarks)


def test_doubles_are_taken_over_and_singles_begin_at_zero(doubles, singles_too):
    events = []
    result = run(study(neighbour=start(doubles)), events.append)
    place = dict(zip(result.parameter_labels, result.start_parameters, strict=True))
    assert [place.pop(label) for label in doubles.parameter_labels] == list(doubles.final_parameters)
    assert set(place.values()) == {0.0}
    assert result.trace.energy[0] == pytest.approx(doubles.energy, abs=1e-10)
    assert result.energy == pytest.approx(singles_too.energy, abs=1e-7)
    told = "10 of 14 parameters begin at those of run 1, chain, STO-3G, UCCD, the others at zero."
    assert told in result.remarks
    assert told in [e.text for e in events if isinstance(e, Warned)]
    assert inspect(result.spec).start == told


def test_what_has_no_place_is_told(singles_too):
    result = runs_from(singles_too, UCCD())
    assert any("10 of 10 parameters" in text and "4 of that run have no place here" in text for text in result.remarks)


def test_the_others_begin_as_the_trial_state_says(doubles):
    ansatz = UCCSD(start="small-random")
    alone, result = run(study(ansatz)), runs_from(doubles, ansatz)
    new = [k for k, label in enumerate(result.parameter_labels) if label not in doubles.parameter_labels]
    assert [result.start_parameters[k] for k in new] == [alone.start_parameters[k] for k in new]
    assert all(result.start_parameters[k] != 0.0 for k in new)


def test_the_next_geometry_and_another_encoding_begin_below_their_own_start(singles_too):
    for more in ({"system": WIDER}, {"encoding": BravyiKitaev()}):
        own, taken = run(study(**more)), runs_from(singles_too, **more)
        assert taken.trace.energy[0] < own.trace.energy[0] - 1e-2
        assert taken.iterations < own.iterations
        assert taken.energy == pytest.approx(own.energy, abs=1e-6)


def test_shared_amplitudes_take_those_of_their_operators_and_give_them_back(singles_too):
    tied = runs_from(singles_too, UCCSD(spin_tied=True))
    assert tied.parameters < singles_too.parameters
    assert tied.trace.energy[0] == pytest.approx(singles_too.energy, abs=1e-6)
    loose = runs_from(tied)
    assert loose.trace.energy[0] == pytest.approx(tied.energy, abs=1e-10)


@pytest.mark.parametrize(
    ("system", "shallow", "deep"),
    [
        (FOUR, HardwareEfficient(depth=2), HardwareEfficient(depth=3, start="zero")),
        (FOUR, KUpCCGSD(k=1), KUpCCGSD(k=2, start="zero")),
        (RING, ExchangeLayers(depth=1), ExchangeLayers(depth=3, start="zero")),
    ],
    ids=lambda value: getattr(value, "key", ""),
)
def test_a_deeper_circuit_begins_at_the_state_of_the_shallower_one(system, shallow, deep):
    first = run(study(shallow, system))
    result = runs_from(first, deep, system)
    assert result.trace.energy[0] == pytest.approx(first.energy, abs=1e-9)
    assert f"{getattr(deep, deep.depth_field) - getattr(shallow, shallow.depth_field)} layer" in result.remarks[0]


def test_new_layers_begin_at_small_random_angles_where_the_trial_state_does():
    first = run(study(HardwareEfficient(depth=1)))
    result = runs_from(first, HardwareEfficient(depth=2))
    assert result.start_parameters[-first.parameters :] == first.final_parameters
    assert all(value != 0.0 for value in result.start_parameters[: -first.parameters])


def test_a_schedule_of_angles_is_continued():
    first = run(study(AlternatingOperators(depth=2), RING))
    result = runs_from(first, AlternatingOperators(depth=3), RING)
    expected = AlternatingOperators(depth=3).from_shallower(np.array(first.final_parameters), result.parameters)
    assert result.start_parameters == pytest.approx(expected)


def test_angles_of_a_small_lattice_begin_those_of_a_larger_one():
    """Parts of one layer may have one label, and it names a number of bonds: they are told apart by their order."""
    small = run(study(AlternatingOperators(depth=2), RING))
    larger = LatticeModel(lattice=Chain(sites=8), model=Heisenberg())
    taken, own = runs_from(small, AlternatingOperators(depth=2), larger), run(study(AlternatingOperators(depth=2), larger))
    assert taken.start_parameters == small.final_parameters
    assert taken.trace.energy[0] < own.trace.energy[0]
    several = runs_from(small, AlternatingOperators(depth=3), larger)
    assert "in a circuit with 1 layer more" in several.remarks[0]


def test_free_axes_are_continued_as_well():
    first = run(study(HardwareEfficient(depth=1), optimizer=FreeAxis(max_iterations=2)))
    result = runs_from(first, HardwareEfficient(depth=2, start="zero"), optimizer=FreeAxis(max_iterations=1))
    assert result.trace.energy[0] == pytest.approx(first.energy, abs=1e-9)


def test_a_ladder_is_climbed_on_from_the_depth_of_the_other_run():
    first = run(study(HardwareEfficient(depth=2)))
    result = runs_from(first, HardwareEfficient(depth=4), ladder=DepthLadder(on=True, least_gain=0.0))
    assert result.growth[0].added == ("depth 2",)
    assert result.growth[0].energy == pytest.approx(first.energy, abs=1e-8)


def test_the_first_rung_of_a_ladder_takes_what_fits():
    first = run(study(KUpCCGSD(k=3), stop={"gradient": 1e-3}))
    ladder = study(KUpCCGSD(k=2, start="zero"), ladder=DepthLadder(on=True), neighbour=start(first))
    result = run(ladder)
    assert result.growth[0].added == ("depth 1",)
    assert result.start_parameters == first.final_parameters[: len(result.start_parameters)]


def test_later_starts_are_displaced(doubles):
    result = runs_from(doubles, UCCD(), starts=2)
    first, second = (s.trace.energy[0] for s in result.starts)
    assert first == pytest.approx(doubles.energy, abs=1e-10)
    assert second > first + 1e-4


def test_a_point_of_a_curve_goes_on_from_the_point_beside_it(doubles):
    scan = ScanSpec(
        study=study(UCCD(), hydrogens(2, 0.8), neighbour=start(run(study(UCCD(), hydrogens(2, 0.8))))), path=BondPath(), points=(0.8, 1.2)
    )
    first = solve_point(scan, 0.8, None)
    assert any("begin at those of run 1" in text for text in first.result.remarks)
    second = solve_point(scan, 1.2, first.seed)
    assert second.result.start_parameters == first.result.final_parameters
    assert not any("begin at those of run 1" in text for text in second.result.remarks)


def test_growing_on_takes_as_few_operators_as_growing_in_one_go(stopped, grown):
    result = runs_from(stopped, Adaptive())
    assert result.parameter_labels == grown.parameter_labels
    assert result.energy == pytest.approx(grown.energy, abs=1e-8)
    assert (result.growth[0].added, result.growth[0].parameters) == (stopped.parameter_labels, stopped.parameters)
    assert result.growth[0].energy == pytest.approx(stopped.energy, abs=1e-8)
    assert len(result.growth) == 1 + grown.parameters - stopped.parameters
    assert "Growth begins with the 4 operators of run 1, chain, STO-3G, Adaptive growth." in result.remarks
    assert inspect(result.spec).parameters == stopped.parameters


def test_an_operator_that_was_taken_twice_is_taken_over_twice(grown):
    label = grown.parameter_labels[0]
    twice = Neighbour(parameters=(0.1, 0.2, 0.3), labels=(label, grown.parameter_labels[1], label))
    result = run(study(Adaptive(max_operators=3), neighbour=twice))
    assert (result.parameter_labels, result.start_parameters) == (twice.labels, twice.parameters)
    assert by_label(twice, [label, label, label]).taken.tolist() == [True, True, False]


def test_growth_can_begin_with_a_fixed_trial_state(doubles):
    result = runs_from(doubles, Adaptive(pool="singles-doubles", at_target=False, max_operators=12))
    assert result.parameter_labels[:10] == doubles.parameter_labels
    assert result.growth[0].energy == pytest.approx(doubles.energy, abs=1e-8)


@pytest.mark.parametrize(
    ("more", "field", "words"),
    [
        ({"ansatz": HardwareEfficient()}, "neighbour", "no parameter is the same"),
        ({"ansatz": Adaptive()}, "ansatz.pool", "The pool `spin-adapted` has no operator `0a 1a -> 2a 3a`"),
        ({"ansatz": UCCSD(), "continuation": 5}, "continuation", "Continuation cannot start from run 1"),
        ({"ansatz": HardwareEfficient(), "ladder": DepthLadder(on=True)}, "neighbour", "The search cannot start from run 1"),
    ],
)
def test_what_does_not_fit_is_refused_before_the_search(doubles, more, field, words):
    spec = StudySpec(system=FOUR, neighbour=start(doubles), **more)
    for ask in (run, inspect):
        with pytest.raises(StudyError, match=words) as error:
            ask(spec)
        assert error.value.field == field


def test_a_run_without_parameters_is_no_start(doubles):
    with pytest.raises(StudyError, match="Run 4 has no parameters"):
        doubles.model_copy(update={"final_parameters": ()}).as_start("run 4")


def test_numbers_and_labels_must_be_as_many():
    with pytest.raises(StudyError, match="2 parameters and 1 labels"):
        spec_from_data({"system": FOUR.model_dump(), "neighbour": {"parameters": [0.1, 0.2], "labels": ["a"]}})


def test_settings_without_a_start_load_as_before():
    data = study().model_dump()
    del data["neighbour"]
    assert spec_from_data(data) == study()


def test_the_session_holds_the_start_so_that_the_run_repeats_anywhere(doubles, tmp_path):
    result = runs_from(doubles)
    save_session(Session(setup=result.spec).with_result(result), tmp_path / "s.thalweg.json")
    read = load_session(tmp_path / "s.thalweg.json")
    assert read.setup == result.spec
    assert read.runs[0].result.spec.neighbour == start(doubles)
    assert repeat(read.runs[0].result).deviation == 0.0


def line(result: StudyResult, other: StudyResult) -> Landscape:
    towards = Direction(kind="point", point=other.final_parameters, labels=other.parameter_labels)
    return Landscape(study=result.spec, centre=result.final_parameters, labels=result.parameter_labels, directions=(towards,), points=5)


def test_the_line_between_two_grown_trial_states_passes_through_both_energies(stopped, grown):
    found = diagnose(line(grown, stopped))
    assert found.steps[0][1] == 0.0
    assert found.steps[0][3] == 1.0
    assert found.energies[1][0] == pytest.approx(grown.energy, abs=1e-9)
    assert found.energies[3][0] == pytest.approx(stopped.energy, abs=1e-9)


def test_the_line_to_a_part_of_a_fixed_trial_state_ends_at_its_energy(doubles, singles_too):
    found = diagnose(line(singles_too, doubles))
    assert found.energies[3][0] == pytest.approx(doubles.energy, abs=1e-9)


def test_a_point_whose_state_the_centre_does_not_hold_is_refused(stopped, grown, doubles, singles_too):
    with pytest.raises(StudyError, match="which the trial state at the centre lacks"):
        diagnose(line(stopped, grown))
    turned = stopped.model_copy(update={"parameter_labels": stopped.parameter_labels[::-1]})
    with pytest.raises(StudyError, match="another order"):
        diagnose(line(grown, turned))
    shallow, deep = (run(study(HardwareEfficient(depth=depth), stop={"gradient": 1e-2})) for depth in (1, 2))
    with pytest.raises(StudyError, match="gates between its parameters"):
        diagnose(line(deep, shallow))


def test_a_landscape_needs_a_grown_trial_state(grown):
    with pytest.raises(StudyError, match="Take the point of a run that has grown"):
        diagnose(Landscape(study=grown.spec))
    begins = diagnose(Landscape(study=grown.spec.model_copy(update={"neighbour": start(grown)}), points=3))
    assert begins.centre == grown.final_parameters


def test_the_curvature_at_the_end_of_growth_is_that_of_what_has_grown(grown):
    found = curvature_of(grown)
    assert len(found.eigenvalues) == grown.parameters
    assert found.kind == "minimum"
    assert found.leading_parameter in grown.parameter_labels


def test_the_end_of_a_ladder_is_looked_at_with_its_own_depth():
    result = run(study(KUpCCGSD(k=4), ladder=DepthLadder(on=True)))
    assert len(result.growth) < 4
    assert curvature_of(result).eigenvalues
    found = diagnose(Landscape(study=result.spec, centre=result.final_parameters, labels=result.parameter_labels, points=3))
    assert found.centre_energy == pytest.approx(result.energy, abs=1e-9)
