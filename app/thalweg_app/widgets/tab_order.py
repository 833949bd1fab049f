"""The order in which the Tab key visits widgets that were built late."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QWidget


def visit_after(before: QWidget, late: QWidget) -> None:
    """Visits `late` and all within it after all of `before`; late widgets stand at the end of their window otherwise."""
    *_, last = visited(before)
    for widget in visited(late):
        QWidget.setTabOrder(last, widget)
        last = widget


def visited(whole: QWidget) -> list[QWidget]:
    """What can have the focus within a widget, itself among it, in order."""
    found, following = [whole], whole.nextInFocusChain()
    while following is not None and following is not whole and whole.isAncestorOf(following):
        found.append(following)
        following = following.nextInFocusChain()
    return [widget for widget in found if widget.focusPolicy() != Qt.FocusPolicy.NoFocus]
