"""The file of frames that a scan follows."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from thalweg.errors import StudyError
from thalweg.storage.files import read_limited
from thalweg.study.path.frames import FramesPath, frames_path
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule
from thalweg_app.presenters.fields import CHOICE_WORDS


@dataclass
class FramesFile:
    """Keeps the text, so that the frames are always read for the molecule as it is set up now."""

    name: str = ""
    text: str = ""
    _read: tuple[object, FramesPath] | None = None

    @classmethod
    def open(cls, file: Path) -> FramesFile:
        """StudyError where the file cannot be read, is far too long or is no text."""
        data = read_limited(file)
        if b"\0" in data:
            raise StudyError(f"{file.name} is no text", "geometries are written in plain text", "Choose an XYZ file with several geometries", "path")
        return cls(file.name, data.decode("utf-8-sig", "replace"))

    def path(self, study: StudySpec) -> FramesPath:
        """The path for this study. StudyError where no file is chosen, it holds one geometry alone, or its atoms are not the molecule's."""
        if not self.name:
            raise StudyError("No frames are chosen", "their geometries come from a file", "Choose an XYZ file with several geometries", "path")
        if self._read is None or self._read[0] != study.system:
            self._read = study.system, frames_path(self.text, self.name, study)
        path = self._read[1]
        if len(path.frames) < 2:
            raise StudyError(f"{self.name} holds one geometry", "a scan needs several", "Choose an XYZ file with several geometries", "path")
        return path

    def told(self, study: StudySpec | None) -> str:
        """`stretch.xyz: 12 frames, read in ångström`; the name alone where they do not fit the study."""
        if not self.name:
            return "No file chosen"
        if study is None or not isinstance(study.system, Molecule):
            return self.name
        unit = study.system.unit
        try:
            return f"{self.name}: {len(self.path(study).frames)} frames, read in {CHOICE_WORDS.get(unit, unit)}"
        except StudyError:
            return self.name
