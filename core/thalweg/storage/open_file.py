"""Opens whatever a study can start from: a session, a geometry, integrals; told apart by content."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from thalweg.storage.files import read_limited
from thalweg.storage.session import Session, is_session, parse_session
from thalweg.systems.read_file import open_system


def open_file(path: Path, unit: str = "angstrom", **fields: Any) -> Session | tuple[Any, tuple[str, ...]]:
    """A session, or a system with notes on how it was read. `unit` is that of coordinates, `fields` are set in the system.

    Raises StudyError when the file is neither.
    """
    content = read_limited(path)
    if is_session(content):
        return parse_session(content, path.name)
    return open_system(path, unit, **fields)


def open_as_data(path: Path, unit: str = "angstrom") -> dict[str, Any]:
    """The same as plain data: {"session": ...}, or {"system": ..., "notes": [...]}."""
    found = open_file(path, unit)
    if isinstance(found, Session):
        return {"session": found.model_dump(mode="json")}
    system, notes = found
    return {"system": system.model_dump(mode="json"), "notes": list(notes)}
