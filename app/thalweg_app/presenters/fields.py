"""What the metadata of a settings class says about each of its fields, in the terms a form needs."""

from __future__ import annotations

import types
import typing
from dataclasses import dataclass
from typing import Any, Literal

from pydantic import BaseModel

#: Fields that have an editor of their own and no place in a generated form.
OWN_EDITORS = frozenset({"key", "atoms", "listing", "source", "described"})
#: Words for keys of choices whose plain spelling would read badly; all others are made from the key itself.
CHOICE_WORDS = {"mp2": "MP2", "ccsd": "CCSD", "ccsd(t)": "CCSD(T)", "ry": "RY", "ry-rz": "RY and RZ", "angstrom": "ångström", "-": "−"}

Kind = Literal["number", "whole", "text", "switch", "choice", "choices"]


@dataclass(frozen=True)
class FieldFacts:
    """One field of a settings class."""

    name: str
    title: str
    help: str
    unit: str
    advanced: bool
    kind: Kind
    choices: tuple[str, ...]
    default: Any
    bounds: str  # in words, e.g. `from 1 to 200`; empty when there are none


def fields_of(options: type[BaseModel]) -> list[FieldFacts]:
    """The fields a generated form shows, in the order of declaration."""
    found = []
    for name, info in options.model_fields.items():
        described = _kind(info.annotation)
        if name in OWN_EDITORS or described is None:
            continue
        kind, choices = described
        extra = info.json_schema_extra if isinstance(info.json_schema_extra, dict) else {}
        unit, advanced = str(extra.get("unit") or ""), bool(extra.get("advanced"))
        title = info.title or name.replace("_", " ").capitalize()
        found.append(FieldFacts(name, title, info.description or "", unit, advanced, kind, choices, info.default, _bounds(info.metadata)))
    return found


def choice_words(key: str) -> str:
    """`doubles-first` -> `Doubles first`."""
    return CHOICE_WORDS.get(key, key.replace("-", " ")[:1].upper() + key.replace("-", " ")[1:])


def help_text(facts: FieldFacts) -> str:
    """Everything that is known of a field: for tool tips and F1."""
    parts = [facts.help]
    if facts.bounds:
        parts.append(f"Allowed: {facts.bounds}{' ' + facts.unit if facts.unit else ''}.")
    elif facts.unit:
        parts.append(f"Unit: {facts.unit}.")
    return " ".join(p for p in parts if p)


def _kind(annotation: Any) -> tuple[Kind, tuple[str, ...]] | None:
    origin, arguments = typing.get_origin(annotation), typing.get_args(annotation)
    if origin is Literal:
        return "choice", tuple(str(a) for a in arguments)
    if origin is tuple and len(arguments) == 2 and arguments[1] is Ellipsis and typing.get_origin(arguments[0]) is Literal:
        return "choices", tuple(str(a) for a in typing.get_args(arguments[0]))
    if origin in (typing.Union, types.UnionType):
        inner = [a for a in arguments if a is not type(None)]
        return _kind(inner[0]) if len(inner) == 1 else None
    plain: dict[Any, Kind] = {bool: "switch", int: "whole", float: "number", str: "text"}
    return (plain[annotation], ()) if annotation in plain else None


def _bounds(metadata: list[Any]) -> str:
    limits = {name: getattr(item, name) for item in metadata for name in ("ge", "gt", "le", "lt") if getattr(item, name, None) is not None}
    low = f"from {limits['ge']:,}" if "ge" in limits else f"above {limits['gt']:,}" if "gt" in limits else ""
    high = f"to {limits['le']:,}" if "le" in limits else f"below {limits['lt']:,}" if "lt" in limits else ""
    return " ".join(part for part in (low, high) if part)
