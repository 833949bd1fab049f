"""The molecule in its Gaussian basis, as PySCF holds it.

PySCF is imported inside functions: the window's process never loads it, and Windows has none.
"""

from __future__ import annotations

import importlib
import os
import re
import warnings
from collections.abc import Sequence
from functools import lru_cache
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError

#: Groups whose labels do not compose by xor -> the Abelian subgroup that is used instead.
_ABELIAN = {"SO3": "D2h", "Dooh": "D2h", "Coov": "C2v"}


def count_functions(symbols: Sequence[str], basis: str, cartesian: bool) -> int:
    """Number of basis functions, before anything is computed. Raises StudyError for an unknown basis or missing PySCF."""
    pyscf_module("gto")
    _check_basis(basis, symbols)
    total = 0
    for symbol in symbols:
        for momentum, *rows in _functions(basis, symbol) or []:
            contracted = len(next(row for row in rows if isinstance(row, list | tuple))) - 1
            total += contracted * ((momentum + 1) * (momentum + 2) // 2 if cartesian else 2 * momentum + 1)
    return total


def build_mole(
    symbols: Sequence[str], xyz: FloatArray, basis: str, charge: int, n_unpaired: int, cartesian: bool, point_group: bool, budget_bytes: int
) -> Any:
    """The PySCF molecule; `xyz` in bohr, shape (atoms, 3). The basis is one that `count_functions` took."""
    elements = list(dict.fromkeys(symbols))
    mole = pyscf_module("gto").Mole(
        verbose=0,
        max_memory=budget_bytes / 1e6,
        incore_anyway=True,
        atom=[(s, tuple(r)) for s, r in zip(symbols, xyz.tolist(), strict=True)],
        unit="Bohr",
        basis={s: _functions(basis, s) for s in elements},
        ecp={s: potential for s in elements if (potential := _core_potential(basis, s))},
        charge=charge,
        spin=n_unpaired,
        cart=cartesian,
    )
    return _built(mole, point_group)


def _built(mole: Any, point_group: bool) -> Any:
    """Works out basis and point group; a geometry whose group PySCF cannot work out is left without one.

    The labels of atoms and linear molecules do not compose by xor, and PySCF gives both components of a degenerate shell one shape
    there, which no unevenly filled shell has: such molecules are built in an Abelian group, at once where the geometry shows it.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            foreseen = _abelian_of_line(mole) if point_group else ""
            mole.build(dump_input=False, parse_arg=False, symmetry=foreseen or point_group)
            if point_group and (abelian := _ABELIAN.get(mole.topgroup, "")) != foreseen:
                mole.build(dump_input=False, parse_arg=False, symmetry=abelian or True)
        except pyscf_module("lib.exceptions").PointGroupSymmetryError:
            mole.build(dump_input=False, parse_arg=False, symmetry=False)
    return mole


def _abelian_of_line(mole: Any) -> str:
    """The Abelian group of an atom or a linear molecule, as far as its geometry tells; empty for any other."""
    places = np.array([xyz for _, xyz in mole.atom])
    steps = places - places[0]
    axis = steps[int(np.argmax(np.linalg.norm(steps, axis=1)))]
    if np.linalg.norm(np.cross(steps, axis)) > 1e-9:
        return ""
    along = np.argsort(places @ axis, kind="stable") if axis.any() else np.arange(1)
    symbols, heights = [mole.atom[i][0] for i in along], (places @ axis)[along]
    even = symbols == symbols[::-1] and np.allclose(np.diff(heights), np.diff(heights)[::-1], rtol=0, atol=1e-9)
    return "D2h" if even else "C2v"


def with_turned_axes(mole: Any) -> Any | None:
    """A copy in the same Abelian group with its x and y axes turned by 45 degrees about z; None when the geometry does not allow that."""
    half = np.sqrt(0.5)
    axes = np.array([[half, half, 0.0], [-half, half, 0.0], [0.0, 0.0, 1.0]]) @ mole._symm_axes
    turned = mole.copy()
    try:
        turned.symm_orb, turned.irrep_id = pyscf_module("symm").symm_adapted_basis(turned, turned.groupname, turned._symm_orig, axes)
    except pyscf_module("lib.exceptions").PointGroupSymmetryError:
        return None
    turned._symm_axes = axes
    turned.irrep_name = [pyscf_module("symm").irrep_id2name(turned.groupname, i) for i in turned.irrep_id]
    return turned


def pyscf_module(name: str) -> Any:
    try:
        return importlib.import_module(f"pyscf.{name}")
    except ImportError:
        raise StudyError(
            "A geometry cannot be computed here",
            "the library PySCF, which computes mean fields and integrals, is not installed (there is none for Windows)",
            "Load an FCIDUMP or HDF5 file with the integrals instead, or use Linux or macOS",
            "system",
        ) from None


def _check_basis(basis: str, symbols: Sequence[str]) -> None:
    unknown = StudyError(
        f"Unknown basis set '{basis[:40]}'",
        "PySCF has none of this name",
        "Use a name from the literature, e.g. sto-3g, 6-31g*, cc-pvdz",
        "system.basis",
    )
    # PySCF would read a file of this name or an inline listing: a session must run again without either.
    if not re.fullmatch(r"[\w+*(),.@ -]{1,60}", basis) or os.path.isfile(basis) or basis.lower().startswith("gth"):
        raise unknown
    missing = [s for s in dict.fromkeys(symbols) if _functions(basis, s) is None]
    if not missing:
        return
    if all(_functions(basis, s) is None for s in ("H", "C", "Na", "Fe", "I")):
        raise unknown
    raise StudyError(f"The basis set '{basis}' has no functions for {missing[0]}", "it does not cover this element", "Choose another", "system.basis")


@lru_cache(512)
def _functions(basis: str, symbol: str) -> list[Any] | None:
    """The basis functions of an element as PySCF lists them; None where there are none."""
    return _loaded("load", basis, symbol)


@lru_cache(512)
def _core_potential(basis: str, symbol: str) -> list[Any] | None:
    """The effective core potential that belongs to the basis set; None for most."""
    return _loaded("load_ecp", basis, symbol)


def _loaded(loader: str, basis: str, symbol: str) -> list[Any] | None:
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return getattr(pyscf_module("gto").basis, loader)(basis, symbol) or None
    except Exception:  # PySCF raises half a dozen types for a name that it cannot read
        return None
