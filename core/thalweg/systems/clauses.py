"""Discrete optimisation as a diagonal cost: weighted cuts of a graph, and weighted clauses."""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import combinations
from math import isfinite
from typing import ClassVar, Literal

from thalweg.errors import StudyError
from thalweg.operators.pauli import MAX_QUBITS, PauliExpansion
from thalweg.options import option
from thalweg.systems.lattice_graph import Lattice, LatticeGraph, unconnected
from thalweg.systems.spin_model import SpinModel, need_bonds
from thalweg.systems.spin_terms import SpinTerms

MAX_LITERALS = 12  # a clause of k literals becomes 2^k strings


class WeightedCut(SpinModel):
    title: ClassVar[str] = "Weighted cut"
    about: ClassVar[str] = "Split the sites in two so that the bonds between the parts weigh most; the energy is minus the weight cut."
    usual_reference: ClassVar[str] = "plus"
    unit_name: ClassVar[str] = "units of weight"

    key: Literal["cut"] = "cut"

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        need_bonds(graph)
        terms = SpinTerms(graph.n_sites)
        for bond in graph.first_bonds:
            terms.add(-0.5 * bond.weight, 0, 0)
            terms.pair("Z", bond.first, bond.second, 0.5 * bond.weight)
        return terms.expansion()

    def convention(self) -> str:
        return "H = -sum_<ij> w_ij (1 - Z_i Z_j) / 2: minus the weight of the bonds cut; bit 0 and bit 1 are the two parts"

    def assignment(self, bits: int, graph: LatticeGraph) -> str:
        """`cut of weight 7 | part 0: a, c | part 1: b, d`."""
        weight = sum(b.weight for b in graph.first_bonds if (bits >> b.first ^ bits >> b.second) & 1)
        parts = [", ".join(graph.site_name(q) for q in range(graph.n_sites) if bits >> q & 1 == side) or "none" for side in (0, 1)]
        return f"cut of weight {weight:.12g} | part 0: {parts[0]} | part 1: {parts[1]}"


class Clauses(SpinModel):
    title: ClassVar[str] = "Clauses"
    about: ClassVar[str] = "Wishes such as `a or not b`, with weights; the energy is the weight of the wishes left unmet."
    usual_reference: ClassVar[str] = "plus"
    unit_name: ClassVar[str] = "units of weight"

    key: Literal["clauses"] = "clauses"
    clauses: str = option(
        "a or not b\nb or c : 2\nnot a or not c", "Clauses", "One clause a line, names joined by `or`, `not` before a name, a weight after a colon."
    )

    def graph(self, lattice: Lattice) -> LatticeGraph:
        """One free site for each name, in the order in which the names appear; the lattice is not used."""
        names = clause_names(parse_clauses(self.clauses))
        return unconnected(len(names), f"{len(names)} variables", names)

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        number = {graph.site_name(q): q for q in range(graph.n_sites)}
        terms = SpinTerms(graph.n_sites)
        for clause in parse_clauses(self.clauses):
            _add_unmet(terms, [(number[name], negated) for name, negated in clause.literals], clause.weight)
        return terms.expansion()

    def convention(self) -> str:
        return "H = sum over clauses of the weight of those unmet; bit 1 (Z = -1) is true"

    def assignment(self, bits: int, graph: LatticeGraph) -> str:
        """`a = true, b = false | unmet: not a or not c (weight 1)`."""
        value = {graph.site_name(q): bool(bits >> q & 1) for q in range(graph.n_sites)}
        words = ", ".join(f"{name} = {'true' if is_true else 'false'}" for name, is_true in value.items())
        unmet = [c for c in parse_clauses(self.clauses) if not any(value[name] != negated for name, negated in c.literals)]
        listed = "; ".join(f"{c.words()} (weight {c.weight:.12g})" for c in unmet)
        return f"{words} | {'unmet: ' + listed if unmet else 'every clause is met'}"


@dataclass(frozen=True)
class Clause:
    """Literals (name, negated) joined by or."""

    literals: tuple[tuple[str, bool], ...]
    weight: float = 1.0

    def words(self) -> str:
        return " or ".join(("not " if negated else "") + name for name, negated in self.literals)


def parse_clauses(text: str) -> tuple[Clause, ...]:
    """Reads one clause a line; `#` begins a comment. Raises StudyError naming the line."""
    found = []
    for number, line in enumerate(text.splitlines(), start=1):
        body = line.split("#", 1)[0].strip()
        if body:
            found.append(_clause(body, number))
    if not found:
        raise StudyError("There are no clauses", "the list is empty", "Write one clause a line, such as `a or not b`", "model.clauses")
    return tuple(found)


def clause_names(clauses: tuple[Clause, ...]) -> tuple[str, ...]:
    """The variables in order of first appearance; StudyError when there are too many for a register."""
    names = tuple(dict.fromkeys(name for clause in clauses for name, _ in clause.literals))
    if len(names) > MAX_QUBITS:
        raise StudyError("There are too many variables", f"{len(names)} names need more than {MAX_QUBITS} qubits", "Use fewer names", "model.clauses")
    return names


def _clause(body: str, line: int) -> Clause:
    fix = "Write names joined by `or`, with `not` before a name and a weight after a colon, such as `a or not b : 2`"
    words, colon, weight_text = body.partition(":")
    try:
        weight = float(weight_text) if colon else 1.0
    except ValueError:
        raise StudyError(f"Clause {line} cannot be read", f"the weight '{weight_text.strip()[:20]}' is not a number", fix, "model.clauses") from None
    if not isfinite(weight) or weight < 0:
        raise StudyError(f"Clause {line} cannot be read", f"the weight {weight:g} is not a finite number from 0 up", fix, "model.clauses")
    literals = []
    for part in re.split(r"\s+or\s+", words.strip(), flags=re.IGNORECASE):
        match = re.fullmatch(r"(not\s+)?([^\W\d]\w*)", part.strip(), flags=re.IGNORECASE)
        if match is None or match[2].lower() in ("or", "not"):
            raise StudyError(f"Clause {line} cannot be read", f"'{part.strip()[:30]}' is not a name, or `not` and a name", fix, "model.clauses")
        literals.append((match[2], bool(match[1])))
    kept = tuple(dict.fromkeys(literals))
    if len(kept) > MAX_LITERALS:
        raise StudyError(
            f"Clause {line} is too long", f"it has {len(kept)} names, and {MAX_LITERALS} are the most", "Split the clause", "model.clauses"
        )
    return Clause(kept, weight)


def _add_unmet(terms: SpinTerms, literals: list[tuple[int, bool]], weight: float) -> None:
    """Adds weight times the projector on `every literal false`: prod (1 + s_l Z) / 2, s = +1 for a plain name, -1 under `not`.

    A name beside its own negation makes the clause always true: it adds nothing.
    """
    if len({q for q, _ in literals}) < len(literals):
        return
    share = weight / 2 ** len(literals)
    for size in range(len(literals) + 1):
        for chosen in combinations(literals, size):
            sign = -1.0 if sum(negated for _, negated in chosen) % 2 else 1.0
            terms.add(sign * share, 0, sum(1 << q for q, _ in chosen))
