"""Published figures of molecular Hamiltonians on qubits.

Source: Verteletskyi, Yen and Izmaylov, J. Chem. Phys. 152, 124114 (2020): STO-3G, all bonds 1.0 angstrom, HOH 107.6 degrees.
Values from memory of the paper; terms and one-norms recomputed with PySCF and openfermion (cut 1e-8). Qubits left after
removing Z2 symmetries: recomputed, the point group and the two spin parities counted by hand.
"""

from __future__ import annotations

from typing import NamedTuple


class Figures(NamedTuple):
    """One molecule. Terms include the identity; one-norm (Eh) does not; sets are those of the Bravyi-Kitaev encoding."""

    qubits: int
    tapered_qubits: int
    terms: int
    one_norm: float
    qubit_wise_sets: int
    commuting_sets: int


PUBLISHED = {
    "H2": Figures(4, 1, 15, 1.5750, 3, 2),
    "LiH": Figures(12, 8, 631, 13.0071, 142, 42),
    "BeH2": Figures(14, 9, 666, 22.8038, 172, 36),
    "H2O": Figures(14, 10, 1086, 71.8568, 313, 50),
}

#: H2, STO-3G, 0.7414 angstrom on one qubit: coefficients of I, Z, X up to the signs of Z and X (recomputed with openfermion).
H2_ONE_QUBIT = (-0.328717, -0.787967, 0.181289)
