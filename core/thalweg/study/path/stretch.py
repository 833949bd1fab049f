"""Stretching several bonds together to one length."""

from __future__ import annotations

import re
from typing import ClassVar, Literal

from thalweg.errors import StudyError
from thalweg.options import option
from thalweg.study.path.base import ScanPath, bond_graph, check_atoms, molecule_of, positions_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems.displacement import beyond_bond, set_distance


class StretchPath(ScanPath):
    title: ClassVar[str] = "Symmetric stretch"
    about: ClassVar[str] = "Several bonds take the same length at once, such as both O-H bonds of water or the spacing of a chain."

    key: Literal["stretch"] = "stretch"
    bonds: str = option("1-2", "Bonds", "Pairs of atom numbers such as `1-2,1-3`; the first atom of a pair stays where the two are equal.")

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule = molecule_of(spec, "a stretch")
        chosen = [check_atoms(molecule, pair) for pair in self.pairs()]
        graph = sorted({*bond_graph(molecule), *(_ordered(pair) for pair in chosen)})
        positions = positions_of(molecule)
        for i, j in chosen:
            fragment = beyond_bond(len(molecule.atoms), graph, i, j)
            if i in fragment:
                raise StudyError("These bonds close a ring", "a ring cannot stretch bond by bond", "Use breathing instead", "path.bonds")
            positions = set_distance(positions, i, j, value, sorted(fragment))
        return with_positions(spec, positions)

    def pairs(self) -> list[tuple[int, int]]:
        """Pairs of atom numbers counted from 1; StudyError when the text cannot be read."""
        pairs = [re.fullmatch(r"\s*(\d+)\s*-\s*(\d+)\s*", part) for part in self.bonds.split(",")]
        if not all(pairs):
            raise StudyError(f"Cannot read the bonds '{self.bonds}'", "pairs of atom numbers are expected", "Write them like 1-2,1-3", "path.bonds")
        return [(int(m[1]), int(m[2])) for m in pairs if m]

    def unit(self, spec: StudySpec) -> str:
        return molecule_of(spec, "a stretch").unit

    def axis(self, spec: StudySpec) -> str:
        return f"Length of bonds {self.bonds}"

    @property
    def is_distance(self) -> bool:
        return True


def _ordered(pair: tuple[int, ...]) -> tuple[int, int]:
    return min(pair), max(pair)
