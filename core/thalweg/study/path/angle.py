"""Opening an angle of three atoms."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import option
from thalweg.study.path.base import ScanPath, bond_graph, check_atoms, molecule_of, positions_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems.displacement import moving_fragment, set_angle


class AnglePath(ScanPath):
    title: ClassVar[str] = "Angle"
    about: ClassVar[str] = "The angle at the middle atom; the third atom's fragment turns."

    key: Literal["angle"] = "angle"
    first: int = option(1, "First atom", "Number of the atom that stays, counted from 1.", ge=1)
    vertex: int = option(2, "Middle atom", "Number of the atom at the vertex.", ge=1)
    last: int = option(3, "Third atom", "Number of the atom that turns.", ge=1)

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule = molecule_of(spec, "an angle")
        i, j, k = check_atoms(molecule, (self.first, self.vertex, self.last))
        fragment = moving_fragment(len(molecule.atoms), bond_graph(molecule), j, k)
        return with_positions(spec, set_angle(positions_of(molecule), i, j, k, value, fragment))

    def unit(self, spec: StudySpec) -> str:
        return "degree"

    def axis(self, spec: StudySpec) -> str:
        return f"Angle {self.first}-{self.vertex}-{self.last}"
