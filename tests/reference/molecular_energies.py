"""Published and recomputed energies of molecules. Energies in Eh, lengths in angstrom, angles in degrees.

Sources:
    BOOK  Hehre, Radom, Schleyer, Pople, Ab Initio Molecular Orbital Theory (1986), and the NIST Computational Chemistry Comparison
          and Benchmark Database: energies at the geometry optimised with the same basis set (from memory, recomputed to 1e-6).
    FCI   recomputed with the determinant code of PySCF. Where the tolerance is 5e-6 the geometry was not yet rounded.
    SZABO Szabo and Ostlund, Modern Quantum Chemistry, the worked example of H2 at 1.4 bohr (from memory, recomputed).
"""

from __future__ import annotations

from math import cos, pi, radians, sin, sqrt
from typing import NamedTuple

Atoms = tuple[tuple[str, float, float, float], ...]


def line(symbols: str, *lengths: float) -> Atoms:
    """Atoms along z, the given lengths apart."""
    places = [sum(lengths[:i]) for i in range(len(symbols.split()))]
    return tuple((s, 0.0, 0.0, z) for s, z in zip(symbols.split(), places, strict=True))


def bent(centre: str, length: float, angle: float) -> Atoms:
    """XH2 in the plane x = 0."""
    half = radians(angle) / 2
    y, z = length * sin(half), length * cos(half)
    return (centre, 0.0, 0.0, 0.0), ("H", 0.0, y, z), ("H", 0.0, -y, z)


def pyramid(centre: str, length: float, angle: float) -> Atoms:
    """XH3 with equal H-X-H angles, axis along z."""
    sine = 2 / sqrt(3) * sin(radians(angle) / 2)
    height = -length * sqrt(1 - sine**2)
    around = [(length * sine * cos(a), length * sine * sin(a), height) for a in (0.0, 2 * pi / 3, 4 * pi / 3)]
    return ((centre, 0.0, 0.0, 0.0), *(("H", *place) for place in around))


class Case(NamedTuple):
    """One energy and how near it must be met."""

    atoms: Atoms
    energy: float
    within: float
    settings: dict[str, object] = {}


#: Hartree-Fock at the optimised geometry (BOOK). 6-31G* of the book has Cartesian d functions.
HARTREE_FOCK = {
    "H2 STO-3G": Case(line("H H", 0.7122), -1.117506, 1e-6),
    "LiH STO-3G": Case(line("Li H", 1.5108), -7.863382, 1e-6),
    "BeH2 STO-3G": Case(line("H Be H", 1.2905, 1.2905), -15.561353, 1e-6),
    "H2O STO-3G": Case(bent("O", 0.9894, 100.03), -74.965901, 1e-6),
    "NH3 STO-3G": Case(pyramid("N", 1.0325, 104.16), -55.455420, 1e-6),
    "HF STO-3G": Case(line("H F", 0.9555), -98.572847, 1e-6),
    "N2 STO-3G": Case(line("N N", 1.1339), -107.500654, 1e-6),
    "H2O 6-31G* Cartesian": Case(bent("O", 0.9473, 105.50), -76.010747, 1e-6, {"basis": "6-31g*", "cartesian": True}),
    "N2 6-31G* Cartesian": Case(line("N N", 1.0784), -108.943949, 1e-6, {"basis": "6-31g*", "cartesian": True}),
    # recomputed: the same geometries with spherical d functions
    "H2O 6-31G* spherical": Case(bent("O", 0.9473, 105.50), -76.009341, 1e-6, {"basis": "6-31g*"}),
    "N2 6-31G* spherical": Case(line("N N", 1.0784), -108.943194, 1e-6, {"basis": "6-31g*"}),
    "LiH STO-3G at 2.0": Case(line("Li H", 2.0), -7.83090558, 1e-8),
    "BeH2 STO-3G at 1.3264": Case(line("H Be H", 1.3264, 1.3264), -15.56031234, 1e-8),
    "BeH doublet STO-3G": Case(line("Be H", 1.3426), -14.93441012, 1e-8, {"multiplicity": 2}),
}

