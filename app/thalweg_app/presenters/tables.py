"""Tables behind the Hamiltonian and State pictures, and their bars."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from thalweg.study.result import StudyResult
from thalweg_app.presenters import wording
from thalweg_app.presenters.chart import Bars, Chart, Level, Panel

#: As many bars as can be told apart.
MAX_BARS = 40
MAX_STATES = 12


@dataclass(frozen=True)
class Table:
    """Header with units and rows of text; `numeric` columns are right aligned, `sort_keys` are what a column sorts by."""

    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    numeric: tuple[bool, ...]
    sort_keys: tuple[tuple[float | str, ...], ...]
    about: str = ""


@dataclass(frozen=True)
class Terms:
    """Pauli terms of a Hamiltonian, heaviest first, as far as they are listed."""

    label: str
    unit: str
    terms: tuple[tuple[str, float], ...]
    total: int
    one_norm: float
    qubits: int


def matching(terms: Terms, wanted: str) -> list[tuple[str, float]]:
    """Terms that contain every word of the filter: `X0`, `Z`, `I`; capital or small."""
    words = wanted.upper().split()
    return [(s, c) for s, c in terms.terms if all(_has(s, w) for w in words)]


def _has(string: str, word: str) -> bool:
    factors = string.split()
    return word in factors if any(ch.isdigit() for ch in word) else any(f.startswith(word) for f in factors)


def terms_table(terms: Terms, wanted: str = "") -> Table:
    unit = wording.unit_name(terms.unit)
    found = matching(terms, wanted)
    rows, keys = [], []
    for rank, (string, value) in enumerate(found, 1):
        weight = 0 if string == "I" else len(string.split())
        share = 0.0 if string == "I" or not terms.one_norm else abs(value) / terms.one_norm
        rows.append((str(rank), string, wording.minus(f"{value:+.8f}"), str(weight), f"{100 * share:.2f}" if string != "I" else wording.MISSING))
        keys.append((rank, string, value, weight, share))
    heaviest = f"the {len(terms.terms):,} heaviest of " if terms.total > len(terms.terms) else ""
    shown = f"{len(found):,} of " if len(found) != len(terms.terms) else ""
    about = f"{terms.label}: {shown}{heaviest}{terms.total:,} terms on {wording.counted(terms.qubits, 'qubit')}; "
    about += f"one-norm {terms.one_norm:.6f} {unit} without the constant"
    header = ("", "Pauli string", f"Coefficient / {unit}", "Weight", "Share of one-norm / %")
    return Table(header, tuple(rows), (True, False, True, True, True), tuple(keys), about)


def terms_chart(terms: Terms | None, wanted: str = "", log: bool = False) -> Chart:
    """Bars of |c|; positive and negative coefficients in two colours. The constant is left out: it only shifts the energy."""
    empty = "The Hamiltonian is shown as soon as the system is worked out."
    if terms is None:
        return Chart("Hamiltonian", "Pauli string", (), empty)
    found = [(s, c) for s, c in matching(terms, wanted) if s != "I"][:MAX_BARS]
    if not found:
        return Chart("Hamiltonian", "Pauli string", (), "No term matches the filter.")
    values = np.array([c for _, c in found])
    bars = (
        Bars("Positive coefficient", np.where(values > 0, values, np.nan), "variational"),
        Bars("Negative coefficient", np.where(values < 0, -values, np.nan), "overlay"),
    )
    names = tuple(s for s, _ in found)
    panel = Panel(f"|coefficient| / {wording.unit_name(terms.unit)}", bars=bars, categories=names, log=log)
    return Chart("Hamiltonian", "Pauli string", (panel,), empty, f"{len(found)} heaviest terms of {terms.label}")


def terms_of_result(result: StudyResult) -> Terms:
    return Terms(result.label, result.energy_unit, result.pauli_terms, result.terms, result.one_norm, result.qubits)


def state_chart(result: StudyResult | None, log: bool = False) -> Chart:
    empty = "The state is shown when a run has finished."
    if result is None or not result.leading:
        return Chart("State", "Determinant", (), empty)
    leading = result.leading[:MAX_STATES]
    bars = [Bars("Trial state", np.array([w.weight for w in leading]), "variational")]
    if any(w.exact_weight is not None for w in leading):
        bars.append(Bars("Exact", np.array([np.nan if w.exact_weight is None else w.exact_weight for w in leading]), "exact"))
    name = "Determinant" if result.n_electrons is not None else "Basis state"
    panel = Panel("Weight", bars=tuple(bars), categories=tuple(w.label for w in leading), log=log)
    return Chart("State", name, (panel,), empty, f"Leading weights of {result.label}")


def occupations_chart(result: StudyResult | None) -> Chart:
    """Natural occupations; lines mark the empty and the doubly occupied orbital."""
    if result is None or not result.natural_occupations:
        return Chart("Natural occupations", "Natural orbital", (), "Natural occupations exist for molecules and fermion lattices.")
    values = np.array(result.natural_occupations)
    names = tuple(str(i + 1) for i in range(values.size))
    panel = Panel(
        "Occupation", bars=(Bars("Trial state", values, "variational"),), levels=(Level("Doubly occupied", 2.0, "reference"),), categories=names
    )
    return Chart("Natural occupations", "Natural orbital", (panel,), "", f"Natural occupations of {result.label}")


def state_table(result: StudyResult) -> Table:
    rows, keys = [], []
    for weight in result.leading:
        exact = weight.exact_weight
        rows.append((weight.label, f"{weight.weight:.8f}", wording.MISSING if exact is None else f"{exact:.8f}"))
        keys.append((weight.label, weight.weight, -1.0 if exact is None else exact))
    name = "Determinant" if result.n_electrons is not None else "Basis state"
    return Table((name, "Weight", "Exact weight"), tuple(rows), (False, True, True), tuple(keys))


@dataclass(frozen=True)
class Figure:
    """A figure with its name, for lists of facts."""

    name: str
    value: str
    help: str = field(default="", compare=False)


def state_figures(result: StudyResult) -> Sequence[Figure]:
    unit = wording.unit_name(result.energy_unit)
    pairs: list[tuple[str, float | None, str, str]] = [
        ("N", result.n_electrons, ".6f", "Expected number of active electrons."),
        ("S_z", result.s_z, ".6f", "Expected z component of the spin, in units of the reduced Planck constant."),
        ("S²", result.s_squared, ".6f", "Expected square of the spin; 0 for a singlet, 2 for a triplet."),
        ("Exact S²", result.exact_s_squared, ".6f", "Square of the spin of the exact ground state."),
        (f"Variance / {unit}²", result.variance, ".3e", "Energy variance; zero for an eigenstate."),
        ("Fidelity", result.fidelity, ".8f", "Weight of the trial state in the exact ground space."),
        (f"Gap / {unit}", result.exact_gap, ".6f", "Distance of the exact ground level to the next level of the sector."),
        (f"Gradient / {unit}", result.gradient_norm, ".2e", "Largest component of the gradient at the best point."),
    ]
    return [Figure(n, wording.minus(format(_no_minus_zero(v), f)), h) for n, v, f, h in pairs if v is not None]


def _no_minus_zero(value: float) -> float:
    return 0.0 if abs(value) < 5e-13 else value
