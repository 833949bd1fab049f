"""Atoms in space: units, distances, bonds for the picture, and doubts about a geometry.

`Atoms` is a tuple of (symbol, x, y, z) in a declared unit, `angstrom` or `bohr`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.systems.elements import Element, find_element
from thalweg.units import BOHR_IN_ANGSTROM, LENGTH_UNITS

Atoms = tuple[tuple[str, float, float, float], ...]

MAX_ATOMS = 1000
#: Nearer than this (angstrom) counts as one spot.
_SAME_SPOT = 0.05
#: Nearer than this (angstrom) is shorter than any bond; H2 has 0.74.
_SHORT = 0.5
#: Tolerance on the sum of covalent radii below which a bond is drawn, angstrom (common practice).
_BOND_SLACK = 0.4


@dataclass(frozen=True)
class ShortestDistance:
    """The nearest pair of atoms, counted from 0."""

    first: int
    second: int
    bohr: float

    @property
    def angstrom(self) -> float:
        return self.bohr * BOHR_IN_ANGSTROM


def coordinates_in_bohr(atoms: Atoms, unit: str) -> FloatArray:
    """Cartesian coordinates, shape (atoms, 3), bohr."""
    values = np.array([atom[1:] for atom in atoms], dtype=float).reshape(-1, 3)
    return values / length_unit(unit)


def length_unit(unit: str) -> float:
    """How many of this unit make one bohr; StudyError on an unknown unit."""
    if unit not in LENGTH_UNITS:
        raise StudyError(f"Unknown length unit '{unit}'", "coordinates are read in angstrom or bohr", "Use angstrom or bohr", "system.unit")
    return LENGTH_UNITS[unit]


def elements_of(atoms: Atoms) -> tuple[Element, ...]:
    """The element of each atom; StudyError naming the first atom that is none."""
    found = []
    for number, atom in enumerate(atoms, start=1):
        element = find_element(atom[0])
        if element is None:
            raise StudyError(
                f"Atom {number} has the unknown element '{atom[0][:20]}'",
                "it is neither a symbol, nor a name, nor an atomic number from 1 to 118",
                "Write the element as in the periodic table, e.g. Li",
                "system.atoms",
            )
        found.append(element)
    return tuple(found)


def distances(atoms: Atoms, unit: str) -> FloatArray:
    """All distances, shape (atoms, atoms), bohr."""
    xyz = coordinates_in_bohr(atoms, unit)
    return np.asarray(np.linalg.norm(xyz[:, None, :] - xyz[None, :, :], axis=-1))


def shortest_distance(atoms: Atoms, unit: str) -> ShortestDistance | None:
    """The nearest pair; None for fewer than two atoms."""
    if len(atoms) < 2:
        return None
    table = distances(atoms, unit)
    table[np.tril_indices(len(atoms))] = np.inf
    first, second = divmod(int(np.argmin(table)), len(atoms))
    return ShortestDistance(first, second, float(table[first, second]))


def describe_shortest(atoms: Atoms, unit: str) -> str:
    """`Shortest distance 1.5957 angstrom = 3.0154 bohr (Li 1 - H 2)`; empty for fewer than two atoms."""
    pair = shortest_distance(atoms, unit)
    if pair is None:
        return ""
    names = f"{atoms[pair.first][0]} {pair.first + 1} - {atoms[pair.second][0]} {pair.second + 1}"
    return f"Shortest distance {pair.angstrom:.4f} angstrom = {pair.bohr:.4f} bohr ({names})"


def bonds(atoms: Atoms, unit: str) -> tuple[tuple[int, int], ...]:
    """Pairs of atoms to join in a picture: nearer than the sum of their covalent radii plus 0.4 angstrom (common practice)."""
    if len(atoms) < 2:
        return ()
    limit = (_radius_sums(atoms) + _BOND_SLACK) / BOHR_IN_ANGSTROM
    near = np.triu(distances(atoms, unit) < limit, k=1)
    return tuple((int(i), int(j)) for i, j in np.argwhere(near))


def check_geometry(atoms: Atoms, unit: str) -> None:
    """StudyError when nothing can be computed: no atoms, too many, an unknown element, two atoms on one spot."""
    if not atoms:
        raise StudyError("There are no atoms", "a molecule needs at least one", "Load a geometry or add atoms to the table", "system.atoms")
    if len(atoms) > MAX_ATOMS:
        raise StudyError(
            f"There are {len(atoms)} atoms", f"more than {MAX_ATOMS} are far beyond what can be computed here", "Study a smaller part", "system.atoms"
        )
    elements_of(atoms)
    pair = shortest_distance(atoms, unit)
    if pair is not None and pair.angstrom < _SAME_SPOT:
        raise StudyError(
            f"Atoms {pair.first + 1} and {pair.second + 1} are on one spot",
            f"they are {pair.angstrom:.2g} angstrom apart",
            "Move one of them or delete the double",
            "system.atoms",
        )


def short_distance_doubt(atoms: Atoms, unit: str) -> str:
    """A sentence when the nearest atoms are nearer than any bond; empty otherwise."""
    pair = shortest_distance(atoms, unit)
    if pair is None:
        return ""
    ratio = _nearest_ratio(atoms, unit)
    if unit == "bohr" and ratio < 0.68:
        return f"{describe_shortest(atoms, unit)} is shorter than a bond: were angstrom given as bohr?"
    if pair.angstrom < _SHORT:
        return f"{describe_shortest(atoms, unit)} is shorter than any bond"
    return ""


def unit_doubt(atoms: Atoms, unit: str) -> str:
    """As `short_distance_doubt`, and also a sentence when lengths declared as angstrom would be common bond lengths in bohr."""
    if unit == "angstrom" and len(atoms) > 1:
        pair = shortest_distance(atoms, unit)
        assert pair is not None
        hydrogen = atoms[pair.first][0] == atoms[pair.second][0] == "H"
        # H2 has 1.2 times its covalent radii, other bonds 0.75 to 1.1 times
        low, high = (1.1, 1.25) if hydrogen else (0.75, 1.1)
        ratio = _nearest_ratio(atoms, unit)
        if ratio > 1.41 and low < ratio * BOHR_IN_ANGSTROM < high:
            return f"{describe_shortest(atoms, unit)} is long for a bond: were bohr given as angstrom?"
    return short_distance_doubt(atoms, unit)


def _nearest_ratio(atoms: Atoms, unit: str) -> float:
    """Smallest distance in units of the pair's covalent radii; 1 where there is no pair."""
    if len(atoms) < 2:
        return 1.0
    ratio = distances(atoms, unit) * BOHR_IN_ANGSTROM / _radius_sums(atoms)
    return float(np.min(ratio[np.triu_indices(len(atoms), k=1)]))


def _radius_sums(atoms: Atoms) -> FloatArray:
    radii = np.array([element.covalent_radius or 1.5 for element in elements_of(atoms)])
    return radii[:, None] + radii[None, :]
