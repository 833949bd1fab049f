"""FCIDUMP: a listing of integrals (Knowles and Handy, Comput. Phys. Commun. 54, 75 (1989)).

A Fortran namelist with NORB, NELEC, MS2, ORBSYM, ISYM; then lines `value i j k l` with chemist's (ij|kl), `value i j 0 0` with h_ij,
`value i 0 0 0` with orbital energies, and `value 0 0 0 0` with the core energy. Read and written with real coefficients.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian

FIELD = "system.listing"
MAX_ORBITALS = 200
#: The same integral listed twice may differ by this much, Eh.
_AGREEMENT = 1e-8

_HEADER = re.compile(r"[&$]FCI\b", re.IGNORECASE)
_END = re.compile(r"[&$]END\b|/", re.IGNORECASE)
_ASSIGNMENT = re.compile(r"([A-Za-z]\w*)\s*=\s*([^=]*?)(?=[,\s]*[A-Za-z]\w*\s*=|\s*\Z)", re.ASCII | re.DOTALL)
_REPEATED = re.compile(r"(?:(\d{1,4})\*)?([+-]?\d{1,9})", re.ASCII)
_BARE_EXPONENT = re.compile(r"(\d)([+-]\d{3})(?!\S)", re.ASCII)
_VALUE = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)


@dataclass(frozen=True)
class Listing:
    """What a listing says. Energies in Eh.

    Attributes:
        n_electrons, ms2: electrons and twice the spin projection.
        core_energy: of the line `0 0 0 0`.
        one_body: h, shape (M, M).
        two_body: (pq|rs) without the 1/2, shape (M, M, M, M).
        orbital_energies: shape (M,), or empty where none are listed.
        symmetry: ORBSYM as written, shape (M,), or empty.
        target_symmetry: ISYM as written; 0 where it is missing.
        comments: text after `!` in the header.
        notes: how it was read, one sentence each.
    """

    n_electrons: int
    ms2: int
    core_energy: float
    one_body: FloatArray
    two_body: FloatArray
    orbital_energies: FloatArray
    symmetry: IntArray
    target_symmetry: int = 0
    comments: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def n_orbitals(self) -> int:
        return int(self.one_body.shape[0])


def looks_like_listing(text: str) -> bool:
    """True when the beginning holds the namelist of an FCIDUMP."""
    return _HEADER.search(text[:4000]) is not None


def read_listing(text: str, budget_bytes: int = 4 * 2**30) -> Listing:
    """Reads an FCIDUMP with 8-fold, 4-fold or no folding of the integrals. Raises StudyError for anything else."""
    header, comments, body = _split(text.lstrip("\ufeff"))
    settings = {name.upper(): value for name, value in _ASSIGNMENT.findall(header)}
    _refuse_unrestricted(settings)
    n_orbitals = _whole(settings, "NORB", 1, MAX_ORBITALS)
    n_electrons = _whole(settings, "NELEC", 1, 2 * n_orbitals)
    ms2 = abs(_whole(settings, "MS2", -n_electrons, n_electrons, 0))
    needed = 24 * n_orbitals**4
    if needed > budget_bytes:
        raise StudyError(
            f"The integrals need {needed / 2**30:.3g} GiB of memory",
            f"{n_orbitals} orbitals exceed the budget of {budget_bytes / 2**30:.3g} GiB",
            "List fewer orbitals or raise the memory budget",
            FIELD,
        )
    values, indices = _rows(body, n_orbitals)
    core, energies, notes = _core_and_energies(values, indices, n_orbitals)
    one_body, two_body = _tables(values, indices, n_orbitals)
    return Listing(
        n_electrons,
        ms2,
        core,
        one_body,
        two_body,
        energies,
        _symmetry(settings, n_orbitals),
        _whole(settings, "ISYM", 0, 99, 0),
        comments,
        notes,
    )


def listing_of(fermions: FermionHamiltonian, comments: tuple[str, ...] = ()) -> Listing:
    """The listing of a Hamiltonian: its active orbitals, core energy included."""
    target = 0
    for p, label in enumerate(fermions.orbital_irreps.tolist()):
        if (fermions.reference[0] ^ fermions.reference[1]) >> p & 1:
            target ^= label
    return Listing(
        n_electrons=fermions.sector.n_electrons,
        ms2=fermions.sector.n_alpha - fermions.sector.n_beta,
        core_energy=fermions.core_energy,
        one_body=fermions.one_body,
        two_body=fermions.two_body,
        orbital_energies=fermions.orbital_energies,
        symmetry=fermions.orbital_irreps + 1,
        target_symmetry=target + 1,
        comments=comments,
    )


def write_listing(listing: Listing) -> str:
    """FCIDUMP text with 17 significant digits, which give back the same bits; zeros are left out; 8-fold."""
    size = listing.n_orbitals
    symmetry = listing.symmetry if listing.symmetry.size else np.ones(size, dtype=np.int64)
    lines = [f"&FCI NORB={size},NELEC={listing.n_electrons},MS2={listing.ms2},"]
    lines += [f"! {comment}" for comment in listing.comments]
    lines += [" ORBSYM=" + "".join(f"{label}," for label in symmetry.tolist()), f" ISYM={max(listing.target_symmetry, 1)},", "&END"]
    p, q = np.tril_indices(size)
    first, second = np.tril_indices(p.size)
    columns = p[first], q[first], p[second], q[second]
    lines += _lines(listing.two_body[columns], *columns)
    none = np.full(p.size, -1)
    lines += _lines(listing.one_body[p, q], p, q, none, none)
    orbitals = np.arange(listing.orbital_energies.size)
    lines += [_line(e, int(i), -1, -1, -1) for i, e in zip(orbitals, listing.orbital_energies.tolist(), strict=True)]
    return "\n".join([*lines, _line(listing.core_energy, -1, -1, -1, -1)]) + "\n"


def _lines(values: FloatArray, *columns: IntArray) -> list[str]:
    kept = np.flatnonzero(values)
    rows = zip(values[kept].tolist(), *(c[kept].tolist() for c in columns), strict=True)
    return [_line(*row) for row in rows]


def _line(value: float, i: int, j: int, k: int, l: int) -> str:  # noqa: E741 - the letters of the format's definition
    return f"{value:24.16E}{i + 1:5d}{j + 1:5d}{k + 1:5d}{l + 1:5d}"


def _split(text: str) -> tuple[str, tuple[str, ...], str]:
    """The namelist without its delimiters, its comments, and the text after it."""
    start = _HEADER.search(text[:4000])
    if start is None:
        raise _error("The listing has no header", "it does not begin with &FCI", "Give an FCIDUMP file")
    header: list[str] = []
    comments: list[str] = []
    lines = re.split(r"\r\n|\r|\n", text[start.end() :])
    for number, line in enumerate(lines):
        content, mark, comment = line.partition("!")
        if mark and comment.strip():
            comments.append(comment.strip())
        if end := _END.search(content):
            return "\n".join([*header, content[: end.start()]]), tuple(comments), "\n".join([content[end.end() :], *lines[number + 1 :]])
        header.append(content)
    raise _error("The header of the listing has no end", "neither &END nor / follows &FCI", "Give the whole file")


def _refuse_unrestricted(settings: dict[str, str]) -> None:
    for name in ("UHF", "IUHF"):
        value = settings.get(name, "").strip(" ,.").upper()
        if value and value[0] not in ("F", "0"):
            raise _error(
                "The listing is unrestricted",
                f"it says {name}={settings[name].strip(' ,')[:10]}, and alpha and beta orbitals must be the same here",
                "List integrals over restricted orbitals",
            )


def _whole(settings: dict[str, str], name: str, lowest: int, highest: int, default: int | None = None) -> int:
    text = settings.get(name, "").strip(" ,\t\n")
    if not text and default is not None:
        return default
    if not re.fullmatch(r"[+-]?\d{1,9}", text, re.ASCII):
        raise _error(f"{name} of the listing is {text[:20] or 'missing'}", "it must be a whole number", f"Give {name} in the header")
    if not lowest <= int(text) <= highest:
        raise _error(f"{name} of the listing is {int(text)}", f"it must lie between {lowest} and {highest}", "Correct the header")
    return int(text)


def _symmetry(settings: dict[str, str], n_orbitals: int) -> IntArray:
    """ORBSYM, with the repetition `8*1` of namelists; empty when it is missing."""
    labels: list[int] = []
    for part in re.split(r"[\s,]+", settings.get("ORBSYM", "").strip(" ,\t\n")):
        match = _REPEATED.fullmatch(part)
        if part and match is None:
            raise _error(f"ORBSYM of the listing holds '{part[:20]}'", "it must be whole numbers", "Correct the header")
        if match:
            labels += [int(match[2])] * min(int(match[1] or 1), MAX_ORBITALS + 1)
    if labels and len(labels) != n_orbitals:
        raise _error(f"ORBSYM of the listing has {len(labels)} labels", f"there are {n_orbitals} orbitals", "Give one label an orbital")
    return np.array(labels, dtype=np.int64)


def _rows(body: str, n_orbitals: int) -> tuple[FloatArray, IntArray]:
    """Values, shape (lines,), and indices counted from 1, shape (lines, 4)."""
    if "(" in body:
        raise _error("The listing is complex", "its values are pairs (real, imaginary), and only real integrals are used here", "List real integrals")
    body = body.upper().replace("D", "E")
    tokens = body.split()
    if not tokens:
        raise _error("The listing holds no integrals", "nothing follows the header", "Give the whole file")
    try:
        table = np.array(tokens, dtype=float).reshape(-1, 5)
    except ValueError:
        table = _rows_one_by_one(_BARE_EXPONENT.sub(r"\1E\2", body))
    indices = table[:, 1:]
    wrong = (
        ~np.isfinite(table).all(axis=1) | (indices != np.floor(indices)).any(axis=1) | (indices < 0).any(axis=1) | (indices > n_orbitals).any(axis=1)
    )
    if wrong.any():
        row = int(np.argmax(wrong))
        shown = " ".join(f"{v:g}" for v in table[row])
        raise _error(f"The line '{shown}' cannot be", f"values are finite and orbitals run from 1 to {n_orbitals}", "Correct the line or NORB")
    return np.ascontiguousarray(table[:, 0]), indices.astype(np.int64)


def _rows_one_by_one(body: str) -> FloatArray:
    """As `_rows`, line by line, to name the line that cannot be read."""
    rows = []
    for line in body.split("\n"):
        parts = line.split()
        if not parts:
            continue
        if len(parts) != 5 or not all(_VALUE.fullmatch(part) for part in parts):
            shown = " ".join(parts)[:50]
            raise _error(f"The line '{shown}' cannot be read", "it must be a value and four orbitals", "Correct the line")
        rows.append([float(part) for part in parts])
    return np.array(rows, dtype=float).reshape(-1, 5)


def _core_and_energies(values: FloatArray, indices: IntArray, n_orbitals: int) -> tuple[float, FloatArray, tuple[str, ...]]:
    filled = indices > 0
    kinds = filled.sum(axis=1)
    ordered = (filled[:, :-1] >= filled[:, 1:]).all(axis=1)
    if not np.all(ordered & (kinds != 3)):
        row = int(np.argmin(ordered & (kinds != 3)))
        raise _error(
            f"A line names the orbitals {' '.join(map(str, indices[row].tolist()))}",
            "an integral has four, two, one or none, the zeros last",
            "Correct the line",
        )
    core = values[kinds == 0]
    if core.size > 1 and np.ptp(core) > _AGREEMENT:
        raise _error("The listing has several core energies", "unrestricted listings are parted like this", "List integrals over restricted orbitals")
    notes = [] if core.size else ["The listing has no core energy; it is taken as zero"]
    listed = np.full(n_orbitals, np.nan)
    listed[indices[kinds == 1, 0] - 1] = values[kinds == 1]
    if np.isnan(listed).any() and not np.isnan(listed).all():
        notes.append("Only some orbital energies are listed; they are not used")
    energies = np.empty(0) if np.isnan(listed).any() else listed
    return float(core[0]) if core.size else 0.0, energies, tuple(notes)


def _tables(values: FloatArray, indices: IntArray, n_orbitals: int) -> tuple[FloatArray, FloatArray]:
    """h and (pq|rs), completed by the symmetries of real orbitals; StudyError where two listed values contradict each other."""
    kinds = (indices > 0).sum(axis=1)
    one_body, two_body = np.zeros((n_orbitals,) * 2), np.zeros((n_orbitals,) * 4)
    p, q, _, _ = indices[kinds == 2].T - 1
    one_body[p, q] = one_body[q, p] = values[kinds == 2]
    i, j, k, m = indices[kinds == 4].T - 1
    pairs = values[kinds == 4]
    for a, b, c, d in ((i, j, k, m), (k, m, i, j)):
        two_body[a, b, c, d] = two_body[b, a, c, d] = two_body[a, b, d, c] = two_body[b, a, d, c] = pairs
    worst = max(float(np.abs(one_body[p, q] - values[kinds == 2]).max(initial=0.0)), float(np.abs(two_body[i, j, k, m] - pairs).max(initial=0.0)))
    if worst > _AGREEMENT:
        raise _error(
            "The listing contradicts itself",
            f"integrals that are equal for real restricted orbitals differ by up to {worst:.1e}",
            "List integrals over real restricted orbitals",
        )
    return one_body, two_body


def _error(what: str, why: str, fix: str) -> StudyError:
    return StudyError(what, why, fix, FIELD)
