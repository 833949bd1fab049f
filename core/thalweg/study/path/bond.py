"""Stretching one bond; the smaller fragment moves along."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import option
from thalweg.study.path.base import ScanPath, bond_graph, check_atoms, molecule_of, positions_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems.displacement import moving_fragment, set_distance


class BondPath(ScanPath):
    title: ClassVar[str] = "Bond length"
    about: ClassVar[str] = "The distance of two atoms; the smaller of the two fragments moves along the bond."

    key: Literal["bond"] = "bond"
    first: int = option(1, "First atom", "Number of one atom, counted from 1.", ge=1)
    second: int = option(2, "Second atom", "Number of the other atom.", ge=1)

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule = molecule_of(spec, "a bond")
        i, j = check_atoms(molecule, (self.first, self.second))
        graph, count = bond_graph(molecule), len(molecule.atoms)
        ahead, behind = moving_fragment(count, graph, i, j), moving_fragment(count, graph, j, i)
        fixed, moved, fragment = (i, j, ahead) if len(ahead) <= len(behind) else (j, i, behind)
        return with_positions(spec, set_distance(positions_of(molecule), fixed, moved, value, fragment))

    def unit(self, spec: StudySpec) -> str:
        return molecule_of(spec, "a bond").unit

    def axis(self, spec: StudySpec) -> str:
        symbols = [molecule_of(spec, "a bond").atoms[k - 1][0] for k in (self.first, self.second)]
        return f"{symbols[0]}{self.first}-{symbols[1]}{self.second} distance"

    @property
    def is_distance(self) -> bool:
        return True
