"""A list of geometries, as from a file of several XYZ frames."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.options import option
from thalweg.study.path.base import ScanPath, molecule_of, with_positions
from thalweg.study.spec import StudySpec


class FramesPath(ScanPath):
    title: ClassVar[str] = "Frames"
    about: ClassVar[str] = "The geometries of a file with several frames, in their order."

    key: Literal["frames"] = "frames"
    frames: tuple[tuple[tuple[float, float, float], ...], ...] = option(
        (), "Frames", "Coordinates of all atoms in each frame, in the unit of the system."
    )

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule = molecule_of(spec, "frames")
        number = round(value)
        if abs(value - number) > 1e-9 or not 1 <= number <= len(self.frames):
            raise StudyError(f"There is no frame {value:g}", f"frames are numbered 1 to {len(self.frames)}", "Choose among them", "path")
        frame = self.frames[number - 1]
        if len(frame) != len(molecule.atoms):
            raise StudyError(
                f"Frame {number} has {len(frame)} atoms", f"the molecule has {len(molecule.atoms)}", "Use frames of one molecule", "path.frames"
            )
        return with_positions(spec, np.array(frame))

    def axis(self, spec: StudySpec) -> str:
        return "Frame"

    @property
    def has_equilibrium(self) -> bool:
        return False
