"""A lattice given by its bonds: typed, or read from a CSV or TOML edge list."""

from __future__ import annotations

import csv
import io
import re
import tomllib
from dataclasses import dataclass, field, replace
from math import isfinite
from typing import Any, ClassVar, Literal

import numpy as np

from thalweg.errors import StudyError
from thalweg.options import Options, option
from thalweg.systems.lattice_graph import Bond, LatticeGraph, on_circle, two_colouring

_NAME = re.compile(r"[^\s,;:#=|\"']+")
_HEADINGS = {"site", "first", "from", "source", "node", "a", "i", "u"}
MAX_SITES = 10_000


class BondList(Options):
    title: ClassVar[str] = "Bond list"
    about: ClassVar[str] = "Any graph: one bond a line, two sites, then optionally a weight and a class."

    key: Literal["bonds"] = "bonds"
    bonds: str = option(
        "0 1\n1 2",
        "Bonds",
        "One bond a line: `site site weight class`; weight (1) and class (nearest) may be left out. Sites are numbers from 0 or names.",
    )
    places: str = option("", "Places", "Optional positions, one site a line: `site x y`. Sites without one are put on a circle.", advanced=True)

    def build(self) -> LatticeGraph:
        rows = parse_bonds(self.bonds)
        names = site_names(rows, self.places)
        number = {name: i for i, name in enumerate(names)}
        bonds, notes = _numbered(rows, number)
        places = _placed(self.places, number)
        numbered = all(name == str(i) for i, name in enumerate(names))
        title = f"bond list, {len(names)} sites"
        plain = np.zeros(len(names), dtype=np.int64)
        graph = LatticeGraph(title, places, bonds, plain, notes, (), places, np.zeros((2, 2)), () if numbered else names)
        colours = two_colouring(graph)
        return graph if colours is None else replace(graph, sublattice=colours)


@dataclass(frozen=True)
class BondRow:
    """One line as typed."""

    first: str
    second: str
    weight: float = 1.0
    kind: str = "nearest"
    line: int = field(default=0, compare=False)


def parse_bonds(text: str) -> tuple[BondRow, ...]:
    """Reads lines `site site [weight] [class]`; commas, semicolons and tabs separate as blanks do, `#` begins a comment.

    Raises StudyError naming the line.
    """
    rows = []
    for number, line in enumerate(text.splitlines(), start=1):
        words = re.split(r"[\s,;]+", line.split("#", 1)[0].strip(" \t,;"))
        if words != [""]:
            rows.append(_bond_row(words, number))
    return tuple(rows)


def write_bonds(rows: tuple[BondRow, ...]) -> str:
    """The lines that `parse_bonds` reads back to equal rows."""
    return "\n".join(f"{r.first} {r.second} {r.weight!r} {r.kind}" for r in rows)


def bond_list_from_csv(text: str) -> BondList:
    """An edge list with one bond a row: site, site, weight, class; a heading row and further columns are passed over."""
    try:
        sample = text.lstrip("\ufeff")
        separator = ";" if sample.count(";") > sample.count(",") else "," if "," in sample else "\t" if "\t" in sample else ","
        table = [[cell.strip() for cell in row] for row in csv.reader(io.StringIO(sample, newline=""), delimiter=separator, strict=True)]
    except csv.Error as error:
        raise StudyError("The edge list cannot be read", f"it is not CSV ({error})", "Write one bond a row: site, site, weight, class") from None
    rows: list[BondRow] = []
    for number, row in enumerate(table, start=1):
        cells = [cell for cell in row[:4] if cell]
        is_heading = not rows and len(row) > 1 and row[0].lower().rstrip("0123456789_ ") in _HEADINGS and not _is_number(row[1])
        if cells and not cells[0].startswith("#") and not is_heading:
            rows.append(_bond_row([cell.replace(" ", "_") for cell in cells], number))
    return _filled(rows)


def bond_list_from_toml(text: str) -> BondList:
    """An edge list `bonds = [[0, 1], ["a", "b", 0.5, "second"]]`, as an array of such arrays."""
    try:
        data: Any = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise StudyError("The edge list cannot be read", f"it is not TOML ({error})", "Write bonds = [[0, 1, 0.5], ...]") from None
    listed = data.get("bonds")
    if not isinstance(listed, list) or not all(isinstance(row, list) for row in listed):
        raise StudyError("The edge list has no bonds", "there is no array `bonds` of arrays", "Write bonds = [[0, 1, 0.5], ...]")
    return _filled([_bond_row([str(cell).replace(" ", "_") for cell in row], number) for number, row in enumerate(listed, start=1)])


