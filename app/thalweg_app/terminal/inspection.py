"""`thalweg inspect`: what a study would need, without running it."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import click

from thalweg.storage.files import ensure_writable, write_atomically
from thalweg.storage.plain_json import json_text
from thalweg.study.derived import StudyFigures
from thalweg.study.events import watch_into
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.terminal.answer import figures_lines
from thalweg_app.terminal.attended import attend
from thalweg_app.terminal.display import make_display
from thalweg_app.terminal.setup import read_setup, setup_options
from thalweg_app.terminal.solve import STANDARD_OUTPUT


@click.command()
@setup_options
@click.option("--json", "json_file", metavar="FILE|-", help="Write the figures as one JSON object; - is standard output and nothing else.")
@click.option("--quiet", is_flag=True, help="Show no progress.")
def inspect(json_file: str | None, quiet: bool, **options: Any) -> int:
    """State electrons, orbitals, qubits, terms, one-norm, sector and memory of a study. Nothing is minimised.

    INPUT is as for `thalweg solve`.
    """
    spec, notes = read_setup(options)
    if json_file not in (None, STANDARD_OUTPUT):
        ensure_writable(Path(json_file))
    for note in () if quiet else notes:
        print(note, file=sys.stderr)

    def work(emit: Emit, should_stop: ShouldStop) -> StudyFigures:
        from thalweg.study.figures import inspect as figures_of

        return figures_of(spec, watch_into(emit, should_stop))

    figures, status = attend(work, make_display(spec, quiet=quiet))
    if figures is None:
        return status
    if json_file == STANDARD_OUTPUT:
        click.echo(json_text(figures.model_dump(), indent=1))
        return status
    click.echo("\n".join(figures_lines(figures)))
    if json_file is not None:
        write_atomically(Path(json_file), json_text(figures.model_dump(), indent=1).encode() + b"\n")
    return status
