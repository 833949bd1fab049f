"""Puts the result together: facts of the best state, classical figures, verdict, settings and versions."""

from __future__ import annotations

import platform
from functools import cache
from importlib import metadata
from typing import Any

import numpy as np

from thalweg import __version__
from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import plain
from thalweg.circuit.program import GateProgram
from thalweg.evaluate import Exact
from thalweg.exact.answer import ExactAnswer
from thalweg.simulate.engine import StateFacts
from thalweg.study.figures import heaviest_terms, program_gates, warnings_of
from thalweg.study.lattice_facts import best_string, exact_s_z, facts_with_energies
from thalweg.study.outcome import Outcome, SearchEnd
from thalweg.study.problem import Problem, make_engine, target_error
from thalweg.study.result import LeadingWeight, SiteFigures, StudyResult
from thalweg.study.site_figures import has_site_figures, site_figures
from thalweg.study.verdict import Evidence, judge
from thalweg.units import constants_record

#: A ground space with less weight than this in the tapered sector cannot be reached from the reference.
LOST_WEIGHT = 1e-6


def assemble(exact: ExactAnswer | None, exact_sites: SiteFigures | None, outcome: Outcome, begins: tuple[str, ...] = ()) -> StudyResult:
    """The result of a finished or stopped search; `begins` says where it began, in words."""
    best, end = outcome.starts[outcome.best], outcome.ends[outcome.best]
    problem, parameters = end.problem, end.parameters
    engine = make_engine(problem)
    energy, gradient = engine.energy_and_gradient(parameters)
    norm = float(np.abs(gradient).max(initial=0.0))
    vectors, remarks = exact_vectors(problem, exact)
    facts = engine.facts(parameters, vectors)
    classical, classical_remarks = _classical(problem)
    two_qubit = program_gates(problem).two_qubit
    evidence = _evidence(exact, end, energy, norm, facts, two_qubit)
    verdict = judge(evidence)
    remarks += begins + classical_remarks + warnings_of(problem) + (exact.remarks if exact else ()) + _start_remarks(outcome) + _pool_remark(problem)
    prepared, encoded, program = problem.prepared, problem.encoded, problem.program
    sector = prepared.fermions.sector if prepared.fermions is not None else None
    return StudyResult(
        label=prepared.label,
        energy_unit=prepared.energy_unit,
        energy=energy,
        exact_energy=None if exact is None else exact.energy,
        reference_name=prepared.reference_name,
        reference_energy=prepared.reference_energy,
        error=evidence.error,
        target_error=evidence.target,
        reached_target=verdict.reached,
        verdict=verdict.sentence,
        verdict_kind=verdict.kind,
        remarks=remarks,
        classical=classical,
        qubits=encoded.working.n_qubits,
        qubits_before_tapering=encoded.full.n_qubits,
        terms=len(encoded.working),
        one_norm=encoded.working.one_norm,
        largest_weight=encoded.working.largest_weight,
        parameters=program.n_parameters,
        two_qubit_gates=two_qubit,
        sector_dimension=sector.dimension if sector else None,
        measured_energy=end.energy if problem.spec.evaluation.is_sampled else None,
        standard_error=end.standard_error,
        evaluations=sum(s.evaluations for s in outcome.starts),
        circuits=sum(s.circuits for s in outcome.starts),
        shots=sum(s.shots for s in outcome.starts),
        iterations=sum(s.iterations for s in outcome.starts),
        seconds=sum(s.seconds for s in outcome.starts),
        elapsed=outcome.elapsed,
        preparation_seconds=problem.seconds,
        stop_reason=best.stop_reason,
        gradient_norm=norm,
        starts=tuple(outcome.starts),
        best_start=outcome.best,
        growth=end.growth,
        final_parameters=plain(parameters),
        start_parameters=plain(end.start_parameters),
        parameter_labels=program.labels(),
        operator_order=program.order,
        pauli_terms=heaviest_terms(encoded.working),
        sites=site_figures(problem, np.asarray(engine.state(parameters))[None]) if has_site_figures(problem) else None,
        exact_sites=exact_sites,
        system_facts=facts_with_energies(problem, energy, exact),
        best_string=best_string(problem, engine, parameters),
        seed=problem.spec.seed,
        versions=versions(),
        constants=constants_record(),
        spec=problem.spec,
        **_exact_fields(exact),
        **_state_fields(facts),
    )


