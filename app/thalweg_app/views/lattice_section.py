"""The builder of a lattice: its picture, the choice of lattice and model, the counts and the convention."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from thalweg.errors import StudyError
from thalweg.systems import LatticeModel
from thalweg.systems.lattice import LATTICES
from thalweg.systems.lattice_graph import SECOND, LatticeGraph
from thalweg.systems.lattice_model import MODELS
from thalweg_app.colours import Palette
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.presenters.sites import coupled_kinds
from thalweg_app.theme import SPACE
from thalweg_app.views.alternatives import AlternativeBox
from thalweg_app.widgets.lattice_picture import LatticePicture

#: Larger lattices are not drawn: their sites could not be told apart.
MAX_DRAWN = 600


class LatticeSection(QWidget):
    """Picture above, then lattice and model with their settings."""

    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self.picture = LatticePicture()
        self.lattice = AlternativeBox(setup, "system.lattice", "Lattice", LATTICES)
        self.model = AlternativeBox(setup, "system.model", "Model", MODELS)
        self._facts, self._problem = QLabel(wordWrap=True), QLabel(wordWrap=True)
        self._facts.setProperty("role", "muted")
        self._facts.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._facts.setAccessibleName("Counts and convention")
        self._problem.setProperty("role", "error")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(SPACE)
        for part in (self.picture, self._problem, self._facts, self.lattice, self.model):
            column.addWidget(part)

    def refresh(self, system: LatticeModel) -> None:
        """Shows the settings, and the lattice that they build; where they build none, why."""
        self.lattice.refresh()
        self.model.refresh()
        try:
            graph = system.graph()
        except StudyError as error:
            self.picture.show_graph(None)
            self._say("", str(error))
            return
        drawn = graph.n_sites <= MAX_DRAWN
        self.picture.show_graph(graph if drawn else None, coupled_kinds(system, graph))
        self._say("\n".join(lattice_lines(system, graph)), "" if drawn else f"{graph.n_sites:,} sites are too many to draw.")

    def paths(self) -> set[str]:
        """Fields that are shown with their errors here."""
        return self.lattice.paths() | self.model.paths()

    def set_palette(self, palette: Palette) -> None:
        self.picture.set_palette(palette)

    def _say(self, facts: str, problem: str) -> None:
        self._facts.setText(facts)
        self._facts.setVisible(bool(facts))
        self._problem.setText(problem)
        self._problem.setVisible(bool(problem))


def lattice_lines(system: LatticeModel, graph: LatticeGraph) -> list[str]:
    """Counts, convention, and what is to be said of doubled bonds."""
    kinds = coupled_kinds(system, graph)
    bonds = ", ".join(f"{count} {kind}" for kind, count in graph.bonds_per_class().items() if kind in kinds)
    lines = [f"{graph.n_sites} sites; bonds: {bonds or 'none'}", system.model.convention()]
    return lines + list(graph.notes) + (list(graph.second_notes) if SECOND in kinds else [])
