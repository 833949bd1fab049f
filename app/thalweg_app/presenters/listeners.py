"""Callback lists: how presenters tell the views that something changed, without Qt."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any


class Listeners:
    """Calling it calls every connected function in the order of connection."""

    def __init__(self) -> None:
        self._functions: list[Callable[..., Any]] = []

    def connect(self, function: Callable[..., Any]) -> None:
        self._functions.append(function)

    def __call__(self, *arguments: Any) -> None:
        for function in list(self._functions):
            function(*arguments)
