"""`thalweg` alone and `thalweg open`: the window, after a look whether the system can show one."""

from __future__ import annotations

import gc
import importlib
import os
from pathlib import Path
from types import ModuleType

import click

from thalweg.errors import StudyError
from thalweg_app.system_libraries import has_display, install_line, missing_libraries


@click.command("open")
@click.argument("file", type=click.Path(path_type=Path))
def open_file(file: Path) -> int:
    """Open FILE in the window: a session, a geometry, integrals, or the name of a sample."""
    from thalweg_app.terminal.setup import find_sample

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
    return int(load_window().open_window(arguments))


def load_window() -> ModuleType:
    """The module of the window, loaded the quick way. Collection of garbage is off until the window stands (`main.settle`).

    Next to nothing that loading makes is garbage, yet looking for some takes a tenth of the start. What knows no Qt is loaded before Qt,
    whose import hook reads the source of every module that comes after it. Plug-ins of pydantic, of which there are none, are not searched for.
    """
    gc.disable()
    os.environ.setdefault("PYDANTIC_DISABLE_PLUGINS", "__all__")
    for module in ("thalweg_app.presenters.workbench", "thalweg_app.presenters.opening", "thalweg_app.messages"):
        importlib.import_module(module)
    return importlib.import_module("thalweg_app.main")
