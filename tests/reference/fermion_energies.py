"""Published and independently computed energies that the exact solver and UCCSD are held against, hartree.

Geometries in angstrom, STO-3G, all electrons.
"""

from __future__ import annotations

# (atoms, unpaired electrons, energy). LiH 1.5957, HF, N2 and BeH stand at the experimental r_e of Huber and Herzberg, Constants of
# Diatomic Molecules (1979). Energies: full CI by PySCF, recomputed independently of this project.
FULL_CI = {
    "H2 0.735": ("H 0 0 0; H 0 0 .735", 0, -1.13730604),
    "H2 0.75": ("H 0 0 0; H 0 0 .75", 0, -1.13711707),
    "LiH 1.0": ("Li 0 0 0; H 0 0 1", 0, -7.78446028),
    "LiH 1.5957": ("Li 0 0 0; H 0 0 1.5957", 0, -7.88239151),
    "LiH 3.0": ("Li 0 0 0; H 0 0 3", 0, -7.79884316),
    "BeH2 1.3264": ("Be 0 0 0; H 0 0 1.3264; H 0 0 -1.3264", 0, -15.59517687),
    "HF 0.916808": ("F 0 0 0; H 0 0 .916808", 0, -98.59658809),
    "N2 1.097685": ("N 0 0 0; N 0 0 1.097685", 0, -107.65282015),
    "F2 1.41193": ("F 0 0 0; F 0 0 1.41193", 0, -196.04964081),
    "BeH 1.3426": ("Be 0 0 0; H 0 0 1.3426", 1, -14.95696939),
    "H3 linear 0.9": ("H 0 0 0; H 0 0 .9; H 0 0 1.8", 1, -1.56997969),
    "H4 linear 0.9": ("H 0 0 0; H 0 0 .9; H 0 0 1.8; H 0 0 2.7", 0, -2.18031661),
    "H4 linear 1.5": ("H 0 0 0; H 0 0 1.5; H 0 0 3; H 0 0 4.5", 0, -1.99615033),
    "H4 linear 2.0": ("H 0 0 0; H 0 0 2; H 0 0 4; H 0 0 6", 0, -1.89778065),
}
# Water, 0.9894 angstrom and 100.03 degrees: the STO-3G geometry of Hehre, Radom, Schleyer and Pople, Ab Initio Molecular
# Orbital Theory (1986), rounded there to the digits given.
WATER_FULL_CI = -75.02041046
# Error of the UCCSD product against full CI, mEh, from zero start: (doubles act first, singles act first); recomputed
# independently of this project. The last digit given is the tolerance.
UCCSD_ERRORS = {
    "LiH 1.45": ("Li 0 0 0; H 0 0 1.45", (0.0087, 0.0088), 1e-4),
    "LiH 1.5957": ("Li 0 0 0; H 0 0 1.5957", (0.0105, 0.0106), 1e-4),
    "LiH 3.0": ("Li 0 0 0; H 0 0 3", (0.0811, 0.0888), 1e-4),
    "BeH2 1.3264": ("Be 0 0 0; H 0 0 1.3264; H 0 0 -1.3264", (0.380, 0.382), 1e-3),
    "BeH2 3.0": ("Be 0 0 0; H 0 0 3; H 0 0 -3", (2.89, 17.9), (1e-2, 1e-1)),
    "H4 linear 0.9": ("H 0 0 0; H 0 0 .9; H 0 0 1.8; H 0 0 2.7", (0.037, 0.035), 1e-3),
    "H4 linear 2.0": ("H 0 0 0; H 0 0 2; H 0 0 4; H 0 0 6", (3.54, 4.56), 1e-2),
    "H6 linear 1.0": ("H 0 0 0; H 0 0 1; H 0 0 2; H 0 0 3; H 0 0 4; H 0 0 5", (0.63, 0.61), 1e-2),
    "H6 linear 2.0": ("H 0 0 0; H 0 0 2; H 0 0 4; H 0 0 6; H 0 0 8; H 0 0 10", (8.21, 12.7), (1e-2, 1e-1)),
}
WATER_UCCSD_ERRORS = (0.095, 0.099)
# Spin-orbital UCCSD parameters, all electrons, no point group (counted: occupied and virtual spin orbitals).
UCCSD_COUNTS = {"H2": 3, "H4": 26, "LiH": 92, "H6": 117, "H2O": 140, "BeH2": 204, "N2": 609}
