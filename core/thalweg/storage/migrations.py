"""Brings the plain data of an older session up to the present format, one step at a time."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, Final

from thalweg.errors import StudyError

#: The number that a session file carries. Raise it with every change that an older program could not read.
CURRENT_FORMAT: Final = 1

Step = Callable[[dict[str, Any]], dict[str, Any]]

#: Format n -> the step from n to n + 1. A step takes and returns plain JSON data and never imports today's models.
STEPS: Mapping[int, Step] = {}


def migrate(data: dict[str, Any], steps: Mapping[int, Step] = STEPS, current: int = CURRENT_FORMAT) -> dict[str, Any]:
    """The same session in format `current`; StudyError for a newer or an unknown format."""
    found = data.get("format")
    if not isinstance(found, int) or isinstance(found, bool) or found < 1:
        raise StudyError("The session has no format number", "a session states it as a whole number from 1", "Open a file that Thalweg has saved")
    if found > current:
        why = f"it has format {found} and this version reads formats up to {current}"
        raise StudyError("The session was saved by a newer version", why, "Install a newer Thalweg to open it")
    for number in range(found, current):
        if number not in steps:
            raise StudyError(
                f"Format {number} cannot be read", "no step leads from it to the present format", "Open it with an older version of Thalweg"
            )
        data = {**steps[number](data), "format": number + 1}
    return data
