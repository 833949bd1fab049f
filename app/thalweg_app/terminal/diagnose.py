"""`thalweg diagnose`: why a search fails."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from thalweg.errors import StudyError
from thalweg.storage.files import ensure_writable, write_atomically
from thalweg.storage.plain_json import json_text
from thalweg.study.diagnosis_spec import Direction, Landscape, Trainability
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec
from thalweg_app.jobs import Emit, ShouldStop
from thalweg_app.presenters.diagnosis import Finding, chart_of, table_of_finding
from thalweg_app.presenters.numbers import parse_wholes
from thalweg_app.terminal.answer import aligned
from thalweg_app.terminal.attended import attend
from thalweg_app.terminal.display import make_display
from thalweg_app.terminal.runs import run_of
from thalweg_app.terminal.setup import read_setup, setup_options
from thalweg_app.terminal.solve import STANDARD_OUTPUT

WHAT = ("trainability", "landscape", "curvature", "starts")
ALONG_HELP = "parameter:N, random, steepest, or run:N for the line to the point of a run of the session. Twice for a map."


@click.command()
@setup_options
@click.option("--what", type=click.Choice(WHAT), required=True, help="Vanishing gradients, energies along directions, or the end of a run.")
@click.option("--run", "number", type=int, metavar="N", help="Take settings and found point of this run of the session INPUT.")
@click.option("--cost", type=click.Choice(["energy", "global", "local"]), default="energy", help="trainability: what is differentiated.")
@click.option("--qubits", metavar="2,4,6-8", help="trainability: sizes of the lattice, or of a global or local cost.")
@click.option("--layers", metavar="1,2,4", help="trainability: depths of the trial state.")
@click.option("--samples", type=int, default=200, show_default=True, help="trainability: random starts of each point.")
@click.option("--component", type=click.Choice(["mean", "first", "last"]), default="mean", help="trainability: which part of the gradient.")
@click.option("--angles", type=click.Choice(["uniform", "as-set"]), default="uniform", help="trainability: starts over the circle, or as set.")
@click.option("--along", multiple=True, metavar="WHERE", help=f"landscape: {ALONG_HELP}")
@click.option("--reach", type=float, default=3.141592653589793, help="landscape: how far on both sides, in radians.")
@click.option("--points", type=int, default=41, show_default=True, help="landscape: energies along each direction.")
@click.option("--workers", type=int, default=1, show_default=True, help="Processes; 0 takes all cores.")
@click.option("--figure", type=click.Path(path_type=Path), metavar="FILE", help="Draw the curve as PNG, SVG or PDF.")
@click.option("--json", "json_file", metavar="FILE|-", help="Write what was found as one JSON object; - is standard output and nothing else.")
@click.option("--quiet", is_flag=True, help="Show no progress.")
def diagnose(what: str, figure: Path | None, json_file: str | None, quiet: bool, workers: int, **options: Any) -> int:
    """Say why a search fails: do gradients vanish, how does the energy look around a point, is the found point a minimum, do starts agree?

    INPUT is as for `thalweg solve`. `curvature` and `starts` run the study first unless --run names a run of the session INPUT.
    """
    spec, notes = read_setup(options)
    if json_file not in (None, STANDARD_OUTPUT):
        ensure_writable(Path(json_file))
    result = None if options["number"] is None else run_of(options["input_name"], options["number"]).result
    study = spec if result is None else result.spec
    for note in () if quiet or result is not None else notes:
        print(note, file=sys.stderr)
    found, status = attend(_work(what, study, result, workers, options), make_display(study, quiet=quiet))
    if found is None:
        return status
    _print(found, json_file)
    if figure is not None:
        from thalweg_app.plots.printing import draw_chart

        draw_chart(chart_of(found), figure)
        print(f"Drawn in {figure}", file=sys.stderr)
    return status


def _work(what: str, study: StudySpec, result: StudyResult | None, workers: int, options: dict[str, Any]) -> Callable[[Emit, ShouldStop], Finding]:
    if what in ("curvature", "starts"):
        return lambda emit, should_stop: _of_run(what, study, result, workers, emit, should_stop)
    settings = _trainability(study, options) if what == "trainability" else _landscape(study, result, options)

    def work(emit: Emit, should_stop: ShouldStop) -> Finding:
        from thalweg.study.diagnosis import diagnose as run_diagnosis
        from thalweg.study.executors import make_executor

        with make_executor("serial" if workers == 1 else "local", workers) as executor:
            return run_diagnosis(settings, executor, emit, should_stop)

    return work


def _of_run(what: str, study: StudySpec, result: StudyResult | None, workers: int, emit: Emit, should_stop: ShouldStop) -> Finding:
    from thalweg.study.events import watch_into
    from thalweg.study.executors import Local
    from thalweg.study.hessian import curvature_of, spread_of_starts
    from thalweg.study.run import run

    result = run(study, emit, should_stop, None if workers == 1 else Local(workers)) if result is None else result
    return spread_of_starts(result) if what == "starts" else curvature_of(result, watch_into(emit, should_stop))


def _trainability(study: StudySpec, options: dict[str, Any]) -> Trainability:
    settings = {
        "study": study,
        "cost": options["cost"],
        "qubits": parse_wholes(options["qubits"] or "", "qubits"),
        "layers": parse_wholes(options["layers"] or "", "layers"),
        "samples": options["samples"],
        "component": options["component"],
        "starts": options["angles"],
    }
    return _made(Trainability, settings)


def _landscape(study: StudySpec, result: StudyResult | None, options: dict[str, Any]) -> Landscape:
    directions = tuple(_direction(text, options["input_name"]) for text in options["along"] or ("random",))
    centre = {} if result is None else {"centre": result.final_parameters, "labels": result.parameter_labels}
    return _made(Landscape, {"study": study, **centre, "directions": directions, "reach": options["reach"], "points": options["points"]})


def _made(cls: Any, settings: dict[str, Any]) -> Any:
    from pydantic import ValidationError

    from thalweg.study.spec import study_error

    try:
        return cls(**settings)
    except ValidationError as error:
        raise study_error(error) from None


def _direction(text: str, input_name: str) -> Direction:
    kind, _, number = text.partition(":")
    if kind in ("random", "steepest") and not number:
        return Direction(kind=kind)  # type: ignore[arg-type]
    if kind in ("parameter", "run") and number.isdigit():
        if kind == "parameter":
            return Direction(kind="parameter", parameter=int(number))
        other = run_of(input_name, int(number)).result
        return Direction(kind="point", point=other.final_parameters, labels=other.parameter_labels)
    raise StudyError(f"--along {text} is no direction", "it is none of those known", "Give parameter:N, random, steepest, or run:N", "along")


def _print(found: Finding, json_file: str | None) -> None:
    text = json_text(found.model_dump(), indent=1)
    if json_file == STANDARD_OUTPUT:
        click.echo(text)
        return
    sentence = found.verdict[:1].upper() + found.verdict[1:]
    click.echo("\n".join([f"{sentence}.", "", *aligned(table_of_finding(found))]))
    if json_file is not None:
        write_atomically(Path(json_file), text.encode() + b"\n")
