"""All presenters of one window, joined: what happens in one is told to the others. No Qt."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from thalweg.errors import StudyError
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec
from thalweg_app.presenters import jobs
from thalweg_app.presenters.answer import NOTHING_YET, Answer, answer_of, answer_of_check, check_words
from thalweg_app.presenters.diagnosis_control import DiagnosisControl
from thalweg_app.presenters.document import Document, RecentFiles
from thalweg_app.presenters.figures import DerivedFigures
from thalweg_app.presenters.history import History
from thalweg_app.presenters.jobs import JobStarter
from thalweg_app.presenters.ledger import VERDICT_WORDS, Ledger
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.run_control import CheckOutcome, RunControl
from thalweg_app.presenters.scan_control import SCAN, ScanControl
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.presenters.tables import Terms, terms_of_result
from thalweg_app.presenters.traces import Shown, XChoice, convergence, shown_live, shown_result


class Workbench:
    """`answer_changed`: the sentence under the set-up. `pictures_changed`: what is drawn. `told`: a sentence for the status line."""

    def __init__(
        self, starter: JobStarter, recent: RecentFiles, *, run: str = jobs.RUN, inspect: str = jobs.INSPECT, check: str = jobs.CHECK, scan: str = SCAN
    ) -> None:
        self.starter = starter
        self.history = History()
        self.setup = SetupEditing(self.history)
        self.ledger = Ledger(self.history)
        self.scans = ScanControl(starter, self._usable_study, scan)
        self.document = Document(self.setup, self.ledger, self.scans, self.history, recent)
        self.figures = DerivedFigures(starter, inspect)
        self.runs = RunControl(starter, self.figures.of, run, check)
        self.diagnosis = DiagnosisControl(starter, self._usable_study, self.ledger)
        self._point: Shown | None = None  # a point of a curve whose convergence is shown
        self._check: CheckOutcome | None = None
        self.answer_changed, self.pictures_changed = Listeners(), Listeners()
        self.point_opened = Listeners()
        self.told, self.defect = Listeners(), Listeners()
        self.difference_unit = "mEh"
        self._connect()

    def _connect(self) -> None:
        self.setup.changed.connect(self._follow_setup)
        self.figures.refused.connect(self.setup.refuse)
        self.figures.changed.connect(self.pictures_changed)
        self.figures.changed.connect(self.answer_changed)
        self.figures.defect.connect(self.defect)
        self.runs.refused.connect(self.setup.refuse)
        self.runs.finished.connect(self._on_finished)
        self.runs.checked.connect(self._on_checked)
        self.runs.told.connect(self.told)
        self.runs.defect.connect(self.defect)
        self.runs.changed.connect(self.pictures_changed)
        self.scans.told.connect(self.told)
        self.scans.defect.connect(self.defect)
        self.diagnosis.told.connect(self.told)
        self.diagnosis.defect.connect(self.defect)
        self.setup.changed.connect(self.diagnosis.changed)
        self.ledger.selection_changed.connect(self.diagnosis.changed)
        self.setup.changed.connect(self.scans.changed)
        self.ledger.selection_changed.connect(self._on_selection)

    @property
    def can_run(self) -> bool:
        return not self.setup.obstacle

    def _usable_study(self) -> StudySpec | None:
        return self.setup.spec if self.can_run else None

    @property
    def answer(self) -> Answer:
        if self._check is not None:
            return answer_of_check(self._check)
        run = self.ledger.selected
        if run is None:
            return NOTHING_YET
        figures = self.figures.shown if self.figures.is_fresh else None
        known = (*figures.warnings, figures.start) if figures is not None and run.result.spec == self.setup.spec else ()
        return answer_of(run.number, run.result, known)

    @property
    def state_in_words(self) -> str:
        """For the title bar: what runs, or what the answer is."""
        run = self.ledger.selected
        if self.runs.is_running:
            return "running"
        if self._check is not None:
            return f"run {self._check.number}: {check_words(self._check)}"
        return "" if run is None else f"run {run.number}: {VERDICT_WORDS.get(run.result.verdict_kind, run.result.verdict_kind)}"

    def run(self) -> None:
        """Runs the set-up as it is, when it can be run."""
        if self.can_run:
            self._check = None
            self.runs.submit(self.setup.spec)

    def stop(self) -> None:
        """Ends the run under way, or else the scan; what is finished is kept."""
        (self.runs.stop if self.runs.is_running else self.scans.stop)()

    @property
    def under_way(self) -> str:
        """What would be lost if the program ended now: `run`, `scan`, or empty."""
        return "run" if self.runs.is_running else "scan" if self.scans.live is not None else ""

    def stop_all(self) -> None:
        """Ends runs, those that wait, and the scan; what is finished is kept."""
        self.runs.stop_all()
        self.scans.stop()

    def check_selected(self) -> None:
        """Repeats the selected run and states the deviation."""
        run = self.ledger.selected
        if run is not None:
            self.runs.check(run)

    def use_selected(self) -> None:
        """Puts the settings of the selected run back into the set-up."""
        run = self.ledger.selected
        if run is not None:
            self.setup.use(run.result.spec, f"use of run {run.number}'s set-up")

    def start_from_selected(self) -> None:
        """Lets the search of the set-up begin at the parameters of the selected run."""
        run = self.ledger.selected
        if run is None:
            return
        try:
            self.setup.start_from(run.result.as_start(f"run {run.number}"), f"start from run {run.number}")
        except StudyError as error:
            self.told(str(error))

    def choose_difference_unit(self, unit: str) -> None:
        self.difference_unit = self.ledger.difference_unit = unit
        self.ledger.changed()
        self.pictures_changed()

    def show_point(self, result: StudyResult, name: str) -> None:
        """The convergence of one point of a curve, until a run is selected."""
        self._point = replace(shown_result(0, result), name=name)
        self.pictures_changed()
        self.point_opened()

    def convergence(self, x: XChoice) -> Any:
        """The run under way in front of the ticked ones, or the selected run."""
        overlays = [(run.number, shown_result(run.number, run.result)) for run in self.ledger.ticked]
        live = shown_live(self.runs.live) if self.runs.live is not None else None
        run = self.ledger.selected
        main: Shown | None = live or self._point
        if main is None and run is not None:
            main = shown_result(run.number, run.result)
            overlays = [(n, shown) for n, shown in overlays if n != run.number]
        return convergence(main, [shown for _, shown in overlays], x, self.difference_unit)

    @property
    def shown_result(self) -> StudyResult | None:
        return None if self.ledger.selected is None else self.ledger.selected.result

    @property
    def terms(self) -> Terms | None:
        """Of the set-up while its figures are known, otherwise of the selected run."""
        figures = self.figures.shown
        if figures is not None and self.figures.is_fresh:
            return Terms(figures.label, figures.energy_unit, figures.pauli_terms, figures.terms, figures.one_norm, figures.qubits)
        return None if self.shown_result is None else terms_of_result(self.shown_result)

    def _follow_setup(self) -> None:
        usable = self.setup.has_system and not self.setup.draft.errors
        self.figures.follow(self.setup.spec if usable else None)

    def _on_finished(self, result: StudyResult) -> None:
        self._check = None
        self.ledger.add(result)

    def _on_checked(self, outcome: CheckOutcome) -> None:
        self.ledger.select(outcome.number)
        self._check = outcome
        self.answer_changed()

    def _on_selection(self) -> None:
        self._check, self._point = None, None
        self.answer_changed()
        self.pictures_changed()
