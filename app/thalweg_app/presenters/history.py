"""Undo and redo over every edit of the set-up and the ledger."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from thalweg_app.presenters.listeners import Listeners


@dataclass(frozen=True)
class Edit:
    """Something a person did, in words for the menu, and how to take it back and do it again."""

    text: str
    undo: Callable[[], None]
    redo: Callable[[], None]


class History:
    """Edits in their order; a new edit after an undo forgets what was undone."""

    def __init__(self) -> None:
        self._done: list[Edit] = []
        self._undone: list[Edit] = []
        self.changed = Listeners()

    @property
    def undo_text(self) -> str:
        """What undo would take back; empty when there is nothing."""
        return self._done[-1].text if self._done else ""

    @property
    def redo_text(self) -> str:
        return self._undone[-1].text if self._undone else ""

    def record(self, text: str, undo: Callable[[], None], redo: Callable[[], None]) -> None:
        """Notes an edit that has already happened."""
        self._done.append(Edit(text, undo, redo))
        self._undone.clear()
        self.changed()

    def undo(self) -> None:
        if self._done:
            edit = self._done.pop()
            self._undone.append(edit)
            edit.undo()
            self.changed()

    def redo(self) -> None:
        if self._undone:
            edit = self._undone.pop()
            self._done.append(edit)
            edit.redo()
            self.changed()

    def clear(self) -> None:
        self._done.clear()
        self._undone.clear()
        self.changed()
