"""Following the active orbitals from one geometry to the next by their overlap.

The overlap is taken between symmetrically orthogonalised coefficients S^(1/2) C (Loewdin 1950): the basis functions move with their
atoms, so orbitals of the same character overlap by nearly 1 at neighbouring geometries, and no integral between two geometries is needed.
"""

from __future__ import annotations

from collections.abc import Mapping
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
#: Facts of a prepared molecule.
ORDER, TURNED = "active_orbital_order", "orbitals_of_other_sign"


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


def order_facts(field: MeanField, space: ActiveSpace) -> dict[str, list[int]]:
    """Orbitals counted from 1: the active ones where they are not in the order of their energies, and those of other than standard sign."""
    facts = {ORDER: [p + 1 for p in space.active]} if list(space.active) != sorted(space.active) else {}
    return facts | ({TURNED: [p + 1 for p in field.turned]} if field.turned else {})


def as_told(seed: MeanFieldSeed, facts: Mapping[str, Any]) -> MeanFieldSeed:
    """The seed of a mean field that was worked out anew, with the order and signs that `order_facts` told of it before."""
    signs = np.ones(seed.orbitals.shape[1])
    signs[[p - 1 for p in facts.get(TURNED, ())]] = -1.0
    order = tuple(p - 1 for p in facts.get(ORDER, ())) or seed.active
    return replace(seed, orbitals=seed.orbitals * signs, active=order) if sorted(order) == sorted(seed.active) else seed


def usable_density(seed: MeanFieldSeed | None, n_functions: int) -> FloatArray | None:
    """The density that starts the mean field, where the basis has as many functions."""
    return seed.density if seed is not None and seed.density.shape[-1] == n_functions else None


def follow(seed: MeanFieldSeed | None, field: MeanField, chosen: ActiveSpace) -> tuple[ActiveSpace, MeanField, tuple[str, ...]]:
    """The active space nearest the neighbour's, the mean field in phase with it, and what is to be said of it.

    `chosen` is the space that its description picks here. With `seed.follow` the orbitals of the neighbour's space are picked instead, as
    many from each occupation, in the neighbour's order and with its signs: then parameters keep their meaning from one geometry to the
    next, and a product keeps the order of its factors where orbital energies cross. Without it `chosen` stays. A space that is not the
    neighbour's is reported as changed.
    """
    if seed is None or seed.orbitals.shape != field.orbitals.shape or len(seed.active) != len(chosen.active):
        return chosen, field, ()
    overlap = seed.orbitals.T @ _orthogonalised(field)
    space = _nearest(seed, overlap, field.occupation, chosen) if seed.follow else chosen
    notes = []
    if set(space.active) != set(chosen.active):
        came = sorted(set(space.active) - set(chosen.active))
        gone = sorted(set(chosen.active) - set(space.active))
        notes.append(f"{FOLLOWED}: orbitals {_numbers(came)} kept by overlap instead of {_numbers(gone)}, which the energies would choose")
    weight = np.sum(overlap[np.ix_(seed.active, space.active)] ** 2, axis=0)
    lost = [p for p, w in zip(space.active, weight.tolist(), strict=True) if w < KEPT_WEIGHT]
    if lost:
        remedy = "enlarge the active space" if seed.follow else "follow the orbitals or enlarge the active space"
        notes.append(f"{CHANGED}: orbitals {_numbers(lost)} are not those of the neighbour (overlap {weight.min():.2f}); {remedy}")
    if seed.follow and np.array_equal(seed.occupation[list(seed.active)], field.occupation[list(chosen.active)]):
        space, field = _in_order_and_phase(seed, overlap, space, field)
    return space, field, tuple(notes)


def _in_order_and_phase(seed: MeanFieldSeed, overlap: FloatArray, space: ActiveSpace, field: MeanField) -> tuple[ActiveSpace, MeanField]:
    """Each active orbital in the place and with the sign of the neighbour's that it overlaps with most, occupation by occupation."""
    from scipy.optimize import linear_sum_assignment

    occupation = seed.occupation[list(seed.active)]
    active = list(space.active)
    for occupied in np.unique(occupation):
        places = np.flatnonzero(occupation == occupied)
        members = [p for p in space.active if field.occupation[p] == occupied]
        before = [seed.active[k] for k in places]
        weights = overlap[np.ix_(before, members)] ** 2
        for k, column in zip(places.tolist(), linear_sum_assignment(-weights)[1].tolist(), strict=True):
            active[k] = members[column]
    turned = tuple(p for k, p in enumerate(active) if overlap[seed.active[k], p] < 0)
    return replace(space, active=tuple(active)), field.with_signs_changed(turned) if turned else field


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
