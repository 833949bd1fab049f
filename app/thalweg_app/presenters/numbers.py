"""Reads numbers as people type them: decimal point or comma, exponents, a true minus sign."""

from __future__ import annotations

import math
import re

from thalweg.errors import StudyError

_GROUPED = re.compile(r"[+-]?\d{1,3}([,\u2009\u202f' ]\d{3})+")
_DECIMAL = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eEdD][+-]?\d+)?")


def parse_number(text: str, field: str = "") -> float:
    """`0.735`, `0,735`, `1e-6`, `1D-6`, `.5`; a comma is a decimal sign. StudyError when it is no number."""
    cleaned = _cleaned(text)
    if not _DECIMAL.fullmatch(cleaned):
        raise _not_a_number(text, "a number such as 0.735 or 1e-6", field)
    value = float(re.sub("[dD]", "e", cleaned.replace(",", ".")))
    if not math.isfinite(value):
        raise StudyError(f"'{text.strip()}' is too large", "it does not fit a number", "Give a smaller number", field)
    return value


def parse_whole(text: str, field: str = "") -> int:
    """`20000`, `20,000`, `2e4`. StudyError when it is no whole number."""
    cleaned = _cleaned(text)
    if _GROUPED.fullmatch(cleaned):
        return int(re.sub(r"[^\d+-]", "", cleaned))
    if not _DECIMAL.fullmatch(cleaned) or "," in cleaned:
        raise _not_a_number(text, "a whole number such as 20000", field)
    value = parse_number(cleaned, field)
    if value != int(value):
        raise StudyError(
            f"'{text.strip()}' is not a whole number", "only whole numbers make sense here", f"Give {int(value)} or {int(value) + 1}", field
        )
    return int(value)


def number_text(value: float | int) -> str:
    """A number as a field shows it: at most eight significant digits, a decimal point always, an exponent only far from one."""
    if isinstance(value, int):
        return str(value)
    if value == 0 or 1e-4 <= abs(value) < 1e8:
        return f"{value:.8g}"
    mantissa, exponent = f"{value:.7e}".split("e")
    return f"{mantissa.rstrip('0').rstrip('.')}e{int(exponent)}"


def _cleaned(text: str) -> str:
    return text.strip().replace("\u2212", "-").replace("\u00a0", " ")


def _not_a_number(text: str, wanted: str, field: str) -> StudyError:
    shown = text.strip()
    what = f"'{shown[:40]}' is not a number" if shown else "A number is missing"
    return StudyError(what, "this field holds a number", f"Type {wanted}", field)


def parse_wholes(text: str, field: str = "") -> tuple[int, ...]:
    """`2, 4, 6-8` as whole numbers, nothing as none. StudyError when a part is neither a number nor a range."""
    found: list[int] = []
    for part in text.replace(",", " ").split():
        match = re.fullmatch(r"(\d{1,6})(?:-(\d{1,6}))?", part)
        if match is None:
            raise StudyError(f"'{part[:40]}' is no list of numbers", "sizes are whole numbers and ranges", "Write it as 2, 4, 6-8", field)
        first, last = int(match[1]), int(match[2] or match[1])
        if last < first:
            raise StudyError(f"The range '{part}' is empty", "it ends below its beginning", f"Write it as {last}-{first}", field)
        found += range(first, last + 1)
    return tuple(found)
