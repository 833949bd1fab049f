"""Turning a dihedral of four atoms."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import option
from thalweg.study.path.base import ScanPath, bond_graph, check_atoms, molecule_of, positions_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems.displacement import moving_fragment, set_dihedral


class DihedralPath(ScanPath):
    title: ClassVar[str] = "Dihedral"
    about: ClassVar[str] = "The torsion angle of four atoms; the fragment beyond the middle bond turns."

    key: Literal["dihedral"] = "dihedral"
    first: int = option(1, "First atom", "Number of the first atom, counted from 1.", ge=1)
    second: int = option(2, "Second atom", "Number of the second atom: one end of the axis.", ge=1)
    third: int = option(3, "Third atom", "Number of the third atom: the other end of the axis.", ge=1)
    fourth: int = option(4, "Fourth atom", "Number of the atom that turns.", ge=1)

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule = molecule_of(spec, "a dihedral")
        i, j, k, m = check_atoms(molecule, (self.first, self.second, self.third, self.fourth))
        fragment = moving_fragment(len(molecule.atoms), bond_graph(molecule), j, k)
        return with_positions(spec, set_dihedral(positions_of(molecule), i, j, k, m, value, fragment))

    def unit(self, spec: StudySpec) -> str:
        return "degree"

    def axis(self, spec: StudySpec) -> str:
        return f"Dihedral {self.first}-{self.second}-{self.third}-{self.fourth}"
