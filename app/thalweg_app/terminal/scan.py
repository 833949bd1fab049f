"""`thalweg scan`: a curve along a bond, an angle, a list of geometries or a setting."""

from __future__ import annotations

import sys
import time
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import click
from click.core import ParameterSource

from thalweg.errors import StudyError
from thalweg.paths import as_characters
from thalweg.storage.files import write_atomically
from thalweg.storage.plain_json import json_text
from thalweg.storage.session import ScanRun, Session, load_session, save_session
from thalweg.study.events import AnyEvent, ScanPoint, Stage
from thalweg.study.executors import EXECUTORS
from thalweg.study.scan_refine import refined
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import ScanSpec
from thalweg.units import LENGTH_UNITS
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.plots.printing import draw_chart
from thalweg_app.presenters.curve import CurveUnits, ShownCurve, curve_chart
from thalweg_app.presenters.curve_numbers import scan_csv, scan_data
from thalweg_app.presenters.wording import DIFFERENCE_UNITS, counted, time_left
from thalweg_app.terminal.attended import attend
from thalweg_app.terminal.scan_answer import scan_lines
from thalweg_app.terminal.scan_display import make_scan_display
from thalweg_app.terminal.scan_setup import path_options, read_scan, read_values
from thalweg_app.terminal.setup import read_setup, setup_options
from thalweg_app.terminal.solve import STANDARD_OUTPUT, check_targets, session_to_extend
from thalweg_app.terminal.where import where_options

#: Options that a resumed scan still takes: where it runs, what is written, and points to add.
FREE_WITH_RESUME = frozenset(
    {"resume", "save", "executor", "workers", "scheduler", "refine", "where", "points", "first", "last", "geometric", "json_file", "csv_file"}
    | {"figure", "errors_in", "lengths_in", "quiet"}
)
#: Seconds between two saves of a scan under way.
SAVE_INTERVAL = 30.0


@dataclass
class Plan:
    """What is to be run: the scan, the points that are known, and where it is kept.

    Attributes:
        checked: the known points come from a finished scan.
        number: of the scan in the session that it goes on from; None for a new one.
        refine, where: points to add when the scan is finished.
    """

    scan: ScanSpec
    known: tuple[CurvePoint, ...] = ()
    checked: bool = False
    session: Session = field(default_factory=Session)
    file: Path | None = None
    number: int | None = None
    refine: int = 0
    where: Any = "minimum"
    saved_at: float = field(default_factory=time.monotonic)

    def keep(self, result: ScanResult) -> None:
        """Writes the session with what there is so far."""
        if self.file is None:
            return
        self.session = self.session.with_scan(result, self.number)
        self.number = self.session.scans[-1].number if self.number is None else self.number
        save_session(self.session, self.file)
        self.saved_at = time.monotonic()


@click.command()
@setup_options
@path_options
@where_options(EXECUTORS, "points")
@click.option("--scheduler", default="", metavar="tcp://HOST:PORT", help="Address of the Dask scheduler.")
@click.option("--refine", type=click.IntRange(min=0), default=0, metavar="N", help="Add N points when the curve is there.")
@click.option("--where", type=click.Choice(["minimum", "error"]), default="minimum", help="Where to refine: around the minimum, or at large errors.")
@click.option("--resume", type=click.Path(path_type=Path), metavar="SESSION", help="Go on with the last scan of a session; INPUT is left out.")
@click.option(
    "--save", type=click.Path(path_type=Path), metavar="FILE", help="Save a session, also while the scan runs; a session there gets one more scan."
)
@click.option("--json", "json_file", metavar="FILE|-", help="Write the curve as one JSON object; - is standard output and nothing else.")
@click.option("--csv", "csv_file", metavar="FILE|-", help="Write the points as CSV under a header of units and settings.")
@click.option("--figure", type=click.Path(path_type=Path), metavar="FILE", help="Draw the curve as PNG, SVG or PDF.")
@click.option("--errors-in", type=click.Choice(DIFFERENCE_UNITS), default="mEh", show_default=True, help="Unit of printed errors of molecules.")
@click.option("--lengths-in", type=click.Choice(list(LENGTH_UNITS)), help="Unit of printed lengths; by default that of the geometry.")
@click.option("--quiet", is_flag=True, help="Show no progress.")
def scan(
    executor: str,
    workers: int,
    scheduler: str,
    resume: Path | None,
    json_file: str | None,
    csv_file: str | None,
    figure: Path | None,
    errors_in: str,
    lengths_in: str | None,
    quiet: bool,
    **options: Any,
) -> int:
    """Run a study along a path and state what the curve yields.

    INPUT is as for `solve`. Each point starts from its neighbour; points that jump or stall are tried again from both sides. The exit
    status is 0 when the scan ran, whatever its verdict; 2 for bad input; 130 after Ctrl-C, with the finished points kept.
    """
    if json_file == csv_file == STANDARD_OUTPUT:
        raise StudyError("--json - and --csv - exclude each other", "standard output takes one of them", "Give a file name to one")
    check_targets(figure, json_file, csv_file)
    plan = _resumed(resume, options) if resume is not None else _new(options, quiet)
    own_unit = plan.scan.path.unit(plan.scan.study)
    units = CurveUnits(lengths_in or (own_unit if own_unit in LENGTH_UNITS else "angstrom"), errors_in)

    def work(emit: Emit, should_stop: ShouldStop) -> ScanResult:
        return _run(plan, (executor, workers, scheduler), emit, should_stop, quiet)

    result, status = attend(work, make_scan_display(units, len(plan.known), quiet=quiet))
    if result is None or not any(p.result is not None or p.failure for p in result.points):
        print("Stopped before the first point: there is nothing to keep.", file=sys.stderr)
        return status
    _log_defects(result)
    plan.keep(result)
    _print(result, units, json_file, csv_file)
    _say_files(plan, result, units, figure)
    return status


