"""Says which run the search starts from, with a button that takes the start away."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QToolButton, QVBoxLayout, QWidget

from thalweg.study.derived import StudyFigures
from thalweg_app.colours import Palette
from thalweg_app.forms import describe
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.theme import SPACE, icon

PATH = "neighbour"
HELP = (
    "The search begins at the final parameters of that run, wherever this trial state has the same operator; all others begin as the trial "
    "state says. Another run is taken in the ledger."
)


class StartLine(QWidget):
    """Hidden where the search begins as the trial state says. The sentence under it says why a start cannot be used."""

    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self._setup = setup
        self.text, self.taken, self.problem = (QLabel(wordWrap=True) for _ in range(3))
        self.text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        describe(self.text, "Start", HELP)
        self.taken.setProperty("role", "muted")
        self.taken.setAccessibleName("What is taken over")
        self.problem.setProperty("role", "error")
        self.problem.setAccessibleName("Why the search cannot start there")
        self.button = QToolButton()
        self.button.setIconSize(QSize(16, 16))
        self.button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        describe(self.button, "Start without that run", "The search begins as the trial state says; undo brings the run back.")
        self.button.clicked.connect(setup.leave_start)
        row = QHBoxLayout()
        row.setSpacing(SPACE)
        row.addWidget(self.text, 1)
        row.addWidget(self.button, 0, Qt.AlignmentFlag.AlignTop)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(3)
        column.addLayout(row)
        column.addWidget(self.taken)
        column.addWidget(self.problem)

    def refresh(self) -> None:
        line = self._setup.start_line
        error = self._setup.errors.get(PATH)
        self.text.setText(line)
        self.problem.setText("" if error is None else str(error))
        self.problem.setVisible(error is not None)
        self.setVisible(bool(line))

    def show_figures(self, figures: StudyFigures | None, is_fresh: bool) -> None:
        """How much of that run finds a place, while it is known."""
        sentence = figures.start if figures is not None and is_fresh else ""
        self.taken.setText(sentence)
        self.taken.setVisible(bool(sentence))

    def set_palette(self, palette: Palette) -> None:
        self.button.setIcon(icon("delete", palette.ink, 16))