def site_names(rows: tuple[BondRow, ...], places: str = "") -> tuple[str, ...]:
    """Names in order of site number: 0..largest when every name is a whole number, else in order of first appearance."""
    names = [name for row in rows for name in (row.first, row.second)] + [name for name, _, _ in _parse_places(places)]
    if not names:
        raise StudyError("The bond list is empty", "it names no site", "Give at least one bond, such as `0 1`", "bonds")
    if all(name.isascii() and name.isdecimal() for name in names):
        largest = max(int(name[:9]) if len(name) > 9 else int(name) for name in names)
        if largest >= MAX_SITES or any(len(name) > 9 for name in names):
            raise StudyError(
                "The bond list is too large", f"sites are numbered from 0 and may not reach {MAX_SITES}", "Number the sites from 0", "bonds"
            )
        return tuple(str(i) for i in range(largest + 1))
    return tuple(dict.fromkeys(names))


def _bond_row(words: list[str], line: int) -> BondRow:
    fix = "Write two sites, then optionally a weight and a class, such as `0 1 0.5 second`"
    if not 2 <= len(words) <= 4:
        raise StudyError(f"Bond {line} cannot be read", f"it has {len(words)} entries", fix, "bonds")
    if not all(_NAME.fullmatch(word) for word in words):
        raise StudyError(f"Bond {line} cannot be read", "an entry holds a sign that separates", fix, "bonds")
    weight, kind = 1.0, "nearest"
    for position, word in enumerate(words[2:]):
        if position == 0 and _is_number(word):
            weight = float(word)
        elif position == len(words) - 3:
            kind = word
        else:
            raise StudyError(f"Bond {line} cannot be read", f"the weight '{word[:20]}' is not a number", fix, "bonds")
    if not isfinite(weight):
        raise StudyError(f"Bond {line} cannot be read", f"the weight is {weight}", "Give a finite weight", "bonds")
    if _is_number(kind):
        raise StudyError(f"Bond {line} cannot be read", f"the class '{kind}' is a number", fix, "bonds")
    first, second = (str(int(w)) if w.isascii() and w.isdecimal() and len(w) < 10 else w for w in words[:2])
    return BondRow(first, second, weight, kind, line)


def _is_number(word: str) -> bool:
    try:
        float(word)
    except ValueError:
        return False
    return True


def _filled(rows: list[BondRow]) -> BondList:
    if not rows:
        raise StudyError("The edge list is empty", "it holds no bond", "Write one bond a row: site, site, weight, class")
    return BondList(bonds=write_bonds(tuple(rows)))


def _numbered(rows: tuple[BondRow, ...], number: dict[str, int]) -> tuple[tuple[Bond, ...], tuple[str, ...]]:
    kept: dict[tuple[int, int, str], Bond] = {}
    repeated = 0
    for row in rows:
        a, b = sorted((number[row.first], number[row.second]))
        if a == b:
            raise StudyError(f"Bond {row.line} joins site {row.first} to itself", "a bond has two ends", "Name two different sites", "bonds")
        key = (a, b, row.kind)
        repeated += key in kept
        kept[key] = Bond(*key, row.weight + (kept[key].weight if key in kept else 0.0))
    note = f"{repeated} line{'' if repeated == 1 else 's'} of the bond list repeat a pair; the weights are added"
    return tuple(kept.values()), ((note,) if repeated else ())


def _parse_places(text: str) -> list[tuple[str, float, float]]:
    found = []
    for line, row in enumerate(text.splitlines(), start=1):
        words = re.split(r"[\s,;]+", row.split("#", 1)[0].strip(" \t,;"))
        if words == [""]:
            continue
        if len(words) != 3 or not (_is_number(words[1]) and _is_number(words[2])) or not isfinite(float(words[1])) or not isfinite(float(words[2])):
            raise StudyError(f"Place {line} cannot be read", "it is not a site and two numbers", "Write `site x y`", "places")
        name = str(int(words[0])) if words[0].isascii() and words[0].isdecimal() and len(words[0]) < 10 else words[0]
        found.append((name, float(words[1]), float(words[2])))
    return found


def _placed(text: str, number: dict[str, int]) -> np.ndarray:
    places = on_circle(len(number))
    for name, x, y in _parse_places(text):
        places[number[name]] = x, y
    return places
