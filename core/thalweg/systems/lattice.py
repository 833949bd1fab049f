"""Lattices to choose from: one options class each, with `build() -> LatticeGraph`."""

from __future__ import annotations

from dataclasses import replace
from typing import Annotated, ClassVar, Literal

import numpy as np
from pydantic import Field

from thalweg.errors import StudyError
from thalweg.options import Options, option
from thalweg.registry import Alternatives
from thalweg.systems.bond_list import BondList
from thalweg.systems.lattice_cells import Link, Patch, UnitCell, shell_links, tile
from thalweg.systems.lattice_graph import LatticeGraph, on_circle, unconnected

_HALF = np.sqrt(3.0) / 2.0
_SQUARE = np.eye(2)
_TRIANGULAR = np.array([[1.0, 0.0], [0.5, _HALF]])
MAX_LENGTH = 1000

Doubled = Literal["each", "once"]
_DOUBLED_HELP = "Where a periodic lattice is so small that a pair is bonded more than once: count the pair `each` time it is met, or `once`."


class _Repeating(Options):
    doubled: Doubled = option("each", "Doubled bonds", _DOUBLED_HELP, advanced=True)

    def _tile(self, name: str, cell: UnitCell, patch: Patch) -> LatticeGraph:
        return tile(name, cell, patch, self.doubled == "once")


class Chain(_Repeating):
    title: ClassVar[str] = "Chain or ring"
    about: ClassVar[str] = "Sites in a line; periodic, it is a ring. Second neighbours are two steps apart."

    key: Literal["chain"] = "chain"
    sites: int = option(8, "Sites", "Number of sites.", ge=1, le=MAX_LENGTH)
    periodic: bool = option(True, "Periodic", "Join the last site to the first.")

    def build(self) -> LatticeGraph:
        links: tuple[Link, ...] = ((0, 0, 1, 0, "nearest", 1.0), (0, 0, 2, 0, "second", 1.0))
        cell = UnitCell(_SQUARE, np.zeros((1, 2)), links, lambda c, r, b: c % 2)
        kind = "ring" if self.periodic else "open chain"
        graph = self._tile(f"{kind} of {self.sites} sites", cell, Patch(self.sites, 1, self.periodic, False))
        return _as_ring(graph) if self.periodic else graph


class Ladder(_Repeating):
    title: ClassVar[str] = "Ladder"
    about: ClassVar[str] = "Two legs joined by rungs; classes `leg` and `rung`, second neighbours across the diagonals."

    key: Literal["ladder"] = "ladder"
    rungs: int = option(4, "Rungs", "Number of rungs; there are twice as many sites.", ge=1, le=MAX_LENGTH)
    periodic: bool = option(True, "Periodic", "Close the ladder along its legs.")
    rung_weight: float = option(1.0, "Rung weight", "Coupling on the rungs relative to the legs.")

    def build(self) -> LatticeGraph:
        links: tuple[Link, ...] = (
            (0, 0, 1, 0, "leg", 1.0),
            (1, 1, 1, 0, "leg", 1.0),
            (0, 1, 0, 0, "rung", self.rung_weight),
            (0, 1, 1, 0, "second", 1.0),
            (1, 0, 1, 0, "second", 1.0),
        )
        cell = UnitCell(_SQUARE, np.array([[0.0, 0.0], [0.0, 1.0]]), links, lambda c, r, b: (c + b) % 2)
        return self._tile(f"{_edges(self.periodic)} ladder of {self.rungs} rungs", cell, Patch(self.rungs, 1, self.periodic, False))


class _Plane(_Repeating):
    """A lattice of the plane. Tori with tilted edges come from `shift` (every torus has such a form)."""

    columns: int = option(4, "Columns", "Number of unit cells along the first direction.", ge=1, le=MAX_LENGTH)
    rows: int = option(4, "Rows", "Number of unit cells along the second direction.", ge=1, le=MAX_LENGTH)
    periodic_x: bool = option(True, "Periodic along columns", "Join the last column to the first.")
    periodic_y: bool = option(True, "Periodic along rows", "Join the last row to the first.")
    shift: int = option(
        0, "Shift", "Cells by which the last row is moved along the first direction before it joins the first: a tilted torus.", advanced=True
    )

    def _plane(self, kind: str, vectors: np.ndarray, positions: np.ndarray, links: tuple[Link, ...], colour: object) -> LatticeGraph:
        if self.shift and not (self.periodic_x and self.periodic_y):
            raise StudyError(
                "The shift needs a torus",
                "an open edge cannot be joined with a shift",
                "Set the shift to 0, or make both directions periodic",
                "shift",
            )
        if self.columns * self.rows > MAX_LENGTH * 10:
            raise StudyError("The lattice is too large", f"{self.columns} x {self.rows} cells", "Use fewer columns or rows", "columns")
        cell = UnitCell(vectors, positions, links, colour)  # type: ignore[arg-type]
        shift = f", shift {self.shift}" if self.shift else ""
        name = f"{kind} lattice, {self.columns} x {self.rows} cells{shift}, {self._closing()}"
        return self._tile(name, cell, Patch(self.columns, self.rows, self.periodic_x, self.periodic_y, self.shift))

    def _closing(self) -> str:
        if self.periodic_x and self.periodic_y:
            return "torus"
        return "cylinder" if self.periodic_x or self.periodic_y else "open"


