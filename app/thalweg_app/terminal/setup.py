"""The options that `solve` and `inspect` share, and how they become the settings of a study."""

from __future__ import annotations

import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar, get_args

import click

from thalweg.errors import StudyError
from thalweg.options import Options
from thalweg.storage.session import Session
from thalweg.study.spec import SECTIONS, Neighbour, StudySpec, suited, with_setting
from thalweg.systems import LatticeModel
from thalweg.systems.spin_reference import ReferenceChoice
from thalweg_app.terminal.runs import run_of

Command = TypeVar("Command", bound=Callable[..., Any])

STANDARD_INPUT = "-"
MAX_STANDARD_INPUT = 64 * 2**20
#: As a start: the parameters of a run. As a neighbour: none, not even that of the session.
AT_NEIGHBOUR, NO_NEIGHBOUR = "neighbour", "none"

#: Terminal option -> the setting that it stands for.
PLAIN_OPTIONS = {
    "unit": "system.unit",
    "charge": "system.charge",
    "multiplicity": "system.multiplicity",
    "basis": "system.basis",
    "encoding": "encoding",
    "taper": "encoding.taper",
    "ansatz": "ansatz",
    "depth": "ansatz.depth",
    "start": "ansatz.start",
    "optimizer": "optimizer",
    "evaluation": "evaluation",
    "shots": "evaluation.shots",
    "starts": "starts",
    "seed": "seed",
}

NEIGHBOUR_HELP = "Start at the parameters of this run of a session, its last one without a number; `none` leaves out that of the session INPUT."

#: Sections whose settings have an option of their own.
SET_SECTIONS = ("ansatz", "optimizer", "evaluation")


def setup_options(command: Command) -> Command:
    """Adds the argument and the options of a set-up to a command."""
    for add in reversed(_options()):
        command = add(command)
    return command


def _options() -> list[Callable[[Command], Command]]:
    choice = {name: click.Choice(alternatives.keys(), case_sensitive=False) for name, alternatives in SECTIONS.items()}
    return [
        click.argument("input_name", metavar="INPUT"),
        click.option("--charge", type=int, help="Total charge."),
        click.option("--multiplicity", type=int, help="2S + 1: 1 singlet, 2 doublet, 3 triplet."),
        click.option("--basis", help="Gaussian basis set, e.g. sto-3g, 6-31g, cc-pvdz."),
        click.option("--unit", type=click.Choice(["angstrom", "bohr"], case_sensitive=False), help="Unit of the coordinates."),
        click.option("--frozen-core", is_flag=True, help="Freeze the core orbitals."),
        click.option("--active", metavar="4e,6o", help="Active electrons and orbitals, or a list of orbitals such as 2,3,5-8."),
        click.option("--encoding", type=choice["encoding"], help="Fermions to qubits."),
        click.option("--taper/--no-taper", default=None, help="Remove a qubit for each Z2 symmetry."),
        click.option("--ansatz", type=choice["ansatz"], help="Trial state."),
        _setting_option("ansatz", "the trial state, e.g. k=2"),
        click.option("--depth", type=int, help="Number of layers of a layered circuit."),
        click.option("--reference", help="State to begin at: 22ab00, 0101, a combination such as 2200,2020, or for spins up, neel, plus, singlets."),
        click.option("--start", help="First parameters, e.g. zero, mp2, small-random, uniform-random."),
        click.option("--neighbour", metavar="FILE[:RUN]", help=NEIGHBOUR_HELP),
        click.option("--optimizer", type=choice["optimizer"], help="Search for the lowest energy."),
        _setting_option("optimizer", "the search, e.g. step=0.05"),
        click.option("--evaluation", type=choice["evaluation"], help="Exact energies, drawn bit strings, or exact with the error of shots."),
        _setting_option("evaluation", "the evaluation, e.g. allocation=by-variance"),
        click.option("--shots", type=int, help="Shots of one energy, for an evaluation that draws them."),
        click.option("--starts", type=int, help="Number of independent starts; the lowest counts."),
        click.option("--seed", type=int, help="Seed of every random choice."),
        click.option("--classical", metavar="mp2,ccsd", help="Classical methods to compute beside: mp2, ccsd, ccsd(t)."),
        click.option("--set", "settings", multiple=True, metavar="FIELD=VALUE", help="Any other setting, e.g. stop.gradient=1e-8. Repeatable."),
    ]


def read_setup(options: dict[str, Any]) -> tuple[StudySpec, tuple[str, ...]]:
    """The settings that the options describe, and notes on how the input was read. StudyError when they do not fit."""
    unit = options["unit"]
    spec, notes = read_input(options["input_name"], unit or "angstrom")
    read = spec
    given = {path: options[name] for name, path in PLAIN_OPTIONS.items() if options[name] is not None}
    spec = _with_neighbour(spec, options["neighbour"], given)
    if options["classical"] is not None:
        given["classical"] = [name.strip().lower() for name in options["classical"].split(",") if name.strip()]
    if options["frozen_core"] or options["active"] is not None:
        given["system.active_space"] = _active_space(options["frozen_core"], options["active"])
    if options["reference"] is not None:
        given |= _reference(options["reference"])
    for path, value in given.items():
        spec = _with_option(spec, path, value)
    for section in SET_SECTIONS:
        for text in options[f"{section}_settings"]:
            spec = _with_text(spec, f"--{section}-set", f"{section}.", text)
    for text in options["settings"]:
        spec = _with_text(spec, "--set", "", text)
    return _named_anew(spec, read), notes


