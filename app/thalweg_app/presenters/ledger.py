"""The ledger: every run, sortable, with a selection, ticks, notes and deletion that can be undone."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Any

from thalweg.storage.session import Run
from thalweg.study.result import StudyResult
from thalweg.systems import has_electrons
from thalweg_app.presenters import wording
from thalweg_app.presenters.history import History
from thalweg_app.presenters.listeners import Listeners

VERDICT_WORDS = {
    "reached": "reached",
    "outside": "outside target",
    "stationary": "stationary start",
    "wrong-symmetry": "wrong symmetry",
    "not-converged": "not converged",
    "no-exact": "no exact energy",
}


@dataclass(frozen=True)
class Column:
    """`text` is shown, `key` is what the column sorts by."""

    name: str
    help: str
    numeric: bool
    text: Callable[[Run, str], str]  # (run, unit of differences)
    key: Callable[[Run], Any]


def _plain(name: str, help: str, value: Callable[[StudyResult], Any], text: Callable[[Any], str] = str, numeric: bool = True) -> Column:
    return Column(name, help, numeric, lambda run, _: text(value(run.result)), lambda run: value(run.result))


def _encoding(result: StudyResult) -> str:
    if not has_electrons(result.spec.system):
        return wording.MISSING
    return f"{result.spec.encoding.title}{' T' if result.qubits != result.qubits_before_tapering else ''}"


COLUMNS: tuple[Column, ...] = (
    Column("Run", "Number of the run; tick it to lay it over the picture.", True, lambda run, _: str(run.number), lambda run: run.number),
    _plain("System", "What was studied.", lambda r: r.label, numeric=False),
    _plain(
        "Encoding",
        "Fermions to qubits; T marks tapering. Spins need none.",
        _encoding,
        numeric=False,
    ),
    _plain("Trial state", "The ansatz.", lambda r: r.spec.ansatz.title, numeric=False),
    _plain("Optimiser", "The method of minimisation.", lambda r: r.spec.optimizer.title, numeric=False),
    Column(
        "Energy",
        "Lowest energy found, core energy included.",
        True,
        lambda run, _: wording.energy(run.result.energy),
        lambda run: run.result.energy,
    ),
    Column(
        "Error",
        "Energy above the exact one.",
        True,
        lambda run, unit: wording.difference(run.result.error, run.result.energy_unit, unit),
        lambda run: run.result.error,
    ),
    _plain("Verdict", "Whether the target accuracy was reached.", lambda r: VERDICT_WORDS.get(r.verdict_kind, r.verdict_kind), numeric=False),
    _plain("Qubits", "Qubits of the register, after tapering.", lambda r: r.qubits),
    _plain("Parameters", "Free parameters of the trial state.", lambda r: r.parameters, wording.count),
    _plain("Two-qubit gates", "Two-qubit gates of the trial state's circuit.", lambda r: r.two_qubit_gates, wording.count),
    _plain("Evaluations", "Energy evaluations of all starts.", lambda r: r.evaluations, wording.count),
    _plain("Seconds", "Time of the search, that of all starts added up.", lambda r: r.seconds, wording.seconds_text),
    _plain("Seed", "Seed of every random choice.", lambda r: r.seed),
    Column("Note", "Your own remark; double click to edit.", False, lambda run, _: run.note, lambda run: run.note),
)
NOTE = len(COLUMNS) - 1
ENERGY, ERROR = (next(i for i, c in enumerate(COLUMNS) if c.name == name) for name in ("Energy", "Error"))


class Ledger:
    """`changed`: rows came, went or moved. `selected` and `ticked`: what the pictures show."""

    def __init__(self, history: History) -> None:
        self._history = history
        self._runs: tuple[Run, ...] = ()
        self._unit_of: tuple[tuple[Run, ...], str] = ((), "hartree")
        self._last_number = 0
        self._selected: int | None = None
        self._ticked: set[int] = set()
        self._sorting: tuple[int, bool] = (0, False)
        self.difference_unit = "mEh"
        self.changed = Listeners()
        self.selection_changed = Listeners()

    @property
    def runs(self) -> tuple[Run, ...]:
        """In the order of their numbers."""
        return self._runs

    @property
    def rows(self) -> list[Run]:
        """In the order shown; runs without the figure that is sorted by come last."""
        column, descending = self._sorting
        key = COLUMNS[column].key
        known = sorted((r for r in self._runs if key(r) is not None), key=lambda r: _comparable(key(r)), reverse=descending)
        return known + [r for r in self._runs if key(r) is None]

    @property
    def _shared_unit(self) -> str:
        """The energy unit of all rows; empty when they differ. Every cell asks for it, so that it is found once for these runs."""
        runs, unit = self._unit_of
        if runs is not self._runs:
            units = {run.result.energy_unit for run in self._runs}
            unit = next(iter(units)) if len(units) == 1 else "" if units else "hartree"
            self._unit_of = self._runs, unit
        return unit

    def cell(self, run: Run, column: int) -> str:
        """What a cell shows; energies carry their unit where the heading cannot."""
        text = COLUMNS[column].text(run, self.difference_unit)
        if self._shared_unit or text == wording.MISSING:
            return text
        if column == ENERGY:
            return f"{text} {wording.unit_name(run.result.energy_unit)}"
        return f"{text} {wording.difference_factor(run.result.energy_unit, self.difference_unit)[1]}" if column == ERROR else text

    @property
    def header(self) -> list[str]:
        shared = self._shared_unit
        names = [c.name for c in COLUMNS]
        if shared:
            names[ENERGY] = f"Energy / {wording.unit_name(shared)}"
            names[ERROR] = f"Error / {wording.difference_factor(shared, self.difference_unit)[1]}"
        names[names.index("Seconds")] = "Time / s"
        return names

    @property
    def selected(self) -> Run | None:
        return self.run(self._selected)

    @property
    def can_start(self) -> bool:
        """Whether the selected run has parameters that a search can start from."""
        return self.selected is not None and bool(self.selected.result.final_parameters)

    @property
    def ticked(self) -> list[Run]:
        return [run for run in self._runs if run.number in self._ticked]

    def run(self, number: int | None) -> Run | None:
        return next((run for run in self._runs if run.number == number), None)

    def load(self, runs: Iterable[Run]) -> None:
        self._runs = tuple(sorted(runs, key=lambda r: r.number))
        self._last_number = max((run.number for run in self._runs), default=0)
        self._ticked.clear()
        self._selected = self._runs[-1].number if self._runs else None
        self._tell()

    def add(self, result: StudyResult) -> Run:
        """A new run under the next number, selected. Not an edit: undo leaves results alone."""
        self._last_number += 1
        run = Run(number=self._last_number, result=result)
        self._runs = (*self._runs, run)
        self._selected = run.number
        self._tell()
        return run

    def sort(self, column: int, descending: bool) -> None:
        self._sorting = (column, descending)
        self.changed()

    def select(self, number: int | None) -> None:
        if number != self._selected:
            self._selected = number
            self.selection_changed()

    def tick(self, number: int, on: bool) -> None:
        (self._ticked.add if on else self._ticked.discard)(number)
        self.selection_changed()

    def is_ticked(self, number: int) -> bool:
        return number in self._ticked

    def annotate(self, number: int, note: str) -> None:
        run = self.run(number)
        if run is not None and run.note != note:
            before = run.note
            self._set_note(number, note)
            self._history.record(f"note on run {number}", lambda: self._set_note(number, before), lambda: self._set_note(number, note))

    def delete(self, number: int) -> None:
        run = self.run(number)
        if run is not None:
            self._remove(number)
            self._history.record(f"deletion of run {number}", lambda: self._put_back(run), lambda: self._remove(number))

    def _set_note(self, number: int, note: str) -> None:
        self._runs = tuple(r.model_copy(update={"note": note}) if r.number == number else r for r in self._runs)
        self.changed()

    def _remove(self, number: int) -> None:
        rows = [r.number for r in self.rows]
        place = rows.index(number)
        rows.remove(number)
        self._runs = tuple(r for r in self._runs if r.number != number)
        if self._selected == number:
            self._selected = rows[min(place, len(rows) - 1)] if rows else None
        self._tell()

    def _put_back(self, run: Run) -> None:
        self._runs = tuple(sorted((*self._runs, run), key=lambda r: r.number))
        self._selected = run.number
        self._tell()

    def _tell(self) -> None:
        self.changed()
        self.selection_changed()


def _comparable(value: Any) -> Any:
    return value.lower() if isinstance(value, str) else value
