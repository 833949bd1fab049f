"""Numbers of things in sentences."""

from __future__ import annotations


def counted(number: int, noun: str) -> str:
    """`1 electron`, `4 electrons`, `no electrons`."""
    return f"{number or 'no'} {noun}{'' if number == 1 else 's'}"
