"""Runs of a session that options name."""

from __future__ import annotations

from pathlib import Path

from thalweg.errors import StudyError
from thalweg.storage.files import read_limited
from thalweg.storage.session import Run, is_session, load_session


def run_of(name: str, number: int | None = None) -> Run:
    """The run with this number of the session `name`, or its last one. StudyError where there is none."""
    path = Path(name)
    if not path.exists():
        raise StudyError(f"{name} holds no runs", "there is no file of this name", "Check the path, and give a session")
    if not path.is_file() or not is_session(read_limited(path)):
        raise StudyError(f"{name} holds no runs", "it is not a session", "Save a run with `thalweg solve --save`, and give that session")
    runs = load_session(path).runs
    if not runs:
        raise StudyError(f"{name} holds no runs", "nothing was run in this session yet", "Save a run to it with `thalweg solve --save`")
    if number is None:
        return runs[-1]
    for run in runs:
        if run.number == number:
            return run
    held = ", ".join(str(run.number) for run in runs)
    raise StudyError(f"There is no run {number} in {name}", f"the session holds {'run' if len(runs) == 1 else 'runs'} {held}", "Give one of these")
