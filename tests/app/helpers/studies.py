"""Results and figures for tests of the window, made by hand: numbers are invented and stand for a small molecule."""

from thalweg.ansatz import HardwareEfficient
from thalweg.study.derived import Rung, StudyFigures
from thalweg.study.result import LeadingWeight, StartRecord, StudyResult, Trace
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule
from thalweg.units import CHEMICAL_ACCURACY, constants_record

EXACT, REFERENCE = -7.882324, -7.862002


def molecule(**changes):
    atoms = (("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.6))
    return Molecule(**({"name": "LiH", "atoms": atoms} | changes))


def study(**changes):
    return StudySpec(**({"system": molecule()} | changes))


def other_study():
    return study(ansatz=HardwareEfficient(), seed=5)


def trace(final_error=1.1e-5, steps=14):
    errors = [(REFERENCE - EXACT) * (final_error / (REFERENCE - EXACT)) ** (i / (steps - 1)) for i in range(steps)]
    return Trace(
        iteration=tuple(range(steps)),
        evaluations=tuple(1 + i + i // 4 for i in range(steps)),
        energy=tuple(EXACT + e for e in errors),
        gradient_norm=tuple(0.1 * 0.35**i for i in range(steps)),
        seconds=tuple(0.02 * i for i in range(steps)),
    )


def result(error=1.1e-5, spec=None, kind=None, **changes):
    line = trace(error)
    kind = kind or ("reached" if error <= CHEMICAL_ACCURACY else "outside")
    words = {"reached": "Reaches", "outside": "Outside"}.get(kind, "Not converged near")
    spec = spec or study()
    start = StartRecord(
        seed=spec.seed,
        energy=line.energy[-1],
        stop_reason="gradient",
        evaluations=line.evaluations[-1],
        iterations=line.iteration[-1],
        gradient_norm=line.gradient_norm[-1],
        seconds=line.seconds[-1],
        trace=line,
    )
    made = {
        "label": "LiH, STO-3G",
        "energy_unit": "hartree",
        "energy": EXACT + error,
        "exact_energy": EXACT,
        "reference_name": "Hartree-Fock",
        "reference_energy": REFERENCE,
        "error": error,
        "target_error": CHEMICAL_ACCURACY,
        "reached_target": kind == "reached",
        "verdict": f"{words} chemical accuracy: {error * 1e3:.3g} mEh above exact with 44 parameters; 1,216 two-qubit gates",
        "verdict_kind": kind,
        "qubits": 10,
        "qubits_before_tapering": 12,
        "terms": 631,
        "one_norm": 9.8765,
        "largest_weight": 10,
        "parameters": 44,
        "two_qubit_gates": 1216,
        "sector_dimension": 225,
        "evaluations": line.evaluations[-1],
        "iterations": line.iteration[-1],
        "seconds": 0.28,
        "preparation_seconds": 0.4,
        "stop_reason": "gradient",
        "gradient_norm": line.gradient_norm[-1],
        "starts": (start,),
        "n_electrons": 4.0,
        "s_z": 0.0,
        "s_squared": 0.0,
        "variance": 3.1e-6,
        "fidelity": 0.999998,
        "exact_s_squared": 0.0,
        "exact_gap": 0.1,
        "leading": (
            LeadingWeight(label="220000", weight=0.974, exact_weight=0.9741),
            LeadingWeight(label="200002", weight=0.0142, exact_weight=0.0141),
            LeadingWeight(label="2ud000", weight=0.0042, exact_weight=None),
        ),
        "natural_occupations": (1.9999, 1.962, 0.031, 0.003, 0.003, 0.001),
        "pauli_terms": (("I", -4.1), ("Z0", -0.4), ("X0 X2", 0.2), ("Z0 Z1", 0.1), ("Y0 Y2", -0.05)),
        "seed": spec.seed,
        "versions": {"thalweg": "0.1.0"},
        "constants": constants_record(),
        "spec": spec,
    }
    return StudyResult(**(made | changes))


def figures(**changes):
    ladder = tuple(
        Rung(number=i + 1, energy=e, occupation=2.0 if i < 2 else 0.0, irrep="A1", active=True, frozen=False)
        for i, e in enumerate((-2.35, -0.29, 0.08, 0.16, 0.16, 0.55))
    )
    made = {
        "label": "LiH, STO-3G",
        "energy_unit": "hartree",
        "reference_name": "Hartree-Fock",
        "reference_energy": REFERENCE,
        "n_electrons": 4,
        "n_orbitals": 6,
        "sector": "2 alpha + 2 beta electrons in 6 orbitals",
        "sector_dimension": 225,
        "qubits": 10,
        "qubits_before_tapering": 12,
        "terms": 631,
        "terms_before_tapering": 631,
        "one_norm": 9.8765,
        "largest_weight": 10,
        "symmetries": ("Z0 Z2 = +1 (qubit 0 removed)",),
        "parameters": 44,
        "factors": 44,
        "two_qubit_gates": 1216,
        "depth": 2000,
        "memory_bytes": 30000,
        "operator_order": "doubles first",
        "facts": {},
        "warnings": (),
        "ladder": ladder,
        "pauli_terms": (("I", -4.1), ("Z0", -0.4), ("X0 X2", 0.2), ("Z0 Z1", 0.1), ("Y0 Y2", -0.05)),
    }
    return StudyFigures(**(made | changes))
