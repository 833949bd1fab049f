"""`thalweg solve`: one study from input to answer."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import click

from thalweg.errors import StudyError
from thalweg.storage.files import ensure_writable, read_limited, write_atomically
from thalweg.storage.plain_json import json_text
from thalweg.storage.session import Session, is_session, load_session, save_session
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.plots.printing import draw_chart, picture_format
from thalweg_app.presenters.traces import X_TITLES, XChoice, convergence, shown_result
from thalweg_app.terminal.attended import attend
from thalweg_app.terminal.display import make_display
from thalweg_app.terminal.setup import read_setup, setup_options
from thalweg_app.terminal.where import local_of, where_options

STANDARD_OUTPUT = "-"


@click.command()
@setup_options
@where_options(("local", "serial"), "several starts")
@click.option("--save", type=click.Path(path_type=Path), metavar="FILE", help="Save a session; a session that is there gets one more run.")
@click.option("--figure", type=click.Path(path_type=Path), metavar="FILE", help="Draw the convergence as PNG, SVG or PDF.")
@click.option("--x-axis", type=click.Choice(list(X_TITLES)), default="iteration", help="What the figure is drawn against.")
@click.option("--json", "json_file", metavar="FILE|-", help="Write the result as one JSON object; - is standard output and nothing else.")
@click.option("--quiet", is_flag=True, help="Show no progress.")
def solve(
    executor: str, workers: int, save: Path | None, figure: Path | None, x_axis: XChoice, json_file: str | None, quiet: bool, **options: Any
) -> int:
    """Find the lowest energy of a trial state and judge it against the exact one.

    INPUT is a file (XYZ, a list of atoms, FCIDUMP, HDF5 molecular data, a lattice, a session), the name of a sample, or - for standard input.
    The exit status is 0 when the study ran, whatever its verdict; 2 for bad input; 130 after Ctrl-C, with the best so far kept.
    """
    spec, notes = read_setup(options)
    session = session_to_extend(save, spec)
    check_targets(figure, json_file)
    for note in () if quiet else notes:
        print(note, file=sys.stderr)

    def work(emit: Emit, should_stop: ShouldStop) -> StudyResult:
        from thalweg.study.run import run  # loads the numerical libraries, which Ctrl-C may interrupt as well

        return run(spec, emit, should_stop, local_of(executor, workers))

    result, status = attend(work, make_display(spec, quiet=quiet))
    if result is None:
        print("Stopped before the first energy: there is nothing to keep.", file=sys.stderr)
        return status
    _print(result, json_file)
    _keep(result, session, save, figure, x_axis)
    return status


def session_to_extend(save: Path | None, spec: StudySpec) -> Session:
    """The session at `save`, or a new one. StudyError, before any work is done, when something else is there."""
    if save is None or not save.exists():
        if save is not None:
            ensure_writable(save)
        return Session(name=save.name.split(".")[0] if save else "", setup=spec)
    if not is_session(read_limited(save)):
        raise StudyError(f"{save} is not overwritten", "it is there and is not a session", "Give another name to --save")
    return load_session(save)


def check_targets(figure: Path | None, *text_files: str | None) -> None:
    """StudyError, before any work is done, where one of these cannot be written."""
    if figure is not None:
        picture_format(figure)
        ensure_writable(figure)
    for name in text_files:
        if name is not None and name != STANDARD_OUTPUT:
            ensure_writable(Path(name))


def _print(result: StudyResult, json_file: str | None) -> None:
    if json_file == STANDARD_OUTPUT:
        click.echo(json_text(result.model_dump(), indent=1))
        return
    from thalweg_app.terminal.answer import answer_lines

    click.echo("\n".join(answer_lines(result)))
    if json_file is not None:
        write_atomically(Path(json_file), json_text(result.model_dump(), indent=1).encode() + b"\n")


def _keep(result: StudyResult, session: Session, save: Path | None, figure: Path | None, x_axis: XChoice) -> None:
    session = session.with_result(result)
    if save is not None:
        save_session(session, save)
        print(f"Saved as run {session.runs[-1].number} of {save}", file=sys.stderr)
    if figure is not None:
        draw_chart(convergence(shown_result(session.runs[-1].number, result), x=x_axis), figure)
        print(f"Drawn in {figure}", file=sys.stderr)
