"""A list of geometries, as from a file of several XYZ frames."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.options import option
from thalweg.study.path.base import ScanPath, molecule_of, with_positions
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule
from thalweg.systems.xyz import read_frames


class FramesPath(ScanPath):
    title: ClassVar[str] = "Frames"
    about: ClassVar[str] = "The geometries of a file with several frames, in their order."

    key: Literal["frames"] = "frames"
    frames: tuple[tuple[tuple[float, float, float], ...], ...] = option(
        (), "Frames", "Coordinates of all atoms in each frame, in the unit of the system."
    )

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        molecule, frame = molecule_of(spec, "frames"), self.frame(value)
        if len(frame) != len(molecule.atoms):
            raise StudyError(
                f"Frame {value:g} has {len(frame)} atoms", f"the molecule has {len(molecule.atoms)}", "Use frames of one molecule", "path.frames"
            )
        return with_positions(spec, np.array(frame))

    def frame(self, value: float) -> tuple[tuple[float, float, float], ...]:
        """Coordinates of the frame with this number, counted from 1. StudyError where there is none."""
        number = round(value)
        if abs(value - number) > 1e-9 or not 1 <= number <= len(self.frames):
            raise StudyError(f"There is no frame {value:g}", f"frames are numbered 1 to {len(self.frames)}", "Choose among them", "path")
        return self.frames[number - 1]

    def axis(self, spec: StudySpec) -> str:
        return "Frame"

    @property
    def has_equilibrium(self) -> bool:
        return False


def frames_path(text: str, file_name: str, spec: StudySpec) -> FramesPath:
    """The path over all geometries of an XYZ text, read in the unit of the molecule of the study.

    StudyError where the study has no atoms, where the text cannot be read, and naming the first frame whose atoms are not those of the molecule.
    """
    molecule = spec.system
    if not isinstance(molecule, Molecule):
        raise StudyError("Frames need a molecule", "this system has no atoms", "Open a geometry, such as the first of the frames")
    frames = read_frames(text, molecule.unit)
    symbols = [atom[0] for atom in molecule.atoms]
    for number, frame in enumerate(frames, 1):
        if (found := [atom[0] for atom in frame.atoms]) != symbols:
            why = f"it holds {' '.join(found[:12])}, the molecule {' '.join(symbols[:12])}"
            fix = "All frames must hold the atoms of the molecule in its order"
            raise StudyError(f"Frame {number} of {file_name} has other atoms", why, fix, "path")
    return FramesPath(frames=tuple(tuple(atom[1:] for atom in frame.atoms) for frame in frames))
