"""The set-up column: four numbered sections that fold, the answer line, Run and Stop."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt, QTimer, Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QPushButton, QScrollArea, QVBoxLayout, QWidget

from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import describe
from thalweg_app.presenters.answer import Answer
from thalweg_app.presenters.summaries import SECTION_TITLES, summary
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import SPACE, base_font, icon, pixmap
from thalweg_app.views.sections import EncodingSection, SearchSection, TrialSection
from thalweg_app.views.system_section import SystemSection
from thalweg_app.widgets.fold import Section

WIDTH = 388
#: Pixels kept in sight above and under what is brought into sight.
ROOM = 60
STOP_HELP = "Ends the run and keeps the best point so far (Esc)."
STOP_NOW_HELP = "Does not wait for the properties of the best point; its energy is kept (Esc)."
_ANSWER_PICTURES = {"good": "reached", "bad": "missed", "unclear": "unclear"}


#: Settings of the study itself that stand in the section of the trial state; all others stand in that of the search.
OF_TRIAL = frozenset({"reference", "continuation", "ladder", "neighbour"})


class SetupColumn(QWidget):
    """Shows the workbench's set-up and figures; `run_asked` and `stop_asked` come from the buttons."""

    run_asked = Signal()
    stop_asked = Signal()

    def __init__(self, workbench: Workbench) -> None:
        super().__init__()
        self._workbench = workbench
        self.system = SystemSection(workbench.setup)
        self.encoding, self.trial, self.search = EncodingSection(workbench.setup), TrialSection(workbench.setup), SearchSection(workbench.setup)
        self._bodies: dict[str, SystemSection | EncodingSection | TrialSection | SearchSection] = {
            "system": self.system,
            "encoding": self.encoding,
            "ansatz": self.trial,
            "optimizer": self.search,
        }
        self.sections: dict[str, Section] = {}
        self.answer = AnswerLine()
        self._palette = LIGHT
        self.setMinimumWidth(330)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(0)
        layout.addWidget(self._scroll(), 1)
        layout.addWidget(self._footer())
        workbench.setup.changed.connect(self.refresh)
        workbench.figures.changed.connect(self.refresh_figures)
        workbench.runs.changed.connect(self.refresh_buttons)
        workbench.answer_changed.connect(self.refresh_answer)
        self.refresh()
        self.refresh_figures()

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(WIDTH, 600)

    def refresh(self) -> None:
        for body in self._bodies.values():
            body.refresh()
        for path in self._workbench.setup.errors:
            self._reveal(path)
        self.refresh_summaries()
        self.refresh_buttons()

    def refresh_figures(self) -> None:
        figures = self._workbench.figures
        for body in self._bodies.values():
            body.show_figures(figures.shown, figures.is_fresh)
        self.refresh_summaries()
        self.refresh_buttons()

    def refresh_summaries(self) -> None:
        figures, spec = self._workbench.figures, self._workbench.setup.spec
        for name, section in self.sections.items():
            own = name == "optimizer" or figures.is_fresh
            section.show_summary(summary(name, spec, figures.shown if self._workbench.setup.has_system else None), own)

    def refresh_buttons(self) -> None:
        runs, obstacle = self._workbench.runs, self._workbench.setup.obstacle
        self.run_button.setEnabled(not obstacle)
        self.run_button.setText("Add to queue" if runs.is_running else "Run")
        self.run_button.setToolTip(obstacle or "Minimises the energy with these settings (Ctrl+R).")
        stopping = runs.live is not None and runs.live.is_stopping
        self.stop_button.setEnabled(runs.is_running)
        self.stop_button.setText("Stop now" if stopping else "Stop")
        self.stop_button.setToolTip(STOP_NOW_HELP if stopping else STOP_HELP)
        self._obstacle.setText(obstacle)
        self._obstacle.setVisible(bool(obstacle))

    def refresh_answer(self) -> None:
        self.answer.show_answer(self._workbench.answer, self._palette)

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        self.system.set_palette(palette)
        for section in self.sections.values():
            section.refresh_icon()
        for body in (self.encoding, self.trial, self.search):
            body.set_palette(palette)
        self.run_button.setIcon(icon("run", palette.on_accent, 14, palette.muted))
        self.stop_button.setIcon(icon("stop", palette.ink, 14))
        self.refresh_answer()

    def show_start(self) -> None:
        """Opens the trial state and brings into sight where it stands which run the search starts from."""
        self.sections["ansatz"].set_open(True)
        QTimer.singleShot(0, self, lambda: self._area.ensureWidgetVisible(self.trial.start, 0, ROOM))  # once the section is laid out

    def _reveal(self, path: str) -> None:
        """Opens the section that holds a field with an error."""
        first = path.partition(".")[0]
        self.sections[first if first in self.sections else "ansatz" if first in OF_TRIAL else "optimizer"].set_open(True)

    def _scroll(self) -> QScrollArea:
        holder = QWidget()
        column = QVBoxLayout(holder)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(1)
        for number, (name, title) in enumerate(SECTION_TITLES.items(), 1):
            section = Section(number, title)
            section.set_content(self._bodies[name])
            self.sections[name] = section
            column.addWidget(section)
        column.addStretch(1)
        self.sections["system"].set_open(True)
        area = self._area = QScrollArea()
        area.setWidgetResizable(True)
        area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        area.setWidget(holder)
        area.setAccessibleName("Set-up")
        return area

    def _footer(self) -> QFrame:
        footer = QFrame()
        footer.setProperty("role", "footer")
        self.run_button, self.stop_button = QPushButton("Run"), QPushButton("Stop")
        self.run_button.setProperty("role", "primary")
        describe(self.run_button, "Run", "Minimises the energy with these settings (Ctrl+R).")
        describe(self.stop_button, "Stop", STOP_HELP)
        for button in (self.run_button, self.stop_button):
            button.setIconSize(QSize(14, 14))
        self.run_button.clicked.connect(self.run_asked)
        self.stop_button.clicked.connect(self.stop_asked)
        self._obstacle = QLabel(wordWrap=True)
        self._obstacle.setProperty("role", "error")
        self._obstacle.setAccessibleName("Why Run is not possible")
        row = QHBoxLayout()
        row.setSpacing(SPACE)
        row.addWidget(self.run_button, 1)
        row.addWidget(self.stop_button)
        column = QVBoxLayout(footer)
        column.setContentsMargins(12, 10, 12, 10)
        column.setSpacing(SPACE)
        column.addWidget(self.answer)
        column.addWidget(self._obstacle)
        column.addLayout(row)
        return footer


