"""JSON as this program writes it: UTF-8, every digit of a float, no infinite or undefined number."""

from __future__ import annotations

import json
import math
from datetime import datetime
from typing import Any

from thalweg.paths import as_characters


def json_text(data: Any, indent: int | None = None) -> str:
    """Plain data as JSON. ValueError when a figure is not finite; see `first_not_finite` for its place.

    What is no character in UTF-8 becomes a question mark.
    """
    separators = (",", ":") if indent is None else (",", ": ")
    return as_characters(json.dumps(data, ensure_ascii=False, allow_nan=False, indent=indent, separators=separators, default=plain))


def read_json(text: str) -> Any:
    """The data in `text`. ValueError for anything that is not JSON, NaN and numbers too large for a float included."""
    return json.loads(text, parse_constant=_refuse_constant, parse_float=_finite)


def first_not_finite(node: Any, place: str = "") -> str:
    """Dotted place of the first infinite or undefined float in plain data; empty when there is none."""
    if isinstance(node, float):
        return "" if math.isfinite(node) else place
    if isinstance(node, dict):
        pairs: Any = node.items()
    elif isinstance(node, list | tuple):
        pairs = enumerate(node)
    else:
        return ""
    return next((found for key, item in pairs if (found := first_not_finite(item, f"{place}.{key}" if place else str(key)))), "")


def _refuse_constant(text: str) -> float:
    raise ValueError(f"{text} is not a number that JSON knows")


def _finite(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise ValueError(f"{text} is too large for a number")
    return value


def plain(value: Any) -> Any:
    """A value that JSON has no form of, as plain data. TypeError where there is none."""
    if isinstance(value, datetime):
        return value.isoformat()
    if hasattr(value, "tolist"):  # numpy scalars and arrays among the facts
        return value.tolist()
    raise TypeError(f"{type(value).__name__} has no form in JSON")
