"""From settings to everything prepared: the system, its qubits, the trial state and the engine. Read-only once made."""

from __future__ import annotations

import threading
import time
from collections import OrderedDict
from collections.abc import Callable, Hashable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from thalweg.ansatz.adaptive import Adaptive
from thalweg.ansatz.ground import Ground
from thalweg.circuit.axes import with_free_axes
from thalweg.circuit.program import ExcitationProgram, GateProgram, Program
from thalweg.encoding.encoded import EncodedSystem, encode_fermions, encode_spins
from thalweg.errors import StudyError
from thalweg.estimate import AXES
from thalweg.exact.answer import ExactAnswer
from thalweg.simulate.engine import Engine
from thalweg.study.regrowth import regrown
from thalweg.study.spec import StudySpec
from thalweg.systems.own_reference import with_reference
from thalweg.systems.prepared import MeanFieldSeed, PreparedSystem
from thalweg.watch import SILENT, Watch

GIB = 2**30
#: Far beyond any unit, and small enough that products of energies stay finite.
LARGEST_COEFFICIENT = 1e100


@dataclass(frozen=True)
class Problem:
    """What a minimisation and an inspection stand on.

    Attributes:
        spec: the settings.
        prepared: integrals or bonds, reference energy, facts.
        encoded: the Hamiltonian on qubits, before and after tapering.
        program: the trial state as data.
        seconds: time that the preparation took.
    """

    spec: StudySpec
    prepared: PreparedSystem
    encoded: EncodedSystem
    program: Program
    ground: Ground
    seconds: float

    @property
    def budget_bytes(self) -> int:
        return int(self.spec.memory_gib * GIB)


class Recent:
    """The last few results of a pure function, so that an edit of one section does not repeat the others.

    Where a prepared system is the input its identity is the key; the kept value holds the system, so that the identity stays its own.
    """

    def __init__(self, size: int) -> None:
        self._size = size
        self._kept: OrderedDict[Hashable, Any] = OrderedDict()
        self._lock = threading.Lock()  # tasks may run on an executor of threads

    def get(self, key: Hashable, make: Callable[[], Any]) -> Any:
        with self._lock:
            if key in self._kept:
                self._kept.move_to_end(key)
                return self._kept[key]
        made = make()
        with self._lock:
            self._kept[key] = made
            self._kept.move_to_end(key)
            while len(self._kept) > self._size:
                self._kept.popitem(last=False)
        return made

    def clear(self) -> None:
        with self._lock:
            self._kept.clear()


_systems, _references, _encodings, _answers = Recent(4), Recent(4), Recent(4), Recent(4)
_products, _engines = Recent(2), Recent(1)


def forget_everything() -> None:
    """Lets go of all that is kept for the next study, such as before a process is forked."""
    for recent in (_systems, _references, _encodings, _answers, _products, _engines):
        recent.clear()


def prepare(spec: StudySpec, watch: Watch = SILENT, neighbour: MeanFieldSeed | None = None) -> Problem:
    """Works out system, encoding and trial state. `neighbour` seeds the mean field of a scan point.

    Raises StudyError for what a person can mend, Stopped when asked to stop.
    """
    begun = time.perf_counter()
    prepared = prepare_system(spec, watch, neighbour)
    if spec.reference:
        prepared = _references.get((id(prepared), spec.reference), lambda: (prepared, with_reference(prepared, spec.reference)))[1]
    watch.stage("Encoding")
    encoded = _encodings.get((id(prepared), spec.encoding), lambda: (prepared, _encode(spec, prepared, watch)))[1]
    _refuse_overflow(encoded)
    watch.stage("Building the trial state")
    kind, pairs, terms = prepared.reference_kind, prepared.reference_pairs, prepared.reference_terms
    ground = Ground(prepared.fermions, encoded.working, encoded.reference_bits, encoded, kind, pairs, terms)
    program = trial_state(spec, spec.ansatz, ground)
    if isinstance(spec.ansatz, Adaptive) and spec.neighbour.is_given:
        program = regrown(spec.ansatz, ground, program, spec.neighbour.labels)
    return Problem(spec, prepared, encoded, program, ground, time.perf_counter() - begun)


def trial_state(spec: StudySpec, ansatz: Any, ground: Ground) -> Program:
    """The program of `ansatz` as the optimiser of the study takes it. StudyError where it does not fit the system."""
    program: Program = ansatz.build(ground)
    if AXES in spec.optimizer.needs and isinstance(program, GateProgram):
        return with_free_axes(program)
    return program


def with_system(problem: Problem, prepared: PreparedSystem) -> Problem:
    """The study of another Hamiltonian on the same orbitals or sites: trial state, register and its symmetries stay."""
    encoded = problem.encoded
    full = prepared.spins
    if prepared.fermions is not None:
        from thalweg.encoding.linear import map_hamiltonian

        assert encoded.linear is not None
        full = map_hamiltonian(prepared.fermions, encoded.linear, problem.spec.encoding.cut)
    assert full is not None
    working = encoded.tapering.expansion(full)
    assert working is not None
    encoded = replace(encoded, full=full, working=working)
    return replace(problem, prepared=prepared, encoded=encoded, ground=replace(problem.ground, fermions=prepared.fermions, qubits=working))


