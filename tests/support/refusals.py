"""Reading what may or may not be readable."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from thalweg.errors import StudyError


def read_or_refusal(read: Callable[[], Any]) -> tuple[Any, StudyError | None]:
    """(what was read, None), or (None, the refusal); anything else that is raised is a defect and passes through."""
    try:
        return read(), None
    except StudyError as error:
        return None, error