class AnswerLine(QWidget):
    """One sentence on the selected run with a mark; remarks under it."""

    def __init__(self) -> None:
        super().__init__()
        self._mark, self._sentence, self._remarks = QLabel(), QLabel(wordWrap=True), QLabel(wordWrap=True)
        self._mark.setAlignment(Qt.AlignmentFlag.AlignTop)
        self._mark.setFixedWidth(24)
        self._sentence.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._sentence.setAccessibleName("Answer")
        font = base_font(1.05)
        font.setWeight(font.Weight.Medium)
        self._sentence.setFont(font)
        self._remarks.setProperty("role", "muted")
        column = QVBoxLayout()
        column.setSpacing(3)
        column.addWidget(self._sentence)
        column.addWidget(self._remarks)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(6)
        row.addWidget(self._mark)
        row.addLayout(column, 1)

    @property
    def text(self) -> str:
        return self._sentence.text()

    def show_answer(self, answer: Answer, palette: Palette) -> None:
        self._sentence.setText(answer.sentence)
        self._sentence.setAccessibleDescription(answer.sentence)
        self._remarks.setText("\n".join(answer.remarks))
        self._remarks.setVisible(bool(answer.remarks))
        self._mark.setVisible(answer.kind in _ANSWER_PICTURES)
        if answer.kind in _ANSWER_PICTURES:
            colour = {"good": palette.good, "bad": palette.bad, "unclear": palette.warning}[answer.kind]
            self._mark.setPixmap(pixmap(_ANSWER_PICTURES[answer.kind], colour, 20, self.devicePixelRatioF() * 2))
