"""Which orbitals are correlated: all, frozen core, electrons and orbitals around the Fermi level, or a list."""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.systems.wording import counted

FIELD = "system.active_space"
CORE_RULE = "the orbitals of the preceding noble gas of each atom: none for H and He, 1s for Li to Ne, 1s 2s 2p for Na to Ar, and so on"
#: Orbital energies nearer than this count as degenerate, Eh.
DEGENERATE = 1e-6

_CAS = re.compile(r"\(?\s*(\d{1,4})\s*e\s*[,; ]?\s*(\d{1,4})\s*o\s*\)?", re.ASCII)
_RANGE = re.compile(r"(\d{1,4})(?:-(\d{1,4}))?", re.ASCII)


@dataclass(frozen=True)
class ActiveSpace:
    """Orbitals counted from 0; ascending, unless the active ones keep the order of a neighbouring geometry.

    Attributes:
        core: doubly occupied and frozen.
        active: correlated.
        n_alpha, n_beta: electrons in the active orbitals.
        rule: one line that says how they were chosen.
    """

    core: tuple[int, ...]
    active: tuple[int, ...]
    n_alpha: int
    n_beta: int
    rule: str

    @property
    def n_electrons(self) -> int:
        return self.n_alpha + self.n_beta


def choose_active_space(text: str, occupation: FloatArray, energies: FloatArray, n_core_default: int | None) -> ActiveSpace:
    """Works out an active space from its description.

    Args:
        text: `all`, `frozen-core`, `4e,6o`, or orbitals counted from 1 such as `2,3,5-8`.
        occupation: 2, 1 or 0 for each orbital of the mean field, shape (orbitals,).
        energies: orbital energies, same shape, Eh.
        n_core_default: orbitals that `frozen-core` freezes; None where that is unknown.

    Raises StudyError (field `system.active_space`) for whatever cannot be.
    """
    wanted = text.strip().lower().replace("_", "-")
    if wanted in ("", "all"):
        return _space((), tuple(range(occupation.size)), occupation, "all orbitals")
    if re.fullmatch(r"frozen[- ]?core", wanted):
        return _frozen_core(occupation, energies, n_core_default)
    if match := _CAS.fullmatch(wanted):
        return _around_fermi_level(int(match[1]), int(match[2]), occupation, energies)
    return _from_list(text, occupation)


def cut_degeneracies(space: ActiveSpace, energies: FloatArray) -> tuple[str, ...]:
    """A sentence for each pair of degenerate orbitals of which only one is active."""
    active = set(space.active)
    order = np.argsort(energies, kind="stable").tolist()
    return tuple(
        f"Orbitals {min(p, q) + 1} and {max(p, q) + 1} have the same energy and the active space holds only one of them: "
        "the answer depends on their orientation"
        for p, q in pairwise(order)
        if (p in active) != (q in active) and energies[q] - energies[p] < DEGENERATE
    )


def fold_core(core_energy: float, one_body: FloatArray, two_body: FloatArray, space: ActiveSpace) -> tuple[float, FloatArray, FloatArray]:
    """Core energy, h (M, M) and (pq|rs) (M, M, M, M) of the active orbitals in the field of the frozen ones, Eh.

    Helgaker, Jorgensen, Olsen, Molecular Electronic-Structure Theory (2000), section 12.2: h'_pq = h_pq + sum_i 2(pq|ii) - (pi|iq).
    """
    core, active = list(space.core), list(space.active)
    field = 2.0 * np.einsum("pqii->pq", two_body[:, :, core][:, :, :, core]) - np.einsum("piiq->pq", two_body[:, core][:, :, core])
    energy = core_energy + float(np.sum(2.0 * np.diag(one_body)[core] + np.diag(field)[core]))
    effective = (one_body + field)[np.ix_(active, active)]
    return energy, effective, np.ascontiguousarray(two_body[np.ix_(active, active, active, active)])


def _frozen_core(occupation: FloatArray, energies: FloatArray, n_core: int | None) -> ActiveSpace:
    if n_core is None:
        raise _error(
            "The core cannot be frozen by rule",
            "a system given by integrals does not say which atoms its orbitals belong to",
            "Name the active orbitals, e.g. 2-6, or give electrons and orbitals, e.g. 4e,5o",
        )
    lowest = _by_energy(occupation, energies)[:n_core]
    if n_core > occupation.size or np.any(occupation[lowest] < 2):
        raise _error(
            f"The core of {counted(n_core, 'orbital')} is not doubly occupied",
            "the molecule has too few electrons to freeze its core",
            "Take `all` orbitals",
        )
    core = tuple(sorted(lowest.tolist()))
    rest = tuple(p for p in range(occupation.size) if p not in core)
    return _space(core, rest, occupation, f"frozen core ({CORE_RULE})")