def _with_neighbour(spec: StudySpec, text: str | None, given: dict[str, Any]) -> StudySpec:
    """The study from the run that `text` names; `--start neighbour` says the same as naming one, and leaves `given`."""
    if text is not None:
        spec = spec.model_copy(update={"neighbour": Neighbour() if text == NO_NEIGHBOUR else _neighbour(text)})
    if str(given.get("ansatz.start")).lower() == AT_NEIGHBOUR:
        del given["ansatz.start"]
        if not spec.neighbour.is_given:
            raise StudyError(
                "--start neighbour does not say which run",
                "a search starts at the parameters of a run of a session",
                "Name it as --neighbour FILE or --neighbour FILE:RUN",
            )
    return spec


def _neighbour(text: str) -> Neighbour:
    """The parameters of the run `FILE:RUN`, or of the last run of `FILE`. StudyError where there is none."""
    name, mark, number = text.rpartition(":")
    if not mark or not number.isdecimal() or Path(text).exists():
        name, number = text, ""
    run = run_of(name, int(number) if number else None)
    return run.result.as_start(f"run {run.number} of {Path(name).name}")


def _named_anew(spec: StudySpec, read: StudySpec) -> StudySpec:
    """Without the name of the file's lattice where options have changed what it names: then the name says what is there."""
    old, new = read.system, spec.system
    if not isinstance(old, LatticeModel) or not isinstance(new, LatticeModel) or new.name != old.name:
        return spec
    if (old.lattice, old.model) == (new.lattice, new.model):
        return spec
    return spec.model_copy(update={"system": new.model_copy(update={"name": ""})})


def _setting_option(section: str, what: str) -> Callable[[Command], Command]:
    words = f"A setting of {what}. Repeatable."
    return click.option(f"--{section}-set", f"{section}_settings", multiple=True, metavar="KEY=VALUE", help=words)


def _with_text(spec: StudySpec, name: str, before: str, text: str) -> StudySpec:
    path, sign, value = text.partition("=")
    if not sign:
        raise StudyError(f"{name} {text} has no value", "it needs a field and a value", f"Write it as {name} field=value")
    return _with_option(spec, before + path.strip(), value.strip())


def read_input(name: str, unit: str) -> tuple[StudySpec, tuple[str, ...]]:
    """A file (geometry, integrals, session), `-` for standard input, or the name of a sample; a file goes before a sample."""
    if name == STANDARD_INPUT:
        return _from_standard_input(unit)
    path = Path(name)
    if path.exists():
        return _from_file(path, unit)
    sample = find_sample(name)
    if sample is None:
        raise StudyError(f"There is no file '{name}'", "and no sample has this name", "See `thalweg samples` for the samples, or check the path")
    spec, notes = _from_file(sample, unit)
    return spec, (f"Sample {sample.name}", *notes)


def find_sample(name: str) -> Path | None:
    """The file of the sample with this name or file name; upper and lower case are alike."""
    from thalweg.systems.samples import list_samples

    wanted = name.casefold()
    return next((s.file for s in list_samples() if wanted in (s.name.casefold(), s.file.name.casefold())), None)


def _from_file(path: Path, unit: str, **fields: str) -> tuple[StudySpec, tuple[str, ...]]:
    from thalweg.storage.open_file import open_file

    found = open_file(path, unit, **fields)
    if isinstance(found, Session):
        return _from_session(found, path.name)
    system, notes = found
    return suited(StudySpec(system=system)), notes


def _from_session(session: Session, name: str) -> tuple[StudySpec, tuple[str, ...]]:
    if session.setup is not None:
        return session.setup, (f"Set-up read from {name}",)
    if session.runs:
        return session.runs[-1].result.spec, (f"Settings of run {session.runs[-1].number} read from {name}",)
    raise StudyError(f"{name} is an empty session", "it holds neither a set-up nor a run", "Give a geometry or a session with a set-up")


def _from_standard_input(unit: str) -> tuple[StudySpec, tuple[str, ...]]:
    content = sys.stdin.buffer.read(MAX_STANDARD_INPUT + 1)
    if len(content) > MAX_STANDARD_INPUT:
        raise StudyError("Standard input is too long", f"the limit is {MAX_STANDARD_INPUT // 2**20} MiB", "Give the name of the file instead")
    if not content.strip():
        raise StudyError("Standard input is empty", "nothing was piped in", "Pipe a geometry in, or give the name of a file")
    with tempfile.TemporaryDirectory() as folder:  # the readers tell the form of a file by its content
        path = Path(folder) / "standard input"
        path.write_bytes(content)
        return _from_file(path, unit, name="")


def _reference(text: str) -> dict[str, str]:
    """The name of a state of a lattice model, or a state that is written out."""
    word = text.strip().lower()
    return {"system.reference": word, "reference": ""} if word in get_args(ReferenceChoice) else {"reference": text}


def _active_space(frozen_core: bool, active: str | None) -> str:
    if frozen_core and active is not None:
        raise StudyError(
            "--frozen-core and --active exclude each other", "an active space already says which orbitals are frozen", "Give one of the two"
        )
    return "frozen-core" if active is None else active


def _with_option(spec: StudySpec, path: str, value: Any) -> StudySpec:
    """As `with_setting`, with a sentence of its own where the chosen alternative has no such field."""
    section, *fields = path.split(".")
    chosen = getattr(spec, section, None)
    for field in fields:  # down to settings within settings, as in `system.lattice.sites`
        if not isinstance(chosen, Options):
            break
        if field not in type(chosen).model_fields:
            known = ", ".join(name for name in type(chosen).model_fields if name != "key")
            what = f"{chosen.title or section} has no setting '{field}'"
            raise StudyError(what, f"it has {known}", f"Leave the option out or choose another {section}", path)
        section, chosen = field, getattr(chosen, field)
    return with_setting(spec, path, value)
