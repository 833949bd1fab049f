"""A last measurement where energies are sampled and the answer was chosen among several: the lowest of them is low by luck."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from thalweg.study.outcome import Outcome
from thalweg.study.problem import make_engine
from thalweg.study.simulator import search_source

#: Third word of the seed of this measurement, so that it is independent of those that the choice was made by.
AFRESH = 2


def measured_afresh(outcome: Outcome) -> Outcome:
    """With the energy of the chosen start measured once more, and counted, where starts or steps of growth were compared.

    The record keeps the energy that the choice was made by, so that the spread of the starts is that of like measurements.
    """
    best = outcome.best
    record, end = outcome.starts[best], outcome.ends[best]
    if not end.problem.spec.evaluation.is_sampled or (len(outcome.starts) == 1 and not end.growth):
        return outcome
    source = search_source(end.problem, make_engine(end.problem), np.random.default_rng([record.seed, 1, AFRESH]))
    estimate = source.energy(end.parameters)
    cost = estimate.cost
    counted = record.model_copy(
        update={
            "evaluations": record.evaluations + cost.evaluations,
            "circuits": record.circuits + cost.circuits,
            "shots": record.shots + cost.shots,
        }
    )
    starts, ends = list(outcome.starts), list(outcome.ends)
    starts[best], ends[best] = counted, replace(end, energy=estimate.energy, standard_error=estimate.standard_error)
    return replace(outcome, starts=starts, ends=ends)
