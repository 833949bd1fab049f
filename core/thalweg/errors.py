"""The two exceptions that carry meaning across floors."""

from __future__ import annotations


class StudyError(Exception):
    """Something the person can mend: one sentence each for what, why and how.

    Anything else that is raised is a defect of the program and is logged with its traceback.
    """

    def __init__(self, what: str, why: str, fix: str, field: str = "") -> None:
        self.what, self.why, self.fix = what.rstrip("."), why.rstrip("."), fix.rstrip(".")
        self.field = field  # dotted path of the setting at fault, e.g. "system.basis"; "" when none
        super().__init__(f"{self.what}: {self.why}. {self.fix}.")

    def __reduce__(self) -> tuple[object, ...]:  # exceptions must survive a process boundary
        return StudyError, (self.what, self.why, self.fix, self.field)


class Stopped(Exception):  # noqa: N818 - a signal, not an error
    """Raised from inside an evaluation to end a minimisation; never caught by an optimiser."""

    def __init__(self, reason: str) -> None:
        self.reason = reason  # a key of `thalweg.study.result.STOP_REASONS`
        super().__init__(reason)

    def __reduce__(self) -> tuple[object, ...]:
        return Stopped, (self.reason,)
