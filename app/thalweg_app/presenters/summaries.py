"""The one line that a folded section shows: what is chosen, and what it costs."""

from __future__ import annotations

from thalweg.errors import StudyError
from thalweg.study.derived import StudyFigures
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel, Molecule, has_electrons
from thalweg_app.presenters import wording
from thalweg_app.presenters.wording import counted

SECTION_TITLES = {"system": "System", "encoding": "Encoding", "ansatz": "Trial state", "optimizer": "Search"}


def summary(section: str, spec: StudySpec, figures: StudyFigures | None) -> str:
    """The line without the section's number and title. Figures are left out where they are not known."""
    makers = {"system": _system, "encoding": _encoding, "ansatz": _ansatz, "optimizer": _search}
    return makers[section](spec, figures)


def formula(atoms: tuple[tuple[str, float, float, float], ...]) -> str:
    """`H2O` from the atoms: carbon first, then hydrogen, then by the alphabet (Hill order)."""
    symbols = [symbol.capitalize() for symbol, *_ in atoms]
    first = [s for s in ("C", "H") if "C" in symbols and s in symbols]
    order = first + sorted(set(symbols) - set(first))
    return "".join(s + (str(n) if (n := symbols.count(s)) > 1 else "") for s in order)


def system_label(spec: StudySpec) -> str:
    system = spec.system
    if isinstance(system, Molecule):
        name = system.name or formula(system.atoms)
        return f"{name}, {system.basis.upper() if system.basis[:3] == 'sto' else system.basis}" if name else ""
    if isinstance(system, LatticeModel):
        return lattice_label(system)
    return system.name or system.title


def lattice_label(system: LatticeModel) -> str:
    """Name, or model and lattice; the titles alone where the two do not fit each other."""
    try:
        return system.label()
    except StudyError:
        return f"{system.model.title}, {system.lattice.title}"


def _system(spec: StudySpec, figures: StudyFigures | None) -> str:
    label = system_label(spec)
    if not label:
        return "none yet"
    if figures is None:
        return label
    if figures.n_electrons is None or figures.n_orbitals is None:
        return f"{label}: {counted(figures.qubits_before_tapering, 'site')}"
    return f"{label}: {counted(figures.n_electrons, 'electron')} in {counted(figures.n_orbitals, 'orbital')}"


def _encoding(spec: StudySpec, figures: StudyFigures | None) -> str:
    if has_electrons(spec.system):
        chosen = f"{spec.encoding.title}, {'tapered' if spec.encoding.taper else 'not tapered'}"
    else:
        chosen = "every site is a qubit"
    if figures is None:
        return chosen
    before, after = figures.qubits_before_tapering, figures.qubits
    qubits = f"{before} → {counted(after, 'qubit')}" if before != after else counted(after, "qubit")
    return f"{chosen}: {qubits}, {counted(figures.terms, 'term')}"


def _ansatz(spec: StudySpec, figures: StudyFigures | None) -> str:
    if figures is None:
        return spec.ansatz.title
    gates = "" if figures.two_qubit_gates is None else f", {counted(figures.two_qubit_gates, 'two-qubit gate')}"
    return f"{spec.ansatz.title}: {counted(figures.parameters, 'parameter')}{gates}"


def _search(spec: StudySpec, figures: StudyFigures | None) -> str:
    if isinstance(spec.system, LatticeModel):
        target = f"{wording.significant(100 * spec.target.relative)} % of |E|"
    else:
        target = f"{wording.difference(spec.target.error)} mEh"
    return f"{spec.optimizer.title}: {counted(spec.starts, 'start')}, target {target}"
