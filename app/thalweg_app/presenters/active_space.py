"""Turns clicks on the orbital ladder into the text of an active space, and checks nothing: the core does."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from thalweg.study.derived import Rung


def toggled(ladder: Sequence[Rung], number: int) -> str:
    """The active space with orbital `number` (counted from 1) taken in or left out; never empty."""
    active = {rung.number for rung in ladder if rung.active}
    changed = active ^ {number}
    if not changed:
        changed = active
    return "all" if len(changed) == len(ladder) else listing(changed)


def listing(numbers: Iterable[int]) -> str:
    """`2,3,5-8` from orbital numbers."""
    parts: list[str] = []
    ordered = sorted(numbers)
    start = 0
    for i, number in enumerate(ordered):
        if i + 1 < len(ordered) and ordered[i + 1] == number + 1:
            continue
        first = ordered[start]
        parts.append(str(first) if first == number else f"{first}-{number}" if number > first + 1 else f"{first},{number}")
        start = i + 1
    return ",".join(parts)
