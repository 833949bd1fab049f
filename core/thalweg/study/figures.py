"""The derived figures of a study, without minimising: what the set-up column and `inspect` show."""

from __future__ import annotations

from typing import Any

from thalweg.ansatz.adaptive import Adaptive
from thalweg.ansatz.alternating_operators import AlternatingOperators
from thalweg.circuit.angles import Angles, angles_of
from thalweg.circuit.compile import excitation_gates
from thalweg.circuit.program import GateProgram, Program
from thalweg.circuit.structure import structure_of
from thalweg.cost.gates import GateCounts, gate_counts
from thalweg.cost.groups import qubit_wise_groups
from thalweg.encoding.encoded import EncodedSystem
from thalweg.errors import StudyError
from thalweg.estimate import SHOTS
from thalweg.evaluate.metric import metric_circuits
from thalweg.evaluate.shift import SHIFT_RULES
from thalweg.operators.pauli import PauliExpansion, pauli_label
from thalweg.study.derived import Rung, StudyFigures
from thalweg.study.neighbour import refuse_unfit_start, start_words
from thalweg.study.problem import GIB, Problem, Recent, make_engine, prepare
from thalweg.study.simulator import measured_register, refuse_unfit
from thalweg.study.spec import StudySpec
from thalweg.watch import SILENT, Watch

#: How many Pauli terms a result lists; the session keeps the settings that give all of them.
MAX_LISTED_TERMS = 200

#: Sorting more strings than this would hold up the figures.
MOST_SORTED_TERMS = 20_000

_gates, _set_counts = Recent(8), Recent(4)


def inspect(spec: StudySpec, watch: Watch = SILENT) -> StudyFigures:
    """Works out every figure that needs no minimisation and no diagonalisation."""
    return figures_of(prepare(spec, watch), watch)


def figures_of(problem: Problem, watch: Watch = SILENT) -> StudyFigures:
    prepared, encoded, program = problem.prepared, problem.encoded, problem.program
    refuse_unfit_start(problem)
    sector = prepared.fermions.sector if prepared.fermions is not None else None
    watch.stage("Counting gates")
    gates = program_gates(problem)
    return StudyFigures(
        label=prepared.label,
        energy_unit=prepared.energy_unit,
        reference_name=prepared.reference_name,
        reference_energy=prepared.reference_energy,
        n_electrons=sector.n_electrons if sector else None,
        n_orbitals=sector.n_orbitals if sector else None,
        sector=str(sector) if sector else "",
        sector_dimension=sector.dimension if sector else None,
        qubits=encoded.working.n_qubits,
        qubits_before_tapering=encoded.full.n_qubits,
        terms=len(encoded.working),
        terms_before_tapering=len(encoded.full),
        one_norm=encoded.working.one_norm,
        largest_weight=encoded.working.largest_weight,
        symmetries=symmetry_texts(encoded),
        parameters=program.n_parameters,
        factors=len(program.parameter),
        two_qubit_gates=gates.two_qubit,
        depth=gates.depth,
        memory_bytes=make_engine(problem, watch).memory_bytes(),
        exact_bytes=exact_bytes(problem),
        operator_order=program.order,
        facts=prepared.facts,
        start=" ".join(start_words(problem)),
        warnings=warnings_of(problem) + _exact_warnings(problem) + _refusal(problem),
        ladder=tuple(Rung(**vars(row)) for row in prepared.ladder),
        pauli_terms=heaviest_terms(encoded.working),
        **_measurement_figures(problem, watch),
    )


def _measurement_figures(problem: Problem, watch: Watch) -> dict[str, int | None]:
    """Measurement sets, and what one iteration and one choice of growth take: energies times sets."""
    expansion, spec = measured_register(problem).working, problem.spec
    pool = _whole_pool(problem, watch) if isinstance(spec.ansatz, Adaptive) else None
    operators: dict[str, int | None] = {} if pool is None else {"pool_operators": pool.n_parameters - problem.program.n_parameters}
    if len(expansion) > MOST_SORTED_TERMS:
        return operators
    watch.stage("Sorting the Pauli strings into measurement sets")
    key = (id(expansion),)
    sets: int = _set_counts.get(key, lambda: (expansion, len(qubit_wise_groups(expansion, largest_first=True, watch=watch))))[1]
    angles, structure = angles_of(problem.program), structure_of(problem.program, expansion.one_norm)
    part = spec.optimizer.metric_a_step()
    overlaps = 0 if part is None else metric_circuits(angles, part, structure.layer)
    energies = spec.optimizer.energies_a_step(structure, _energies_of(angles))
    shots = None if SHOTS in spec.optimizer.needs else getattr(spec.evaluation, "shots", None)
    found: dict[str, int | None] = {"measurement_sets": sets}
    if problem.program.n_parameters:  # otherwise there is nothing to iterate
        found |= {"circuits_a_step": sets * energies + overlaps, "shots_a_step": None if shots is None else shots * (energies + overlaps)}
    if pool is not None:
        found["pool_circuits"] = sets * (_energies_of(angles_of(pool)) - _energies_of(angles))
    return found | operators


