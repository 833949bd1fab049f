"""Sections 2 to 4: encoding, trial state and search."""

from __future__ import annotations

from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from thalweg.ansatz import ANSATZE
from thalweg.encoding import ENCODINGS
from thalweg.evaluate import EVALUATIONS
from thalweg.optimize import OPTIMIZERS
from thalweg.optimize.objective import StopRules
from thalweg.study.derived import StudyFigures
from thalweg.study.spec import DepthLadder, StudySpec, Target
from thalweg.systems import has_electrons
from thalweg_app.colours import Palette
from thalweg_app.forms import OptionsForm
from thalweg_app.presenters import wording
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.presenters.tables import Figure
from thalweg_app.theme import SPACE, show_fresh
from thalweg_app.views.alternatives import AlternativeBox
from thalweg_app.views.start_line import StartLine
from thalweg_app.widgets.figure_grid import FigureGrid
from thalweg_app.widgets.fold import Fold


class SectionBody(QWidget):
    """Column with the margins that all sections share."""

    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self.setup = setup
        self.column = QVBoxLayout(self)
        self.column.setContentsMargins(12, SPACE, 12, 12)
        self.column.setSpacing(SPACE)
        self.problem = QLabel(wordWrap=True)
        self.problem.setProperty("role", "error")
        self.problem.hide()
        self.column.addWidget(self.problem)

    def show_problem(self, *sections: str) -> None:
        """Errors of a section as a whole, such as a trial state that does not fit the system."""
        names = {*sections, *(f"{section}.key" for section in sections)}
        found = [str(error) for path, error in self.setup.errors.items() if path in names]
        self.problem.setText("\n".join(found))
        self.problem.setVisible(bool(found))

    def set_palette(self, palette: Palette) -> None:
        for fold in self.findChildren(Fold):
            fold.refresh_icon()


class EncodingSection(SectionBody):
    def __init__(self, setup: SetupEditing) -> None:
        super().__init__(setup)
        self.choice = AlternativeBox(setup, "encoding", "Encoding", ENCODINGS)
        self.figures = FigureGrid()
        self._unneeded = QLabel("Every site is a qubit: encodings are for electrons.", wordWrap=True)
        self._symmetries = QLabel(wordWrap=True)
        self._symmetries.setAccessibleName("Symmetries found")
        for part in (self._unneeded, self.choice, self.figures, self._symmetries):
            self.column.addWidget(part)

    def refresh(self) -> None:
        is_needed = has_electrons(self.setup.spec.system)
        self._unneeded.setVisible(not is_needed)
        self.choice.setVisible(is_needed)
        self.choice.refresh()
        self.show_problem("encoding")

    def show_figures(self, figures: StudyFigures | None, is_fresh: bool) -> None:
        self.figures.show_figures([] if figures is None else _encoding_figures(figures), is_fresh)
        lines = [] if figures is None else list(figures.symmetries)
        self._symmetries.setVisible(bool(lines))
        self._symmetries.setText(f"{wording.counted(len(lines), 'symmetry').replace('symmetrys', 'symmetries')} used:\n" + "\n".join(lines))
        show_fresh(self._symmetries, is_fresh)


class TrialSection(SectionBody):
    def __init__(self, setup: SetupEditing) -> None:
        super().__init__(setup)
        self.choice = AlternativeBox(setup, "ansatz", "Ansatz", ANSATZE)
        self.start = StartLine(setup)
        self.figures = FigureGrid()
        self._order = QLabel(wordWrap=True)
        self._order.setProperty("role", "muted")
        self.forms = [
            OptionsForm(StudySpec, only=("reference", "continuation"), fold="Reference and continuation"),
            OptionsForm(DepthLadder, "ladder", fold="Settings of the ladder"),
        ]
        for form in self.forms:
            form.edited.connect(setup.edit)
        for part in (self.choice, self.start, *self.forms, self.figures, self._order):
            self.column.addWidget(part)

    def refresh(self) -> None:
        self.choice.refresh()
        self.show_problem("ansatz", "ladder")
        self.start.refresh()
        for form in self.forms:
            form.show_values(self.setup.shown, self.setup.errors)

    def set_palette(self, palette: Palette) -> None:
        super().set_palette(palette)
        self.start.set_palette(palette)

    def show_figures(self, figures: StudyFigures | None, is_fresh: bool) -> None:
        self.start.show_figures(figures, is_fresh)
        self.figures.show_figures([] if figures is None else _trial_figures(figures), is_fresh)
        self._order.setText("" if figures is None or not figures.operator_order else f"Factor order: {figures.operator_order}")
        self._order.setVisible(bool(self._order.text()) and is_fresh)


