"""The row that remains of a run whose process was ended before it could hand over its best point."""

from __future__ import annotations

import platform

import thalweg
from thalweg.study.derived import StudyFigures
from thalweg.study.result import STOP_REASONS, StartRecord, StudyResult, Trace
from thalweg.study.verdict import amount
from thalweg.units import constants_record
from thalweg_app.presenters.live import LiveRun, LiveStart


def partial_result(live: LiveRun, figures: StudyFigures | None, reason: str) -> StudyResult | None:
    """A result from the iterates alone; None when there is no iterate or the figures are not known. It never counts as reached."""
    best, started = live.best, live.started
    if best is None or started is None or figures is None:
        return None
    begun = [k for k, start in enumerate(live.starts) if start.energy]
    starts = tuple(_record(live.starts[k], live.spec.seed + k, reason) for k in begun)
    best_start = begun.index(best[0])
    energy = starts[best_start].energy
    error = None if started.exact_energy is None else energy - started.exact_energy
    return StudyResult(
        label=started.label,
        energy_unit=started.energy_unit,
        energy=energy,
        exact_energy=started.exact_energy,
        reference_name=started.reference_name,
        reference_energy=started.reference_energy,
        error=error,
        target_error=started.target_error,
        reached_target=False,
        verdict=_sentence(error, started.energy_unit, reason),
        verdict_kind="not-converged",
        remarks=("Parameters and properties of the best state were not handed over.", *live.warnings),
        qubits=figures.qubits,
        qubits_before_tapering=figures.qubits_before_tapering,
        terms=figures.terms,
        one_norm=figures.one_norm,
        largest_weight=figures.largest_weight,
        parameters=figures.parameters,
        two_qubit_gates=figures.two_qubit_gates,
        sector_dimension=figures.sector_dimension,
        evaluations=sum(s.evaluations for s in starts),
        iterations=sum(s.iterations for s in starts),
        seconds=sum(s.seconds for s in starts),
        preparation_seconds=0.0,
        stop_reason=reason,
        gradient_norm=starts[best_start].gradient_norm,
        starts=starts,
        best_start=best_start,
        operator_order=figures.operator_order,
        pauli_terms=figures.pauli_terms,
        system_facts=figures.facts,
        seed=live.spec.seed,
        versions={"thalweg": thalweg.__version__, "python": platform.python_version()},
        constants=constants_record(),
        spec=live.spec,
    )


def _record(start: LiveStart, seed: int, reason: str) -> StartRecord:
    lowest = min(range(len(start.energy)), key=start.energy.__getitem__)
    trace = Trace(
        iteration=tuple(start.iteration),
        evaluations=tuple(start.evaluations),
        energy=tuple(start.energy),
        gradient_norm=tuple(start.gradient_norm),
        seconds=tuple(start.seconds),
        circuits=tuple(start.circuits),
        shots=tuple(start.shots),
        standard_error=tuple(start.standard_error),
        noiseless=tuple(start.noiseless),
    )
    return StartRecord(
        seed=seed,
        energy=start.energy[lowest],
        stop_reason=start.reason or reason,
        evaluations=start.evaluations[-1],
        iterations=start.iteration[-1],
        gradient_norm=start.gradient_norm[lowest],
        seconds=start.seconds[-1],
        trace=trace,
        circuits=start.circuits[-1],
        shots=start.shots[-1],
        standard_error=start.standard_error[lowest],
    )


def _sentence(error: float | None, unit: str, reason: str) -> str:
    where = "" if error is None else f" {amount(error, unit)} above exact at the best iterate;"
    return f"Not examined:{where} {STOP_REASONS[reason]}"
