"""Repeats one row of a session and tells how far the second answer lies from the first."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol, TypeVar

import click

from thalweg.errors import StudyError
from thalweg_app.terminal.answer import aligned
from thalweg_app.terminal.attended import Work, attend
from thalweg_app.terminal.display import Display


class Repeated(Protocol):
    """A second answer beside the first."""

    def within(self, tolerance: float) -> bool: ...


R = TypeVar("R", bound=Repeated)


def repeat_and_tell(
    title: str, work: Work[R | None], display: Display, tolerance: float, rows: Callable[[R], list[tuple[str, str]]], nothing: tuple[str, int]
) -> tuple[bool, int]:
    """Whether the second answer held, and the exit status owed to a signal; `nothing`: what is said, and the status, where there is none."""
    try:
        again, status = attend(work, display)
    except StudyError as error:
        click.echo(f"{title}: cannot be repeated. {error}")
        return False, 0
    if again is None:
        words, otherwise = nothing
        click.echo(f"{title}: {'stopped before it was repeated' if status else words}.")
        return False, status or otherwise
    good = again.within(tolerance)
    click.echo(f"{title}: {'repeats' if good else 'PAST TOLERANCE'}")
    click.echo("\n".join("    " + line for line in aligned(rows(again))))
    return good, status
