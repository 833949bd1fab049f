"""Opens a file as a system: XYZ or a list of atoms, FCIDUMP, HDF5 molecular data, a lattice file or an edge list."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from pydantic import ValidationError

from thalweg.errors import StudyError
from thalweg.paths import as_characters
from thalweg.systems.fcidump import looks_like_listing, read_listing
from thalweg.systems.integrals import Integrals
from thalweg.systems.lattice_file import looks_like_lattice, read_edge_list, read_lattice_file
from thalweg.systems.lattice_model import LatticeModel
from thalweg.systems.molecule import Molecule
from thalweg.systems.xyz import read_atoms

AnySystem = Molecule | Integrals | LatticeModel

_HDF5 = b"\x89HDF\r\n\x1a\n"
_LARGEST = 512 * 2**20
_KINDS = "Give XYZ, a list of atoms, FCIDUMP, HDF5 molecular data, a lattice file (TOML) or an edge list (CSV)"


def open_system(path: str | Path, unit: str = "angstrom", **overrides: Any) -> tuple[AnySystem, tuple[str, ...]]:
    """The system that a file holds, and sentences on how it was read.

    Args:
        path: a file; what it is decides its content, not its name.
        unit: of the coordinates, `angstrom` or `bohr`.
        overrides: fields of the system to set, e.g. charge=1, basis="6-31g"; None leaves what the file says.

    Raises StudyError when there is no such file or nothing in it that is a system.
    """
    path = Path(path)
    content = _read(path)
    given = {name: value for name, value in overrides.items() if value is not None}
    if content.startswith(_HDF5):
        from thalweg.systems.molecular_data import read_molecular_data

        return _with(read_molecular_data(path), given), (f"Read '{path.name}' as HDF5 molecular data",)
    text = _text(content, path.name)
    if looks_like_listing(text):
        listing = read_listing(text)
        system = Integrals(name=_name(path), listing=text, source=as_characters(path.name), described="; ".join(listing.comments))
        return _with(system, given), (
            f"Read '{path.name}' as FCIDUMP: {listing.n_electrons} electrons in {listing.n_orbitals} orbitals",
            *listing.notes,
        )
    if path.suffix.lower() == ".toml" or looks_like_lattice(text):
        return _with(read_lattice_file(text), given), (f"Read '{path.name}' as a lattice file",)
    if path.suffix.lower() == ".csv":
        return _with(read_edge_list(text, _name(path)), given), (
            f"Read '{path.name}' as an edge list; the model on it is Heisenberg until another is chosen",
        )
    return _open_geometry(path, text, unit, given)


def _open_geometry(path: Path, text: str, unit: str, given: dict[str, Any]) -> tuple[Molecule, tuple[str, ...]]:
    try:
        read = read_atoms(text, unit)
    except StudyError as error:
        if path.suffix.lower() in (".xyz", ".txt", "") or error.field != "system.atoms":
            raise
        raise StudyError(f"'{path.name}' is no system that can be read", str(error).rstrip("."), _KINDS) from None
    stated: dict[str, Any] = {"charge": read.charge, "multiplicity": read.multiplicity}
    stated = {name: value for name, value in stated.items() if value is not None}
    molecule = _with(Molecule(name=_name(path)), {"atoms": read.atoms, "unit": unit} | stated | given)
    assert isinstance(molecule, Molecule)
    return molecule, (*read.notes, *read.warnings)


def _with(system: AnySystem, changes: dict[str, Any]) -> AnySystem:
    """A validated copy with these fields; StudyError naming the one at fault."""
    for name in changes:
        if name not in type(system).model_fields:
            raise StudyError(
                f"'{name}' cannot be set for this system",
                f"a system of the kind '{type(system).title}' has no such setting",
                "Leave it out, or give a geometry instead",
                f"system.{name}",
            )
    try:
        return type(system).model_validate(system.model_dump() | changes)
    except ValidationError as error:
        first = error.errors()[0]
        field = ".".join(str(part) for part in first["loc"])
        raise StudyError(f"'{field}' cannot be {first['input']!r:.60}", first["msg"], "Give a value that fits", f"system.{field}") from None


def _read(path: Path) -> bytes:
    try:
        if path.is_dir():
            raise StudyError(f"'{path}' is a folder", "a system is one file", "Name a file in it")
        if path.stat().st_size > _LARGEST:
            raise StudyError(f"'{path.name}' is too large", f"it has more than {_LARGEST // 2**20} MiB", _KINDS)
        content = path.read_bytes()
    except FileNotFoundError:
        raise StudyError(f"There is no file '{path}'", "nothing has this name", "Check the name and the folder") from None
    except (OSError, ValueError) as error:
        raise StudyError(f"'{path}' cannot be opened", str(getattr(error, "strerror", None) or error), "Check the name and the permissions") from None
    if not content.strip():
        raise StudyError(f"'{path.name}' is empty", "there is nothing to read", _KINDS)
    return content


def _text(content: bytes, name: str) -> str:
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        return content.decode("utf-16", "replace")
    if b"\0" in content:
        raise StudyError(f"'{name}' is a binary file of an unknown kind", "it is neither text nor HDF5", _KINDS)
    try:
        return content.decode("utf-8")
    except UnicodeDecodeError:
        return content.decode("latin-1")


def _name(path: Path) -> str:
    """The file's name without its ending; nothing for the customary name FCIDUMP, which says nothing."""
    return "" if path.name.upper() == "FCIDUMP" else as_characters(path.stem)
