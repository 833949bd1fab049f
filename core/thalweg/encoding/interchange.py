"""To and from the operators of the openfermion library, and Pauli expansions as text."""

from __future__ import annotations

import re
from typing import Any

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import MAX_QUBITS, PauliExpansion, collect_terms, pauli_label

_FACTOR = re.compile(r"([XYZ])(\d{1,4})")
_SIZE = re.compile(r"qubits\s*[:=]?\s*(\d{1,4})", re.IGNORECASE)


def to_qubit_operator(expansion: PauliExpansion) -> Any:
    """An openfermion QubitOperator; qubit q keeps its number."""
    from openfermion import QubitOperator

    operator = QubitOperator()
    for x, z, c in zip(expansion.x.tolist(), expansion.z.tolist(), expansion.coefficients.tolist(), strict=True):
        operator.terms[_factors(x, z)] = c
    return operator


def from_qubit_operator(operator: Any, n_qubits: int | None = None, cut: float = 0.0) -> PauliExpansion:
    """A PauliExpansion of an openfermion QubitOperator; terms with |c| <= cut are dropped.

    Raises StudyError where a coefficient is not real, or a qubit lies outside `n_qubits` or past 62.
    """
    terms = []
    for term, coefficient in operator.terms.items():
        value = complex(coefficient)
        if abs(value.imag) > 1e-12 * max(1.0, abs(value.real)):
            text = " ".join(f"{letter}{q}" for q, letter in term) or "I"
            raise StudyError(f"Term {text} has the complex coefficient {value}", "a Hamiltonian has real ones", "Give a Hermitian operator")
        terms.append((value.real, tuple((int(q), letter) for q, letter in term)))
    return _expansion(terms, n_qubits, cut)


def to_fermion_operator(hamiltonian: FermionHamiltonian) -> Any:
    """An openfermion FermionOperator on interleaved spin orbitals (alpha 2p, beta 2p + 1), terms that vanish left out."""
    from openfermion import FermionOperator

    operator = FermionOperator((), float(hamiltonian.core_energy))
    for p, q in np.argwhere(hamiltonian.one_body).tolist():
        for s in (0, 1):
            operator += FermionOperator(((2 * p + s, 1), (2 * q + s, 0)), float(hamiltonian.one_body[p, q]))
    for p, q, r, s in np.argwhere(hamiltonian.two_body).tolist():
        weight = 0.5 * float(hamiltonian.two_body[p, q, r, s])
        for a, b in ((0, 0), (0, 1), (1, 0), (1, 1)):
            if a != b or (p != r and q != s):
                operator += FermionOperator(((2 * p + a, 1), (2 * r + b, 1), (2 * s + b, 0), (2 * q + a, 0)), weight)
    return operator


def to_text(expansion: PauliExpansion) -> str:
    """A line `qubits N`, then one line a term: the coefficient with all its digits and the label, e.g. `-0.25 Z0 Z3`."""
    lines = [f"qubits {expansion.n_qubits}"]
    masks = zip(expansion.x.tolist(), expansion.z.tolist(), expansion.coefficients.tolist(), strict=True)
    lines += [f"{c!r} {pauli_label(x, z)}" for x, z, c in masks]
    return "\n".join(lines) + "\n"


def from_text(text: str, n_qubits: int | None = None, cut: float = 0.0) -> PauliExpansion:
    """Reads lines `coefficient label`, e.g. `-0.25 Z0 Z3` or `1.5 I`; `#` starts a comment; repeated labels add up.

    A line `qubits N` states the size of the register; otherwise the largest qubit named does.
    Raises StudyError naming the line at fault.
    """
    terms = []
    for number, raw in enumerate(text.splitlines(), 1):
        line = raw.split("#", 1)[0].strip()
        size = _SIZE.fullmatch(line)
        if size:
            n_qubits = int(size[1]) if n_qubits is None else n_qubits
        elif line:
            terms.append(_read_term(line, number))
    if not terms:
        raise StudyError("No Pauli terms were found", "every line is empty or a comment", "Give lines such as `-0.25 Z0 Z3`")
    return _expansion(terms, n_qubits, cut)


def _read_term(line: str, number: int) -> tuple[float, tuple[tuple[int, str], ...]]:
    first, _, rest = line.replace("*", " ").partition(" ")
    try:
        coefficient = float(first.replace("D", "e").replace("d", "e"))
    except ValueError:
        coefficient = np.nan
    if not np.isfinite(coefficient):
        raise StudyError(f"Line {number} begins with '{first[:30]}'", "a term begins with a finite real coefficient", "Write e.g. `-0.25 Z0 Z3`")
    label = rest.upper().split()
    if label in ([], ["I"]):
        return coefficient, ()
    factors = []
    for part in label:
        found = _FACTOR.fullmatch(part)
        if not found:
            raise StudyError(f"Line {number} holds '{part[:30]}'", "a factor is X, Y or Z and the number of a qubit", "Write e.g. `-0.25 Z0 Z3`")
        factors.append((int(found[2]), found[1]))
    if len({q for q, _ in factors}) < len(factors):
        raise StudyError(f"Line {number} names a qubit twice", "a string has one letter a qubit", "Multiply the letters out")
    return coefficient, tuple(factors)


def _expansion(terms: list[tuple[float, tuple[tuple[int, str], ...]]], n_qubits: int | None, cut: float) -> PauliExpansion:
    needed = max((q + 1 for _, factors in terms for q, _ in factors), default=1)
    n_qubits = needed if n_qubits is None else n_qubits
    if not needed <= n_qubits <= MAX_QUBITS:
        why = f"the register has {n_qubits} qubits" if needed > n_qubits else f"at most {MAX_QUBITS} qubits fit"
        raise StudyError(f"Qubit {max(needed, n_qubits) - 1} is out of range", why, "Number the qubits from 0 without gaps")
    x = np.array([sum(1 << q for q, letter in factors if letter in "XY") for _, factors in terms], np.uint64)
    z = np.array([sum(1 << q for q, letter in factors if letter in "ZY") for _, factors in terms], np.uint64)
    return collect_terms(n_qubits, x, z, np.array([c for c, _ in terms], float), cut)


def _factors(x: int, z: int) -> tuple[tuple[int, str], ...]:
    support = x | z
    return tuple((q, "IXZY"[(x >> q & 1) + 2 * (z >> q & 1)]) for q in range(support.bit_length()) if support >> q & 1)
