"""An ordered list of alternatives, looked up by their literal `key`."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, Generic, TypeVar

from thalweg.errors import StudyError
from thalweg.options import Options

T = TypeVar("T", bound=Options)


class Alternatives(Generic[T]):
    """Key -> options class. The order of the list is the order of the menus."""

    def __init__(self, what: str, classes: list[type[T]]) -> None:
        self.what = what
        self._by_key = {key_of(cls): cls for cls in classes}

    def __iter__(self) -> Iterator[type[T]]:
        return iter(self._by_key.values())

    def keys(self) -> list[str]:
        return list(self._by_key)

    def get(self, key: str) -> type[T]:
        """The class with this key; StudyError naming the known keys otherwise."""
        if key not in self._by_key:
            raise StudyError(f"Unknown {self.what} '{key}'", "no alternative has this key", "Use one of: " + ", ".join(self.keys()), self.what)
        return self._by_key[key]


def key_of(cls: type[Any]) -> str:
    return str(cls.model_fields["key"].default)
