"""The systems that ship with the program."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

from thalweg.paths import data_folder
from thalweg.systems.lattice_file import lattice_description

_SETTING = re.compile(r"\b(charge|multiplicity)\s*=\s*[+-]?\d+\s*", re.IGNORECASE)


#: Says of files that have no place for a comment what they are: lines `file: description`.
_DESCRIPTIONS = "descriptions.txt"


@dataclass(frozen=True)
class Sample:
    """`description` says what it is and where its numbers come from."""

    name: str
    file: Path
    description: str


def list_samples() -> tuple[Sample, ...]:
    """Every XYZ, FCIDUMP and lattice file of the folder `sample_systems`, by name."""
    folder = data_folder("sample_systems")
    described = dict(line.split(": ", 1) for line in (folder / _DESCRIPTIONS).read_text(encoding="utf-8").splitlines() if ": " in line)
    files = sorted((f for f in folder.iterdir() if f.suffix.lower() in (".xyz", ".fcidump", ".toml")), key=lambda f: f.name.casefold())
    return tuple(Sample(f.stem, f, described.get(f.name) or _comment(f)) for f in files)


def _comment(file: Path) -> str:
    """The comment at the head of a lattice file, or that of an XYZ file without the settings that it states."""
    if file.suffix.lower() == ".toml":
        return lattice_description(file.read_text(encoding="utf-8"))
    return _SETTING.sub("", file.read_text(encoding="utf-8").splitlines()[1]).strip()