def prepare_system(spec: StudySpec, watch: Watch = SILENT, neighbour: MeanFieldSeed | None = None) -> PreparedSystem:
    """The system alone, from the recent ones where it is among them."""
    budget = int(spec.memory_gib * GIB)
    if neighbour is not None:  # the mean field depends on the neighbour, so the settings alone are no key
        seeded: PreparedSystem = spec.system.prepare(watch, budget_bytes=budget, neighbour=neighbour)
        return seeded
    key = (spec.system, budget)
    prepared: PreparedSystem = _systems.get(key, lambda: spec.system.prepare(watch, budget_bytes=budget))
    return prepared


def _encode(spec: StudySpec, prepared: PreparedSystem, watch: Watch) -> EncodedSystem:
    if prepared.fermions is not None:
        _refuse_mapping(spec, prepared.fermions.n_orbitals)
        return encode_fermions(prepared.fermions, spec.encoding, watch)
    assert prepared.spins is not None
    return encode_spins(prepared.spins, spec.encoding, prepared.reference_bits)


def _refuse_overflow(encoded: EncodedSystem) -> None:
    """StudyError where the squares of energies could not be worked out, as variances need."""
    largest = float(np.abs(encoded.full.coefficients).max(initial=0.0))
    if not largest <= LARGEST_COEFFICIENT:
        raise StudyError(
            "The Hamiltonian cannot be worked with",
            f"its largest coefficient is {largest:.3g} and the limit is {LARGEST_COEFFICIENT:.3g}",
            "Check its numbers, or write them in a larger unit",
            "system",
        )


def _refuse_mapping(spec: StudySpec, n_orbitals: int) -> None:
    from thalweg.encoding.linear import mapping_bytes

    needed = mapping_bytes(n_orbitals)
    if needed > spec.memory_gib * GIB:
        raise StudyError(
            f"{2 * n_orbitals} spin orbitals cannot be written on qubits",
            f"the Pauli strings may need {needed / GIB:.3g} GiB of memory and {spec.memory_gib:.3g} GiB are allowed",
            "Allow more memory or choose a smaller active space",
            "memory_gib",
        )


def make_engine(problem: Problem, watch: Watch = SILENT) -> Engine:
    """The engine that fits the program, the last one where it is asked for again; StudyError when it would not fit the memory budget."""
    prepared, program = problem.prepared, problem.program
    key = (id(prepared), id(program), problem.spec.encoding, problem.budget_bytes)
    engine: Engine = _engines.get(key, lambda: (prepared, program, _new_engine(problem, watch)))[2]
    engine.watch = watch  # the engine may come from a search that was stopped
    return engine


def _new_engine(problem: Problem, watch: Watch) -> Engine:
    program = problem.program
    if isinstance(program, ExcitationProgram):
        from thalweg.simulate.sector import SectorEngine

        assert problem.prepared.fermions is not None
        return SectorEngine(problem.prepared.fermions, program, sector_product(problem), budget_bytes=problem.budget_bytes)
    return _register_engine(problem, program, watch)


def _register_engine(problem: Problem, program: GateProgram, watch: Watch) -> Engine:
    from thalweg.simulate.register import RegisterEngine

    encoded = problem.encoded
    return RegisterEngine(
        encoded.working,
        program,
        number=encoded.number,
        s_z=encoded.s_z,
        s_squared=encoded.s_squared,
        label=encoded.occupation_label,
        budget_bytes=problem.budget_bytes,
        product=lambda: register_product(problem),
        watch=watch,
    )


def sector_product(problem: Problem) -> Any:
    """H applied to sector states, built once for a system and shared by engine and exact answer."""
    from thalweg.simulate.sector import SectorHamiltonian

    fermions = problem.prepared.fermions
    assert fermions is not None
    return _products.get(id(problem.prepared), lambda: (problem.prepared, SectorHamiltonian(fermions)))[1]


def register_product(problem: Problem) -> Any:
    """H applied to states of the working register."""
    from thalweg.operators.product import ExpansionProduct

    working = problem.encoded.working
    return _products.get((id(problem.prepared), problem.spec.encoding), lambda: (problem.prepared, ExpansionProduct(working)))[1]


def exact_answer(problem: Problem, watch: Watch = SILENT) -> ExactAnswer | None:
    """The exact lowest level in the representation of the sector (fermions) or the register (spins)."""
    if not problem.spec.exact:
        return None
    key = (id(problem.prepared), problem.budget_bytes, problem.spec.exact_spin)
    answer: ExactAnswer = _answers.get(key, lambda: (problem.prepared, _diagonalise(problem, watch)))[1]
    return answer


def target_error(problem: Problem, exact: ExactAnswer | None) -> float:
    """The largest error that counts as reached, in the energy unit of the system."""
    prepared = problem.prepared
    return problem.spec.target.error_in(prepared.energy_unit, prepared.reference_energy if exact is None else exact.energy)


def _diagonalise(problem: Problem, watch: Watch) -> ExactAnswer:
    watch.stage("Exact diagonalisation")
    if problem.prepared.fermions is not None:
        from thalweg.exact.determinant import lowest_level

        return lowest_level(
            problem.prepared.fermions,
            watch=watch,
            budget_bytes=problem.budget_bytes,
            sector_hamiltonian=sector_product(problem),
            fixed_spin=problem.spec.exact_spin == "fixed",
        )
    if problem.spec.exact_spin == "fixed":
        raise StudyError("The spin of the exact state cannot be fixed", "this system has sites instead of electrons", "Set it to `any`", "exact_spin")
    from thalweg.exact.spin_sector import lowest_level_spins

    assert problem.prepared.spins is not None
    return lowest_level_spins(problem.prepared.spins, watch=watch, budget_bytes=problem.budget_bytes, translations=problem.prepared.translations)
