"""Displacing a geometry along internal coordinates. Positions are arrays (atoms, 3); any length unit, the same in and out."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from thalweg.arrays import FloatArray

Bond = tuple[int, int]


def moving_fragment(n_atoms: int, bonds: Iterable[Bond], fixed: int, moved: int) -> tuple[int, ...]:
    """Atoms that move with `moved` when its bond to `fixed` is cut; only `moved` itself where a ring joins the two anyway."""
    side = beyond_bond(n_atoms, bonds, fixed, moved)
    return (moved,) if fixed in side else tuple(sorted(side))


def beyond_bond(n_atoms: int, bonds: Iterable[Bond], fixed: int, moved: int) -> set[int]:
    """Atoms still joined to `moved` when its bond to `fixed` is cut; holds `fixed` when the bond is part of a ring."""
    neighbours: dict[int, set[int]] = {i: set() for i in range(n_atoms)}
    for i, j in bonds:
        if {i, j} != {fixed, moved}:
            neighbours[i].add(j)
            neighbours[j].add(i)
    reached, open_atoms = {moved}, [moved]
    while open_atoms:
        for atom in neighbours[open_atoms.pop()] - reached:
            reached.add(atom)
            open_atoms.append(atom)
    return reached


def set_distance(positions: FloatArray, fixed: int, moved: int, distance: float, fragment: Sequence[int]) -> FloatArray:
    """Translates `fragment` along the line of the two atoms until they stand `distance` apart."""
    axis = positions[moved] - positions[fixed]
    length = float(np.linalg.norm(axis))
    out = positions.copy()
    out[list(fragment)] += axis * (distance / length - 1.0)
    return out


def set_angle(positions: FloatArray, first: int, vertex: int, moved: int, degrees: float, fragment: Sequence[int]) -> FloatArray:
    """Rotates `fragment` about the vertex, in the plane of the three atoms, until the angle is `degrees`."""
    a, b = positions[first] - positions[vertex], positions[moved] - positions[vertex]
    normal = np.cross(a, b)
    if np.linalg.norm(normal) < 1e-8 * np.linalg.norm(a) * np.linalg.norm(b):
        normal = np.cross(a, _not_along(a))  # straight: any plane through the line is as good as another
    return _rotated(positions, vertex, normal, np.radians(degrees) - _angle(a, b), fragment)


def set_dihedral(positions: FloatArray, i: int, j: int, k: int, moved: int, degrees: float, fragment: Sequence[int]) -> FloatArray:
    """Rotates `fragment` about the axis j-k until the dihedral i-j-k-moved is `degrees` (IUPAC sign)."""
    turn = np.radians(degrees - dihedral_degrees(positions, i, j, k, moved))
    return _rotated(positions, k, positions[k] - positions[j], turn, fragment)


def breathed(positions: FloatArray, factor: float) -> FloatArray:
    """All distances scaled by `factor` about the centroid."""
    centre = positions.mean(axis=0)
    return centre + factor * (positions - centre)


def angle_degrees(positions: FloatArray, first: int, vertex: int, last: int) -> float:
    return float(np.degrees(_angle(positions[first] - positions[vertex], positions[last] - positions[vertex])))


def dihedral_degrees(positions: FloatArray, i: int, j: int, k: int, last: int) -> float:
    """Dihedral angle in (-180, 180], positive clockwise seen from j to k (IUPAC Gold Book, torsion angle)."""
    axis = positions[k] - positions[j]
    axis = axis / np.linalg.norm(axis)
    a, b = positions[i] - positions[j], positions[last] - positions[k]
    a, b = a - (a @ axis) * axis, b - (b @ axis) * axis
    return float(np.degrees(np.arctan2(np.cross(axis, a) @ b, a @ b)))


def _angle(a: FloatArray, b: FloatArray) -> float:
    return float(np.arctan2(np.linalg.norm(np.cross(a, b)), a @ b))


def _not_along(a: FloatArray) -> FloatArray:
    return np.eye(3)[int(np.argmin(np.abs(a)))]


def _rotated(positions: FloatArray, centre: int, axis: FloatArray, angle: float, fragment: Sequence[int]) -> FloatArray:
    """Rodrigues' rotation of the fragment about an axis through the centre atom."""
    u = axis / np.linalg.norm(axis)
    cross = np.array([[0, -u[2], u[1]], [u[2], 0, -u[0]], [-u[1], u[0], 0]])
    rotation = np.eye(3) + np.sin(angle) * cross + (1 - np.cos(angle)) * cross @ cross
    out = positions.copy()
    rows = list(fragment)
    out[rows] = positions[centre] + (positions[rows] - positions[centre]) @ rotation.T
    return out
