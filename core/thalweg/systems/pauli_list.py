"""A Hamiltonian typed as a sum of Pauli strings, such as `0.5 X0 X1 - Z2`."""

from __future__ import annotations

import re
from math import isfinite
from typing import ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.pauli import MAX_QUBITS, PauliExpansion, pauli_label
from thalweg.options import option
from thalweg.systems.lattice_graph import Lattice, LatticeGraph, unconnected
from thalweg.systems.spin_model import SpinModel
from thalweg.systems.spin_terms import SpinTerms

_TOKEN = re.compile(
    r"(?P<sign>[+\-\u2212])|(?P<number>(?:\d+\.?\d*|\.\d+)(?:[eE][+\-]?\d+)?)|(?P<pauli>[XYZxyz])(?P<qubit>\d+)|(?P<one>[Ii](?![A-Za-z0-9]))|(?P<times>\*)"
)
_FIX = "Write a sum such as `0.5 X0 X1 - Z2 + 1.5`"


class PauliList(SpinModel):
    title: ClassVar[str] = "Pauli list"
    about: ClassVar[str] = "Any sum of Pauli strings, typed; a number alone is a multiple of the identity."
    usual_reference: ClassVar[str] = "up"
    unit_name: ClassVar[str] = "units of the list"

    key: Literal["pauli-list"] = "pauli-list"
    terms: str = option(
        "-Z0 Z1 - 0.5 X0 - 0.5 X1", "Terms", "The sum, such as `0.5 X0 X1 - Z2`; line breaks count as blanks, qubits are numbered from 0."
    )

    def graph(self, lattice: Lattice) -> LatticeGraph:
        """The lattice, or as many free sites as the list needs when there is none."""
        needed, graph = needed_qubits(parse_paulis(self.terms)), lattice.build()
        if graph.n_sites == 0:
            return unconnected(needed, f"{needed} free sites")
        if graph.n_sites < needed:
            raise StudyError(
                f"The Pauli list acts on qubit {needed - 1}",
                f"{graph.name} has {graph.n_sites} sites, counted from 0",
                "Choose `sites` as lattice, or a larger one",
                "lattice",
            )
        return graph

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        terms = SpinTerms(graph.n_sites)
        for coefficient, x, z in parse_paulis(self.terms):
            terms.add(coefficient, x, z)
        return terms.expansion()

    def convention(self) -> str:
        words = " ".join(self.terms.split())
        return f"H = {words if len(words) <= 120 else words[:117] + '...'}; X, Y, Z are Pauli matrices"


PauliTerm = tuple[float, int, int]


def parse_paulis(text: str) -> tuple[PauliTerm, ...]:
    """(coefficient, x mask, z mask) of each term in the order typed. Raises StudyError naming the place."""
    words = _words(text)
    terms: list[PauliTerm] = []
    position = 0
    while position < len(words):
        term, position = _term(words, position, first=not terms)
        terms.append(term)
    if not terms:
        raise StudyError("The Pauli list is empty", "it holds no term", _FIX, "model.terms")
    return tuple(terms)


def write_paulis(terms: tuple[PauliTerm, ...]) -> str:
    """The sum that `parse_paulis` reads back to equal terms."""
    parts = []
    for coefficient, x, z in terms:
        label = "" if x == z == 0 else " " + pauli_label(x, z)
        parts.append(f"{'-' if np.signbit(coefficient) else '+'} {abs(coefficient)!r}{label}")
    return " ".join(parts)


def needed_qubits(terms: tuple[PauliTerm, ...]) -> int:
    """One more than the highest qubit named, at least 1."""
    return max(1, max((x | z).bit_length() for _, x, z in terms))


def _words(text: str) -> list[re.Match[str]]:
    found, position = [], 0
    while position < len(text):
        if text[position].isspace():
            position += 1
            continue
        match = _TOKEN.match(text, position)
        if match is None:
            raise StudyError(
                "The Pauli list cannot be read",
                f"'{text[position : position + 12]}' at sign {position + 1} is no number, sign or Pauli",
                _FIX,
                "model.terms",
            )
        found.append(match)
        position = match.end()
    return found


def _term(words: list[re.Match[str]], position: int, first: bool) -> tuple[PauliTerm, int]:
    """One signed product from `position`; returns it and where the next begins."""
    coefficient, begun = 1.0, position
    while position < len(words) and words[position]["sign"]:
        coefficient *= 1.0 if words[position]["sign"] == "+" else -1.0
        position += 1
    if position - begun > 2 or (position == begun and not first):
        raise _unreadable(words, position, "a term needs one sign before it" if position == begun else "there are too many signs")
    factors, x, z, expects = 0, 0, 0, True
    while position < len(words) and not words[position]["sign"]:
        word = words[position]
        if word["times"]:
            if expects:
                raise _unreadable(words, position, "a product sign has nothing before it")
            expects, position = True, position + 1
            continue
        if word["number"]:
            if factors:
                raise _unreadable(words, position, "a number stands after a factor")
            coefficient *= float(word["number"])
        elif word["pauli"]:
            x, z = _times(words, position, x, z)
        factors, expects, position = factors + 1, False, position + 1
    if expects:
        raise _unreadable(words, position, "a sign has nothing after it")
    if not isfinite(coefficient):
        raise _unreadable(words, position - 1, "the coefficient is not finite")
    return (coefficient, x, z), position


def _times(words: list[re.Match[str]], position: int, x: int, z: int) -> tuple[int, int]:
    letter, digits = words[position]["pauli"].upper(), words[position]["qubit"]
    if len(digits) > 4 or int(digits) >= MAX_QUBITS:
        raise _unreadable(words, position, f"qubits are numbered from 0 to {MAX_QUBITS - 1}")
    bit = 1 << int(digits)
    if (x | z) & bit:
        raise _unreadable(words, position, f"qubit {int(digits)} stands twice in one term")
    return x | (bit if letter in "XY" else 0), z | (bit if letter in "YZ" else 0)


def _unreadable(words: list[re.Match[str]], position: int, why: str) -> StudyError:
    place = f" at '{words[position].group()}' (sign {words[position].start() + 1})" if position < len(words) else " at its end"
    return StudyError(f"The Pauli list cannot be read{place}", why, _FIX, "model.terms")
