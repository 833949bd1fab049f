"""The options of `thalweg scan` that say what is varied and at which values."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from thalweg.errors import StudyError
from thalweg.storage.files import read_limited
from thalweg.study.path import AnglePath, BondPath, BreathePath, DihedralPath, FramesPath, SettingPath, StretchPath
from thalweg.study.path.frames import frames_path
from thalweg.study.scan_spec import AnyPath, Literature, ScanSpec, geometric_points, linear_points, read_points
from thalweg.study.spec import Molecule, StudySpec
from thalweg.units import ENERGY_UNITS
from thalweg_app.terminal.setup import STANDARD_INPUT, Command, find_sample

#: Options of which one names the path.
PATH_OPTIONS = ("bond", "angle", "dihedral", "stretch", "breathe", "frames", "vary")
LITERATURE_FIELDS = ("r_e", "d_e", "omega_e", "omega_e_x_e")


def path_options(command: Command) -> Command:
    """Adds the options of a path and of its points."""
    for add in reversed(_options()):
        command = add(command)
    return command


def _options() -> list[Callable[[Command], Command]]:
    return [
        click.option("--bond", metavar="1,2", help="Two atoms, counted from 1; the smaller fragment moves. The default for a diatomic."),
        click.option("--angle", metavar="1,2,3", help="Three atoms, the vertex in the middle; degrees."),
        click.option("--dihedral", metavar="1,2,3,4", help="Four atoms; degrees."),
        click.option("--stretch", metavar="1-2,1-3", help="Bonds that take one length together."),
        click.option("--breathe", is_flag=True, help="Scale all distances by one factor."),
        click.option("--frames", is_flag=True, help="Every geometry of an XYZ file with several, numbered from 1."),
        click.option("--vary", metavar="SETTING", help="Any numeric setting, e.g. system.model.field."),
        click.option(
            "--from", "first", type=float, metavar="VALUE", help="First value; angstrom or bohr as the geometry, degrees, or a plain number."
        ),
        click.option("--to", "last", type=float, metavar="VALUE", help="Last value."),
        click.option("--points", metavar="40|LIST", help="Number of points from first to last, or a list of values such as 0.6,0.7,0.8."),
        click.option("--geometric", is_flag=True, help="A constant ratio between neighbours instead of a constant step."),
        click.option("--both-directions", is_flag=True, help="Run the curve from both ends and keep the lower energy at each point."),
        click.option("--follow/--no-follow", default=True, help="Follow the active orbitals by overlap from point to point.", show_default=True),
        click.option(
            "--spin", type=click.Choice(["any", "fixed"]), default="any", help="Exact state: of any spin, or of the multiplicity asked for."
        ),
        click.option("--reduced-mass", type=click.FloatRange(min=0.0), default=0.0, metavar="U", help="For the frequency; else principal isotopes."),
        click.option("--literature", metavar="r_e=1.6,...", help="Values to print beside: r_e, d_e (eV and the like after the number), omega_e ..."),
        click.option("--literature-source", default="", metavar="TEXT", help="Where those values were published."),
    ]


def read_scan(study: StudySpec, options: dict[str, Any]) -> ScanSpec:
    """The scan that the options describe. StudyError when they do not fit."""
    path = _path(study, options)
    scan = ScanSpec(
        study=study,
        path=path,
        points=_points(path, options),
        follow_orbitals=options["follow"],
        both_directions=options["both_directions"],
        spin=options["spin"],
        reduced_mass=options["reduced_mass"],
        literature=_literature(options["literature"], options["literature_source"]),
    )
    scan.at(scan.points[0])
    return scan


def _path(study: StudySpec, options: dict[str, Any]) -> AnyPath:
    given = [name for name in PATH_OPTIONS if options[name]]
    if len(given) > 1:
        names = " and ".join(f"--{name}" for name in given)
        raise StudyError(f"{names} exclude each other", "a scan has one path", "Give one of them")
    if not given:
        if isinstance(study.system, Molecule) and len(study.system.atoms) == 2:
            return BondPath()
        fix = "Give one of " + ", ".join(f"--{name}" for name in PATH_OPTIONS)
        raise StudyError("Nothing says what is to be varied", "a scan needs a path", fix)
    name, value = given[0], options[given[0]]
    if name == "bond":
        return BondPath.model_validate(dict(zip(("first", "second"), _numbers(value, 2, "bond"), strict=True)))
    if name == "angle":
        return AnglePath.model_validate(dict(zip(("first", "vertex", "last"), _numbers(value, 3, "angle"), strict=True)))
    if name == "dihedral":
        return DihedralPath.model_validate(dict(zip(("first", "second", "third", "fourth"), _numbers(value, 4, "dihedral"), strict=True)))
    if name == "stretch":
        return StretchPath(bonds=value)
    if name == "vary":
        return SettingPath(setting=value)
    return BreathePath() if name == "breathe" else _frames(study, options["input_name"])


def _numbers(text: str, count: int, name: str) -> list[int]:
    parts = [part for part in re.split(r"[\s,-]+", text.strip()) if part]
    if len(parts) != count or not all(part.isdecimal() and int(part) > 0 for part in parts):
        example = ",".join(str(k + 1) for k in range(count))
        raise StudyError(f"Cannot read --{name} {text}", f"it takes the numbers of {count} atoms, counted from 1", f"Write it like {example}")
    return [int(part) for part in parts]


def _frames(study: StudySpec, input_name: str) -> FramesPath:
    if input_name == STANDARD_INPUT:
        raise StudyError("--frames cannot read standard input", "the file is read a second time", "Give the name of the file")
    if not isinstance(study.system, Molecule):
        raise StudyError("--frames needs geometries", "this system has no atoms", "Give an XYZ file with several geometries")
    file = Path(input_name) if Path(input_name).exists() else find_sample(input_name)
    assert file is not None  # the study was read from it
    return frames_path(read_limited(file).decode("utf-8-sig", "replace"), file.name, study)


def _points(path: AnyPath, options: dict[str, Any]) -> tuple[float, ...]:
    if isinstance(path, FramesPath):
        if options["first"] is None and options["last"] is None:
            return tuple(float(k + 1) for k in range(len(path.frames))) if options["points"] is None else read_points(options["points"])
        raise StudyError("--frames has no range", "frames are numbered from 1", "Leave --from and --to out, or list frames as --points 1,3,5")
    return read_values(options)


def read_values(options: dict[str, Any]) -> tuple[float, ...]:
    """A range and a number of points, or a list. StudyError when they do not fit."""
    first, last, text = options["first"], options["last"], options["points"]
    if first is None and last is None:
        if text is None:
            raise StudyError("No points to scan", "neither a range nor a list is given", "Give --from, --to and --points, or a list as --points")
        if text.strip().isdecimal():
            raise StudyError(f"--points {text} needs a range", "a single whole number is a number of points", "Give --from and --to as well")
        return read_points(text)
    if first is None or last is None:
        raise StudyError("Half a range", f"{'--from' if first is None else '--to'} is missing", "Give both ends")
    if text is None or not text.strip().isdecimal():
        raise StudyError("A range needs a number of points", f"--points is {text or 'missing'}", "Give a whole number such as --points 40")
    return (geometric_points if options["geometric"] else linear_points)(first, last, int(text))


def _literature(text: str | None, source: str) -> Literature:
    """`r_e=1.5957,omega_e=1405.65,d_e=2.515 eV`; an energy without a unit is in hartree."""
    values: dict[str, Any] = {"source": source}
    for part in (text or "").split(","):
        if not part.strip():
            continue
        name, sign, value = (piece.strip() for piece in part.partition("="))
        number = re.fullmatch(r"([+-]?[\d.]+(?:[eE][+-]?\d+)?)\s*(\S*)", value)
        if not sign or name not in LITERATURE_FIELDS or number is None or (number[2] and (name != "d_e" or number[2] not in ENERGY_UNITS)):
            fields = ", ".join(LITERATURE_FIELDS)
            raise StudyError(f"Cannot read --literature {part.strip()}", f"it takes {fields}", "Write it like r_e=1.5957,omega_e=1405.65,d_e=2.515eV")
        values[name] = float(number[1]) / ENERGY_UNITS[number[2] or "hartree"]
    return Literature(**values)
