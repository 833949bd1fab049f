"""The session: a set-up being edited and the ledger of everything that was run from it. One JSON file, UTF-8, no code in it."""

from __future__ import annotations

import re
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Final, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator

from thalweg import __version__
from thalweg.errors import StudyError
from thalweg.storage.files import read_limited, write_atomically
from thalweg.storage.migrations import CURRENT_FORMAT, migrate
from thalweg.storage.plain_json import first_not_finite, json_text, plain, read_json
from thalweg.study.result import StudyResult
from thalweg.study.scan_result import ScanResult
from thalweg.study.spec import StudySpec

#: The ending that names a session file (any other is read as well).
SUFFIX = ".thalweg.json"
PROGRAM: Final = "thalweg"
#: How an infinite or undefined number stands in the text; a note may hold the same letters, so that this is a reason to look closer only.
NOT_FINITE = re.compile(r"[:,\[](?:NaN|-?Infinity)\b")


def now() -> datetime:
    return datetime.now(UTC).replace(microsecond=0)


class SessionPart(BaseModel):
    model_config = ConfigDict(frozen=True, defer_build=True, extra="forbid", allow_inf_nan=False, ser_json_inf_nan="constants")


class Run(SessionPart):
    """One row of the ledger; the result holds the settings that it came from."""

    number: int = Field(ge=1, description="Number of the run in its session, counted from 1; not given twice.")
    result: StudyResult
    note: str = Field(default="", description="The person's own remark.")


class ScanRun(SessionPart):
    """One scan; the result holds its settings and a whole result for every point."""

    number: int = Field(ge=1, description="Number of the scan in its session, counted from 1; not given twice.")
    result: ScanResult
    note: str = Field(default="", description="The person's own remark.")


class Session(SessionPart):
    """Everything that a colleague needs to see the same pictures without running again, and to run again."""

    format: Literal[1] = Field(default=CURRENT_FORMAT, description="Format number of this file.")
    program: Literal["thalweg"] = PROGRAM
    program_version: str = Field(default_factory=lambda: __version__, description="The version that saved the file last.")
    name: str = ""
    created: datetime = Field(default_factory=now, description="ISO 8601, with offset.")
    modified: datetime = Field(default_factory=now, description="ISO 8601, with offset.")
    setup: StudySpec | None = Field(default=None, description="The set-up as it was last edited.")
    runs: tuple[Run, ...] = ()
    scans: tuple[ScanRun, ...] = ()

    @model_validator(mode="after")
    def _numbers_are_unique(self) -> Session:
        for what, rows in (("runs", self.runs), ("scans", self.scans)):
            if len({row.number for row in rows}) != len(rows):
                raise ValueError(f"two {what} carry the same number")
        return self

    def with_result(self, result: StudyResult, note: str = "") -> Session:
        """A copy with one more run, under the next free number."""
        number = 1 + max((run.number for run in self.runs), default=0)
        return self.model_copy(update={"runs": (*self.runs, Run(number=number, result=result, note=note)), "modified": now()})

    def with_scan(self, result: ScanResult, number: int | None = None) -> Session:
        """A copy with one more scan under the next free number; with the `number` of a scan that is there, that one is replaced."""
        old = next((scan for scan in self.scans if scan.number == number), None)
        if old is not None:
            changed = tuple(scan.model_copy(update={"result": result}) if scan is old else scan for scan in self.scans)
        else:
            changed = (*self.scans, ScanRun(number=1 + max((scan.number for scan in self.scans), default=0), result=result))
        return self.model_copy(update={"scans": changed, "modified": now()})


def save_session(session: Session, path: Path) -> None:
    """Writes the file whole or not at all. StudyError when a figure is not finite or the system refuses."""
    whole = session.model_copy(update={"program_version": __version__})
    try:
        text = whole.model_dump_json(fallback=plain)  # many times faster than json.dumps, and the window saves while it lives
    except ValueError:  # a name or a note holds what is no character in UTF-8
        text = ""
    place = first_not_finite(whole.model_dump(mode="python")) if not text or NOT_FINITE.search(text) else ""
    if place:
        raise StudyError("The session cannot be saved", f"the figure {place} is not a finite number", "Delete that run and save again")
    write_atomically(path, (text or json_text(whole.model_dump(mode="python"))).encode("utf-8"))


def load_session(path: Path) -> Session:
    """Reads a session of this or an older format. StudyError for everything else; the file is never changed."""
    return parse_session(read_limited(path), path.name)


def is_session(content: bytes) -> bool:
    """Whether these bytes are a session of any format, told by the program's name in them."""
    try:
        return bool(_object(content, "").get("program") == PROGRAM)
    except StudyError:
        return False


def parse_session(content: bytes, name: str) -> Session:
    """The session in `content`; `name` is what error sentences call the file."""
    data = _object(content, name)
    if data.get("program") != PROGRAM:
        raise StudyError(f"{name} is not a session", "it does not carry the mark of this program", "Open a file that Thalweg has saved")
    try:
        return Session.model_validate(migrate(data))
    except ValidationError as error:
        first = error.errors()[0]
        place = ".".join(str(part) for part in first["loc"]) or "the file"
        why = f"{place}: {first['msg'][:1].lower()}{first['msg'][1:]}"
        raise StudyError(f"{name} is damaged", why, "Go back to a copy that was not edited by hand") from None
    except RecursionError:
        raise StudyError(f"{name} is damaged", "it is nested too deeply", "Go back to an undamaged copy") from None


def _object(content: bytes, name: str) -> dict[str, Any]:
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise StudyError(f"{name} is not a session", f"byte {error.start} is not UTF-8 text", "Open a file that Thalweg has saved") from None
    try:
        data = read_json(text)
    except RecursionError:
        raise StudyError(f"{name} is damaged", "it is nested too deeply", "Go back to an undamaged copy") from None
    except ValueError as error:
        why = f"it is not complete JSON ({error})"
        raise StudyError(f"{name} is damaged or not a session", why, "Go back to an undamaged copy") from None
    if not isinstance(data, dict):
        raise StudyError(f"{name} is not a session", "a session is one JSON object", "Open a file that Thalweg has saved")
    return data
