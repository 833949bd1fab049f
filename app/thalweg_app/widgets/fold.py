"""A heading that folds what stands under it."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt, Signal
from PySide6.QtWidgets import QApplication, QLabel, QSizePolicy, QToolButton, QVBoxLayout, QWidget

from thalweg_app.theme import icon, show_fresh


class Fold(QWidget):
    """`toggled` tells whether it is open now."""

    toggled = Signal(bool)

    def __init__(self, title: str, *, section: bool = False, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._open = False
        self._content: QWidget | None = None
        self.head = QToolButton()
        self.head.setText(title)
        self.head.setProperty("role", "section" if section else "fold")
        self.head.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextBesideIcon)
        self.head.setIconSize(QSize(14, 14))
        self.head.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.head.setAccessibleName(title)
        self.head.setToolTip(f"Folds or unfolds “{title}”.")
        self.head.clicked.connect(lambda: self.set_open(not self._open))
        self._layout = QVBoxLayout(self)
        self._layout.setContentsMargins(0, 0, 0, 0)
        self._layout.setSpacing(0 if section else 6)
        self._layout.addWidget(self.head)
        self.refresh_icon()

    @property
    def is_open(self) -> bool:
        return self._open

    def set_content(self, content: QWidget) -> None:
        self._content = content
        self._layout.addWidget(content)
        content.setVisible(self._open)

    def set_open(self, is_open: bool) -> None:
        if is_open != self._open:
            self._open = is_open
            if self._content is not None:
                self._content.setVisible(is_open)
            self.refresh_icon()
            self.toggled.emit(is_open)

    def refresh_icon(self) -> None:
        """Draws the arrow in the colour of the text, which changes with the appearance."""
        colour = QApplication.palette().color(self.head.foregroundRole()).name()
        self.head.setIcon(icon("unfolded" if self._open else "folded", colour, 14))
        self.head.setAccessibleDescription("open" if self._open else "folded")


class Section(Fold):
    """A numbered section of the set-up column, with a line that says what is chosen and what it costs."""

    def __init__(self, number: int, title: str) -> None:
        super().__init__(f"{number}  {title}", section=True)
        self.line = QLabel()
        self.line.setWordWrap(True)
        self.line.setContentsMargins(30, 3, 8, 7)
        self.line.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._layout.addWidget(self.line)

    def show_summary(self, text: str, is_fresh: bool) -> None:
        self.line.setText(text)
        show_fresh(self.line, is_fresh)
        self.head.setAccessibleDescription(text)
