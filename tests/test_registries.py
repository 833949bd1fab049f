"""Contracts that every alternative of every registry keeps, so that adding one is one file and one line."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest
from support.sources import PlainSource

from thalweg.errors import Stopped, StudyError
from thalweg.estimate import AXES, HARMONICS, SHOTS
from thalweg.optimize import OPTIMIZERS
from thalweg.optimize.objective import CountedObjective, StopRules
from thalweg.optimize.settings import refuse_unless_offered
from thalweg.study.result import STOP_REASONS
from thalweg.study.spec import SECTIONS, DepthLadder, StudySpec, Target, spec_from_data, with_setting
from thalweg.systems import Molecule

ALTERNATIVES = [pytest.param(section, cls, id=f"{section}-{cls.model_fields['key'].default}") for section, found in SECTIONS.items() for cls in found]
SETTINGS = [
    *ALTERNATIVES,
    pytest.param("stop", StopRules, id="stop"),
    pytest.param("target", Target, id="target"),
    pytest.param("ladder", DepthLadder, id="ladder"),
    pytest.param("study", StudySpec, id="study"),
]
#: Fields that are sections of their own, described by their own alternatives.
SECTION_FIELDS = {*SECTIONS, "stop", "target", "ladder"}


def base_spec() -> StudySpec:
    return StudySpec(system=Molecule(name="pair", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7))))


@pytest.mark.parametrize("section", SECTIONS)
def test_keys_are_unique_lower_case_words_joined_by_hyphens(section):
    keys = [cls.model_fields["key"].default for cls in SECTIONS[section]]
    assert SECTIONS[section].keys() == keys
    assert len(set(keys)) == len(keys)
    for key in keys:
        assert key == key.lower().strip()
        assert set(key) <= set("abcdefghijklmnopqrstuvwxyz0123456789-")


def test_the_keys_that_the_terminal_promises_are_there():
    assert {"jordan-wigner", "parity", "bravyi-kitaev"} <= set(SECTIONS["encoding"].keys())
    assert {"uccsd", "uccd", "uccgsd", "puccd", "k-upccgsd", "adaptive", "number-conserving", "hardware-efficient"} <= set(SECTIONS["ansatz"].keys())
    promised = {"l-bfgs-b", "slsqp", "cobyla", "nelder-mead", "gradient-descent", "momentum", "adam"}
    assert promised <= set(SECTIONS["optimizer"].keys())


@pytest.mark.parametrize("section", SECTIONS)
def test_an_unknown_key_is_refused_with_the_known_ones(section):
    with pytest.raises(StudyError, match=SECTIONS[section].keys()[0]):
        SECTIONS[section].get("no-such-key")


@pytest.mark.parametrize(("section", "cls"), ALTERNATIVES)
def test_an_alternative_says_what_it_is(section, cls):
    assert cls.title
    assert cls.about.endswith(".")


@pytest.mark.parametrize(("section", "cls"), SETTINGS)
def test_every_field_has_a_title_and_a_help_sentence(section, cls):
    for name, field in cls.model_fields.items():
        if name == "key" or (cls is StudySpec and name in SECTION_FIELDS):
            continue
        assert field.title, name
        assert field.description, name
        assert field.description.endswith("."), name
        assert {"unit", "advanced"} <= set(field.json_schema_extra), name


@pytest.mark.parametrize(("section", "cls"), ALTERNATIVES)
def test_an_alternative_is_frozen_hashable_and_refuses_unknown_fields(section, cls):
    one, other = cls(), cls()
    assert one == other
    assert hash(one) == hash(other)
    with pytest.raises(ValueError, match="frozen"):
        one.key = "other"
    with pytest.raises(ValueError, match="Extra inputs"):
        cls(no_such_field=1)


@pytest.mark.parametrize(("section", "cls"), ALTERNATIVES)
def test_an_alternative_passes_through_json_inside_a_study(section, cls):
    spec = base_spec().model_copy(update={section: cls()})
    back = spec_from_data(json.loads(spec.model_dump_json()))
    assert back == spec
    assert hash(back) == hash(spec)
    assert type(getattr(back, section)) is cls


@pytest.mark.parametrize(("section", "cls"), [p for p in ALTERNATIVES if p.values[0] != "system"])
def test_an_alternative_is_chosen_by_its_key_alone(section, cls):
    assert getattr(with_setting(base_spec(), section, cls.model_fields["key"].default), section) == cls()


# --- optimisers: every one on every problem ---------------------------------------------------------------------------


def quadratic(x: np.ndarray) -> tuple[float, np.ndarray]:
    scale = np.arange(1.0, x.size + 1.0)
    shifted = x - 0.3
    return float(0.5 * (scale * shifted**2).sum()), scale * shifted


def curved_valley(x: np.ndarray) -> tuple[float, np.ndarray]:
    """Rosenbrock's form (1960) with the factor 100 softened to 4, so that plain descent gets through it too."""
    gap, rest = x[1] - x[0] ** 2, 1.0 - x[0]
    return float(4.0 * gap**2 + rest**2), np.array([-16.0 * x[0] * gap - 2.0 * rest, 8.0 * gap])


