"""`thalweg check`: repeats every run of a session and states the deviation."""

from __future__ import annotations

import sys
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

import click

from thalweg.errors import StudyError
from thalweg.storage.session import Run, load_session
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.presenters.wording import significant, unit_name
from thalweg_app.terminal.check_scan import check_scan
from thalweg_app.terminal.display import make_display
from thalweg_app.terminal.repetition import repeat_and_tell

if TYPE_CHECKING:
    from thalweg.study.repeat import Repetition

PAST_TOLERANCE = 1


@click.command()
@click.argument("session_file", metavar="SESSION", type=click.Path(path_type=Path))
@click.option("--tolerance", type=click.FloatRange(min=0.0), default=1e-7, show_default=True, help="Largest deviation allowed, in the energy unit.")
@click.option("--quiet", is_flag=True, help="Show no progress.")
def check(session_file: Path, tolerance: float, quiet: bool) -> int:
    """Repeat every run and every scan of SESSION with its own settings and seed, and state how far each answer deviates.

    The exit status is 1 when a deviation is past the tolerance, or a run cannot be repeated.
    """
    session = load_session(session_file)
    if not session.runs and not session.scans:
        raise StudyError(f"{session_file} has nothing to check", "it holds no run and no scan", "Run the study first")
    checks = [partial(_check_run, run) for run in session.runs] + [partial(check_scan, scan) for scan in session.scans]
    worst = 0
    for repeat_one in checks:
        good, status = repeat_one(tolerance, quiet)
        if status:
            return status
        worst = max(worst, 0 if good else PAST_TOLERANCE)
    what = " and scan" if session.scans else ""
    click.echo(f"{'Every' if worst == 0 else 'Not every'} run{what} repeats within {tolerance:g}.")
    return worst


def _check_run(run: Run, tolerance: float, quiet: bool) -> tuple[bool, int]:
    """Whether the run held, and the exit status owed to a signal."""
    first = run.result
    if not quiet:
        print(f"Run {run.number} of the session: {first.label}", file=sys.stderr)

    def work(emit: Emit, should_stop: ShouldStop) -> Repetition | None:
        from thalweg.study.executors import Local
        from thalweg.study.repeat import repeat

        return repeat(first, emit, should_stop, Local())

    title, nothing = f"Run {run.number}  {first.label}", ("stopped before it was repeated", 130)
    return repeat_and_tell(title, work, make_display(first.spec, quiet=quiet), tolerance, partial(_rows, run), nothing)


def _rows(run: Run, again: Repetition) -> list[tuple[str, str]]:
    first, unit = run.result, unit_name(run.result.energy_unit)
    rows = [
        ("Deviation", f"{significant(again.deviation)} {unit} ({again.compared}: {first.energy:.10f} then, {again.result.energy:.10f} now)"),
        ("Exact energy", f"{significant(again.exact_deviation)} {unit}" if again.exact_deviation is not None else ""),
    ]
    changed = [
        f"{name} {then} -> {again.result.versions.get(name)}" for name, then in first.versions.items() if again.result.versions.get(name) != then
    ]
    return [*rows, ("Versions changed", ", ".join(changed))]
