"""Scaling the whole geometry."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.errors import StudyError
from thalweg.study.path.base import ScanPath, molecule_of, positions_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems.displacement import breathed


class BreathePath(ScanPath):
    title: ClassVar[str] = "Breathing"
    about: ClassVar[str] = "All distances are scaled by one factor about the centroid."

    key: Literal["breathe"] = "breathe"

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        if value <= 0:
            raise StudyError(f"The factor {value:g} is not positive", "distances would vanish", "Give factors above 0", "path")
        return with_positions(spec, breathed(positions_of(molecule_of(spec, "breathing")), value))

    def axis(self, spec: StudySpec) -> str:
        return "Scale of all distances"