def periodic(x: np.ndarray) -> tuple[float, np.ndarray]:
    """As energies of rotations are: sines and cosines, with a coupling."""
    phase = x - 0.4
    value = -np.cos(phase).sum() + 0.2 * np.sin(phase[0]) * np.sin(phase[-1])
    gradient = np.sin(phase)
    gradient[0] += 0.2 * np.cos(phase[0]) * np.sin(phase[-1])
    gradient[-1] += 0.2 * np.sin(phase[0]) * np.cos(phase[-1])
    return float(value), gradient


def one_qubit(x: np.ndarray) -> tuple[float, np.ndarray]:
    """<0|U+ (0.3 X + 0.4 Y + 1.2 Z) U|0> for U = R_z(c) R_y(b) R_z(a), whose lowest value is -1.3."""
    _, b, c = x.tolist()
    bloch = np.array([np.sin(b) * np.cos(c), np.sin(b) * np.sin(c), np.cos(b)])
    by_b = np.array([np.cos(b) * np.cos(c), np.cos(b) * np.sin(c), -np.sin(b)])
    by_c = np.array([-np.sin(b) * np.sin(c), np.sin(b) * np.cos(c), 0.0])
    field = np.array([0.3, 0.4, 1.2])
    return float(field @ bloch), np.array([0.0, field @ by_b, field @ by_c])


#: Function, start, lowest value, and what its source knows: degree in every parameter, bound of second derivatives, gates with free axes.
PROBLEMS = {
    "quadratic": (quadratic, np.zeros(4), 0.0, {"steepness": 4.0}),
    "curved-valley": (curved_valley, np.array([-0.5, 0.5]), 0.0, {"steepness": 60.0}),
    "periodic": (periodic, np.zeros(3), -3.0, {"degree": 1, "steepness": 1.5}),
    "one-qubit": (one_qubit, np.array([0.1, 0.4, -0.3]), -1.3, {"degree": 1, "steepness": 1.5, "triples": ((0, 1, 2),)}),
}
SETTINGS_OF = {
    "gradient-descent": {"max_iterations": 5000, "step": 0.03},
    "momentum": {"max_iterations": 5000, "step": 0.02},
    "nesterov": {"max_iterations": 5000, "step": 0.02},
    "adam": {"max_iterations": 5000},
    "spsa": {"max_iterations": 4000, "perturbation": 0.003, "first_step": 0.1},
    "natural-gradient": {"max_iterations": 5000, "step": 0.03},
    "icans": {"max_iterations": 10_000},
    "gcans": {"max_iterations": 10_000},
    "operator-sampling": {"max_iterations": 10_000},
}
OFFSET = 1.0


class Account:
    """Every call of a problem and every report of its objective."""

    source: PlainSource

    def __init__(self, function, rules: StopRules, stop_after: int = 10**9) -> None:
        self.points: list[np.ndarray] = []
        self.reports = []
        self._function, self._stop_after = function, stop_after
        self.objective: CountedObjective
        self._rules = rules

    def make(self, n: int, **known: Any) -> CountedObjective:
        """What the source knows is `known`; sines of degree one where nothing is said, so that every optimiser runs."""
        self.source = PlainSource(self._call, n, **({"degree": 1, "steepness": 60.0} | known))
        self.objective = CountedObjective(
            self.source,
            offset=OFFSET,
            rules=self._rules,
            target_energy=None,
            report=self.reports.append,
            should_stop=lambda: len(self.points) >= self._stop_after,
        )
        return self.objective

    def _call(self, x: np.ndarray) -> tuple[float, np.ndarray]:
        self.points.append(np.array(x, copy=True))
        return self._function(x)