next(p for p in scan.params if p.name == "input_name").required = False  # a resumed scan brings its own


def _new(options: dict[str, Any], quiet: bool) -> Plan:
    if options["input_name"] is None:
        raise StudyError("Nothing to scan", "neither INPUT nor --resume is given", "Give a geometry, a sample or a session")
    study, notes = read_setup(options)
    wanted = read_scan(study, options)
    session = session_to_extend(options["save"], study)
    for note in () if quiet else notes:
        print(note, file=sys.stderr)
    return Plan(wanted, session=session, file=options["save"], refine=options["refine"], where=options["where"])


def _resumed(file: Path, options: dict[str, Any]) -> Plan:
    """The last scan of the session; its settings are those of the session, and only points may be added."""
    _refuse_other_settings()
    session = load_session(file)
    if not session.scans:
        raise StudyError(f"{file} has no scan to resume", "it holds none", "Run one with --save first")
    last: ScanRun = session.scans[-1]
    wanted, target = last.result.spec, options["save"] or file
    if options["points"] is not None or options["first"] is not None:
        wanted = wanted.model_copy(update={"points": tuple(sorted({*wanted.points, *read_values(options)}))})
    known = tuple(p for p in last.result.points if p.result is not None)
    kept, number = (session, last.number) if target == file else (session_to_extend(target, wanted.study), None)
    return Plan(wanted, known, last.result.finished, kept, target, number, options["refine"], options["where"])


def _refuse_other_settings() -> None:
    """A resumed scan has its settings in the session: whatever else is given would be passed over."""
    context = click.get_current_context()
    given = [p for p in context.command.params if context.get_parameter_source(str(p.name)) is ParameterSource.COMMANDLINE]
    others = [p.opts[0] if p.param_type_name == "option" else "INPUT" for p in given if p.name not in FREE_WITH_RESUME]
    if others:
        raise StudyError(f"--resume and {others[0]} exclude each other", "a resumed scan has its settings in the session", f"Leave {others[0]} out")


def _run(plan: Plan, where: tuple[str, int, str], emit: Emit, should_stop: ShouldStop, quiet: bool) -> ScanResult:
    from thalweg.study.executors import make_executor  # these load the numerical libraries, which Ctrl-C may interrupt as well
    from thalweg.study.scan import run_scan

    def once(wanted: ScanSpec, known: Sequence[CurvePoint], checked: bool) -> ScanResult:
        return run_scan(wanted, lambda: make_executor(*where), _saving(plan, wanted, known, emit), should_stop, done=known, checked=checked)

    if not quiet and not plan.known and where[0] != "dask":
        _foretell(plan.scan, where, emit, should_stop)
    result = once(plan.scan, plan.known, plan.checked)
    if plan.refine and result.finished and not should_stop():
        emit(Stage(text=f"Adding {counted(plan.refine, 'point')}"))
        result = once(refined(result, plan.refine, plan.where), result.points, True)
    return result


def _foretell(wanted: ScanSpec, where: tuple[str, int, str], emit: Emit, should_stop: ShouldStop) -> None:
    from thalweg.study.scan_foresight import foresee
    from thalweg.watch import Watch

    try:
        seconds = foresee(wanted, 1 if where[0] == "serial" else where[1], Watch(should_stop=should_stop))
    except StudyError:
        return  # the scan says it of every point that it concerns
    emit(Stage(text=f"Expected time for {counted(len(wanted.points), 'point')}: {time_left(seconds).removesuffix(' left')}"))


def _saving(plan: Plan, wanted: ScanSpec, known: Sequence[CurvePoint], emit: Emit) -> Emit:
    """Passes events on, and saves the session with the points so far every half minute."""
    from thalweg.study.scan_summary import summarise

    points = {p.coordinate: p for p in known}
    begun = time.monotonic()

    def take(event: AnyEvent) -> None:
        emit(event)
        if not isinstance(event, ScanPoint):
            return
        points[event.point.coordinate] = event.point
        if plan.file is not None and time.monotonic() - plan.saved_at > SAVE_INTERVAL:
            so_far = [points.get(x) or CurvePoint(index=i, coordinate=x, result=None) for i, x in enumerate(wanted.points)]
            plan.keep(summarise(wanted, so_far, time.monotonic() - begun))

    return take


def _log_defects(result: ScanResult) -> None:
    from thalweg_app.user_folders import log_defect

    for details in dict.fromkeys(p.details for p in result.points if p.details):
        path = log_defect(RuntimeError(details))
        print(f"A point failed by a defect of Thalweg; the details are in {path}.", file=sys.stderr)


def _print(result: ScanResult, units: CurveUnits, json_file: str | None, csv_file: str | None) -> None:
    texts = ((json_file, lambda: json_text(scan_data(result), indent=1) + "\n"), (csv_file, lambda: scan_csv(result, units)))
    for name, make in texts:
        if name is not None and name != STANDARD_OUTPUT:
            write_atomically(Path(name), as_characters(make()).encode())
    on_output = [make for name, make in texts if name == STANDARD_OUTPUT]
    click.echo(on_output[0]() if on_output else "\n".join(scan_lines(result, units)), nl=not on_output)


def _say_files(plan: Plan, result: ScanResult, units: CurveUnits, figure: Path | None) -> None:
    if plan.file is not None:
        print(f"Saved as scan {plan.number} of {plan.file}", file=sys.stderr)
    if figure is not None:
        title = result.spec.study.ansatz.title
        draw_chart(curve_chart(ShownCurve(title, result.axis, result.unit, result.points, result), units), figure)
        print(f"Drawn in {figure}", file=sys.stderr)
