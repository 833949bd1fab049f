"""Varying any numeric setting, such as a coupling of a lattice model."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.errors import StudyError
from thalweg.options import option
from thalweg.study.path.base import ScanPath
from thalweg.study.spec import StudySpec, with_setting


class SettingPath(ScanPath):
    title: ClassVar[str] = "Setting"
    about: ClassVar[str] = "Any numeric setting of the study, such as a coupling, a field or the number of sites."

    key: Literal["setting"] = "setting"
    setting: str = option("", "Setting", "Dotted name of the setting, such as `system.model.field`.")

    def at(self, spec: StudySpec, value: float) -> StudySpec:
        name, current = self._found(spec)
        if isinstance(current, int) and value != round(value):
            raise StudyError(f"'{self.setting}' cannot be {value:g}", "it is a whole number", "Choose points that are whole numbers", "path")
        return with_setting(spec, name, round(value) if isinstance(current, int) else float(value))

    def axis(self, spec: StudySpec) -> str:
        return self.setting

    @property
    def has_equilibrium(self) -> bool:
        return False

    def counts_something(self, spec: StudySpec) -> bool:
        """True for whole numbers, such as the sites of a lattice, along which a curve has no derivatives."""
        return isinstance(self._found(spec)[1], int)

    def _found(self, spec: StudySpec) -> tuple[str, int | float]:
        """The setting's own dotted name and its present value."""
        node: object = spec
        names = []
        for given in self.setting.split("."):
            name = getattr(type(node), "also_called", {}).get(given, given)
            node = getattr(node, name, None)
            names.append(name)
        if isinstance(node, bool) or not isinstance(node, int | float):
            raise StudyError(f"'{self.setting}' cannot be varied", "it is not a number of this study", "Name a numeric setting", "path.setting")
        return ".".join(names), node