def minimise(key: str, account: Account, start: np.ndarray, **known: Any) -> str:
    optimiser = OPTIMIZERS.get(key)(**SETTINGS_OF.get(key, {}))
    objective = account.make(start.size, **known)
    before = start.copy()
    try:
        objective.begin(start)
        reason = optimiser.minimise(objective, start, np.random.default_rng(1))
    except Stopped as stop:
        reason = stop.reason
    assert np.array_equal(start, before), "the start belongs to the caller"
    return reason


@pytest.mark.parametrize("problem", PROBLEMS)
@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_every_optimiser_finds_the_minimum_of_every_smooth_problem(key, problem):
    function, start, lowest, known = PROBLEMS[problem]
    account = Account(function, StopRules(gradient=1e-6, evaluations=50_000))
    optimiser, offers = OPTIMIZERS.get(key)(), offers_of(**known)
    if optimiser.needs <= offers:
        reason = minimise(key, account, start, **({"degree": -1} | known))
        assert account.objective.best_energy == pytest.approx(lowest, abs=1e-5)
        assert reason in STOP_REASONS
    else:
        with pytest.raises(StudyError) as error:
            refuse_unless_offered(optimiser, offers, "Exact")
        assert error.value.field == "optimizer"


def offers_of(degree: int = -1, steepness: float = 1.0, triples: tuple = ()) -> frozenset[str]:
    """What the sources of these problems give beside values, gradients and the metric: shots always."""
    return frozenset([SHOTS] + [HARMONICS] * (degree >= 0) + [AXES] * bool(triples))


def test_every_optimiser_has_a_problem_that_offers_what_it_needs():
    best = [offers_of(**known) for _, _, _, known in PROBLEMS.values()]
    assert all(any(cls.needs <= offers for offers in best) for cls in OPTIMIZERS)


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_every_optimiser_is_counted_and_reports_each_iterate_once(key):
    account = Account(quadratic, StopRules(gradient=1e-6, evaluations=50_000))
    minimise(key, account, np.zeros(3))
    objective = account.objective
    assert objective.evaluations >= objective.iterations > 0
    assert [r.iteration for r in account.reports] == list(range(len(account.reports)))
    assert len(account.reports) == objective.iterations + 1
    assert [r.evaluations for r in account.reports] == sorted(r.evaluations for r in account.reports)
    assert objective.evaluations <= len(account.points)
    best = min(quadratic(x)[0] for x in account.points)
    assert objective.best_energy == best
    assert quadratic(objective.best_parameters)[0] == best


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_every_optimiser_lets_a_stop_through_at_once_and_the_best_is_kept(key):
    account = Account(curved_valley, StopRules(gradient=0.0), stop_after=7)
    assert minimise(key, account, np.array([-0.5, 0.5])) == "stopped-by-person"
    assert len(account.points) == 7
    assert account.objective.best_energy == min(curved_valley(x)[0] for x in account.points)


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_every_optimiser_obeys_the_evaluation_limit(key):
    account = Account(curved_valley, StopRules(gradient=0.0, evaluations=9))
    assert minimise(key, account, np.array([-0.5, 0.5])) == "evaluations"
    assert account.objective.evaluations == 9


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_every_optimiser_obeys_its_own_iteration_limit(key):
    optimiser = OPTIMIZERS.get(key)(max_iterations=3)
    account = Account(curved_valley, StopRules(gradient=0.0))
    objective = account.make(2)
    start = np.array([-0.5, 0.5])
    objective.begin(start)
    reason = optimiser.minimise(objective, start, np.random.default_rng(1))
    assert reason in STOP_REASONS
    assert objective.iterations <= 5  # one method needs a simplex before its first iteration


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_an_energy_that_is_not_finite_ends_the_search(key):
    def breaking(x: np.ndarray) -> tuple[float, np.ndarray]:
        value, gradient = quadratic(x)
        return (value, gradient) if np.abs(x).max() < 1e-3 else (float("nan"), gradient)

    assert minimise(key, Account(breaking, StopRules()), np.zeros(2)) == "not-finite"


@pytest.mark.parametrize("key", OPTIMIZERS.keys())
def test_the_same_seed_gives_the_same_path(key):
    paths = []
    for _ in range(2):
        account = Account(periodic, StopRules(gradient=1e-6, evaluations=200))
        minimise(key, account, np.zeros(3))
        paths.append(np.array(account.points))
    assert np.array_equal(paths[0], paths[1])
