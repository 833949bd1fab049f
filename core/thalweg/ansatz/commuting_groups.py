"""A Hamiltonian split into groups of commuting Pauli strings, which a circuit can exponentiate exactly one after another."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray, IntArray, MaskArray
from thalweg.operators.pauli import PauliExpansion, pauli_label

#: Coefficients closer than this, relative to the larger, count as equal.
EQUAL = 1e-9


@dataclass(frozen=True)
class TermGroup:
    """Strings that commute with each other.

    Attributes:
        label: what they are, e.g. `XX+YY+ZZ on 6 bonds`.
        x, z, coefficients: the strings, shape (L,).
        cell: which strings must turn together to keep the symmetries of H (those of one bond), counted from 0, shape (L,).
    """

    label: str
    x: MaskArray
    z: MaskArray
    coefficients: FloatArray
    cell: IntArray

    @property
    def largest(self) -> float:
        """The largest |coefficient|."""
        return float(np.abs(self.coefficients).max())

    @property
    def n_cells(self) -> int:
        return int(self.cell[-1]) + 1

    def cell_labels(self) -> list[str]:
        """One text a cell: its strings."""
        names: list[list[str]] = [[] for _ in range(self.n_cells)]
        for cell, x, z in zip(self.cell.tolist(), self.x.tolist(), self.z.tolist(), strict=True):
            names[cell].append(pauli_label(x, z))
        return [" + ".join(found) for found in names]


@dataclass(frozen=True)
class _Cell:
    """Strings that stay together; only cells of one `kind` share a group."""

    kind: str
    x: MaskArray
    z: MaskArray
    coefficients: FloatArray


def by_type(expansion: PauliExpansion) -> list[TermGroup]:
    """Strings of X alone, of Y alone, of Z alone, and the mixed ones in as many groups as they need."""
    x, z, c = _strings(expansion)
    kinds = np.select([z == 0, x == 0, x == z], ["X", "Z", "Y"], "mixed")
    cells = [_Cell(str(kinds[i]), x[i : i + 1], z[i : i + 1], c[i : i + 1]) for i in range(c.size)]
    return _grouped(cells, expansion.n_qubits)


def by_bond(expansion: PauliExpansion, pairs: Iterable[tuple[int, int]] = ()) -> list[TermGroup]:
    """The strings on one set of sites stay together, and sets that commute form a group: a colouring of the bonds.

    The bonds of `pairs` come first, so that a group of them is not mixed with others; then strong bonds come before weak ones.
    XX + YY of one bond commutes with S_z and XX + YY + ZZ with the total spin, so that their exponentials keep what H keeps.
    """
    x, z, c = _strings(expansion)
    support = x | z
    single = np.bitwise_count(support) == 1
    keys = list(zip(support.tolist(), np.where(single, x, 0).tolist(), np.where(single, z, 0).tolist(), strict=True))
    first = {1 << a | 1 << b for a, b in pairs}
    cells = _cells(keys, x, z, c)
    cells.sort(key=lambda cell: (int(cell.x[0] | cell.z[0]) not in first, -round(float(np.abs(cell.coefficients).max()), 12)))
    return _grouped(cells, expansion.n_qubits)


def by_flip(expansion: PauliExpansion) -> list[TermGroup]:
    """The strings with one x mask stay together: diagonal terms, and for electrons all that move the same occupations.

    N, S_z and every other diagonal operator that commutes with H commutes with the sum of the strings of one x mask, since
    different masks lead to different basis states.
    """
    x, z, c = _strings(expansion)
    return _grouped(_cells([(mask, 0, 0) for mask in x.tolist()], x, z, c, "diagonal", "flips"), expansion.n_qubits)


def commutes(x: MaskArray, z: MaskArray, other_x: MaskArray, other_z: MaskArray) -> bool:
    """Whether every string of the one list commutes with every string of the other."""
    odd = np.bitwise_count(x[:, None] & other_z) + np.bitwise_count(z[:, None] & other_x)
    return not bool(np.any(odd & 1))


def string_type(x: int, z: int) -> str:
    """The Pauli letters of a string in alphabetical order: `XX`, `XYZ`."""
    return "X" * (x & ~z).bit_count() + "Y" * (x & z).bit_count() + "Z" * (z & ~x).bit_count()


def exchange_bonds(expansion: PauliExpansion) -> dict[tuple[int, int], float] | None:
    """The bonds and coefficients of a pure sum of c (XX + YY + ZZ); None for any other Hamiltonian."""
    x, z, c = _strings(expansion)
    if np.any(np.bitwise_count(x | z) != 2):
        return None
    found: dict[int, dict[str, float]] = {}
    for a, b, value in zip(x.tolist(), z.tolist(), c.tolist(), strict=True):
        found.setdefault(a | b, {})[string_type(a, b)] = value
    bonds = {}
    for mask, terms in found.items():
        if set(terms) != {"XX", "YY", "ZZ"} or np.ptp(list(terms.values())) > EQUAL * max(map(abs, terms.values())):
            return None
        bonds[sites_of(mask)] = terms["ZZ"]
    return bonds


def sites_of(mask: int) -> tuple[int, int]:
    """The lowest and the highest site of a mask."""
    return (mask & -mask).bit_length() - 1, mask.bit_length() - 1


def _strings(expansion: PauliExpansion) -> tuple[MaskArray, MaskArray, FloatArray]:
    keep = (expansion.x | expansion.z) != 0
    return expansion.x[keep], expansion.z[keep], expansion.coefficients[keep]


def _cells(keys: list[tuple[int, int, int]], x: MaskArray, z: MaskArray, c: FloatArray, diagonal: str = "", other: str = "") -> list[_Cell]:
    """One cell a key, or several where strings of one key do not commute. Kinds are the types of strings unless named."""
    rows: dict[tuple[int, int, int], list[int]] = {}
    for i, key in enumerate(keys):
        rows.setdefault(key, []).append(i)
    cells = []
    for members in rows.values():
        for part in _commuting_parts(members, x, z):
            types = {string_type(int(x[i]), int(z[i])) for i in part}
            named = diagonal if not x[part].any() else other
            cells.append(_Cell(named or "+".join(sorted(types)), x[part], z[part], c[part]))
    return cells


def _commuting_parts(members: list[int], x: MaskArray, z: MaskArray) -> list[list[int]]:
    if commutes(x[members], z[members], x[members], z[members]):
        return [members]
    parts: list[list[int]] = []
    for i in members:
        for part in parts:
            if commutes(x[i : i + 1], z[i : i + 1], x[part], z[part]):
                part.append(i)
                break
        else:
            parts.append([i])
    return parts


def _grouped(cells: list[_Cell], n_qubits: int) -> list[TermGroup]:
    """Each cell goes to the first group of its kind with which it commutes."""
    groups: list[list[_Cell]] = []
    for cell in cells:
        for group in groups:
            if group[0].kind == cell.kind and all(commutes(cell.x, cell.z, other.x, other.z) for other in group):
                group.append(cell)
                break
        else:
            groups.append([cell])
    return [_group(group, n_qubits) for group in groups]


def _group(cells: list[_Cell], n_qubits: int) -> TermGroup:
    x, z, c = (np.concatenate([getattr(cell, name) for cell in cells]) for name in ("x", "z", "coefficients"))
    numbers = np.repeat(np.arange(len(cells)), [cell.x.size for cell in cells])
    return TermGroup(_label(cells), x, z, c, numbers)


def _label(cells: list[_Cell]) -> str:
    """What a group holds, e.g. `XX+YY+ZZ on 6 bonds`, `X on 8 sites`, `12 diagonal terms`."""
    kind, count = cells[0].kind, len(cells)
    if kind in ("diagonal", "flips"):
        strings = sum(cell.x.size for cell in cells)
        what = "diagonal" if kind == "diagonal" else "exchange"
        return f"{strings} {what} {'term' if strings == 1 else 'terms'}"
    if kind in ("X", "Y", "Z", "mixed") and any(int(cell.x[0] | cell.z[0]).bit_count() > 1 for cell in cells):
        types = sorted({string_type(int(cell.x[0]), int(cell.z[0])) for cell in cells}, key=lambda text: (-len(text), text))
        return f"{count} {' and '.join(types[:3])}{' ...' if len(types) > 3 else ''} {'term' if count == 1 else 'terms'}"
    weight = int(cells[0].x[0] | cells[0].z[0]).bit_count()
    what = {1: "site", 2: "bond"}.get(weight, f"set of {weight} sites")
    plural = what.replace("set", "sets") if weight > 2 else f"{what}s"
    return f"{kind} on {count} {what if count == 1 else plural}"