#: Exact energy in the basis and active space, STO-3G (FCI).
EXACT = {
    "H2 .735": Case(line("H H", 0.735), -1.13730604, 1e-8),
    "H2 .75": Case(line("H H", 0.75), -1.13711707, 1e-8),
    "LiH 1.0": Case(line("Li H", 1.0), -7.78446028, 1e-8),
    "LiH 1.5957": Case(line("Li H", 1.5957), -7.88239151, 1e-8),
    "LiH 2.0": Case(line("Li H", 2.0), -7.86108777, 1e-8),
    "LiH 3.0": Case(line("Li H", 3.0), -7.79884316, 1e-8),
    "LiH 1.5957 (2e,2o)": Case(line("Li H", 1.5957), -7.86226408, 1e-8, {"active_space": "2e,2o"}),
    "LiH 1.5957 frozen core": Case(line("Li H", 1.5957), -7.88216403, 1e-8, {"active_space": "frozen-core"}),
    "BeH2 1.3264": Case(line("H Be H", 1.3264, 1.3264), -15.59517687, 1e-8),
    "H2O frozen core": Case(bent("O", 0.9894, 100.03), -75.02033520, 5e-6, {"active_space": "frozen-core"}),
    "H2 .7122": Case(line("H H", 0.7122), -1.136848, 5e-6),
    "LiH 1.5108": Case(line("Li H", 1.5108), -7.88252641, 5e-6),
    "BeH2 1.2905": Case(line("H Be H", 1.2905, 1.2905), -15.59474583, 5e-6),
    "H2O .9894/100.03": Case(bent("O", 0.9894, 100.03), -75.02041046, 5e-6),
    "NH3 1.0325/104.16": Case(pyramid("N", 1.0325, 104.16), -55.52454633, 5e-6),
    "HF .9555": Case(line("H F", 0.9555), -98.60174886, 5e-6),
    "N2 1.097685 frozen core": Case(line("N N", 1.097685), -107.65252394, 1e-8, {"active_space": "frozen-core"}),
    "N2 1.097685 (6e,6o)": Case(line("N N", 1.097685), -107.62184055, 1e-8, {"active_space": "6e,6o"}),
    "N2 1.097685": Case(line("N N", 1.097685), -107.65282015, 1e-8),
    "HF .916808": Case(line("H F", 0.916808), -98.59658809, 1e-8),
    "F2 1.41193": Case(line("F F", 1.41193), -196.04964081, 1e-8),
    "BeH 1.3426 doublet": Case(line("Be H", 1.3426), -14.95696939, 1e-8, {"multiplicity": 2}),
    "H3 .9 doublet": Case(line("H H H", 0.9, 0.9), -1.56997969, 1e-8, {"multiplicity": 2}),
    "H4 line .9": Case(line("H H H H", 0.9, 0.9, 0.9), -2.18031661, 1e-8),
    "H4 line 1.5": Case(line("H H H H", 1.5, 1.5, 1.5), -1.99615033, 1e-8),
    "H4 line 2.0": Case(line("H H H H", 2.0, 2.0, 2.0), -1.89778065, 1e-8),
    "H6 line 1.0": Case(line("H H H H H H", *[1.0] * 5), -3.23606628, 1e-8),
    "H6 line 2.0": Case(line("H H H H H H", *[2.0] * 5), -2.84719213, 1e-8),
}

#: H2, STO-3G, 1.4 bohr (SZABO): energies of mean field and full CI, then integrals over the two molecular orbitals.
TEXTBOOK_H2 = {
    "hartree_fock": -1.1167,
    "full_ci": -1.1373,
    "h11": -1.2528,
    "h22": -0.4756,
    "J11": 0.6746,
    "J12": 0.6636,
    "J22": 0.6975,
    "K12": 0.1813,
    "e1": -0.578,
    "e2": 0.670,
}
