"""F1: what the focused field means."""

from __future__ import annotations

from PySide6.QtCore import QPoint, Qt
from PySide6.QtWidgets import QApplication, QFrame, QLabel, QVBoxLayout, QWidget

NOTHING = (
    "<b>Thalweg</b><br>Choose a system, an encoding, a trial state and a search at the left, then press Run. "
    "F1 explains the field that has the focus."
)


def help_of(widget: QWidget | None) -> str:
    """The help text of a widget or of the nearest widget around it that has one."""
    while widget is not None:
        text = widget.property("help")
        if text:
            return str(text)
        widget = widget.parentWidget()
    return NOTHING


class HelpBubble(QFrame):
    """Closes by Escape or a click elsewhere."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent, Qt.WindowType.Popup)
        self._owner = parent
        self.setProperty("role", "help")
        self.label = QLabel(wordWrap=True)
        self.label.setTextFormat(Qt.TextFormat.RichText)
        self.label.setMinimumWidth(300)
        self.label.setMaximumWidth(420)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(12, 10, 12, 10)
        layout.addWidget(self.label)

    def show_for(self, widget: QWidget | None) -> None:
        self.label.setText(help_of(widget))
        self.adjustSize()
        anchor, offset = (self._owner, QPoint(60, 60)) if widget is None else (widget, QPoint(0, widget.height() + 4))
        place = anchor.mapToGlobal(offset)
        screen = QApplication.primaryScreen().availableGeometry()
        place.setX(max(screen.left(), min(place.x(), screen.right() - self.width())))
        place.setY(max(screen.top(), min(place.y(), screen.bottom() - self.height())))
        self.move(place)
        self.show()
