"""The HDF5 molecular data files of the openfermion package, read as an `Integrals` system.

Their two_body_integrals[p, q, r, s] is (ps|qr) in chemist's order; lengths are angstrom, energies Eh.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.paths import as_characters
from thalweg.systems.elements import formula
from thalweg.systems.fcidump import MAX_ORBITALS, Listing, write_listing
from thalweg.systems.integrals import Integrals

_ENERGIES = {"HF": "hf_energy", "MP2": "mp2_energy", "CISD": "cisd_energy", "CCSD": "ccsd_energy", "FCI": "fci_energy"}


def read_molecular_data(path: Path) -> Integrals:
    """The file as an embedded listing with its stored energies. Raises StudyError when it is no such file, or lacks the integrals."""
    import h5py

    try:
        with h5py.File(path, "r") as file:
            return _integrals(file, as_characters(path.name))
    except (OSError, RuntimeError, KeyError, ValueError, TypeError, AttributeError) as error:
        raise StudyError(
            f"'{path.name}' cannot be read as HDF5 molecular data", str(error).strip("'\" ")[:120], "Give a file with stored integrals"
        ) from None


def _integrals(file: Any, name: str) -> Integrals:
    one_body, pairs = _array(file, "one_body_integrals", 2), _array(file, "two_body_integrals", 4)
    size = one_body.shape[0]
    if one_body.shape != (size,) * 2 or pairs.shape != (size,) * 4 or not 1 <= size <= MAX_ORBITALS:
        raise ValueError("the integrals have shapes that do not fit each other")
    energies = _array(file, "orbital_energies", 1) if _stored(file, "orbital_energies") else np.empty(0)
    n_electrons, multiplicity = int(_number(file, "n_electrons")), int(_number(file, "multiplicity"))
    listing = Listing(
        n_electrons=n_electrons,
        ms2=multiplicity - 1,
        core_energy=_number(file, "nuclear_repulsion"),
        one_body=0.5 * (one_body + one_body.T),
        two_body=_eightfold(np.ascontiguousarray(pairs.transpose(0, 3, 1, 2))),
        orbital_energies=energies if energies.size == size else np.empty(0),
        symmetry=np.empty(0, dtype=np.int64),
    )
    atoms, basis = _geometry(file), _text(file, "basis")
    stored = tuple((label, _number(file, key)) for label, key in _ENERGIES.items() if _stored(file, key))
    title = formula(tuple(symbol for symbol, _ in atoms)) if atoms else _text(file, "name")
    return Integrals(
        name=", ".join(part for part in (title, basis.upper()) if part),
        listing=write_listing(listing),
        source=name,
        described="; ".join([*(f"{symbol} {place}" for symbol, place in atoms), "angstrom", basis]) if atoms else basis,
        stored_energies=stored,
    )


def _eightfold(two_body: FloatArray) -> FloatArray:
    """The mean over the symmetries of real orbitals; ValueError when they are broken by more than rounding."""
    mean = 0.5 * (two_body + two_body.transpose(1, 0, 2, 3))
    mean = 0.5 * (mean + mean.transpose(0, 1, 3, 2))
    mean = 0.5 * (mean + mean.transpose(2, 3, 0, 1))
    if np.abs(mean - two_body).max(initial=0.0) > 1e-7:
        raise ValueError("the two-body integrals lack the symmetries of real orbitals")
    return mean


def _stored(file: Any, key: str) -> bool:
    """The files write False for what was not computed."""
    return key in file and file[key].dtype != bool


def _array(file: Any, key: str, dimensions: int) -> FloatArray:
    if not _stored(file, key):
        raise ValueError(f"it holds no {key}")
    data = file[key]
    if data.ndim != dimensions or data.dtype.kind not in "fi" or max(data.shape, default=1) > MAX_ORBITALS:
        raise ValueError(f"{key} is not a real array with {dimensions} dimensions")
    values = np.asarray(data[...], dtype=float)
    if not np.isfinite(values).all():
        raise ValueError(f"{key} holds values that are not finite")
    return values


def _number(file: Any, key: str) -> float:
    return float(_array(file, key, 0))


def _text(file: Any, key: str) -> str:
    if key not in file:
        return ""
    value = file[key][...].tobytes() if file[key].dtype.kind == "S" else b""
    return value.rstrip(b"\0").decode("utf-8", "replace").strip()


def _geometry(file: Any) -> list[tuple[str, str]]:
    """(symbol, coordinates as text) of each atom; empty when the file holds none."""
    if "geometry/atoms" not in file or "geometry/positions" not in file:
        return []
    symbols = [bytes(s).decode("ascii", "replace") for s in file["geometry/atoms"][...].tolist()]
    positions = _array(file, "geometry/positions", 2)
    return [(s, " ".join(f"{x:g}" for x in row)) for s, row in zip(symbols, positions.tolist(), strict=True)]