def exact_vectors(problem: Problem, exact: ExactAnswer | None) -> tuple[Any, tuple[str, ...]]:
    """The ground space in the engine's representation, and a remark where the working register does not hold it."""
    if exact is None or exact.vectors is None:
        return None, ()
    if not isinstance(problem.program, GateProgram):
        return exact.vectors, ()
    encoded = problem.encoded
    if exact.vectors.shape[0] * 16 << encoded.working.n_qubits > problem.budget_bytes // 2:
        return None, ("The exact ground states do not fit the memory budget on the register, so that the fidelity is not stated.",)
    vectors = encoded.from_sector(exact.vectors) if problem.prepared.fermions is not None else encoded.from_register(exact.vectors)
    lost = 1.0 - float(np.min(np.sum(np.abs(vectors) ** 2, axis=-1)))
    if lost < LOST_WEIGHT:
        return vectors, ()
    remark = (
        "The exact ground state lies in another symmetry sector than the reference, outside the tapered register; switch tapering off to reach it."
    )
    return vectors, (remark,)


def versions() -> dict[str, str]:
    """Program, Python and the libraries that numbers depend on."""
    return dict(_versions())


@cache  # reading package metadata takes milliseconds
def _versions() -> tuple[tuple[str, str], ...]:
    found = [("thalweg", __version__), ("python", platform.python_version())]
    for name in ("numpy", "scipy", "numba", "pyscf", "openfermion"):
        try:
            found.append((name, metadata.version(name)))
        except metadata.PackageNotFoundError:
            found.append((name, "not installed"))
    return tuple(found)


def _evidence(exact: ExactAnswer | None, end: SearchEnd, energy: float, norm: float, facts: StateFacts, two_qubit: int | None) -> Evidence:
    problem, prepared = end.problem, end.problem.prepared
    sector = prepared.fermions.sector if prepared.fermions is not None else None
    exact_energy = None if exact is None else exact.energy
    return Evidence(
        unit=prepared.energy_unit,
        error=None if exact_energy is None else energy - exact_energy,
        target=target_error(problem, exact),
        reference_error=None if exact_energy is None else prepared.reference_energy - exact_energy,
        stop_reason=end.reason,
        gradient_norm=norm,
        start_gradient_norm=end.start_gradient_norm,
        lowered=end.start_energy - energy,
        parameters=problem.program.n_parameters,
        two_qubit_gates=two_qubit,
        n_electrons=facts.n_electrons,
        expected_electrons=sector.n_electrons if sector else None,
        s_z=facts.s_z,
        expected_s_z=sector.s_z if sector else exact_s_z(problem, exact),
        s_squared=facts.s_squared,
        exact_s_squared=None if exact is None else exact.s_squared,
        standard_error=end.standard_error,
        measured_error=end.energy - exact_energy if exact_energy is not None and problem.spec.evaluation.is_sampled else None,
    )


def _classical(problem: Problem) -> tuple[dict[str, float | None], tuple[str, ...]]:
    if not problem.spec.classical or problem.prepared.fermions is None:
        return {}, ()
    from thalweg.exact.classical import classical_energies

    return classical_energies(problem.prepared.fermions, problem.spec.classical)


def _start_remarks(outcome: Outcome) -> tuple[str, ...]:
    energies = [s.energy for s in outcome.starts]
    remarks = tuple(f"Start {k + 1} is lost: its process ended, perhaps for want of memory." for k in outcome.lost)
    if len(energies) < 2:
        return remarks
    return (*remarks, f"{len(energies)} starts end between {min(energies):.9f} and {max(energies):.9f}; the lowest counts.")


def _pool_remark(problem: Problem) -> tuple[str, ...]:
    evaluation = problem.spec.evaluation
    if not isinstance(problem.spec.ansatz, Adaptive) or isinstance(evaluation, Exact) or evaluation.counts_gradients:
        return ()
    return ("The slopes of the pool are those of the simulation, as gradients are, and no circuits are counted for them.",)


def _exact_fields(exact: ExactAnswer | None) -> dict[str, Any]:
    if exact is None:
        return {}
    return {"exact_degeneracy": exact.degeneracy, "exact_gap": exact.gap, "exact_s_squared": exact.s_squared, "exact_method": exact.method}


def _state_fields(facts: StateFacts) -> dict[str, Any]:
    return {
        "n_electrons": facts.n_electrons,
        "s_z": facts.s_z,
        "s_squared": facts.s_squared,
        "variance": facts.variance,
        "fidelity": facts.fidelity,
        "leading": tuple(LeadingWeight(**vars(state)) for state in facts.leading),
        "natural_occupations": facts.natural_occupations,
    }
