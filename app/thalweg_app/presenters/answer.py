"""The answer line: one sentence on the selected run, and what stands beside it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from thalweg.study.result import StudyResult
from thalweg_app.presenters import wording
from thalweg_app.presenters.run_control import CheckOutcome

Kind = Literal["none", "good", "bad", "unclear"]
KINDS: dict[str, Kind] = {
    "reached": "good",
    "outside": "bad",
    "wrong-symmetry": "bad",
    "stationary": "bad",
    "not-converged": "unclear",
    "no-exact": "unclear",
}
#: A repetition within this many hartree (or couplings) counts as the same answer.
SAME = 1e-7


@dataclass(frozen=True)
class Answer:
    kind: Kind
    sentence: str
    remarks: tuple[str, ...] = ()


def answer_of(number: int, result: StudyResult, known: tuple[str, ...] = ()) -> Answer:
    """The verdict with the remarks that do not stand in the set-up already (`known`)."""
    remarks = tuple(remark for remark in result.remarks if remark not in known)
    return Answer(KINDS.get(result.verdict_kind, "unclear"), f"Run {number}: {result.verdict}.", remarks)


def answer_of_check(outcome: CheckOutcome) -> Answer:
    if outcome.deviation is None:
        return Answer("unclear", f"The check of run {outcome.number} was stopped before it was complete.")
    same = outcome.deviation <= SAME
    unit, words = wording.unit_name(outcome.unit), check_words(outcome)
    by = f"it deviates by {wording.minus(f'{outcome.deviation:.1e}')} {unit}" if outcome.deviation else "it agrees to the last digit"
    return Answer("good" if same else "bad", f"Run {outcome.number} {words}: {by} ({outcome.compared}).")


def check_words(outcome: CheckOutcome) -> str:
    """`repeats`, `does not repeat`, `check stopped`."""
    if outcome.deviation is None:
        return "check stopped"
    return "repeats" if outcome.deviation <= SAME else "does not repeat"


NOTHING_YET = Answer("none", "No run yet.")
