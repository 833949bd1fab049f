"""Tiling the plane: a unit cell repeated over columns and rows, open or closed to a cylinder or (twisted) torus."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.systems.lattice_graph import SECOND, Bond, LatticeGraph

#: From basis site `first` to basis site `second` of the cell (right, up) away.
Link = tuple[int, int, int, int, str, float]


@dataclass(frozen=True)
class UnitCell:
    """vectors: rows a1 and a2, shape (2, 2); positions: basis sites, shape (b, 2); links: (first, second, right, up, class, weight).

    colour: sublattice index from (column, row, basis site).
    """

    vectors: FloatArray
    positions: FloatArray
    links: tuple[Link, ...]
    colour: Callable[[int, int, int], int]


@dataclass(frozen=True)
class Patch:
    """How many cells, and how the edges meet: going up by `rows` also moves `shift` columns to the right."""

    columns: int
    rows: int
    periodic_x: bool
    periodic_y: bool
    shift: int = 0

    def cell(self, column: int, row: int) -> int | None:
        """Number of the cell at this place after folding; None beyond an open edge."""
        if self.periodic_y:
            turns = row // self.rows
            column, row = column - turns * self.shift, row - turns * self.rows
        if self.periodic_x:
            column %= self.columns
        inside = 0 <= column < self.columns and 0 <= row < self.rows
        return row * self.columns + column if inside else None


def shell_links(vectors: FloatArray, positions: FloatArray, shell: int, kind: str) -> tuple[Link, ...]:
    """All links at the `shell`-th smallest distance (1 = nearest), each once.

    Of a link and its reverse the one with the displacement in the upper half plane is kept.
    """
    found = []
    for first in range(len(positions)):
        for second in range(len(positions)):
            for right in range(-3, 4):
                for up in range(-3, 4):
                    step = positions[second] - positions[first] + right * vectors[0] + up * vectors[1]
                    if step[1] > 1e-9 or (abs(step[1]) <= 1e-9 and step[0] > 1e-9):
                        found.append((round(float(np.hypot(*step)), 6), (first, second, right, up, kind, 1.0)))
    distance = sorted({d for d, _ in found})[shell - 1]
    return tuple(link for d, link in found if d == distance)


def tile(name: str, cell: UnitCell, patch: Patch, doubled_once: bool) -> LatticeGraph:
    """The lattice made of the cells of `patch`. Site number = cell number times basis size + basis site."""
    basis = len(cell.positions)
    places = [(c, r) for r in range(patch.rows) for c in range(patch.columns)]
    coordinates = np.array([cell.positions[b] + c * cell.vectors[0] + r * cell.vectors[1] for c, r in places for b in range(basis)])
    colours = np.array([cell.colour(c, r, b) for c, r in places for b in range(basis)], dtype=np.int64)
    raw = _raw_bonds(cell, patch, places)
    first, notes = _merged([b for b in raw if b.kind != SECOND], doubled_once)
    second, second_notes = _merged([b for b in raw if b.kind == SECOND], doubled_once)
    translations = _translations(patch, places, basis)
    torus = np.zeros((2, 2))
    if patch.periodic_x:
        torus[0] = patch.columns * cell.vectors[0]
    if patch.periodic_y:
        torus[1] = patch.rows * cell.vectors[1] + patch.shift * cell.vectors[0]
    return LatticeGraph(name, coordinates, first + second, colours, notes, translations, coordinates, torus, second_notes=second_notes)


def _raw_bonds(cell: UnitCell, patch: Patch, places: list[tuple[int, int]]) -> list[Bond]:
    basis, bonds = len(cell.positions), []
    for here, (column, row) in enumerate(places):
        for first, second, right, up, kind, weight in cell.links:
            there = patch.cell(column + right, row + up)
            if there is None:
                continue
            folded = there != (row + up) * patch.columns + column + right or not 0 <= column + right < patch.columns
            a, b = sorted((here * basis + first, there * basis + second))
            bonds.append(Bond(a, b, kind, weight, folded))
    return bonds


def _merged(bonds: list[Bond], once: bool) -> tuple[tuple[Bond, ...], tuple[str, ...]]:
    """Equal pairs of one class become one bond; notes say how often it counts and what was left out."""
    kept: dict[tuple[int, int, str], Bond] = {}
    repeated: dict[str, int] = {}
    loops: dict[str, int] = {}
    for bond in bonds:
        key = (bond.first, bond.second, bond.kind)
        if bond.first == bond.second:
            loops[bond.kind] = loops.get(bond.kind, 0) + 1
        elif key in kept:
            repeated[bond.kind] = repeated.get(bond.kind, 0) + 1
            weight = kept[key].weight if once else kept[key].weight + bond.weight
            kept[key] = Bond(*key, weight, kept[key].wraps and bond.wraps)
        else:
            kept[key] = bond
    notes = [
        f"Small periodic lattice: {_some(count, kind)} a pair of sites that is already bonded; such a pair counts "
        + ("once" if once else "as often as it is met (its weight is the sum)")
        for kind, count in repeated.items()
    ]
    notes += [f"Small periodic lattice: {_some(count, kind)} a site to itself and {_is(count)} left out" for kind, count in loops.items()]
    return tuple(sorted(kept.values(), key=lambda b: (b.kind, b.first, b.second))), tuple(notes)


def _some(count: int, kind: str) -> str:
    return f"{count} bond of class {kind} joins" if count == 1 else f"{count} bonds of class {kind} join"


def _is(count: int) -> str:
    return "is" if count == 1 else "are"


def _translations(patch: Patch, places: list[tuple[int, int]], basis: int) -> tuple[tuple[int, ...], ...]:
    steps = [(1, 0)] * (patch.periodic_x and patch.columns > 1) + [(0, 1)] * (patch.periodic_y and patch.rows > 1)
    found = []
    for right, up in steps:
        cells = [patch.cell(c + right, r + up) for c, r in places]
        found.append(tuple(there * basis + b for there in cells if there is not None for b in range(basis)))
    return tuple(found)
