"""What every path offers, and the helpers that geometric paths share."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.options import Options
from thalweg.study.spec import StudySpec
from thalweg.systems.geometry import bonds
from thalweg.systems.molecule import Molecule


class ScanPath(Options):
    """A one-dimensional family of studies. Values are in `unit(spec)`."""

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        """The study at one value of the coordinate. StudyError where the path does not fit the system."""
        raise AssertionError(f"{type(self).__name__} defines no at")

    def unit(self, spec: StudySpec) -> str:
        """Unit of the coordinate, `` where it has none."""
        return ""

    def axis(self, spec: StudySpec) -> str:
        """Axis title without the unit."""
        return self.title

    @property
    def is_distance(self) -> bool:
        """True where the coordinate is a length, so that the curve is that of a bond."""
        return False

    @property
    def has_equilibrium(self) -> bool:
        """True where the coordinate is one of the geometry, so that a minimum is an equilibrium."""
        return True


def molecule_of(spec: StudySpec, path: str) -> Molecule:
    """The molecule of the study; StudyError for other systems."""
    if isinstance(spec.system, Molecule):
        return spec.system
    raise StudyError(f"A path along {path} needs a geometry", "this system has no atoms", "Open a molecule, or vary a setting instead", "path")


def check_atoms(molecule: Molecule, numbers: Sequence[int]) -> tuple[int, ...]:
    """Zero-based indices of atoms counted from 1; StudyError when one does not exist or repeats."""
    count = len(molecule.atoms)
    for number in numbers:
        if not 1 <= number <= count:
            raise StudyError(f"There is no atom {number}", f"the molecule has atoms 1 to {count}", "Choose among them", "path")
    if len(set(numbers)) != len(numbers):
        raise StudyError("An atom is named twice", "a path needs different atoms", "Choose different atoms", "path")
    return tuple(number - 1 for number in numbers)


def positions_of(molecule: Molecule) -> FloatArray:
    """Coordinates in the molecule's own unit, shape (atoms, 3)."""
    return np.array([atom[1:] for atom in molecule.atoms], float)


def bond_graph(molecule: Molecule) -> list[tuple[int, int]]:
    """Bonds by covalent radii, zero-based."""
    return list(bonds(molecule.atoms, molecule.unit))


def with_positions(spec: StudySpec, positions: FloatArray) -> StudySpec:
    """The study with the atoms moved. Coordinates are rounded to 1e-10 so that equal points are equal specs."""
    molecule = molecule_of(spec, "a geometry")
    rounded = np.round(positions, 10) + 0.0  # + 0.0 turns -0.0 into 0.0
    atoms = tuple((atom[0], *map(float, row)) for atom, row in zip(molecule.atoms, rounded, strict=True))
    return spec.model_copy(update={"system": molecule.model_copy(update={"atoms": atoms})})
