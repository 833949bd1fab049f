"""A finished result to put into sessions: figures of no real molecule, with floats that need all their digits."""

from __future__ import annotations

import pytest

from thalweg.study.result import LeadingWeight, StartRecord, StudyResult, Trace
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule


@pytest.fixture
def spec() -> StudySpec:
    atoms = (("H", 0.0, 0.0, 0.1 + 0.2), ("H", 0.0, 0.0, 1.0 / 3.0))
    return StudySpec(system=Molecule(name="Wasserstoff-Brücke 氢", atoms=atoms), seed=7)


@pytest.fixture
def result(spec: StudySpec) -> StudyResult:
    trace = Trace(iteration=(0, 1), evaluations=(1, 3), energy=(-1.0, -1.1 - 1e-16), gradient_norm=(0.1, None), seconds=(0.0, 1e-5))
    start = StartRecord(seed=7, energy=-1.1, stop_reason="gradient", evaluations=3, iterations=1, gradient_norm=5e-324, seconds=1e-5, trace=trace)
    return StudyResult(
        label="invented",
        energy_unit="hartree",
        energy=-1.1,
        exact_energy=-1.1000000000000003,
        reference_name="Hartree-Fock",
        reference_energy=-1.0,
        error=2.220446049250313e-16,
        target_error=0.0015936014383657398,
        reached_target=True,
        verdict="Reaches chemical accuracy",
        verdict_kind="reached",
        qubits=1,
        qubits_before_tapering=4,
        terms=3,
        one_norm=1.0,
        largest_weight=1,
        parameters=2,
        evaluations=3,
        iterations=1,
        seconds=1e-5,
        preparation_seconds=0.1,
        stop_reason="gradient",
        gradient_norm=5e-324,
        starts=(start,),
        leading=(LeadingWeight(label="20", weight=0.99, exact_weight=None),),
        final_parameters=(0.1, 1.7976931348623157e308),
        start_parameters=(0.0, -0.0),
        pauli_terms=(("I", -0.5), ("X0", 0.18)),
        system_facts={"charge": 0, "shortest": 0.7, "note": None},
        seed=7,
        versions={"thalweg": "0.1.0"},
        constants={"set": "CODATA 2022", "bohr_in_angstrom": 0.529177210544},
        spec=spec,
    )
