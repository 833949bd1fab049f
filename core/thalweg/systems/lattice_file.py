"""Lattice models as TOML files, and edge lists as lattice models."""

from __future__ import annotations

import json
import re
import tomllib
from typing import Any

from pydantic import ValidationError

from thalweg.errors import StudyError
from thalweg.systems.bond_list import bond_list_from_csv, bond_list_from_toml
from thalweg.systems.lattice import LATTICES
from thalweg.systems.lattice_model import MODELS, LatticeModel

_FIX = "Write tables [lattice] and [model], each with its `key`, as in the samples"
_HEADING = re.compile(r"^\s*(\[(lattice|model)\]|(lattice|model)\.\w+\s*=|bonds\s*=\s*\[)", re.MULTILINE)


def looks_like_lattice(text: str) -> bool:
    """Whether a text has the headings of a lattice file."""
    return _HEADING.search(text) is not None


def read_lattice_file(text: str) -> LatticeModel:
    """A lattice model from TOML: fields of `LatticeModel` at the top, tables `lattice` and `model`.

    A file with an array `bonds` alone is an edge list, with the Heisenberg model on it. Raises StudyError on anything else.
    """
    try:
        data: dict[str, Any] = tomllib.loads(text.removeprefix("\ufeff"))
    except tomllib.TOMLDecodeError as error:
        raise StudyError("The lattice file cannot be read", f"it is not TOML ({error})", "Correct this place") from None
    if "bonds" in data and not {"lattice", "model"} & set(data):
        return LatticeModel(name=str(data.get("name", "")), lattice=bond_list_from_toml(text))
    for table, known in (("lattice", LATTICES), ("model", MODELS)):
        _check_table(data, table, known.keys())
    try:
        return LatticeModel.model_validate(data)
    except ValidationError as error:
        raise _study_error(error) from None


def write_lattice_file(system: LatticeModel) -> str:
    """The TOML that `read_lattice_file` reads back to an equal model."""
    data = system.model_dump()
    lattice, model = data.pop("lattice"), data.pop("model")
    data.pop("key")
    lines = [_assignment(name, value) for name, value in data.items() if value != type(system).model_fields[name].default]
    for table, fields in (("lattice", lattice), ("model", model)):
        lines += ["", f"[{table}]", _assignment("key", fields.pop("key")), *(_assignment(name, value) for name, value in fields.items())]
    return "\n".join(lines).lstrip("\n") + "\n"


def read_edge_list(text: str, name: str = "") -> LatticeModel:
    """A CSV edge list as a lattice of free bonds, with the Heisenberg model on it until another is chosen."""
    return LatticeModel(name=name, lattice=bond_list_from_csv(text))


def lattice_description(text: str) -> str:
    """The comment lines at the head of a lattice file, joined."""
    words = []
    for line in text.splitlines():
        if not line.startswith("#"):
            break
        words.append(line.lstrip("# ").strip())
    return " ".join(words)


def _check_table(data: dict[str, Any], table: str, keys: list[str]) -> None:
    fields = data.get(table)
    if not isinstance(fields, dict):
        raise StudyError(f"The lattice file has no table [{table}]", "it is needed", _FIX, table)
    if fields.get("key") not in keys:
        given = f"'{fields['key']}' is none of the kinds" if "key" in fields else "it has no `key`"
        raise StudyError(f"The table [{table}] cannot be read", given, f"Set its key to one of: {', '.join(keys)}", f"{table}.key")


def _study_error(error: ValidationError) -> StudyError:
    first = error.errors()[0]
    location = [str(part) for part in first["loc"]]
    if len(location) > 2:  # table, key of the kind, field
        del location[1]
    field = ".".join(location)
    if first["type"] == "extra_forbidden":
        return StudyError(f"The lattice file has an unknown field '{field}'", "no setting has this name", "Correct or remove it", field)
    why = first["msg"][:1].lower() + first["msg"][1:]
    return StudyError(f"The field '{field}' cannot be {first['input']!r:.60}", why, "Give a value that fits", field)


def _assignment(name: str, value: Any) -> str:
    if isinstance(value, bool):
        return f"{name} = {'true' if value else 'false'}"
    if isinstance(value, str):
        return f"{name} = {_quoted(value)}"
    return f"{name} = {value!r}"


def _quoted(text: str) -> str:
    """A TOML string; several lines stay several lines where no sign needs an escape."""
    plain = all(sign == "\n" or sign.isprintable() for sign in text) and '"""' not in text and "\\" not in text and not text.endswith('"')
    if "\n" in text and plain:
        return f'"""\n{text}"""'
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")
