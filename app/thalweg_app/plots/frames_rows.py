"""The rows of the scan form that choose a file of frames."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFileDialog, QLabel, QPushButton, QWidget

from thalweg_app.forms import TextEntry, describe, form_grid
from thalweg_app.presenters.scan_control import ScanControl

FRAMES_FILTER = "XYZ geometries (*.xyz);;Any file (*)"


class FramesRows(QWidget):
    """Which file, how many frames it has, and which of them are run."""

    def __init__(self, scans: ScanControl) -> None:
        super().__init__()
        self._scans = scans
        self.file = QLabel(wordWrap=True)
        self.file.setAccessibleName("File of frames")
        self.choose = QPushButton("Choose frames…")
        describe(self.choose, "Choose frames", "Takes an XYZ file with several geometries of the molecule; each is a point of the curve.")
        self.choose.clicked.connect(self._ask)
        self.among = TextEntry(False)
        self.among.setPlaceholderText("all")
        describe(self.among, "Frames", "Numbers of the frames to run, counted from 1 and separated by spaces or commas; empty: all of them.")
        self.among.committed.connect(lambda text: scans.edit("among_frames", text))
        grid = form_grid(self)
        for row, (title, widget) in enumerate((("File", self.file), ("", self.choose), ("Frames", self.among))):
            label = QLabel(title)
            label.setBuddy(widget)
            grid.addWidget(label, row, 0, Qt.AlignmentFlag.AlignTop if widget is self.file else Qt.AlignmentFlag(0))
            grid.addWidget(widget, row, 1)

    def refresh(self) -> None:
        self.file.setText(self._scans.frames_told)
        self.among.show_value(self._scans.draft.among_frames)

    def _ask(self) -> None:
        dialog = QFileDialog(self.window(), "Choose frames")
        dialog.setFileMode(QFileDialog.FileMode.ExistingFile)
        dialog.setNameFilter(FRAMES_FILTER)
        dialog.fileSelected.connect(lambda path: self._scans.open_frames(Path(path)))
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.open()
