"""The plan of a large excitation program: its factors in stretches, each with the view in which it runs fastest.

Factors keep their order, save that alpha-only and beta-only neighbours commute and are gathered by spin. Factors of one
spin act on whole rows. Alpha-beta factors act on row pairs of one spin and on runs of columns of the other; runs are long
where the source orbital counts as the last in the column order, so a stretch with one alpha source gets such a view.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import groupby

import numpy as np

from thalweg.circuit.program import Excitation
from thalweg.operators.sector_layout import StringSpace
from thalweg.simulate.sector_views import View, view

#: A stretch gets its own view when it has this many pair rotations for each amplitude.
WORTH_A_VIEW = 4


@dataclass(frozen=True)
class Stretch:
    """Factors that run in one view, in order; `factors` are positions in the program."""

    view: View
    factors: tuple[int, ...]


def stretches(excitations: list[Excitation], alpha: StringSpace, beta: StringSpace, irrep: int) -> list[Stretch]:
    """Cuts a program into stretches. alpha, beta: the natural string spaces."""
    plan = _Plan(excitations, alpha, beta, irrep)
    kinds = [_kind(e) for e in excitations]
    for mixed, positions in groupby(range(len(excitations)), key=lambda f: kinds[f] == "ab"):
        members = list(positions)
        if mixed:
            for source, group in groupby(members, key=lambda f: excitations[f].alpha_source):
                plan.add_mixed(source, list(group))
        else:
            plan.add_one_spin([f for f in members if kinds[f] == "a"], [f for f in members if kinds[f] == "b"])
    return plan.finished()


class _Plan:
    def __init__(self, excitations: list[Excitation], alpha: StringSpace, beta: StringSpace, irrep: int) -> None:
        self._excitations, self._alpha, self._beta, self._irrep = excitations, alpha, beta, irrep
        self._views: dict[tuple[bool, int], View] = {}
        self._found: list[tuple[View, list[int]]] = []

    def add_mixed(self, source: tuple[int, ...], factors: list[int]) -> None:
        size = self._alpha.size * self._beta.size / self._alpha.n_irreps
        pairs = len(factors) * self._share(self._alpha) * self._share(self._beta) * size
        if pairs >= WORTH_A_VIEW * size:
            self._append(self._view(False, source[-1]), factors)
        else:
            self._append(self._current(), factors)

    def add_one_spin(self, alpha: list[int], beta: list[int]) -> None:
        """Alpha-only factors need alpha rows, beta-only ones beta rows; the spin whose rows stand now goes first."""
        here = self._current()
        for rows_are_alpha in (here.rows_are_alpha, not here.rows_are_alpha):
            factors = alpha if rows_are_alpha else beta
            if factors:
                fits = self._current().rows_are_alpha == rows_are_alpha
                self._append(self._current() if fits else self._view(rows_are_alpha, -1), factors)

    def finished(self) -> list[Stretch]:
        """Stretches of one-spin factors take over the view of the next one where only the column order differs."""
        views = [where for where, _ in self._found]
        for n in range(len(views) - 2, -1, -1):
            one_spin = all(_kind(self._excitations[f]) != "ab" for f in self._found[n][1])
            if one_spin and views[n].rows_are_alpha == views[n + 1].rows_are_alpha:
                views[n] = views[n + 1]
        merged: list[tuple[View, list[int]]] = []
        for where, (_, factors) in zip(views, self._found, strict=True):
            if merged and merged[-1][0] is where:
                merged[-1][1].extend(factors)
            else:
                merged.append((where, list(factors)))
        return [Stretch(where, tuple(factors)) for where, factors in merged]

    def _current(self) -> View:
        return self._found[-1][0] if self._found else self._view(True, -1)

    def _append(self, where: View, factors: list[int]) -> None:
        if self._found and self._found[-1][0] is where:
            self._found[-1][1].extend(factors)
        else:
            self._found.append((where, factors))

    def _view(self, rows_are_alpha: bool, last: int) -> View:
        key = (rows_are_alpha, last)
        if key not in self._views:
            self._views[key] = view(self._alpha, self._beta, self._irrep, rows_are_alpha=rows_are_alpha, last=last)
        return self._views[key]

    @staticmethod
    def _share(space: StringSpace) -> float:
        """Part of the strings on which a single replacement acts."""
        m, n = space.n_orbitals, space.n_electrons
        return n * (m - n) / max(m * (m - 1), 1)


def _kind(e: Excitation) -> str:
    return "ab" if e.alpha_source and e.beta_source else "a" if e.alpha_source else "b"


def order_of(plan: list[Stretch]) -> np.ndarray:
    """Positions in the program, in the order in which the plan runs them, shape (F,)."""
    return np.array([f for stretch in plan for f in stretch.factors], dtype=np.int64)
