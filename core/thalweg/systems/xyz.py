"""Reads atoms from XYZ text or from a pasted list, as people write them."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field

from thalweg.errors import StudyError
from thalweg.systems.elements import find_element
from thalweg.systems.geometry import MAX_ATOMS, Atoms, check_geometry, describe_shortest, length_unit, unit_doubt

_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eEdD][+-]?\d+)?", re.ASCII)
_DECIMAL_COMMA = re.compile(r"[+-]?\d*,\d+([eEdD][+-]?\d+)?", re.ASCII)
_LABEL = re.compile(r"([A-Za-z]+)[\d_()'*-]*", re.ASCII)
_SETTING = re.compile(r"\b(charge|multiplicity|unit)\s*=\s*\"?([+-]?\w+)", re.IGNORECASE | re.ASCII)
_COORDINATE_LIMIT = 1e5


@dataclass(frozen=True)
class GeometryText:
    """What a text said.

    Attributes:
        atoms: (symbol, x, y, z) in `unit`.
        unit: the unit that was declared by the caller, `angstrom` or `bohr`.
        comment: the comment line, stripped; empty for a plain list.
        charge, multiplicity: from `charge=1 multiplicity=3` in the comment; None where it says nothing.
        notes: how the text was read, one sentence each, the shortest distance included.
        warnings: what looks wrong.
    """

    atoms: Atoms
    unit: str
    comment: str = ""
    charge: int | None = None
    multiplicity: int | None = None
    notes: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


@dataclass
class _Reading:
    """Collects notes while lines are read; each kind of remark once."""

    notes: list[str] = field(default_factory=list)

    def note(self, sentence: str) -> None:
        if sentence not in self.notes:
            self.notes.append(sentence)


def read_atoms(text: str, unit: str = "angstrom") -> GeometryText:
    """The first (or only) geometry of an XYZ text, or a plain list of atoms. Raises StudyError when there is none."""
    lines = _lines(text)
    reading = _Reading()
    if not _is_count(lines[0]):
        return _read_plain(lines, unit, reading)
    atoms, comment, rest = _read_frame(lines, reading)
    frames = 1 + _count_frames(rest)
    if frames > 1:
        reading.note(f"The text holds {frames} geometries; the first is used")
    elif any(line.strip() for line in rest):
        reading.note("Lines after the last atom are ignored")
    return _finished(atoms, comment, unit, reading)


def read_frames(text: str, unit: str = "angstrom") -> tuple[GeometryText, ...]:
    """Every geometry of an XYZ text with several; a plain list counts as one. Raises StudyError when any cannot be read."""
    lines = _lines(text)
    if not _is_count(lines[0]):
        return (read_atoms(text, unit),)
    frames = []
    while lines and _is_count(lines[0]):
        reading = _Reading()
        atoms, comment, lines = _read_frame(lines, reading)
        frames.append(_finished(atoms, comment, unit, reading))
        lines = _without_leading_blanks(lines)
    return tuple(frames)


def _lines(text: str) -> list[str]:
    text = text.lstrip("\ufeff").replace("\u00a0", " ").replace("\u2212", "-")
    lines = _without_leading_blanks(re.split(r"\r\n|\r|\n", text))
    if not lines:
        raise StudyError("There is no geometry", "the text is empty", "Give XYZ text or a list of atoms, e.g. `H 0 0 0.74`", "system.atoms")
    return lines


def _without_leading_blanks(lines: list[str]) -> list[str]:
    start = next((i for i, line in enumerate(lines) if line.strip()), len(lines))
    return lines[start:]


def _is_count(line: str) -> bool:
    return re.fullmatch(r"\s*\+?\d+\s*", line, re.ASCII) is not None


def _read_frame(lines: list[str], reading: _Reading) -> tuple[Atoms, str, list[str]]:
    """One frame from the count line on: atoms, comment, the lines after it."""
    digits = lines[0].strip().lstrip("+").lstrip("0") or "0"
    count = int(digits) if len(digits) < 10 else 10**9
    if not 1 <= count <= MAX_ATOMS:
        raise StudyError(
            f"The first line announces {digits[:12]} atoms", f"a geometry has 1 to {MAX_ATOMS}", "Correct the count in the first line", "system.atoms"
        )
    comment, body = (lines[1].strip() if len(lines) > 1 else ""), lines[2:]
    atom_lines = [line for line in body if line.strip()][:count]
    if len(atom_lines) < count and _looks_like_atom(comment):
        reading.note("The comment line is missing; the second line was read as an atom")
        comment, body = "", lines[1:]
        atom_lines = [line for line in body if line.strip()][:count]
    if len(atom_lines) < count:
        raise StudyError(
            f"The first line announces {count} atoms",
            f"the text holds {len(atom_lines)}",
            "Correct the count or add the missing lines",
            "system.atoms",
        )
    atoms: list[tuple[str, float, float, float]] = []
    rest = list(body)
    while len(atoms) < count:
        line = rest.pop(0)
        if line.strip():
            atoms.append(_read_atom(line, len(atoms) + 1, reading))
    return tuple(atoms), comment, rest


def _count_frames(lines: list[str]) -> int:
    """Frames that begin in these lines, judged by count lines that enough lines follow."""
    frames, i = 0, 0
    while i < len(lines):
        digits = lines[i].strip()
        if _is_count(lines[i]) and len(digits) < 10 and int(digits) > 0:
            frames += 1
            i += int(digits) + 2
        else:
            i += 1
    return frames


def _read_plain(lines: list[str], unit: str, reading: _Reading) -> GeometryText:
    """Atoms without a header; `#` and `!` begin comment lines, `;` may separate atoms."""
    comments: list[str] = []
    atoms: list[tuple[str, float, float, float]] = []
    for line in lines:
        stripped = line.strip()
        if stripped[:1] in ("#", "!"):
            comments.append(stripped.lstrip("#! "))
            continue
        pieces = [p for p in stripped.split(";") if p.strip()]
        if len(pieces) > 1 and not all(_looks_like_atom(p) for p in pieces):
            pieces = [stripped.replace(";", " ")]
        for piece in pieces:
            if len(atoms) >= MAX_ATOMS:
                raise StudyError("There are too many atoms", f"a geometry has at most {MAX_ATOMS}", "Study a smaller part", "system.atoms")
            atoms.append(_read_atom(piece, len(atoms) + 1, reading))
    return _finished(tuple(atoms), " ".join(comments), unit, reading)


def _finished(atoms: Atoms, comment: str, unit: str, reading: _Reading) -> GeometryText:
    length_unit(unit)
    check_geometry(atoms, unit)
    settings = {name.lower(): value.lower() for name, value in _SETTING.findall(comment)}
    warnings = [doubt] if (doubt := unit_doubt(atoms, unit)) else []
    stated = {"a": "angstrom", "au": "bohr"}.get(settings.get("unit", unit), settings.get("unit", unit))
    if stated != unit:
        warnings.append(f"The comment line says unit={settings['unit']}, but the coordinates are read as {unit}")
    charge, multiplicity = _whole(settings.get("charge"), -20, 20), _whole(settings.get("multiplicity"), 1, 20)
    for name, value in (("charge", charge), ("multiplicity", multiplicity)):
        if value is not None:
            reading.note(f"The {name} {value} is taken from the comment line")
        elif name in settings:
            warnings.append(f"The comment line says {name}={settings[name]}, which cannot be read and is ignored")
    if shortest := describe_shortest(atoms, unit):
        reading.note(f"Coordinates read as {unit}. {shortest}")
    return GeometryText(atoms, unit, comment, charge, multiplicity, tuple(reading.notes), tuple(warnings))


def _whole(text: str | None, lowest: int, highest: int) -> int | None:
    if text is None or not re.fullmatch(r"[+-]?\d{1,3}", text, re.ASCII):
        return None
    return int(text) if lowest <= int(text) <= highest else None


def _looks_like_atom(line: str) -> bool:
    try:
        _read_atom(line, 0, _Reading())
    except StudyError:
        return False
    return True


def _read_atom(line: str, number: int, reading: _Reading) -> tuple[str, float, float, float]:
    """One atom from `element x y z ...`; StudyError naming the line."""
    tokens = _tokens(line, reading)
    if len(tokens) >= 5 and tokens[0].isdigit() and _element_symbol(tokens[1]) and not _NUMBER.fullmatch(tokens[1]):
        tokens = tokens[1:]
        reading.note("Numbers before the element are ignored")
    if len(tokens) < 4:
        raise _line_error(line, number, "it needs an element and three coordinates")
    symbol = _element_symbol(tokens[0])
    if symbol is None:
        raise _line_error(line, number, f"'{tokens[0][:20]}' is no element")
    if symbol == "H" and tokens[0][:1] in "DdTt":
        reading.note("Deuterium and tritium are read as H: the electronic energy is the same")
    elif re.search(r"[^A-Za-z]", tokens[0]) and not tokens[0].isdigit():
        reading.note("Labels after the element symbols are ignored")
    if len(tokens) > 4:
        reading.note("Columns after the coordinates are ignored")
    x, y, z = (_coordinate(token, line, number) for token in tokens[1:4])
    return symbol, x, y, z


def _tokens(line: str, reading: _Reading) -> list[str]:
    """Columns of one line. Commas are decimal marks where each coordinate holds one and no point stands in the line, else separators."""
    tokens = line.split()
    if "," not in line:
        return tokens
    if len(tokens) >= 4 and "." not in line and any(_DECIMAL_COMMA.fullmatch(t) for t in tokens[1:4]):
        reading.note("Decimal commas are read as points")
        return [tokens[0], *(t.replace(",", ".") for t in tokens[1:])]
    return line.replace(",", " ").split()


def _element_symbol(token: str) -> str | None:
    label = _LABEL.fullmatch(token)
    element = find_element(label.group(1) if label else token)
    return element.symbol if element else None


def _coordinate(token: str, line: str, number: int) -> float:
    if not _NUMBER.fullmatch(token):
        raise _line_error(line, number, f"'{token[:20]}' is no number")
    value = float(token.replace("d", "e").replace("D", "E"))
    if not math.isfinite(value) or abs(value) > _COORDINATE_LIMIT:
        raise _line_error(line, number, f"the coordinate {token[:20]} is out of any range")
    return value


def _line_error(line: str, number: int, why: str) -> StudyError:
    shown = " ".join(line.split())[:50]
    return StudyError(f"Atom {number}, '{shown}', cannot be read", why, "Write one atom a line: element x y z", "system.atoms")
