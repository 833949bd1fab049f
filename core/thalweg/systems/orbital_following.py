"""Following the active orbitals from one geometry to the next by their overlap.

The overlap is taken between symmetrically orthogonalised coefficients S^(1/2) C (Loewdin 1950): the basis functions move with their
atoms, so orbitals of the same character overlap by nearly 1 at neighbouring geometries, and no integral between two geometries is needed.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.systems.active_space import ActiveSpace
from thalweg.systems.orbital_order import MeanField
from thalweg.systems.prepared import MeanFieldSeed

#: An active space that keeps less than this of any of its orbitals' weight is another space.
KEPT_WEIGHT = 0.5
CHANGED, FOLLOWED = "active-space-changed", "followed"


def seed_of(field: MeanField, space: ActiveSpace) -> MeanFieldSeed:
    """What a neighbouring geometry needs of this one; plain arrays, so that it travels between processes."""
    return MeanFieldSeed(
        density=np.asarray(field.solver.make_rdm1(), dtype=float),
        orbitals=_orthogonalised(field),
        occupation=field.occupation.copy(),
        core=space.core,
        active=space.active,
        energy=field.energy,
        stability=field.stability,
        warnings=field.warnings,
        breaks_group=field.breaks_group,
    )


def usable_density(seed: MeanFieldSeed | None, n_functions: int) -> FloatArray | None:
    """The density that starts the mean field, where the basis has as many functions."""
    return seed.density if seed is not None and seed.density.shape[-1] == n_functions else None


def follow(seed: MeanFieldSeed | None, field: MeanField, chosen: ActiveSpace) -> tuple[ActiveSpace, tuple[str, ...]]:
    """The active space nearest the neighbour's, and what is to be said of it.

    `chosen` is the space that its description picks here. With `seed.follow` the orbitals of the neighbour's space are picked instead,
    as many from each occupation; without it `chosen` stays. A space that is not the neighbour's is reported as changed.
    """
    if seed is None or seed.orbitals.shape != field.orbitals.shape or len(seed.active) != len(chosen.active):
        return chosen, ()
    overlap = seed.orbitals.T @ _orthogonalised(field)
    space = _nearest(seed, overlap, field.occupation, chosen) if seed.follow else chosen
    notes = []
    if space.active != chosen.active:
        came = sorted(set(space.active) - set(chosen.active))
        gone = sorted(set(chosen.active) - set(space.active))
        notes.append(f"{FOLLOWED}: orbitals {_numbers(came)} kept by overlap instead of {_numbers(gone)}, which the energies would choose")
    weight = np.sum(overlap[np.ix_(seed.active, space.active)] ** 2, axis=0)
    lost = [p for p, w in zip(space.active, weight.tolist(), strict=True) if w < KEPT_WEIGHT]
    if lost:
        remedy = "enlarge the active space" if seed.follow else "follow the orbitals or enlarge the active space"
        notes.append(f"{CHANGED}: orbitals {_numbers(lost)} are not those of the neighbour (overlap {weight.min():.2f}); {remedy}")
    return space, tuple(notes)


def _nearest(seed: MeanFieldSeed, overlap: FloatArray, occupation: FloatArray, chosen: ActiveSpace) -> ActiveSpace:
    """As many orbitals of each occupation as `chosen` has, those with most weight in the neighbour's active space."""
    weight = np.sum(overlap[list(seed.active)] ** 2, axis=0)
    active: list[int] = []
    for occupied in np.unique(occupation):
        members = np.flatnonzero(occupation == occupied)
        count = sum(int(occupation[p] == occupied) for p in chosen.active)
        best = members[np.argsort(-weight[members], kind="stable")][:count]
        active.extend(int(p) for p in best)
    picked = tuple(sorted(active))
    core = tuple(p for p in range(occupation.size) if occupation[p] == 2 and p not in picked)
    return replace(chosen, core=core, active=picked)


def _orthogonalised(field: MeanField) -> FloatArray:
    overlap: Any = field.solver.get_ovlp()
    values, vectors = np.linalg.eigh(np.asarray(overlap, dtype=float))
    root = (vectors * np.sqrt(np.maximum(values, 0.0))) @ vectors.T
    return np.asarray(root @ field.orbitals, dtype=float)


def _numbers(orbitals: list[int]) -> str:
    return ", ".join(str(p + 1) for p in orbitals)
