"""Derived figures of a study as records, apart from what computes them: the window reads them and loads no numerics."""

from __future__ import annotations

from typing import Any

from thalweg.study.result import Record


class Rung(Record):
    """One orbital of the ladder."""

    number: int
    energy: float
    occupation: float
    irrep: str
    active: bool
    frozen: bool


class StudyFigures(Record):
    """Figures of a study before it is run. None where a figure has no meaning for the system."""

    label: str
    energy_unit: str
    reference_name: str
    reference_energy: float
    n_electrons: int | None
    n_orbitals: int | None
    sector: str
    sector_dimension: int | None
    qubits: int
    qubits_before_tapering: int
    terms: int
    terms_before_tapering: int
    one_norm: float
    largest_weight: int
    symmetries: tuple[str, ...]
    parameters: int
    factors: int
    two_qubit_gates: int | None
    depth: int | None
    memory_bytes: int
    exact_bytes: int = 0
    operator_order: str
    facts: dict[str, Any]
    warnings: tuple[str, ...]
    start: str = ""  # what is taken over from another run, in a sentence
    ladder: tuple[Rung, ...]
    pauli_terms: tuple[tuple[str, float], ...]
    measurement_sets: int | None = None  # of strings read together, qubit by qubit; None where there are too many strings to sort at once
    circuits_a_step: int | None = None  # that a device would run for one iteration of the search
    shots_a_step: int | None = None  # of that iteration; None without shots, and where the optimiser chooses their number itself
    pool_operators: int | None = None  # that adaptive growth chooses from
    pool_circuits: int | None = None  # that a device would run for the slopes of all of them, once for every step of growth
