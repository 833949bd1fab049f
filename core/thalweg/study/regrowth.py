"""The program of a trial state that has grown, from the labels of its operators."""

from __future__ import annotations

from typing import Any

from thalweg.ansatz.adaptive import Adaptive
from thalweg.ansatz.ground import Ground
from thalweg.circuit.program import Program
from thalweg.errors import StudyError


def regrown(ansatz: Adaptive, ground: Ground, program: Program, labels: tuple[str, ...]) -> Program:
    """`program` with the operators of these labels appended, in this order, each with a parameter of its own.

    StudyError where the pool of the settings does not have them all.
    """
    pool: Any = ansatz.operators(ground)
    places = {label: i for i, label in enumerate(pool.labels)}
    missing = [label for label in labels if label not in places]
    if missing:
        raise StudyError(
            f"The pool `{ansatz.pool_for(ground)}` has no operator `{missing[0]}`",
            f"{len(missing)} of the {len(labels)} operators that the trial state begins with {'is' if len(missing) == 1 else 'are'} not in it",
            "Choose the pool that they were taken from, with the same setting of the point group, or begin without them",
            "ansatz.pool",
        )
    grown: Program = pool.grown(program, [places[label] for label in labels])
    return grown
