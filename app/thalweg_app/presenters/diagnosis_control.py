"""The diagnosis being set up, the one that runs, and what the last one found."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Literal

from pydantic import TypeAdapter, ValidationError

from thalweg.errors import StudyError
from thalweg.storage.session import Run
from thalweg.study.diagnosis_result import Curvature, LandscapeResult, StartSpread, TrainabilityResult
from thalweg.study.diagnosis_spec import Direction, Landscape, Trainability
from thalweg.study.events import AnyEvent, Failed, Stage
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec, study_error
from thalweg_app.presenters.diagnosis import Finding
from thalweg_app.presenters.jobs import Job, JobListener, JobStarter
from thalweg_app.presenters.ledger import Ledger
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.numbers import parse_number, parse_whole, parse_wholes

DIAGNOSE = "thalweg_app.jobs:diagnose"
What = Literal["trainability", "landscape", "curvature", "starts"]
#: What can be asked -> its title and its one line.
QUESTIONS: dict[What, tuple[str, str]] = {
    "trainability": ("Trainability", "Variance of the gradient over random starts against qubits and layers of the set-up's trial state."),
    "landscape": ("Landscape", "Energy along one direction, or over two, through the selected run's point, or the start where none is selected."),
    "curvature": ("Curvature", "Lowest second derivatives at the selected run's point: a minimum, a saddle, or flat."),
    "starts": ("Starts", "Where the starts of the selected run ended."),
}
COSTS = {"energy": "Energy", "global": "Global cost", "local": "Local cost"}
DIRECTIONS = {"random": "Random", "steepest": "Steepest descent", "parameter": "One parameter", "point": "Towards the ticked run", "none": "None"}
_RESULTS: dict[str, Any] = {"trainability": TrainabilityResult, "landscape": LandscapeResult, "curvature": Curvature, "starts": StartSpread}


@dataclass
class DiagnosisDraft:
    """What the form holds, as typed."""

    what: What = "trainability"
    cost: str = "energy"
    sizes: str = ""
    layers: str = "1-4"
    samples: str = "200"
    first: str = "random"
    first_parameter: str = "0"
    second: str = "none"
    second_parameter: str = "1"
    reach: str = "3.14159"
    points: str = "41"


class DiagnosisControl:
    """`changed`: set-up, start, end. `progressed`: the diagnosis under way told something."""

    def __init__(self, starter: JobStarter, study: Callable[[], StudySpec | None], ledger: Ledger, function: str = DIAGNOSE) -> None:
        self._starter, self._study, self._ledger, self._function = starter, study, ledger, function
        self._job: Job | None = None
        self.draft = DiagnosisDraft()
        self.stage = ""
        self.found: Finding | None = None
        self.changed, self.progressed = Listeners(), Listeners()
        self.told, self.defect = Listeners(), Listeners()

    @property
    def is_running(self) -> bool:
        return self._job is not None

    @property
    def obstacle(self) -> str:
        """Why it cannot be started; empty when it can."""
        try:
            self._question()
        except StudyError as error:
            return str(error)
        return ""

    def edit(self, name: str, value: Any) -> None:
        setattr(self.draft, name, value)
        self.changed()

    def payload(self) -> dict[str, Any]:
        """What the job is given. StudyError when something does not fit."""
        question = self._question()
        name = "result" if isinstance(question, StudyResult) else "settings"
        return {"what": self.draft.what, name: question.model_dump(mode="json")}

    def _question(self) -> StudyResult | Trainability | Landscape:
        """The run to look at, or the settings of what is worked out. StudyError when something does not fit."""
        if self.draft.what in ("curvature", "starts"):
            return self._selected().result
        return self._trainability() if self.draft.what == "trainability" else self._landscape()

    def start(self) -> None:
        if self.is_running:
            return
        try:
            payload = self.payload()
        except StudyError as error:
            self.told(str(error))
            return
        what = payload["what"]
        listener = JobListener(
            events=self._on_events,
            done=lambda value: self._on_done(what, value),
            failed=self._on_failed,
            stopped=lambda: self._end("The diagnosis was stopped."),
        )
        self.stage, self.found = "", None
        self._job = self._starter.start(self._function, payload, listener)
        self.changed()

    def stop(self) -> None:
        if self._job is not None:
            self._job.stop()

    def _trainability(self) -> Trainability:
        draft = self.draft
        settings = {
            "study": self._open_study(),
            "cost": draft.cost,
            "qubits": parse_wholes(draft.sizes, "sizes"),
            "layers": parse_wholes(draft.layers, "layers"),
            "samples": parse_whole(draft.samples, "samples"),
        }
        return _made(Trainability, settings)

    def _landscape(self) -> Landscape:
        draft = self.draft
        run = self._ledger.selected
        directions = [self._direction(draft.first, draft.first_parameter)]
        if draft.second != "none":
            directions.append(self._direction(draft.second, draft.second_parameter))
            if draft.second != "random" and directions[0] == directions[1]:
                raise StudyError("Both directions are the same", "a map needs two", "Choose another second direction, or none")
        settings = {
            "study": run.result.spec if run is not None else self._open_study(),
            "centre": run.result.final_parameters if run is not None else (),
            "labels": run.result.parameter_labels if run is not None else (),
            "directions": tuple(directions),
            "reach": parse_number(draft.reach, "reach"),
            "points": parse_whole(draft.points, "points"),
        }
        return _made(Landscape, settings)

    def _direction(self, kind: str, parameter: str) -> Direction:
        if kind == "parameter":
            return _made(Direction, {"kind": "parameter", "parameter": parse_whole(parameter, "parameter")})
        if kind == "point":
            other = next((run for run in self._ledger.ticked if run is not self._ledger.selected), None)
            if other is None:
                raise StudyError("No other run is ticked", "the line leads from the selected run to a ticked one", "Tick a run in the ledger")
            return Direction(kind="point", point=other.result.final_parameters, labels=other.result.parameter_labels)
        return Direction(kind="steepest" if kind == "steepest" else "random")

    def _open_study(self) -> StudySpec:
        study = self._study()
        if study is None:
            raise StudyError(
                "There is nothing to diagnose", "no system is open, or a setting is refused", "Open a system, or mend what is marked in the set-up"
            )
        return study

    def _selected(self) -> Run:
        run = self._ledger.selected
        if run is None:
            raise StudyError("No run is selected", "this looks at the end of a run", "Run the study, or select a run in the ledger")
        return run

    def _on_events(self, events: Sequence[AnyEvent]) -> None:
        for event in events:
            if isinstance(event, Stage):
                share = "" if event.fraction is None else f", {100 * event.fraction:.0f} %"
                self.stage = event.text + share
        self.progressed()

    def _on_done(self, what: str, value: Any) -> None:
        self.found = TypeAdapter(_RESULTS[what]).validate_python(value)
        self._end("")

    def _on_failed(self, failure: Failed) -> None:
        self._end("")
        if failure.fix and not failure.details:
            self.told(str(StudyError(failure.what, failure.why, failure.fix, failure.field)))
        else:
            self.defect(failure)

    def _end(self, sentence: str) -> None:
        self._job, self.stage = None, ""
        if sentence:
            self.told(sentence)
        self.changed()


def _made(cls: Any, settings: dict[str, Any]) -> Any:
    try:
        return cls(**settings)
    except ValidationError as error:
        raise study_error(error) from None
