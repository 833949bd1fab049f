"""The set-up being edited: settings that always validate, beside what was typed and does not, with undo and redo."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import Any

from thalweg.errors import StudyError
from thalweg.options import Options
from thalweg.study.spec import UNIONS, Neighbour, StudySpec, spec_from_data, suited
from thalweg.systems import Integrals, Molecule
from thalweg.systems.elements import find_element
from thalweg_app.presenters.fields import FieldFacts, fields_of
from thalweg_app.presenters.history import History
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.numbers import parse_number, parse_whole
from thalweg_app.presenters.wording import counted

_NOTHING: Mapping[Any, Any] = MappingProxyType({})


@dataclass(frozen=True)
class Draft:
    """A snapshot of the set-up.

    Attributes:
        spec: the last settings that validate.
        typed: field path -> the text in it that does not validate; nothing typed is lost.
        errors: field path -> what is wrong with that text.
        shelf: (section, key) -> settings of an alternative that is not chosen now, to come back to.
    """

    spec: StudySpec
    typed: Mapping[str, Any] = field(default_factory=lambda: _NOTHING)
    errors: Mapping[str, StudyError] = field(default_factory=lambda: _NOTHING)
    shelf: Mapping[tuple[str, str], Options] = field(default_factory=lambda: _NOTHING)


class SetupEditing:
    """Takes edits field by field. `changed` tells of every new draft."""

    def __init__(self, history: History, spec: StudySpec | None = None) -> None:
        self._history = history
        self._draft = Draft(spec or StudySpec(system=Molecule()))
        self._refused: tuple[StudySpec, StudyError] | None = None
        self.changed = Listeners()

    @property
    def draft(self) -> Draft:
        return self._draft

    @property
    def spec(self) -> StudySpec:
        return self._draft.spec

    @property
    def has_system(self) -> bool:
        return _has_content(self.spec.system)

    @property
    def errors(self) -> dict[str, StudyError]:
        """Field path -> error, what was typed and what the calculation refused alike."""
        found = dict(self._draft.errors)
        if self._refused is not None and self._refused[0] == self.spec:
            found.setdefault(self._refused[1].field, self._refused[1])
        return found

    @property
    def obstacle(self) -> str:
        """Why Run is not possible now; empty when it is."""
        if not self.has_system:
            return "There is no system yet: open a geometry, paste one, or take a sample."
        return next((str(error) for error in self.errors.values()), "")

    @property
    def start_line(self) -> str:
        """Which run the search starts from; empty where it begins as the trial state says."""
        start = self.spec.neighbour
        return f"Starts from {start.source or 'another run'}: {counted(len(start.parameters), 'parameter')}" if start.is_given else ""

    def load(self, spec: StudySpec) -> None:
        """Takes over settings as a new beginning, which undo does not reach behind."""
        self._put(Draft(spec))

    def edit(self, path: str, value: Any) -> None:
        """Sets a field to what was typed or chosen; text is read as the field's kind. Bad input stays in the field with its error."""
        draft = self._draft
        if value == self.shown(path) and path not in draft.errors:
            return
        try:
            spec = self._with(path, self._read(path, value))
        except StudyError as error:
            self._record(_title(path, draft.spec), replace(draft, typed={**draft.typed, path: value}, errors={**draft.errors, path: error}))
            return
        typed, errors = _without(draft.typed, path), _without(draft.errors, path)
        self._record(_title(path, draft.spec), replace(draft, spec=spec, typed=typed, errors=errors))

    def edit_atom(self, row: int, column: int, text: str) -> None:
        """Sets a cell of the table of atoms: column 0 is the element, 1 to 3 are x, y, z. Bad input stays in its cell."""
        draft, path = self._draft, f"system.atoms.{row}.{column}"
        atoms = [list(atom) for atom in self.spec.system.atoms]  # type: ignore[union-attr]
        try:
            atoms[row][column] = _element(text, path) if column == 0 else parse_number(text, path)
        except StudyError as error:
            self._record("change of an atom", replace(draft, typed={**draft.typed, path: text}, errors={**draft.errors, path: error}))
            return
        if tuple(atoms[row]) != self.spec.system.atoms[row] or path in draft.errors:  # type: ignore[union-attr]
            self._take_atoms(atoms, "change of an atom", {path})

    def add_atom(self) -> None:
        """One more hydrogen, beside the last atom."""
        atoms = [list(atom) for atom in self.spec.system.atoms]  # type: ignore[union-attr]
        x, y, z = atoms[-1][1:] if atoms else (0.0, 0.0, -0.74)
        self._take_atoms([*atoms, ["H", x, y, float(z) + 0.74]], "new atom", set())

    def remove_atom(self, row: int) -> None:
        atoms = [list(atom) for atom in self.spec.system.atoms]  # type: ignore[union-attr]
        del atoms[row]
        gone = {p for p in self._draft.typed if p.startswith("system.atoms.")}
        self._take_atoms(atoms, "removal of an atom", gone)

    def _take_atoms(self, atoms: list[list[Any]], text: str, settled: set[str]) -> None:
        draft = self._draft
        system = self.spec.system.model_copy(update={"atoms": tuple(tuple(atom) for atom in atoms)})
        typed = {p: v for p, v in draft.typed.items() if p not in settled}
        errors = {p: e for p, e in draft.errors.items() if p not in settled}
        spec = draft.spec.model_copy(update={"system": system})
        self._record(text, replace(draft, spec=spec, typed=typed, errors=errors))

    def choose(self, section: str, key: str) -> None:
        """Switches a section, or a choice within one such as `system.lattice`, to another alternative, which comes back as it was left."""
        draft = self._draft
        old: Options = node_at(draft.spec, section)
        if old.key == key:  # type: ignore[attr-defined]
            return
        cls = UNIONS[section.rpartition(".")[2]].get(key)
        new = draft.shelf.get((section, key)) or _carried_over(cls, old)
        spec = suited(_with_node(draft.spec, section.split("."), new))
        shelf = {**draft.shelf, (section, old.key): old}  # type: ignore[attr-defined]
        typed = {p: v for p, v in draft.typed.items() if not p.startswith(section + ".")}
        errors = {p: e for p, e in draft.errors.items() if not p.startswith(section + ".")}
        self._record(f"choose {cls.title}", Draft(spec, typed, errors, shelf))

    def replace_system(self, system: Any, text: str) -> None:
        """Takes another system, e.g. from a file, and keeps all other sections."""
        draft = self._draft
        typed = {p: v for p, v in draft.typed.items() if not p.startswith("system.")}
        errors = {p: e for p, e in draft.errors.items() if not p.startswith("system.")}
        self._record(text, replace(draft, spec=suited(draft.spec.model_copy(update={"system": system})), typed=typed, errors=errors))

    def use(self, spec: StudySpec, text: str) -> None:
        """Puts the settings of a run back; undo returns to what was there."""
        if spec != self.spec or self._draft.errors:
            self._record(text, Draft(spec, shelf=self._draft.shelf))

    def start_from(self, run: Neighbour, text: str) -> None:
        """The search begins at the parameters of a run, whatever else is chosen."""
        if run != self.spec.neighbour:
            self._record(text, replace(self._draft, spec=self.spec.model_copy(update={"neighbour": run})))

    def leave_start(self) -> None:
        """The search begins as the trial state says."""
        self.start_from(Neighbour(), "removal of the start")

    def refuse(self, spec: StudySpec, error: StudyError) -> None:
        """Notes that a calculation refused these settings; the mark goes when they change."""
        self._refused = (spec, error)
        self.changed()

    def shown(self, path: str) -> Any:
        """What the field shows: the text that does not validate, or the value."""
        if path in self._draft.typed:
            return self._draft.typed[path]
        return node_at(self.spec, path)

    def _read(self, path: str, value: Any) -> Any:
        facts = facts_of(path, self.spec)
        if not isinstance(value, str) or facts is None:
            return value
        if facts.kind == "number":
            return parse_number(value, path)
        return parse_whole(value, path) if facts.kind == "whole" else value.strip()

    def _with(self, path: str, value: Any) -> StudySpec:
        data = self.spec.model_dump()
        *parents, last = path.split(".")
        node = data
        for name in parents:
            node = node[name]
        node[last] = value
        return spec_from_data(data)

    def _record(self, text: str, draft: Draft) -> None:
        before = self._draft
        self._put(draft)
        self._history.record(text, lambda: self._put(before), lambda: self._put(draft))

    def _put(self, draft: Draft) -> None:
        self._draft = draft
        self.changed()