class SearchSection(SectionBody):
    def __init__(self, setup: SetupEditing) -> None:
        super().__init__(setup)
        self.choice = AlternativeBox(setup, "optimizer", "Optimiser", OPTIMIZERS)
        self.evaluation = AlternativeBox(setup, "evaluation", "Energy by", EVALUATIONS)
        self.forms = [
            OptionsForm(StudySpec, only=("starts", "seed")),
            OptionsForm(Target, "target"),
            OptionsForm(StudySpec, skip=("starts", "seed", "reference", "continuation")),
        ]
        self.rules = OptionsForm(StopRules, "stop")
        self.rules_fold = Fold("Stop rules")
        self.rules_fold.set_content(self.rules)
        self.figures = FigureGrid()
        for form in (*self.forms, self.rules):
            form.edited.connect(setup.edit)
        for part in (self.choice, self.evaluation, *self.forms, self.rules_fold, self.figures):
            self.column.addWidget(part)

    def refresh(self) -> None:
        self.choice.refresh()
        self.evaluation.refresh()
        self.show_problem("optimizer", "evaluation", "starts")
        errors = self.setup.errors
        for form in (*self.forms, self.rules):
            form.show_values(self.setup.shown, errors)
        if any(path.startswith("stop.") for path in errors):
            self.rules_fold.set_open(True)

    def show_figures(self, figures: StudyFigures | None, is_fresh: bool) -> None:
        self.figures.show_figures([] if figures is None else _search_figures(figures), is_fresh)


def _encoding_figures(figures: StudyFigures) -> list[Figure]:
    unit = wording.unit_name(figures.energy_unit)
    tapered = figures.qubits != figures.qubits_before_tapering
    return [
        Figure(
            "Qubits",
            f"{figures.qubits_before_tapering} → {figures.qubits}" if tapered else wording.count(figures.qubits),
            "Before and after tapering.",
        ),
        Figure("Pauli terms", wording.count(figures.terms), f"{figures.terms_before_tapering:,} before tapering."),
        Figure(f"One-norm / {unit}", f"{figures.one_norm:.4f}", "Sum of |coefficient| without the constant."),
        Figure("Largest weight", wording.count(figures.largest_weight), "Largest number of qubits that one term acts on."),
    ]


def _trial_figures(figures: StudyFigures) -> list[Figure]:
    return [
        Figure("Parameters", wording.count(figures.parameters), "Free parameters of the trial state."),
        Figure("Factors", wording.count(figures.factors), "Excitation factors or gates; several may share a parameter."),
        Figure("Two-qubit gates", wording.count(figures.two_qubit_gates), "Of the circuit on the working register, any pair of qubits connected."),
        Figure("Depth", wording.count(figures.depth), "Layers of gates that can act at the same time."),
    ]


def _search_figures(figures: StudyFigures) -> list[Figure]:
    """What a device would do. Without strings sorted into sets there are no such figures."""
    found = [
        ("Measurement sets", figures.measurement_sets, "Sets of Pauli strings that one circuit reads together, qubit by qubit."),
        ("Circuits a step", figures.circuits_a_step, "That a device would run for one iteration, gradients by shift rules."),
        ("Shots a step", figures.shots_a_step, "Repetitions of these circuits, all together."),
        ("Operators in the pool", figures.pool_operators, "That adaptive growth chooses from."),
        ("Circuits a choice", figures.pool_circuits, "That a device would run for the slopes of the whole pool, once for every step of growth."),
    ]
    return [Figure(name, wording.count(value), help) for name, value, help in found if value is not None]
