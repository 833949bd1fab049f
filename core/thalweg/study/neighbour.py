"""The start at another run's parameters: each is taken over where the trial state has a parameter of the same label.

Labels name operators and layers, not qubits of an encoding or atoms of a geometry, so that a start serves the next geometry,
another encoding, and trial states that share operators.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
from thalweg.errors import StudyError
from thalweg.study.problem import Problem, prepare, trial_state
from thalweg.study.spec import Neighbour, StudySpec
from thalweg.watch import SILENT, Watch

#: What the parameters begin at that the other run lacks.
OWN_STARTS = {
    "zero": "at zero",
    "mp2": "at first-order amplitudes",
    "ramp": "on the ramp of the trial state",
    "small-random": "at small random angles",
    "uniform-random": "at random angles",
}
LAYER = " in layer "
#: How many terms, bonds or sites a part of a Hamiltonian has: its angle keeps its meaning on a larger lattice (Brandao et al. 2018).
COUNTS = re.compile(r"^\d+ (?=.*\bterms?$)|(?<= on )\d+ (?=(?:bond|site|set)s?\b)|(?<=term)s$|(?<=bond)s$|(?<=site)s$")


def as_found(spec: StudySpec, parameters: tuple[float, ...], labels: tuple[str, ...], watch: Watch = SILENT) -> StudySpec:
    """The study with the trial state that has these parameters: what has grown, or as many layers as a depth ladder came to."""
    if not parameters or not (isinstance(spec.ansatz, Adaptive) or spec.ladder.on):
        return spec
    found = spec.model_copy(update={"neighbour": Neighbour(parameters=parameters, labels=labels)})
    if isinstance(spec.ansatz, Adaptive):
        return found
    ansatz, _ = first_trial_state(prepare(found, watch))
    return spec.model_copy(update={"ansatz": ansatz, "ladder": spec.ladder.model_copy(update={"on": False})})


@dataclass(frozen=True)
class Beginning:
    """First parameters of one trial state.

    Attributes:
        parameters: shape (K,); zero where the other run has none.
        taken: which are that run's, shape (K,).
        left_over: parameters of that run that have no place.
        new_layers: layers that continue those of that run, which ended with fewer.
    """

    parameters: FloatArray
    taken: np.ndarray
    left_over: int = 0
    new_layers: int = 0


def first_trial_state(problem: Problem) -> tuple[Any, Program]:
    """The trial state that a search begins with, which is a shallower one on a depth ladder, and its program."""
    spec = problem.spec
    name = getattr(type(spec.ansatz), "depth_field", "")
    if not spec.ladder.on or not name:
        return spec.ansatz, problem.program
    ansatz = spec.ansatz.model_copy(update={name: first_depth(problem)})
    return ansatz, trial_state(spec, ansatz, problem.ground)


def first_depth(problem: Problem) -> int:
    """The rung of a depth ladder on which the other run ended, so that it is climbed on from there; otherwise the lowest."""
    return max(1, _depth_of(problem, problem.spec.ansatz)) if problem.spec.neighbour.is_given else 1


def begun_at(problem: Problem, ansatz: Any, program: Program, own: FloatArray) -> FloatArray:
    """`own`, the start of the trial state, shape (K,), with what the study takes over from another run in its place."""
    if not problem.spec.neighbour.is_given:
        return own
    beginning = _beginning(problem, ansatz, program)
    return np.where(beginning.taken, beginning.parameters, own)


def by_label(neighbour: Neighbour, labels: Iterable[str]) -> Beginning:
    """Parameters for these labels. One that is shared by several operators takes the mean of theirs; one of them alone takes the shared one."""
    given: dict[tuple[str, int], float] = {}
    owner: dict[tuple[str, int], int] = {}
    for k, (parts, value) in enumerate(zip(_named(neighbour.labels), neighbour.parameters, strict=True)):
        given |= dict.fromkeys(parts, value)
        owner |= dict.fromkeys(parts, k)
    wanted = [[part for part in parts if part in given] for parts in _named(labels)]
    values = np.array([np.mean([given[part] for part in parts]) if parts else 0.0 for parts in wanted])
    used = {owner[part] for parts in wanted for part in parts}
    return Beginning(values, np.array([bool(parts) for parts in wanted], bool), len(neighbour.labels) - len(used))


def refuse_unfit_start(problem: Problem) -> None:
    """StudyError where the study is to start from another run and cannot."""
    spec = problem.spec
    if not spec.neighbour.is_given:
        return
    source = spec.neighbour.source or "another run"
    if spec.continuation > 1:
        raise StudyError(
            f"Continuation cannot start from {source}",
            "it comes to its parameters from an easier Hamiltonian, in which those of another run have no meaning",
            "Set the continuation steps to 0, or start without that run",
            "continuation",
        )
    ansatz, program = first_trial_state(problem)
    if _beginning(problem, ansatz, program).taken.any():
        return
    here = f"here such as `{program.labels()[0]}`" if program.n_parameters else "here none"
    raise StudyError(
        f"The search cannot start from {source}",
        f"no parameter is the same, there such as `{spec.neighbour.labels[0]}`, {here}",
        "Choose a trial state that shares operators with that run, or start without it",
        "neighbour",
    )


def start_words(problem: Problem) -> tuple[str, ...]:
    """One sentence on what is taken over from another run; none where nothing is asked for."""
    spec = problem.spec
    if not spec.neighbour.is_given:
        return ()
    source = spec.neighbour.source or "another run"
    ansatz, program = first_trial_state(problem)
    if isinstance(ansatz, Adaptive):
        operators = "operator" if program.n_parameters == 1 else f"{program.n_parameters} operators"
        return (f"Growth begins with the {operators} of {source}.",)
    found = _beginning(problem, ansatz, program)
    layers = "1 layer" if found.new_layers == 1 else f"{found.new_layers} layers"
    more = f", in a circuit with {layers} more" if found.new_layers else ""
    count, every = int(np.count_nonzero(found.taken)), program.n_parameters
    rest = "" if count == every else f", the others {OWN_STARTS.get(ansatz.start, ansatz.start)}"
    left = f"; {found.left_over} of that run {'has' if found.left_over == 1 else 'have'} no place here" if found.left_over else ""
    return (f"{count} of {every} parameters begin at those of {source}{more}{rest}{left}.",)


def _beginning(problem: Problem, ansatz: Any, program: Program) -> Beginning:
    neighbour = problem.spec.neighbour
    depth = _depth_of(problem, ansatz)
    more = getattr(ansatz, ansatz.depth_field) - depth if depth else 0
    if more:  # new layers need not be the last ones: the trial state knows how it is continued
        deeper = [ansatz.from_shallower(row, program.n_parameters) for row in (np.array(neighbour.parameters), np.ones(len(neighbour.labels)))]
        return Beginning(deeper[0], deeper[1] != 0.0, new_layers=more)
    return by_label(neighbour, program.labels())


def _depth_of(problem: Problem, ansatz: Any) -> int:
    """The number of layers, up to those of `ansatz`, with which its parameters are those of the other run; 0 where there is none."""
    name = getattr(type(ansatz), "depth_field", "")
    wanted = _named(problem.spec.neighbour.labels)
    for depth in range(1, getattr(ansatz, name) + 1 if name else 1):
        program = trial_state(problem.spec, ansatz.model_copy(update={name: depth}), problem.ground)
        if program.n_parameters >= len(wanted):
            return depth if _named(program.labels()) == wanted else 0
    return 0


def _named(labels: Iterable[str]) -> list[list[tuple[str, int]]]:
    """The operators of each label, each with the number of times that it has occurred before.

    `a; b in layer 2` are two operators that share a parameter; what names no layer is in the first. Parts of a Hamiltonian are told
    apart by their kind and order in the layer, not by their size.
    """
    seen: Counter[str] = Counter()
    named = []
    for label in labels:
        text, mark, layer = label.rpartition(LAYER)
        operators = (text if mark else label).split("; ")
        parts = [f"{COUNTS.sub('', operator)}{LAYER}{layer if mark else 1}" for operator in operators]
        named.append([(part, seen[part]) for part in parts])
        seen.update(parts)
    return named