class Square(_Plane):
    title: ClassVar[str] = "Square"
    about: ClassVar[str] = "The square lattice; second neighbours across the diagonals."

    key: Literal["square"] = "square"

    def build(self) -> LatticeGraph:
        origin = np.zeros((1, 2))
        links = shell_links(_SQUARE, origin, 1, "nearest") + shell_links(_SQUARE, origin, 2, "second")
        return self._plane("square", _SQUARE, origin, links, lambda c, r, b: (c + r) % 2)


class Triangular(_Plane):
    title: ClassVar[str] = "Triangular"
    about: ClassVar[str] = "Six nearest neighbours, frustrated. The symmetric 12-site torus has 6 columns, 2 rows and shift 2."

    key: Literal["triangular"] = "triangular"

    def build(self) -> LatticeGraph:
        origin = np.zeros((1, 2))
        links = shell_links(_TRIANGULAR, origin, 1, "nearest") + shell_links(_TRIANGULAR, origin, 2, "second")
        return self._plane("triangular", _TRIANGULAR, origin, links, lambda c, r, b: (c - r) % 3)


class Honeycomb(_Plane):
    title: ClassVar[str] = "Honeycomb"
    about: ClassVar[str] = "Three nearest neighbours, whose bonds are of class x, y and z by direction (Kitaev 2006)."

    key: Literal["honeycomb"] = "honeycomb"
    columns: int = option(2, "Columns", "Number of two-site cells along the first direction.", ge=1, le=MAX_LENGTH)
    rows: int = option(2, "Rows", "Number of two-site cells along the second direction.", ge=1, le=MAX_LENGTH)

    def build(self) -> LatticeGraph:
        vectors, positions = np.sqrt(3.0) * _TRIANGULAR, np.array([[0.0, 0.0], [0.0, 1.0]])
        nearest: tuple[Link, ...] = ((0, 1, 0, -1, "x", 1.0), (0, 1, 1, -1, "y", 1.0), (0, 1, 0, 0, "z", 1.0))
        return self._plane("honeycomb", vectors, positions, nearest + shell_links(vectors, positions, 2, "second"), lambda c, r, b: b)


class Kagome(_Plane):
    title: ClassVar[str] = "Kagome"
    about: ClassVar[str] = "Corner-sharing triangles with three sites a cell, strongly frustrated."

    key: Literal["kagome"] = "kagome"
    columns: int = option(2, "Columns", "Number of three-site cells along the first direction.", ge=1, le=MAX_LENGTH)
    rows: int = option(2, "Rows", "Number of three-site cells along the second direction.", ge=1, le=MAX_LENGTH)

    def build(self) -> LatticeGraph:
        vectors, positions = 2.0 * _TRIANGULAR, np.array([[0.0, 0.0], [1.0, 0.0], [0.5, _HALF]])
        links = shell_links(vectors, positions, 1, "nearest") + shell_links(vectors, positions, 2, "second")
        return self._plane("kagome", vectors, positions, links, lambda c, r, b: b)


class ShastrySutherland(_Plane):
    title: ClassVar[str] = "Shastry-Sutherland"
    about: ClassVar[str] = "The square lattice with orthogonal dimers on every second plaquette (Shastry and Sutherland 1981)."

    key: Literal["shastry-sutherland"] = "shastry-sutherland"
    columns: int = option(2, "Columns", "Number of four-site cells along the first direction.", ge=1, le=MAX_LENGTH)
    rows: int = option(2, "Rows", "Number of four-site cells along the second direction.", ge=1, le=MAX_LENGTH)
    dimer_weight: float = option(1.0, "Dimer weight", "Coupling on the dimers relative to the square bonds.")

    def build(self) -> LatticeGraph:
        vectors, positions = 2.0 * _SQUARE, np.array([[0.0, 0.0], [1.0, 0.0], [0.0, 1.0], [1.0, 1.0]])
        dimers: tuple[Link, ...] = ((0, 3, 0, 0, "dimer", self.dimer_weight), (1, 2, 1, -1, "dimer", self.dimer_weight))
        links = shell_links(vectors, positions, 1, "nearest") + dimers
        return self._plane("Shastry-Sutherland", vectors, positions, links, lambda c, r, b: (b % 2 + b // 2) % 2)


class Unconnected(Options):
    title: ClassVar[str] = "Free sites"
    about: ClassVar[str] = "Sites without bonds, for Hamiltonians that bring their own terms."

    key: Literal["sites"] = "sites"
    sites: int = option(0, "Sites", "Number of sites; 0 takes as many as the Hamiltonian acts on.", ge=0, le=MAX_LENGTH)

    def build(self) -> LatticeGraph:
        return unconnected(self.sites, f"{self.sites} free sites")


AnyLattice = Annotated[
    Chain | Ladder | Square | Triangular | Honeycomb | Kagome | ShastrySutherland | BondList | Unconnected, Field(discriminator="key")
]
LATTICES: Alternatives[Options] = Alternatives(
    "lattice", [Chain, Ladder, Square, Triangular, Honeycomb, Kagome, ShastrySutherland, BondList, Unconnected]
)


def _edges(periodic: bool) -> str:
    return "periodic" if periodic else "open"


def _as_ring(graph: LatticeGraph) -> LatticeGraph:
    """Drawn on a circle, where no bond leaves through an edge."""
    return replace(graph, drawing=on_circle(graph.n_sites), bonds=tuple(replace(b, wraps=False) for b in graph.bonds))