def node_at(spec: StudySpec, path: str) -> Any:
    """The settings or the value at a dotted path."""
    node: Any = spec
    for name in path.split("."):
        node = getattr(node, name)
    return node


def _with_node(owner: Any, names: list[str], value: Any) -> Any:
    """A copy of `owner` in which the node reached by `names` is `value`."""
    first, *rest = names
    return owner.model_copy(update={first: _with_node(getattr(owner, first), rest, value) if rest else value})


def facts_of(path: str, spec: StudySpec) -> FieldFacts | None:
    """Metadata of the field at a dotted path, None for fields with an editor of their own."""
    parents, _, last = path.rpartition(".")
    owner = node_at(spec, parents) if parents else spec
    return next((facts for facts in fields_of(type(owner)) if facts.name == last), None)


def _title(path: str, spec: StudySpec) -> str:
    facts = facts_of(path, spec)
    title = facts.title if facts else path.rsplit(".", 1)[-1].replace("_", " ")
    return f"change of {title[:1].lower() + title[1:] if title[1:2].islower() else title}"


def _element(text: str, field: str) -> str:
    """The symbol of an element given by symbol, name or number."""
    found = find_element(text.strip())
    if found is None:
        raise StudyError(f"'{text.strip()[:20]}' is no element", "no symbol, name or number fits", "Type a symbol such as Li", field)
    return found.symbol


def _has_content(system: Any) -> bool:
    if isinstance(system, Molecule):
        return bool(system.atoms)
    if isinstance(system, Integrals):
        return bool(system.listing)
    return True


def _carried_over(cls: type[Options], old: Options) -> Options:
    """Defaults of `cls`, with the settings that both alternatives share (e.g. tapering) kept where they validate."""
    shared = {n: getattr(old, n) for n in cls.model_fields if n != "key" and n in type(old).model_fields}
    shared = {n: v for n, v in shared.items() if cls.model_fields[n].annotation == type(old).model_fields[n].annotation}
    return cls.model_validate(shared)


def _without(mapping: Mapping[str, Any], path: str) -> dict[str, Any]:
    return {p: v for p, v in mapping.items() if p != path}