def _energies_of(angles: Angles) -> int:
    """Energies of a gradient by shift rules."""
    return sum(SHIFT_RULES[highest].evaluations for highest in angles.highest.tolist())


def _whole_pool(problem: Problem, watch: Watch) -> Program:
    """The trial state with every operator of its pool appended."""
    watch.stage("Making the pool of operators")
    ansatz: Any = problem.spec.ansatz
    pool = ansatz.operators(problem.ground)
    whole: Program = pool.grown(problem.program, list(range(len(pool))))
    return whole


def exact_bytes(problem: Problem) -> int:
    """What the exact answer would take, estimated, bytes."""
    from thalweg.exact.memory import determinant_bytes, spin_bytes

    prepared = problem.prepared
    if prepared.fermions is not None:
        return determinant_bytes(prepared.fermions)
    assert prepared.spins is not None
    return spin_bytes(prepared.spins, problem.budget_bytes)


def _exact_warnings(problem: Problem) -> tuple[str, ...]:
    """A sentence where the run would be refused for its exact energy. Symmetries of a lattice may make it smaller: there the run decides."""
    needed, budget = exact_bytes(problem), problem.budget_bytes
    if not problem.spec.exact or problem.prepared.fermions is None or needed <= budget:
        return ()
    return (f"The exact energy needs about {needed / GIB:.3g} GiB and {budget / GIB:.3g} GiB are allowed: switch it off or raise the memory budget",)


def _refusal(problem: Problem) -> tuple[str, ...]:
    """The sentence by which the run would be refused, where parts of the settings do not go together."""
    try:
        refuse_unfit(problem)
    except StudyError as error:
        return (f"The study cannot run like this: {error}",)
    return ()


def program_gates(problem: Problem) -> GateCounts:
    """Gates of the trial state on the working register."""
    program, encoded = problem.program, problem.encoded
    if isinstance(program, GateProgram):
        return gate_counts(program)
    # Counts depend on the structure alone, which the points of a scan share.
    key = (program.excitations, program.begins, program.parameter.tobytes(), program.factor.tobytes(), encoded.linear, encoded.tapering)
    counts: GateCounts = _gates.get(key, lambda: gate_counts(excitation_gates(program, encoded)))
    return counts


def warnings_of(problem: Problem) -> tuple[str, ...]:
    note = problem.encoded.degenerate_note
    return problem.prepared.warnings + ((note,) if note else ()) + problem.encoded.remarks + _reference_warnings(problem) + _left_out(problem.spec)


def _left_out(spec: StudySpec) -> tuple[str, ...]:
    """A sentence for each way through a search that is asked for and not taken, as another goes before it."""
    grows = isinstance(spec.ansatz, Adaptive)
    found: tuple[str, ...] = (
        ("There is no depth ladder: a trial state that grows operator by operator has no layers",) if grows and spec.ladder.on else ()
    )
    if spec.continuation > 1 and (grows or spec.ladder.on):
        found += (f"There is no continuation: it is for a fixed trial state, and {'this one grows' if grows else 'the depth ladder changes it'}",)
    return found


def _reference_warnings(problem: Problem) -> tuple[str, ...]:
    """A sentence where the circuit begins with another state than the reference that was typed."""
    spec, name = problem.spec, problem.prepared.reference_name
    begins = spec.ansatz.begins_elsewhere(problem.ground) if spec.reference and isinstance(spec.ansatz, AlternatingOperators) else ""
    if not begins:
        return ()
    return (f"The circuit begins from {begins}, not from {name}: set the initial state of the trial state to `reference` to begin there",)


def symmetry_texts(encoded: EncodedSystem) -> tuple[str, ...]:
    """`Z0 Z2 = +1 (qubit 0 removed)` for each Z2 symmetry used."""
    return tuple(f"{s.label} = {s.value:+d} (qubit {s.removed} removed)" for s in encoded.symmetries)


def heaviest_terms(expansion: PauliExpansion, count: int = MAX_LISTED_TERMS) -> tuple[tuple[str, float], ...]:
    """The terms of largest |coefficient|, identity included, descending."""
    order = abs(expansion.coefficients).argsort(kind="stable")[::-1][:count]
    return tuple((pauli_label(int(expansion.x[i]), int(expansion.z[i])), float(expansion.coefficients[i])) for i in order)
