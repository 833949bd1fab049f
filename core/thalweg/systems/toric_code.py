"""The toric code: qubits on the edges of a square lattice, stars and plaquettes (Kitaev 2003)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion
from thalweg.options import option
from thalweg.systems.lattice import Square
from thalweg.systems.lattice_cells import Patch
from thalweg.systems.lattice_graph import Lattice, LatticeGraph
from thalweg.systems.spin_model import SpinModel, number
from thalweg.systems.spin_terms import SpinTerms


class ToricCode(SpinModel):
    title: ClassVar[str] = "Toric code"
    about: ClassVar[str] = "Qubits on the edges of a square lattice; stars of X and plaquettes of Z all commute (Kitaev 2003)."
    usual_reference: ClassVar[str] = "up"
    unit_name: ClassVar[str] = "J"

    key: Literal["toric-code"] = "toric-code"
    star: float = option(1.0, "Star coupling Js", "The term -Js sum over vertices of the product of X on their edges.", unit="J")
    plaquette: float = option(1.0, "Plaquette coupling Jp", "The term -Jp sum over squares of the product of Z on their edges.", unit="J")
    field_x: float = option(0.0, "Field hx", "The term -hx sum X.", unit="J")
    field_z: float = option(0.0, "Field hz", "The term -hz sum Z.", unit="J")

    def graph(self, lattice: Lattice) -> LatticeGraph:
        """The qubits, one at the middle of each edge of the square lattice of vertices."""
        return _Edges.of(lattice).graph()

    def hamiltonian(self, lattice: Lattice) -> PauliExpansion:
        edges = _Edges.of(lattice)
        terms = SpinTerms(len(edges.number))
        for star in edges.stars():
            terms.add(-self.star, star, 0)
        for square in edges.plaquettes():
            terms.add(-self.plaquette, 0, square)
        for q in range(terms.n_sites):
            terms.site("X", q, -self.field_x)
            terms.site("Z", q, -self.field_z)
        return terms.expansion()

    def convention(self) -> str:
        values = f"Js = {number(self.star)}, Jp = {number(self.plaquette)}, hx = {number(self.field_x)}, hz = {number(self.field_z)}"
        where = "qubits on the edges of the square lattice of vertices; at an open edge stars lose edges and plaquettes end (smooth boundary)"
        return f"H = -Js sum_v prod X - Jp sum_p prod Z - hx sum X - hz sum Z; {values}; sigma are Pauli matrices; {where}"

    def main_coupling(self) -> float:
        return self.star


@dataclass(frozen=True)
class _Edges:
    """Edge (column, row, 0) runs right from its vertex, (column, row, 1) up; `number` gives its qubit."""

    patch: Patch
    places: tuple[tuple[int, int], ...]
    number: dict[tuple[int, int], int]  # (cell, direction) -> qubit

    @classmethod
    def of(cls, lattice: Lattice) -> _Edges:
        if not isinstance(lattice, Square):
            raise StudyError(
                "The toric code does not fit this lattice", "its qubits sit on the edges of a square lattice", "Choose the square lattice", "lattice"
            )
        lattice.build()  # refuses what no square lattice can be
        patch = Patch(lattice.columns, lattice.rows, lattice.periodic_x, lattice.periodic_y, lattice.shift)
        narrow = (lattice.periodic_x and lattice.columns < 2) or (lattice.periodic_y and lattice.rows < 2)
        if narrow:
            raise StudyError(
                "The toric code does not fit", "a periodic direction of one cell closes an edge on itself", "Use at least 2 cells", "lattice"
            )
        places = tuple((c, r) for r in range(patch.rows) for c in range(patch.columns))
        number: dict[tuple[int, int], int] = {}
        for cell, (c, r) in enumerate(places):
            for direction, there in enumerate((patch.cell(c + 1, r), patch.cell(c, r + 1))):
                if there is not None:
                    number[cell, direction] = len(number)
        if not number:
            raise StudyError("The toric code has no qubit", "a single vertex has no edge", "Use more columns or rows", "lattice")
        return cls(patch, places, number)

    def mask(self, *edges: tuple[int, int, int]) -> int | None:
        """Bits of the edges (column, row, direction) that exist; None when one is beyond an open edge."""
        bits = 0
        for column, row, direction in edges:
            qubit = self._qubit(column, row, direction)
            if qubit is None:
                return None
            bits ^= 1 << qubit
        return bits

    def stars(self) -> list[int]:
        found = []
        for c, r in self.places:
            around = [self.mask(edge) for edge in ((c, r, 0), (c, r, 1), (c - 1, r, 0), (c, r - 1, 1))]
            star = 0
            for bit in around:
                star ^= bit or 0
            found.append(star)
        return found

    def plaquettes(self) -> list[int]:
        around = [self.mask((c, r, 0), (c + 1, r, 1), (c, r + 1, 0), (c, r, 1)) for c, r in self.places]
        return [square for square in around if square is not None]

    def graph(self) -> LatticeGraph:
        ordered = sorted(self.number, key=self.number.__getitem__)
        middle = np.array([(0.5, 0.0), (0.0, 0.5)])
        coordinates = np.array([np.array(self.places[cell]) + middle[direction] for cell, direction in ordered])
        kinds = np.array([direction for _, direction in ordered], dtype=np.int64)
        patch = self.patch
        torus = np.zeros((2, 2))
        if patch.periodic_x:
            torus[0] = patch.columns, 0.0
        if patch.periodic_y:
            torus[1] = patch.shift, patch.rows
        name = f"edges of a square lattice of {patch.columns} x {patch.rows} vertices, {len(ordered)} qubits"
        return LatticeGraph(name, coordinates, (), kinds, (), self._translations(ordered), coordinates, torus)

    def _translations(self, ordered: list[tuple[int, int]]) -> tuple[tuple[int, ...], ...]:
        steps = [(1, 0)] * self.patch.periodic_x + [(0, 1)] * self.patch.periodic_y
        found = []
        for right, up in steps:
            moved = [self._qubit(self.places[cell][0] + right, self.places[cell][1] + up, direction) for cell, direction in ordered]
            found.append(tuple(q for q in moved if q is not None))
        return tuple(found)

    def _qubit(self, column: int, row: int, direction: int) -> int | None:
        cell = self.patch.cell(column, row)
        return None if cell is None else self.number.get((cell, direction))
