"""Product and dimer states that a spin model's circuit starts from, as data, and their energies."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion
from thalweg.systems.lattice_graph import LatticeGraph, pairing, two_colouring

ReferenceChoice = Literal["auto", "up", "neel", "plus", "singlets", "bits"]


@dataclass(frozen=True)
class SpinReference:
    """kind `bits`: the basis state `bits` (bit q = 1: spin down on site q); `plus`: every site in |+>;
    `singlets`: (|01> - |10>) / sqrt 2 on each pair, bits unused.
    """

    name: str
    kind: str
    bits: int = 0
    pairs: tuple[tuple[int, int], ...] = ()

    def energy(self, expansion: PauliExpansion) -> float:
        """<reference|H|reference>, exact."""
        x, z, c = expansion.x, expansion.z, expansion.coefficients
        if self.kind == "plus":
            return float(c[z == 0].sum())
        if self.kind == "singlets":
            return float(np.dot(c, self._singlet_values(x, z)))
        flipped = np.bitwise_count(z & np.uint64(self.bits)) % 2
        return float(np.where(x == 0, np.where(flipped == 1, -c, c), 0.0).sum())

    def _singlet_values(self, x: np.ndarray, z: np.ndarray) -> np.ndarray:
        """<P> of each string: a pair gives 1 for no Pauli, -1 for equal Paulis, 0 otherwise."""
        value = np.ones(x.size)
        for a, b in self.pairs:
            ax, az, bx, bz = ((mask >> np.uint64(q)) & np.uint64(1) for q in (a, b) for mask in (x, z))
            value *= np.where((ax == bx) & (az == bz), np.where((ax | az) == 1, -1.0, 1.0), 0.0)
        return value


def choose_reference(choice: ReferenceChoice, typed: str, usual: str, graph: LatticeGraph) -> SpinReference:
    """The state asked for; `auto` takes the model's usual one, and alternate sites where a lattice has no Neel state."""
    if choice == "auto":
        colour = two_colouring(graph)
        if usual == "neel" and colour is None:
            return _bits_state(sum(1 << q for q in range(1, graph.n_sites, 2)), graph.n_sites)
        choice = "neel" if usual == "neel" else "plus" if usual == "plus" else "up"
    if choice == "up":
        return SpinReference("all up", "bits")
    if choice == "plus":
        return SpinReference("all plus", "plus")
    if choice == "neel":
        return SpinReference("Neel state", "bits", _neel_bits(graph))
    if choice == "singlets":
        return SpinReference("dimer singlets", "singlets", pairs=_pairs(graph))
    return _bits_state(parse_bits(typed, graph.n_sites), graph.n_sites)


def parse_bits(text: str, count: int) -> int:
    """`0110` -> mask; the leftmost sign belongs to site 0, `1` is spin down. Blanks are passed over."""
    signs = "".join(text.split())
    if len(signs) != count or set(signs) - {"0", "1"}:
        raise StudyError(
            "The bit string does not fit", f"'{text[:40]}' is not {count} signs 0 or 1", "Write one sign for each site, site 0 first", "bits"
        )
    return sum(1 << q for q, sign in enumerate(signs) if sign == "1")


def bit_text(bits: int, count: int) -> str:
    """The inverse of `parse_bits`: site 0 first."""
    return "".join(str(bits >> q & 1) for q in range(count))


def _bits_state(bits: int, count: int) -> SpinReference:
    return SpinReference(f"basis state {bit_text(bits, count)}", "bits", bits)


def _neel_bits(graph: LatticeGraph) -> int:
    colour = two_colouring(graph)
    if colour is None:
        raise StudyError(
            "There is no Neel state", f"{graph.name} has loops of odd length", "Choose another reference, such as a bit string", "reference"
        )
    return sum(1 << q for q, c in enumerate(colour.tolist()) if c)


def _pairs(graph: LatticeGraph) -> tuple[tuple[int, int], ...]:
    found = pairing(graph)
    if found is None:
        raise StudyError(
            "There is no dimer state", f"the sites of {graph.name} cannot all be paired along bonds", "Choose another reference", "reference"
        )
    return found
