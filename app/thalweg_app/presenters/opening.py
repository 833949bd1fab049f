"""Opens sessions, geometries and integrals: small files at once, large ones in a worker process."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

from thalweg.errors import StudyError
from thalweg.storage.open_file import open_as_data
from thalweg.storage.session import Session
from thalweg.study.events import Failed
from thalweg.study.spec import StudySpec, spec_from_data
from thalweg.systems import Molecule
from thalweg.systems.xyz import read_atoms
from thalweg_app.presenters.jobs import OPEN_FILE, JobListener
from thalweg_app.presenters.wording import counted
from thalweg_app.presenters.workbench import Workbench

#: Reading this much takes a few milliseconds.
SMALL_BYTES = 300_000
_HDF5 = b"\x89HDF"


class Opening:
    """`failed` gets a StudyError, `session` what to show (the caller asks about unsaved results first); systems go into the set-up."""

    def __init__(
        self, workbench: Workbench, failed: Callable[[StudyError], None], defect: Callable[[Failed], None], session: Callable[[Session, Path], None]
    ) -> None:
        self._workbench, self._failed, self._defect, self._session = workbench, failed, defect, session

    def open(self, path: Path, unit: str = "angstrom") -> None:
        """Reads the file and shows what it holds."""
        try:
            if _is_small(path):
                self._show(open_as_data(path, unit), path)
                return
        except StudyError as error:
            self._failed(error)
            return
        listener = JobListener(done=lambda value: self._show(value, path), failed=self._on_failed)
        self._workbench.told(f"Reading {path.name}")
        self._workbench.starter.start(OPEN_FILE, {"path": str(path), "unit": unit}, listener)

    def paste(self, text: str, unit: str) -> StudyError | None:
        """Takes atoms from pasted text; gives the error when there are none."""
        try:
            read = read_atoms(text, unit)
        except StudyError as error:
            return error
        system = {**Molecule(atoms=read.atoms).model_dump(), "unit": read.unit, "charge": read.charge or 0, "multiplicity": read.multiplicity or 1}
        self._take_system(system, (*read.notes, *read.warnings), "pasted atoms")
        return None

    def _show(self, value: Any, path: Path) -> None:
        if "session" in value:
            self._session(Session.model_validate(value["session"]), path)
        else:
            self._take_system(value["system"], value["notes"], f"opening of {path.name}")

    def _take_system(self, system: Any, notes: Any, text: str) -> None:
        spec = self._with_system(system)
        self._workbench.setup.replace_system(spec.system, text)
        atoms = getattr(spec.system, "atoms", ())
        read = f"{counted(len(atoms), 'atom')} read. " if atoms else ""
        self._workbench.told(read + " ".join(note.rstrip(".") + "." for note in notes))

    def _with_system(self, system: Any) -> StudySpec:
        return spec_from_data({**self._workbench.setup.spec.model_dump(), "system": system})

    def _on_failed(self, failure: Failed) -> None:
        if failure.details:
            self._defect(failure)
        else:
            self._failed(StudyError(failure.what, failure.why, failure.fix, failure.field))


def _is_small(path: Path) -> bool:
    try:
        with path.open("rb") as stream:
            return path.stat().st_size < SMALL_BYTES and stream.read(4) != _HDF5
    except OSError:
        return True  # reading it says what is wrong
