"""Chooses one of several alternatives and shows the form of the chosen one."""

from __future__ import annotations

from typing import Any

from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from thalweg.registry import Alternatives, key_of
from thalweg_app.forms import OptionsForm, QuietCombo, describe, form_grid
from thalweg_app.presenters.setup import SetupEditing, node_at
from thalweg_app.widgets.tab_order import visit_after


class AlternativeBox(QWidget):
    """Menu of a section of the spec, what speaks for and against the choice, and its form, made when first shown."""

    def __init__(self, setup: SetupEditing, section: str, title: str, alternatives: Alternatives[Any], skip: tuple[str, ...] = ()) -> None:
        super().__init__()
        self._setup, self._section, self._skip = setup, section, skip
        self._forms: dict[str, OptionsForm] = {}
        self._classes = {key_of(cls): cls for cls in alternatives}
        self.menu = QuietCombo()
        self.menu.setMinimumContentsLength(8)
        self.menu.setSizeAdjustPolicy(QuietCombo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        for key, cls in self._classes.items():
            self.menu.addItem(cls.title, key)
        describe(self.menu, title, " ".join(f"{cls.title}: {cls.about}" for cls in self._classes.values()))
        self.menu.activated.connect(lambda i: setup.choose(section, self.menu.itemData(i)))
        self._about = QLabel(wordWrap=True)
        self._about.setProperty("role", "muted")
        label = QLabel(title)
        label.setBuddy(self.menu)
        head = QWidget()
        grid = form_grid(head)
        grid.addWidget(label, 0, 0)
        grid.addWidget(self.menu, 0, 1)
        grid.addWidget(self._about, 1, 1)
        self._layout = QVBoxLayout(self)
        self._layout.setContentsMargins(0, 0, 0, 0)
        self._layout.setSpacing(6)
        self._layout.addWidget(head)

    def refresh(self) -> None:
        key = node_at(self._setup.spec, self._section).key
        self.menu.setCurrentIndex(self.menu.findData(key))
        self._about.setText(self._classes[key].about)
        if key not in self._forms:
            form = OptionsForm(self._classes[key], self._section, skip=self._skip)
            form.edited.connect(self._setup.edit)
            self._forms[key] = form
            self._layout.addWidget(form)
            visit_after(self.menu, form)
        for other, form in self._forms.items():
            form.setVisible(other == key)
        self._forms[key].show_values(self._setup.shown, self._setup.errors)

    def paths(self) -> set[str]:
        """Dotted paths of the fields of the form that is shown."""
        form = self._forms.get(node_at(self._setup.spec, self._section).key)
        return set() if form is None else {row.path for row in form.rows}
