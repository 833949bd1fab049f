"""A small combination of determinants or basis states as a person writes it: a sum with amplitudes, or a list."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Generic, TypeVar

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError

T = TypeVar("T")
#: More terms than this are no reference that a circuit would prepare before the search.
MOST_TERMS = 16
#: Amplitudes below this are rounding.
SMALLEST_AMPLITUDE = 1e-10
#: Terms that a name spells out.
NAMED_TERMS = 4
EXAMPLE = "Write it as in 0.9*2200 - 0.4*2020, or list the states with commas between"

_SIGN = re.compile(r"(?<![eE])([+-])")  # not that of an exponent
_TERM = re.compile(r"(?:([0-9.]+(?:[eE][+-]?[0-9]+)?)\s*[*\u00b7\u00d7])?([^*\u00b7\u00d7]*)")


@dataclass(frozen=True)
class Combination(Generic[T]):
    """What was read: the states in the order typed, and their amplitudes, normalised; none where they are to be found."""

    states: tuple[T, ...]
    amplitudes: tuple[float, ...]

    @property
    def is_single(self) -> bool:
        return len(self.states) == 1

    def amplitudes_in(self, matrix: FloatArray) -> FloatArray:
        """The amplitudes, shape (L,): those typed, or the lowest eigenvector of H among the states, the first of the largest positive."""
        if self.amplitudes:
            return np.array(self.amplitudes)
        values, vectors = np.linalg.eigh(matrix)
        if values[1] - values[0] < SMALLEST_AMPLITUDE * max(1.0, abs(values[0])):
            raise StudyError(
                "The list has no one lowest state",
                "two combinations of the states listed have the same lowest energy",
                "Write the amplitudes, or list other states",
                "reference",
            )
        lowest: FloatArray = np.where(np.abs(vectors[:, 0]) < SMALLEST_AMPLITUDE, 0.0, vectors[:, 0])
        return lowest * np.sign(lowest[np.argmax(np.round(np.abs(lowest), 8))])  # rounding does not choose between equal ones


def read_combination(text: str, read_state: Callable[[str], T]) -> Combination[T]:
    """Reads `A`, a list `A, B, C`, or a sum such as `0.9*A - 0.4*B`. StudyError of `read_state`, and for what is no combination."""
    if "," in text:
        states = tuple(read_state(part) for part in text.split(",") if part.strip())
        _refuse_unusable(states)
        return Combination(states, ())
    first, *rest = _SIGN.split(text)
    signed = [("+", first)] if first.strip() or not rest else []
    found = [_term(sign, part, read_state) for sign, part in [*signed, *zip(rest[::2], rest[1::2], strict=True)]]
    states = tuple(state for _, state in found)
    _refuse_unusable(states)
    amplitudes = np.array([amplitude for amplitude, _ in found])
    largest = np.abs(amplitudes).max()
    if np.isinf(largest):
        raise StudyError("An amplitude of the reference is too large", "it is beyond the range of numbers", EXAMPLE, "reference")
    amplitudes /= largest or 1.0  # so that no square overflows or vanishes
    norm = float(np.linalg.norm(amplitudes))
    if np.abs(amplitudes).min() <= SMALLEST_AMPLITUDE * norm:
        raise StudyError("An amplitude of the reference is zero", "such a term adds nothing", "Leave it out", "reference")
    return Combination(states, tuple((amplitudes / norm).tolist()))


def combination_text(terms: Sequence[tuple[float, str]]) -> str:
    """`0.9165*2200 - 0.4*2020`, the terms as typed; of many the largest, and how many more there are."""
    kept = sorted(sorted(range(len(terms)), key=lambda i: -abs(terms[i][0]))[:NAMED_TERMS])
    text = "".join(f" {'-' if amplitude < 0 else '+'} {abs(amplitude):.4g}*{name}" for amplitude, name in (terms[i] for i in kept))
    more = f" and {len(terms) - len(kept)} more" if len(terms) > len(kept) else ""
    return text.removeprefix(" + ").strip() + more


def _term(sign: str, part: str, read_state: Callable[[str], T]) -> tuple[float, T]:
    match = _TERM.fullmatch(part.strip())
    if match is None:
        raise StudyError("The reference cannot be read", f"'{part.strip()[:40]}' is not an amplitude times a state", EXAMPLE, "reference")
    try:
        size = float(match[1] or 1.0)
    except ValueError:
        raise StudyError("The reference cannot be read", f"'{match[1]}' is no number", EXAMPLE, "reference") from None
    return (-size if sign == "-" else size), read_state(match[2])


def _refuse_unusable(states: Sequence[T]) -> None:
    if not states:
        raise StudyError("The reference names no state", "only separators were typed", EXAMPLE, "reference")
    if len(set(states)) < len(states):
        raise StudyError("A state stands twice in the reference", "each may stand once", "Add up its amplitudes, or leave one out", "reference")
    if len(states) > MOST_TERMS:
        raise StudyError(
            f"A combination of {len(states)} states is too long",
            f"up to {MOST_TERMS} are prepared by a circuit before the search",
            "Keep those of the largest weight",
            "reference",
        )
