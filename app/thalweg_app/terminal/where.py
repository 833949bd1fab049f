"""The options that say where the parts of long work run: in this process or on several cores."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import click

from thalweg.study.executors import Local
from thalweg_app.terminal.setup import Command

KINDS = {"local": "this machine's cores where that pays", "serial": "this process", "dask": "a cluster"}


def where_options(kinds: Sequence[str], what: str) -> Callable[[Command], Command]:
    """Adds `--executor`, one of these kinds, and `--workers`; `what` are the parts of the work."""
    text = f"Where {what} run: " + ", ".join(KINDS[kind] for kind in kinds) + "."

    def add(command: Command) -> Command:
        workers = click.option("--workers", type=click.IntRange(min=0), default=0, help="Processes of the local executor; 0 takes all cores.")
        executor = click.option("--executor", type=click.Choice(list(kinds)), default="local", show_default=True, help=text)
        return executor(workers(command))

    return add


def local_of(executor: str, workers: int) -> Local | None:
    """For starts of a study; None where they run one after another in this process."""
    return None if executor == "serial" else Local(workers)
