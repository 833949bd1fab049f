"""The mean fields of a whole curve, walked outward from the geometry that the active space was chosen at, and back.

Blocks of a scan run side by side, so an active space cannot be followed through them one point after another; it is followed here first.
Walking back from both ends finds mean fields that another branch makes lower.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from thalweg.errors import StudyError
from thalweg.study.path.base import positions_of
from thalweg.study.problem import prepare_system
from thalweg.study.scan_spec import ScanSpec
from thalweg.systems.molecule import Molecule
from thalweg.systems.prepared import MeanFieldSeed
from thalweg.watch import Watch

#: Mean-field energies that differ by more than this (Eh) belong to different solutions.
BRANCH = 1e-6


@dataclass(frozen=True)
class CurveField:
    """The mean field of one point, and what was said on the way to it."""

    seed: MeanFieldSeed
    notes: tuple[str, ...]


class _Silent(Watch):
    """Hears the wish to stop and says nothing of each single mean field."""

    def __init__(self, outer: Watch) -> None:
        super().__init__()
        self._outer = outer

    def stage(self, text: str, fraction: float | None = None) -> None:
        self.check()

    def check(self) -> None:
        self._outer.check()


def curve_fields(scan: ScanSpec, watch: Watch) -> list[CurveField | None]:
    """One entry a point; None where the point cannot be prepared (it fails later with its own sentence) or nothing needs to be followed."""
    system = scan.study.system
    if not isinstance(system, Molecule) or system.active_space.strip().lower() in ("", "all"):
        return [None] * len(scan.points)
    outer, watch = watch, _Silent(watch)
    fields: list[CurveField | None] = [None] * len(scan.points)
    start = _nearest_point(scan, system)
    own = _prepared(scan, None, system, watch)
    ahead, behind = list(range(start, len(fields))), list(range(start - 1, -1, -1))
    for walk in (ahead, behind):
        last = own if walk is ahead or fields[start] is None else fields[start]
        for i in walk:
            outer.stage("Following the mean field", sum(f is not None for f in fields) / len(fields))
            fields[i] = last = _step(scan, i, last, watch)
    outer.stage("Looking for lower mean fields")
    for walk in (ahead[-2::-1], behind[-2::-1]):
        _walk_back(scan, fields, walk, 1 if walk and walk[0] >= start else -1, watch)
    return fields


def _walk_back(scan: ScanSpec, fields: list[CurveField | None], walk: list[int], side: int, watch: Watch) -> None:
    """Towards the start: where the neighbour's density leads to a lower mean field, that branch is taken and said."""
    for i in walk:
        old, neighbour = fields[i], fields[i + side]
        if old is None or neighbour is None:
            continue
        again = _step(scan, i, replace(neighbour, seed=_as_known(neighbour.seed, old.seed)), watch)
        if again is not None and again.seed.energy < old.seed.energy - BRANCH:
            fall = 1e3 * (old.seed.energy - again.seed.energy)
            note = f"mean-field-branch: from the other side the mean field is {fall:.3g} mEh lower, and that one is taken"
            fields[i] = replace(again, notes=(*again.notes, note))


def _as_known(neighbour: MeanFieldSeed, own: MeanFieldSeed) -> MeanFieldSeed:
    """The neighbour's density and orbitals; a mean field of the point's own energy is the one whose stability is known already."""
    return replace(neighbour, energy=own.energy, stability=own.stability, warnings=own.warnings, breaks_group=own.breaks_group, here=True)


def _step(scan: ScanSpec, index: int, neighbour: CurveField | None, watch: Watch) -> CurveField | None:
    try:
        system = scan.at(scan.points[index]).system
    except StudyError:
        return None
    assert isinstance(system, Molecule)
    return _prepared(scan, neighbour, system, watch)


def _prepared(scan: ScanSpec, neighbour: CurveField | None, system: Molecule, watch: Watch) -> CurveField | None:
    seed = None if neighbour is None else replace(neighbour.seed, follow=scan.follow_orbitals)
    try:
        prepared = prepare_system(scan.study.model_copy(update={"system": system}), watch, seed)
    except StudyError:
        return None
    if prepared.seed is None:
        return None
    said = [note for note in prepared.facts.get("orbital_following", ()) if not note.startswith("followed")]
    return CurveField(prepared.seed, tuple(said))


def _nearest_point(scan: ScanSpec, system: Molecule) -> int:
    """Index of the point whose geometry is nearest the study's own."""
    own = positions_of(system)
    best, index = np.inf, 0
    for i, value in enumerate(scan.points):
        moved = scan.at(value).system
        assert isinstance(moved, Molecule)
        distance = float(np.linalg.norm(positions_of(moved) - own))
        if distance < best:
            best, index = distance, i
    return index