def _around_fermi_level(n_electrons: int, n_orbitals: int, occupation: FloatArray, energies: FloatArray) -> ActiveSpace:
    total, single = int(occupation.sum()), int(np.sum(occupation == 1))
    asked = f"{counted(n_electrons, 'electron')} in {counted(n_orbitals, 'orbital')}"
    if n_electrons > total:
        raise _error(f"The active space asks for {counted(n_electrons, 'electron')}", f"the system has {total}", f"Ask for at most {total}e")
    if (total - n_electrons) % 2:
        raise _error(
            f"The active space asks for {n_electrons} of {total} electrons", "frozen orbitals hold two electrons each", f"Ask for {n_electrons + 1}e"
        )
    if n_electrons == 0:
        raise _error(f"The active space asks for {asked}", "there would be nothing to correlate", f"Ask for at least {max(single, 2)}e")
    if n_electrons < single:
        raise _error(f"The active space asks for {asked}", f"{single} orbitals are singly occupied", f"Ask for at least {single}e")
    n_core = (total - n_electrons) // 2
    if n_core + n_orbitals > occupation.size:
        raise _error(
            f"The active space asks for {asked}",
            f"{counted(occupation.size - n_core, 'orbital')} of {occupation.size} remain when {n_core} {'is' if n_core == 1 else 'are'} frozen",
            f"Ask for at most {occupation.size - n_core}o, or take a larger basis set",
        )
    needed = (n_electrons - single) // 2 + single
    if n_orbitals < needed:
        raise _error(f"The active space asks for {asked}", f"these electrons occupy {counted(needed, 'orbital')}", f"Ask for at least {needed}o")
    order = _by_energy(occupation, energies)
    core = tuple(sorted(order[:n_core].tolist()))
    active = tuple(sorted(order[n_core : n_core + n_orbitals].tolist()))
    return _space(core, active, occupation, f"{asked} around the Fermi level")


def _from_list(text: str, occupation: FloatArray) -> ActiveSpace:
    chosen: list[int] = []
    for part in re.split(r"[\s,;]+", re.sub(r"\s*-\s*", "-", text.strip().strip("()[]").strip())):
        match = _RANGE.fullmatch(part)
        if match is None:
            raise _error(
                f"The active space '{text.strip()[:40]}' cannot be read",
                f"'{part[:20]}' is neither an orbital nor a range",
                "Write all, frozen-core, electrons and orbitals such as 4e,6o, or orbitals such as 2,3,5-8",
            )
        first, last = int(match[1]), int(match[2] or match[1])
        if not 1 <= first <= last <= occupation.size:
            raise _error(f"The active space names orbitals {part}", f"the system has orbitals 1 to {occupation.size}", "Name orbitals that exist")
        chosen += range(first - 1, last)
    if len(set(chosen)) < len(chosen):
        double = next(p for p in chosen if chosen.count(p) > 1)
        raise _error(f"The active space names orbital {double + 1} twice", "each orbital counts once", "Name it once")
    left_out = [p + 1 for p in range(occupation.size) if occupation[p] == 1 and p not in chosen]
    if left_out:
        raise _error(f"The active space leaves out orbital {left_out[0]}", "it is singly occupied and cannot be frozen", "Add it to the list")
    core = tuple(p for p in range(occupation.size) if occupation[p] == 2 and p not in chosen)
    return _space(core, tuple(sorted(chosen)), occupation, "orbitals chosen by number")


def _space(core: tuple[int, ...], active: tuple[int, ...], occupation: FloatArray, rule: str) -> ActiveSpace:
    filled = occupation[list(active)]
    space = ActiveSpace(core, active, int(np.sum(filled >= 1)), int(np.sum(filled == 2)), rule)
    if space.n_electrons == 0:
        raise _error("The active space holds no electrons", "every electron sits in a frozen orbital", "Take more orbitals, or `all`")
    return space


def _by_energy(occupation: FloatArray, energies: FloatArray) -> np.ndarray:
    """Orbitals with more electrons first, then by energy."""
    return np.lexsort((energies, -occupation))


def _error(what: str, why: str, fix: str) -> StudyError:
    return StudyError(what, why, fix, FIELD)
