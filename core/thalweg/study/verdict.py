"""The sentence that says whether the study reached its target, and that can say no."""

from __future__ import annotations

from dataclasses import dataclass

from thalweg.study.result import CONVERGED, STOP_REASONS

#: Deviations of N and S_z above this mean another sector; of S^2 another spin.
NUMBER_TOLERANCE = 1e-3
SPIN_TOLERANCE = 0.05
#: The same for spins on sites, of which no sector was asked for: the state is nearer to another one.
SITE_TOLERANCE = 0.5


@dataclass(frozen=True)
class Evidence:
    """What the verdict is drawn from. Energies in `unit`; None where a figure does not exist."""

    unit: str
    error: float | None
    target: float
    reference_error: float | None
    stop_reason: str
    gradient_norm: float | None
    start_gradient_norm: float | None
    lowered: float  # start energy minus best energy
    parameters: int
    two_qubit_gates: int | None
    n_electrons: float | None
    expected_electrons: float | None
    s_z: float | None
    expected_s_z: float | None
    s_squared: float | None
    exact_s_squared: float | None
    standard_error: float | None = None  # of the measured energy, or what shots would have; None with exact evaluation
    measured_error: float | None = None  # measured minus exact energy; `error` is that of the simulated state


@dataclass(frozen=True)
class Verdict:
    kind: str  # reached | outside | stationary | wrong-symmetry | not-converged | uncertain | no-exact
    sentence: str
    reached: bool


def judge(evidence: Evidence) -> Verdict:
    """The first of these that applies: no exact energy, wrong sector, uncertain, reached, stationary start, not converged, outside.

    Uncertain: the state is accurate enough, but an error bar of two standard errors is wider than the target, so that the shots cannot show it.
    """
    if evidence.error is None:
        return Verdict("no-exact", f"No exact energy to compare with; the search ended because {STOP_REASONS[evidence.stop_reason]}", False)
    wrong = _wrong_symmetry(evidence)
    if wrong:
        return Verdict("wrong-symmetry", wrong, False)
    above = f"{amount(evidence.error, evidence.unit)} above exact"
    if evidence.error <= evidence.target and _bar(evidence) > evidence.target:
        return Verdict("uncertain", f"Not shown by the shots: {_bar_text(evidence)} is wider than {_target(evidence)}; without noise {above}", False)
    if evidence.error <= evidence.target:
        return Verdict("reached", f"Reaches {_target(evidence)}: {above} with {_cost(evidence)}{_interrupted(evidence)}{_shots(evidence)}", True)
    if _is_stationary(evidence):
        return Verdict("stationary", f"Stationary start: every gradient vanishes at a point {above}; choose another start or trial state", False)
    if evidence.stop_reason not in CONVERGED:
        return Verdict("not-converged", f"Not converged: {above} when {STOP_REASONS[evidence.stop_reason]}{_shots(evidence)}", False)
    return Verdict("outside", f"Outside {_target(evidence)}: {above} with {_cost(evidence)}{_shots(evidence)}", False)


#: Energy differences below this, in hartree or couplings, are rounding.
ROUNDING = 1e-12


def amount(value: float, unit: str) -> str:
    """An energy difference in words: mEh with three digits for hartree, otherwise the plain unit; rounding as 0."""
    value = 0.0 if abs(value) < ROUNDING else value
    return f"{value * 1e3:.3g} mEh" if unit == "hartree" else f"{value:.3g} {unit}"


def _wrong_symmetry(e: Evidence) -> str:
    assert e.error is not None
    found = []
    by_number, by_spin = (SITE_TOLERANCE, SITE_TOLERANCE) if e.expected_electrons is None else (NUMBER_TOLERANCE, SPIN_TOLERANCE)
    if e.n_electrons is not None and e.expected_electrons is not None and abs(e.n_electrons - e.expected_electrons) > NUMBER_TOLERANCE:
        found.append(f"particle number {e.n_electrons:.3f} instead of {e.expected_electrons:g}")
    if e.s_z is not None and e.expected_s_z is not None and abs(e.s_z - e.expected_s_z) > by_number:
        found.append(f"S_z {e.s_z:.3f} instead of {e.expected_s_z:g}")
    if e.s_squared is not None and e.exact_s_squared is not None and abs(e.s_squared - e.exact_s_squared) > by_spin:
        found.append(f"S^2 {e.s_squared:.3f} instead of {e.exact_s_squared:.3f}")
    sector = "" if e.expected_electrons is None else " of the sector asked for"
    where = f"{amount(abs(e.error), e.unit)} {'above' if e.error >= 0 else 'below'} the exact energy{sector}"
    if found:
        return f"Wrong symmetry: {' and '.join(found)}; {where}{_spin_hint(e, found)}"
    if e.error < -max(1e-7, 1e-3 * e.target):
        return f"Below the exact energy: {where}, so the state has left the sector or the reference is not its lowest state"
    return ""


def _spin_hint(e: Evidence, found: list[str]) -> str:
    """Where the state has the spin asked for, and the lowest state of the sector another one: how the two are compared like with like."""
    if len(found) > 1 or e.s_squared is None or e.expected_s_z is None or e.expected_electrons is None:
        return ""
    spin = abs(e.expected_s_z)
    if abs(e.s_squared - spin * (spin + 1.0)) > SPIN_TOLERANCE:
        return ""
    return "; it has the spin asked for: set the spin of the exact state to `fixed` to compare it with the lowest state of that spin"


def _is_stationary(e: Evidence) -> bool:
    nothing_grew = e.parameters == 0 and e.stop_reason == "pool-slope"
    return (e.parameters > 0 or nothing_grew) and e.start_gradient_norm is not None and e.start_gradient_norm < 1e-7 and e.lowered < 1e-9


def _target(e: Evidence) -> str:
    from thalweg.units import CHEMICAL_ACCURACY

    if e.unit == "hartree" and abs(e.target - CHEMICAL_ACCURACY) < 1e-9:
        return "chemical accuracy"
    return f"the target of {amount(e.target, e.unit)}"


def _cost(e: Evidence) -> str:
    parameters = f"{e.parameters:,} parameter{'' if e.parameters == 1 else 's'}"
    return parameters if e.two_qubit_gates is None else f"{parameters}; {e.two_qubit_gates:,} two-qubit gates"


def _bar(e: Evidence) -> float:
    """Half the width of the error bar: two standard errors, which 95 of 100 measurements keep."""
    return 2.0 * (e.standard_error or 0.0)


def _bar_text(e: Evidence) -> str:
    return f"the error bar of {amount(_bar(e), e.unit)} (two standard errors)"


def _shots(e: Evidence) -> str:
    if e.standard_error is None:
        return ""
    if e.measured_error is None:
        return f"; shots would have an error bar of {amount(_bar(e), e.unit)} (two standard errors)"
    where = f"{amount(abs(e.measured_error), e.unit)} {'above' if e.measured_error >= 0 else 'below'}"
    return f"; measured {where} exact, with an error bar of {amount(_bar(e), e.unit)} (two standard errors)"


def _interrupted(e: Evidence) -> str:
    return "" if e.stop_reason in CONVERGED else f"; the search was not converged ({STOP_REASONS[e.stop_reason]})"
