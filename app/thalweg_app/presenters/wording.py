"""How figures are written in the window: units, digits, thousands, time. One place, so that all views agree."""

from __future__ import annotations

import re

from thalweg.units import ENERGY_UNITS

MISSING = "–"
#: Units offered for energy differences of hartree systems; the first is the default.
DIFFERENCE_UNITS = ("mEh", "eV", "kcal/mol", "kJ/mol", "cm^-1")
_PRINTED = {"hartree": "Eh", "cm^-1": "cm⁻¹"}


def unit_name(unit: str) -> str:
    """The unit as it is printed: `Eh` for hartree."""
    return _PRINTED.get(unit, unit)


def energy(value: float | None, unit: str = "hartree") -> str:
    """A total energy with nine decimals, without its unit."""
    return MISSING if value is None else minus(f"{value:.9f}")


def difference_factor(energy_unit: str, shown: str) -> tuple[float, str]:
    """Factor from `energy_unit` to the unit that differences are shown in, and that unit's printed name."""
    if energy_unit != "hartree":
        return 1.0, unit_name(energy_unit)
    return ENERGY_UNITS[shown], unit_name(shown)


def difference(value: float | None, energy_unit: str = "hartree", shown: str = "mEh") -> str:
    """An energy difference with three significant digits, without its unit."""
    if value is None:
        return MISSING
    factor, _ = difference_factor(energy_unit, shown)
    return minus(significant(value * factor))


def significant(value: float, digits: int = 3) -> str:
    """Three digits; an exponent only far from one, and zero as zero."""
    if value == 0:
        return "0"
    if 1e-3 <= abs(value) < 1e5:
        text = f"{value:.{digits}g}"
        return f"{value:.0f}" if "e" in text else text
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa}e{int(exponent)}"


def minus(text: str) -> str:
    """A true minus sign, which has the width of a digit."""
    return text.replace("-", "−")


def typeset(text: str) -> str:
    """What the terminal writes in plain letters, with the signs of print: plus or minus, a square, a true minus before a number."""
    return re.sub(r"-(?=\d)", "−", text.replace("+-", "±").replace("^2", "²"))


def count(value: int | None) -> str:
    return MISSING if value is None else f"{value:,}"


def counted(value: int, noun: str) -> str:
    """`1 parameter`, `44 parameters`."""
    return f"{value:,} {noun}{'' if value == 1 else 's'}"


def bytes_text(value: int) -> str:
    size = float(value)
    for unit in ("bytes", "KiB", "MiB"):
        if size < 1024:
            return f"{size:.0f} {unit}" if unit == "bytes" else f"{size:.3g} {unit}"
        size /= 1024
    return f"{size:,.3g} GiB"


def seconds_text(value: float | None) -> str:
    """Time that something took, for tables: seconds."""
    if value is None:
        return MISSING
    return f"{value:.2f}" if value < 100 else f"{value:,.0f}"


def time_left(seconds: float) -> str:
    """`about 5 s left`, `about 3 min left`: no more digits than a guess deserves."""
    if seconds < 1.5:
        return "about 1 s left"
    if seconds < 90:
        return f"about {seconds:.0f} s left"
    if seconds < 5400:
        return f"about {seconds / 60:.0f} min left"
    return f"about {seconds / 3600:.1f} h left"


def sentence(what: str, why: str = "", fix: str = "") -> str:
    """One paragraph from the three parts of an error."""
    parts = [f"{what}: {why}." if why else f"{what}."]
    if fix:
        parts.append(f"{fix}.")
    return " ".join(parts)
