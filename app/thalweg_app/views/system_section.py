"""Section 1: what is studied."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QSize, Qt, Signal
from PySide6.QtWidgets import QCompleter, QHBoxLayout, QLabel, QLineEdit, QMenu, QPushButton, QVBoxLayout, QWidget

from thalweg.registry import key_of
from thalweg.study.derived import StudyFigures
from thalweg.systems import SYSTEMS, LatticeModel, Molecule
from thalweg.systems.samples import list_samples
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import OptionsForm, QuietCombo, describe
from thalweg_app.presenters import wording
from thalweg_app.presenters.active_space import toggled
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.presenters.tables import Figure
from thalweg_app.theme import SPACE, icon
from thalweg_app.views.atoms_table import AtomsTable
from thalweg_app.views.lattice_section import LatticeSection
from thalweg_app.views.molecule_picture import MoleculePicture
from thalweg_app.views.orbital_ladder import OrbitalLadder
from thalweg_app.widgets.figure_grid import FigureGrid
from thalweg_app.widgets.fold import Fold
from thalweg_app.widgets.tab_order import visit_after

#: Errors of these settings stand beside them.
SHOWN_ELSEWHERE = ("system", "encoding", "ansatz", "optimizer", "stop", "target", "neighbour")
#: Offered while typing; any basis of the library can be typed.
BASIS_NAMES = [
    "sto-3g",
    "sto-6g",
    "3-21g",
    "6-31g",
    "6-31g*",
    "6-31g**",
    "6-31+g*",
    "6-311g",
    "6-311g**",
    "6-311++g**",
    "cc-pvdz",
    "cc-pvtz",
    "cc-pvqz",
    "aug-cc-pvdz",
    "aug-cc-pvtz",
    "def2-svp",
    "def2-tzvp",
    "def2-tzvpp",
    "ano-rcc",
    "minao",
]


class SystemSection(QWidget):
    """Signals ask the window for files, because it owns the dialogs."""

    open_asked = Signal()
    paste_asked = Signal()
    sample_asked = Signal(str)

    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self._setup = setup
        self._forms: dict[str, OptionsForm] = {}
        self._ladder_rungs: Any = ()
        self.kind = self._kind_menu()
        self.picture = MoleculePicture()
        self.lattice = LatticeSection(setup)
        self.atoms = AtomsTable(setup)
        self.atoms_fold = Fold("Atoms")
        self.atoms_fold.set_content(self.atoms)
        self.ladder = OrbitalLadder()
        self.ladder.toggled.connect(self._toggle_orbital)
        self.ladder_fold = Fold("Orbitals and active space")
        self.ladder_fold.set_content(self.ladder)
        self.figures = FigureGrid()
        self._problem, self._remarks = QLabel(wordWrap=True), QLabel(wordWrap=True)
        self._problem.setProperty("role", "error")
        self._remarks.setProperty("role", "warning")
        self._form_place = QVBoxLayout()
        layout = QVBoxLayout(self)
        layout.setContentsMargins(12, SPACE, 12, 12)
        layout.setSpacing(SPACE)
        layout.addLayout(self._buttons())
        layout.addWidget(self.kind)
        parts: list[list[QWidget]] = [[self.picture, self.lattice, self._problem, self.atoms_fold], [self.ladder_fold, self.figures, self._remarks]]
        for part in parts[0]:
            layout.addWidget(part)
        layout.addLayout(self._form_place)
        for part in parts[1]:
            layout.addWidget(part)

    def refresh(self) -> None:
        """Shows the set-up as it is."""
        system, errors = self._setup.spec.system, self._setup.errors
        is_molecule = isinstance(system, Molecule)
        self.picture.setVisible(is_molecule)
        self.atoms_fold.setVisible(is_molecule)
        self.lattice.setVisible(isinstance(system, LatticeModel))
        if isinstance(system, LatticeModel):
            self.lattice.refresh(system)
        self.kind.setCurrentIndex(self.kind.findData(key_of(type(system))))
        if isinstance(system, Molecule):
            self.picture.show_atoms(system.atoms, system.unit)
            self.atoms.refresh()
            self.atoms_fold.head.setText(f"Atoms ({len(system.atoms)})")
        key = key_of(type(system))
        for other, form in self._forms.items():
            form.setVisible(other == key)
        self._form(key).show_values(self._setup.shown, errors)
        shown_in_form = {row.path for row in self._form(key).rows}
        shown_in_form |= self.lattice.paths() if isinstance(system, LatticeModel) else set()
        loose = [e for path, e in errors.items() if path.startswith("system") and path not in shown_in_form]
        loose += [e for path, e in errors.items() if path.partition(".")[0] not in SHOWN_ELSEWHERE]
        self._problem.setText("\n".join(str(e) for e in loose))
        self._problem.setVisible(bool(loose))

    def show_figures(self, figures: StudyFigures | None, is_fresh: bool) -> None:
        self.figures.show_figures([] if figures is None else _figures(figures), is_fresh)
        warnings = () if figures is None or not is_fresh else figures.warnings
        self._remarks.setText("\n".join(warnings))
        self._remarks.setVisible(bool(warnings))
        rungs = () if figures is None else figures.ladder
        self._ladder_rungs = rungs
        self.ladder_fold.setVisible(bool(rungs))
        if rungs:
            active = sum(r.active for r in rungs)
            self.ladder_fold.head.setText(f"Orbitals and active space ({active} of {len(rungs)} active)")
        self.ladder.show_rungs(rungs, is_fresh)

    def set_palette(self, palette: Palette) -> None:
        self.picture.set_palette(palette)
        self.lattice.set_palette(palette)
        self.ladder.set_palette(palette)
        self.atoms.set_palette(palette)
        for button, picture in ((self.open_button, "open"), (self.paste_button, "paste"), (self.sample_button, "sample")):
            button.setIcon(icon(picture, palette.ink, 16))
        for fold in (self.atoms_fold, self.ladder_fold, *(f.fold for f in self._forms.values() if f.fold)):
            fold.refresh_icon()

    def _kind_menu(self) -> QuietCombo:
        menu = QuietCombo()
        for cls in SYSTEMS:
            menu.addItem(cls.title, key_of(cls))
        describe(menu, "Kind of system", " ".join(f"{cls.title}: {cls.about}" for cls in SYSTEMS))
        menu.activated.connect(lambda i: self._setup.choose("system", menu.itemData(i)))
        return menu

    def _form(self, key: str) -> OptionsForm:
        if key not in self._forms:
            form = OptionsForm(SYSTEMS.get(key), "system")
            form.edited.connect(self._setup.edit)
            for row in form.rows:
                if row.path == "system.basis" and isinstance(row.editor, QLineEdit):
                    completer = QCompleter(BASIS_NAMES, row.editor)
                    completer.setCaseSensitivity(Qt.CaseSensitivity.CaseInsensitive)
                    row.editor.setCompleter(completer)
            self._forms[key] = form
            self._form_place.addWidget(form)
            visit_after(self.atoms_fold, form)
        return self._forms[key]

    def _toggle_orbital(self, number: int) -> None:
        self._setup.edit("system.active_space", toggled(self._ladder_rungs, number))

    def _buttons(self) -> QHBoxLayout:
        self.open_button, self.paste_button, self.sample_button = QPushButton("Open…"), QPushButton("Paste…"), QPushButton("Samples")
        describe(self.open_button, "Open a file", "Reads a geometry (XYZ or a list of atoms), FCIDUMP, HDF5 molecular data, or a session.")
        describe(self.paste_button, "Paste atoms", "Reads a list of atoms from text that you paste.")
        describe(self.sample_button, "Samples", "Takes one of the systems that ship with the program.")
        menu = QMenu(self.sample_button)
        menu.setToolTipsVisible(True)
        for sample in list_samples():
            action = menu.addAction(sample.name)
            action.setToolTip(sample.description)
            action.triggered.connect(lambda _=False, path=str(sample.file): self.sample_asked.emit(path))
        self.sample_button.setMenu(menu)
        self.sample_button.setProperty("menu", True)
        self.open_button.clicked.connect(self.open_asked)
        self.paste_button.clicked.connect(self.paste_asked)
        row = QHBoxLayout()
        row.setSpacing(6)
        for button, picture in ((self.open_button, "open"), (self.paste_button, "paste"), (self.sample_button, "sample")):
            button.setIcon(icon(picture, LIGHT.ink, 16))
            button.setIconSize(QSize(16, 16))
            row.addWidget(button, 1)
        return row


def _short(name: str) -> str:
    return {"Hartree-Fock": "E(HF)"}.get(name, "E(ref)")


def _figures(figures: StudyFigures) -> list[Figure]:
    unit = wording.unit_name(figures.energy_unit)
    found = []
    if figures.n_electrons is not None and figures.n_orbitals is not None:
        found.append(Figure("Electrons", wording.count(figures.n_electrons), figures.sector))
        found.append(Figure("Orbitals", wording.count(figures.n_orbitals), "Spatial orbitals that the study works with."))
    if figures.n_electrons is None:
        found.append(Figure("Sites", wording.count(figures.qubits_before_tapering), "Sites that carry a spin."))
    if figures.sector_dimension is not None:
        found.append(Figure("Sector", wording.count(figures.sector_dimension), "Number of determinants with these electrons of each spin."))
    found.append(Figure("Memory", wording.bytes_text(figures.memory_bytes), "Memory that the trial state and its search need, estimated."))
    if figures.exact_bytes:
        found.append(Figure("Memory, exact", wording.bytes_text(figures.exact_bytes), "Memory that the exact energy needs, estimated."))
    found.append(
        Figure(
            f"{_short(figures.reference_name)} / {unit}",
            wording.minus(f"{figures.reference_energy:.6f}"),
            f"Energy of the reference state: {figures.reference_name}.",
        )
    )
    return found
