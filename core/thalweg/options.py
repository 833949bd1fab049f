"""The base of every frozen settings model, and the one way to declare a field with its metadata.

The metadata (title, unit, bounds, help) feeds validation, the window's form, the terminal option and the JSON Schema.
Modules that define options import nothing heavier than numpy at module level: the window's process loads them all.
"""

from __future__ import annotations

from typing import Any, ClassVar

from pydantic import BaseModel, ConfigDict, Field


class Options(BaseModel):
    """Frozen, hashable, comparable settings; unknown fields are refused."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)

    #: One line for menus, and one line on strengths and weaknesses with its source.
    title: ClassVar[str] = ""
    about: ClassVar[str] = ""
    #: Other names by which a person may call a setting -> its own name.
    also_called: ClassVar[dict[str, str]] = {}


def option(default: Any, title: str, help: str, *, unit: str = "", advanced: bool = False, **bounds: Any) -> Any:
    """A field of an `Options` model. `bounds` are pydantic's (ge, gt, le, lt, min_length ...)."""
    extra: dict[str, Any] = {"unit": unit, "advanced": advanced}
    return Field(default, title=title, description=help, json_schema_extra=extra, **bounds)
