"""`thalweg` alone and `thalweg open`: the window, after a look whether the system can show one."""

from __future__ import annotations

from pathlib import Path

import click

from thalweg.errors import StudyError
from thalweg_app.system_libraries import has_display, install_line, missing_libraries
from thalweg_app.terminal.setup import find_sample


@click.command("open")
@click.argument("file", type=click.Path(path_type=Path))
def open_file(file: Path) -> int:
    """Open FILE in the window: a session, a geometry, integrals, or the name of a sample."""
    path = file if file.exists() else find_sample(str(file))
    if path is None:
        raise StudyError(f"There is no file '{file}'", "and no sample has this name", "Check the path, or see `thalweg samples`")
    return show_window([str(path)])


def show_window(arguments: list[str]) -> int:
    """Opens the window and returns its exit status. StudyError where the system has no display or lacks a library."""
    if not has_display():
        raise StudyError(
            "The window cannot open", "there is no display", "Start it on a desktop or over `ssh -X`, or use the commands of `thalweg --help`"
        )
    missing = missing_libraries()
    if missing:
        line = install_line(list(missing.values())) or "install " + ", ".join(missing)
        raise StudyError("The window cannot open", f"the system lacks {', '.join(missing)}", f"Run: {line}")
    from thalweg_app.main import open_window

    return int(open_window(arguments))
