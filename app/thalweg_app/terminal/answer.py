"""What the terminal prints: the verdict first, then aligned figures with their units, and the remarks that belong to them."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from thalweg.study.derived import StudyFigures
from thalweg.study.result import STOP_REASONS, StudyResult
from thalweg.units import HARTREE_IN_KCAL_PER_MOL
from thalweg_app.presenters.wording import bytes_text, counted, significant, unit_name

Rows = list[tuple[str, str]]

#: Facts that are energies though they are not called so, and endings that name a length's unit.
ENERGY_FACTS = frozenset({"nuclear_repulsion", "homo_lumo_gap", "largest_dropped_integral"})
LENGTH_ENDINGS = {"_angstrom": "angstrom", "_bohr": "bohr"}


def answer_lines(result: StudyResult) -> list[str]:
    """The answer of one run."""
    rows = [*_energy_rows(result), *_lattice_rows(result), *_state_rows(result), *_cost_rows(result), *_search_rows(result)]
    remarks = [f"Remark: {remark}" for remark in result.remarks]
    return [_ended(result.verdict), "", *aligned(rows), *([""] if remarks else []), *remarks]


def figures_lines(figures: StudyFigures) -> list[str]:
    """What `inspect` prints: the figures of a study that has not been run."""
    unit = unit_name(figures.energy_unit)
    rows: Rows = [("System", figures.label), (_words(figures.reference_name), _energy(figures.reference_energy, unit))]
    if figures.n_electrons is not None:
        rows += [
            ("Electrons", f"{figures.n_electrons} active"),
            ("Orbitals", f"{figures.n_orbitals} active"),
            ("Sector", f"{figures.sector_dimension:,} determinants: {figures.sector}"),
        ]
    rows += _qubit_rows(figures.qubits, figures.qubits_before_tapering, figures.terms, figures.one_norm, figures.largest_weight, unit)
    rows += [("Symmetry", text) for text in figures.symmetries]
    rows += [("Parameters", f"{figures.parameters:,} ({counted(figures.factors, 'factor')})"), ("Start", figures.start)]
    if figures.two_qubit_gates is not None:
        rows.append(("Two-qubit gates", f"{figures.two_qubit_gates:,}" + (f", depth {figures.depth:,}" if figures.depth is not None else "")))
    rows += _measurement_rows(figures)
    exact = f"; exact energy {bytes_text(figures.exact_bytes)}" if figures.exact_bytes else ""
    rows += [("Memory", bytes_text(figures.memory_bytes) + exact), ("Operator order", figures.operator_order)]
    facts = [(_words(name), _fact(name, value, unit)) for name, value in figures.facts.items()]
    warnings = [f"Warning: {text}" for text in figures.warnings]
    return [*aligned(rows), "", *aligned(facts), *_ladder(figures), *([""] if warnings else []), *warnings]


def _measurement_rows(figures: StudyFigures) -> Rows:
    if figures.measurement_sets is None:
        return [("Pool", counted(figures.pool_operators, "operator"))] if figures.pool_operators is not None else []
    step = "" if figures.circuits_a_step is None else f"; {counted(figures.circuits_a_step, 'circuit')} an iteration on a device"
    step += "" if figures.shots_a_step is None else f", {counted(figures.shots_a_step, 'shot')}"
    rows = [("Measurement sets", f"{figures.measurement_sets:,}{step}")]
    if figures.pool_operators is not None and figures.pool_circuits is not None:
        slopes = f"{counted(figures.pool_circuits, 'circuit')} for their slopes at every step of growth"
        rows.append(("Pool", f"{counted(figures.pool_operators, 'operator')}; {slopes}"))
    return rows


def aligned(rows: Iterable[tuple[str, str]]) -> list[str]:
    """Names in one column, figures in the next; empty figures are left out."""
    kept = [(name, text) for name, text in rows if text]
    width = max((len(name) for name, _ in kept), default=0)
    return [f"{name:<{width}}  {text}" for name, text in kept]


def difference_text(value: float, energy_unit: str) -> str:
    """`0.0110 mEh = 0.0069 kcal/mol`; other units plain."""
    if energy_unit != "hartree":
        return f"{significant(value)} {unit_name(energy_unit)}"
    return f"{significant(value * 1e3)} mEh = {significant(value * HARTREE_IN_KCAL_PER_MOL)} kcal/mol"


def _energy(value: float, unit: str) -> str:
    return f"{value:.8f} {unit}"


def _energy_rows(result: StudyResult) -> Rows:
    unit = unit_name(result.energy_unit)
    spec = result.spec
    used = (spec.ansatz, spec.optimizer, *([spec.encoding] if result.n_electrons is not None else []))  # spins are qubits already
    rows = [
        ("System", result.label),
        ("Energy", f"{_energy(result.energy, unit)}  ({', '.join(section.title for section in used)})"),
    ]
    if result.measured_energy is not None and result.standard_error is not None:
        measured = f"{_energy(result.measured_energy, unit)} +- {significant(2 * result.standard_error)}"
        rows.append(("Measured", f"{measured}  (two standard errors; the energy above is that of the same state without noise)"))
    elif result.standard_error is not None:
        rows.append(("Error bar of shots", f"+- {significant(2 * result.standard_error)} {unit}  (two standard errors)"))
    if result.exact_energy is not None:
        several = f", {result.exact_degeneracy}-fold degenerate" if (result.exact_degeneracy or 1) > 1 else ""
        rows.append(("Exact", f"{_energy(result.exact_energy, unit)}  ({result.exact_method}{several})"))
    rows.append((_words(result.reference_name), _energy(result.reference_energy, unit)))
    rows += [
        (name.upper(), _energy(value, unit) if value is not None else "not available for this system") for name, value in result.classical.items()
    ]
    if result.error is not None:
        target = difference_text(result.target_error, result.energy_unit)
        rows.append(("Error", f"{difference_text(result.error, result.energy_unit)}  (target {target})"))
    return rows


def _lattice_rows(result: StudyResult) -> Rows:
    """What belongs to an energy on a lattice: its value per site, the convention, the gap, and the answer of a diagonal cost."""
    facts, unit = result.system_facts, unit_name(result.energy_unit)
    rows: Rows = []
    if "energy per site" in facts:
        exact = f"  (exact {facts['exact energy per site']:.8f})" if "exact energy per site" in facts else ""
        rows.append(("Per site", f"{_energy(facts['energy per site'], unit)}{exact}"))
        rows.append(("Convention", facts.get("convention", "")))
        if result.exact_gap is not None:
            rows.append(("Exact gap", f"{significant(result.exact_gap)} {unit}"))
    if result.best_string is not None:
        best = result.best_string
        is_lowest = result.exact_energy is not None and best.energy <= result.exact_energy + 1e-9 * max(1.0, abs(result.exact_energy))
        lowest = ", the lowest energy there is" if is_lowest else ""
        rows.append(("Best bit string", f"{best.bits}: {_energy(best.energy, unit)}, probability {significant(best.weight)}{lowest}"))
        rows.append(("Its meaning", best.words))
    return rows


def _state_rows(result: StudyResult) -> Rows:
    unit = unit_name(result.energy_unit)
    rows = []
    if result.fidelity is not None:
        rows.append(("Fidelity with exact", f"{result.fidelity:.6f}"))
    if result.variance is not None:
        rows.append(("Energy variance", f"{significant(result.variance)} {unit}^2"))
    if result.n_electrons is not None:
        rows.append(("Electrons", f"{result.n_electrons:.6f} active"))
    if result.s_z is not None:
        rows.append(("S_z", _rounded(result.s_z)))
    if result.s_squared is not None:
        exact = f"  (exact {_rounded(result.exact_s_squared)})" if result.exact_s_squared is not None else ""
        rows.append(("S^2", f"{_rounded(result.s_squared)}{exact}"))
    return rows


def _rounded(value: float) -> str:
    """Six decimals, without a sign on zero."""
    return f"{round(value, 6) + 0.0:.6f}"


def _cost_rows(result: StudyResult) -> Rows:
    rows = _qubit_rows(
        result.qubits, result.qubits_before_tapering, result.terms, result.one_norm, result.largest_weight, unit_name(result.energy_unit)
    )
    if result.sector_dimension is not None:
        rows.append(("Sector", counted(result.sector_dimension, "determinant")))
    rows.append(("Parameters", f"{result.parameters:,}"))
    if result.two_qubit_gates is not None:
        rows.append(("Two-qubit gates", f"{result.two_qubit_gates:,}"))
    return rows


def _qubit_rows(qubits: int, before: int, terms: int, one_norm: float, weight: int, unit: str) -> Rows:
    removed = f"  ({before} before {before - qubits} were removed by Z2 symmetries)" if before != qubits else ""
    return [
        ("Qubits", f"{qubits}{removed}"),
        ("Pauli terms", f"{terms:,}, largest on {counted(weight, 'qubit')}"),
        ("One-norm", f"{one_norm:.6f} {unit}"),
    ]


def _search_rows(result: StudyResult) -> Rows:
    unit = unit_name(result.energy_unit)
    starts = f", best of {len(result.starts)} starts" if len(result.starts) > 1 else ""
    rows = [
        ("Stopped because", STOP_REASONS.get(result.stop_reason, result.stop_reason)),
        ("Evaluations", f"{result.evaluations:,} in {counted(result.iterations, 'iteration')}{starts}"),
    ]
    if result.circuits:
        rows.append(("Circuits run", f"{result.circuits:,}" + (f", {result.shots:,} shots" if result.shots else "")))
    if result.gradient_norm is not None:
        rows.append(("Largest gradient", f"{significant(result.gradient_norm)} {unit}"))
    clock = "" if result.elapsed is None else f" in all starts, {result.elapsed:.2f} s by the clock"
    rows.append(("Time", f"{result.seconds:.2f} s{clock}, preparation {result.preparation_seconds:.2f} s"))
    rows += [("Operator order", result.operator_order), ("Seed", str(result.seed))]
    return rows


def _ladder(figures: StudyFigures) -> list[str]:
    if not figures.ladder:
        return []
    head = f"{'Orbital':>7}  {'Energy/Eh':>12}  {'Occupation':>10}  {'Irrep':<6}  Part"
    lines = [
        f"{rung.number:>7}  {rung.energy:>12.6f}  {rung.occupation:>10g}  {rung.irrep:<6}  {_part(rung.active, rung.frozen)}"
        for rung in figures.ladder
    ]
    return ["", head, *lines]


def _part(active: bool, frozen: bool) -> str:
    if active:
        return "active"
    return "frozen" if frozen else "left out"


def _words(name: str) -> str:
    """`Shortest distance` for `shortest_distance_bohr`, whose unit stands behind the figure."""
    for ending in LENGTH_ENDINGS:
        name = name.removesuffix(ending) if name != "bohr_in_angstrom" else name
    text = name.replace("_", " ").replace("homo lumo", "HOMO-LUMO")
    return text[:1].upper() + text[1:]


def _fact(name: str, value: Any, energy_unit: str) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, list | tuple):
        return ", ".join(_fact(name, item, energy_unit) for item in value)
    if not isinstance(value, float):
        return "" if value is None else str(value)
    length = next((unit for ending, unit in LENGTH_ENDINGS.items() if name.endswith(ending)), "")
    unit = length or (energy_unit if name in ENERGY_FACTS or "energy" in name else "")
    return f"{value:.8g} {unit}".rstrip()


def _ended(sentence: str) -> str:
    return sentence if sentence.endswith((".", "!", "?")) else sentence + "."
