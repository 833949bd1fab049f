"""Sites and bonds as read-only data, with what drawing, models and the exact solver need to know of them."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from thalweg.arrays import FloatArray, IntArray

#: The one class of bonds that only models with a second coupling use; every other class is of the first kind.
SECOND = "second"


@dataclass(frozen=True)
class Bond:
    """One bond. `weight` multiplies the model's coupling; `wraps` tells drawing that it leaves through an edge."""

    first: int
    second: int
    kind: str = "nearest"
    weight: float = 1.0
    wraps: bool = False


@dataclass(frozen=True)
class LatticeGraph:
    """A finite lattice.

    Attributes:
        name: for labels, e.g. `ring of 12 sites`.
        coordinates: positions, shape (n, 2), in units of the nearest distance; structure factors use these.
        bonds: each pair once for each class, first < second.
        sublattice: index of each site's sublattice, shape (n,).
        notes, second_notes: sentences on what is counted (doubled bonds, bonds left out), first-kind and second-neighbour bonds.
        translations: site permutations that generate the lattice translations; site i moves to entry i.
        drawing: positions for a picture, shape (n, 2); a ring lies on a circle.
        torus: rows are the vectors after which the lattice repeats, shape (2, 2), zero where it is open.
        site_names: names typed by the person, empty when sites are numbered.
    """

    name: str
    coordinates: FloatArray
    bonds: tuple[Bond, ...]
    sublattice: IntArray
    notes: tuple[str, ...]
    translations: tuple[tuple[int, ...], ...]
    drawing: FloatArray
    torus: FloatArray
    site_names: tuple[str, ...] = ()
    second_notes: tuple[str, ...] = ()

    @property
    def n_sites(self) -> int:
        return int(self.coordinates.shape[0])

    @property
    def first_bonds(self) -> tuple[Bond, ...]:
        """The bonds that every model couples: all but those of class `second`."""
        return tuple(b for b in self.bonds if b.kind != SECOND)

    @property
    def second_bonds(self) -> tuple[Bond, ...]:
        return tuple(b for b in self.bonds if b.kind == SECOND)

    def bonds_per_class(self) -> dict[str, int]:
        """Class name -> number of bonds, in order of first appearance."""
        return dict(Counter(b.kind for b in self.bonds))

    def site_name(self, site: int) -> str:
        return self.site_names[site] if self.site_names else str(site)


class Lattice(Protocol):
    """What a model needs of the settings of a lattice."""

    def build(self) -> LatticeGraph: ...


def unconnected(count: int, name: str, site_names: tuple[str, ...] = ()) -> LatticeGraph:
    """Sites on a circle without bonds."""
    places = on_circle(count)
    return LatticeGraph(name, places, (), np.zeros(count, dtype=np.int64), (), (), places, np.zeros((2, 2)), site_names)


def on_circle(count: int) -> FloatArray:
    """Positions on a circle with neighbours one unit apart, shape (count, 2)."""
    angle = 2 * np.pi * np.arange(count) / max(count, 1)
    radius = 0.5 / np.sin(np.pi / count) if count > 1 else 0.0
    return radius * np.stack([np.sin(angle), np.cos(angle)], axis=1)


def two_colouring(graph: LatticeGraph) -> IntArray | None:
    """0 or 1 for each site so that every first-kind bond joins unlike colours; None when the lattice is frustrated."""
    neighbours = _neighbours(graph)
    colour = np.full(graph.n_sites, -1, dtype=np.int64)
    for root in range(graph.n_sites):
        if colour[root] >= 0:
            continue
        colour[root], waiting = 0, [root]
        while waiting:
            site = waiting.pop()
            for other in neighbours[site]:
                if colour[other] == colour[site]:
                    return None
                if colour[other] < 0:
                    colour[other] = 1 - colour[site]
                    waiting.append(other)
    return colour


def pairing(graph: LatticeGraph, max_steps: int = 200_000) -> tuple[tuple[int, int], ...] | None:
    """Pairs of bonded sites that cover the lattice (a dimer covering); None when none is found.

    Bonds of class `dimer` are tried first, then stronger before weaker ones. The search backtracks and gives up
    after `max_steps` placements, which only contrived graphs of this size need.
    """
    if graph.n_sites % 2:
        return None
    order: list[list[int]] = [[] for _ in range(graph.n_sites)]
    for bond in sorted(graph.first_bonds, key=lambda b: (b.kind != "dimer", -abs(b.weight))):
        order[bond.first].append(bond.second)
        order[bond.second].append(bond.first)
    partner: dict[int, int] = {}
    trail: list[tuple[int, int]] = []  # site placed, next choice to try for it
    site, choice = 0, 0
    for _ in range(max_steps):
        while choice < len(order[site]) and order[site][choice] in partner:
            choice += 1
        if choice < len(order[site]):
            other = order[site][choice]
            partner[site], partner[other] = other, site
            trail.append((site, choice + 1))
            if len(partner) == graph.n_sites:
                return tuple((a, partner[a]) for a, _ in trail)
            site, choice = min(set(range(graph.n_sites)) - set(partner)), 0
        elif trail:
            site, choice = trail.pop()
            del partner[partner.pop(site)]
        else:
            return None
    return None


def _neighbours(graph: LatticeGraph) -> list[list[int]]:
    found: list[list[int]] = [[] for _ in range(graph.n_sites)]
    for bond in graph.first_bonds:
        found[bond.first].append(bond.second)
        found[bond.second].append(bond.first)
    return found
