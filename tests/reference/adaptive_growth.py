"""How many operators adaptive growth takes on small molecules.

Pool: spin-adapted generalised singles and doubles (Grimsley, Economou, Barnes and Mayhall, Nature Communications 10, 3007 (2019)),
one operator a step, STO-3G, all electrons, until within 1 kcal/mol of full CI. Counts recomputed independently of this project;
they depend on how equal slopes are ordered and on how an operator of several excitations is applied, hence the band.
"""

from __future__ import annotations

BAND = 0.30  # of the count
# (atoms, operators), geometries in angstrom
OPERATORS = {
    "LiH 1.5957": ("Li 0 0 0; H 0 0 1.5957", 4),
    "LiH 3.0": ("Li 0 0 0; H 0 0 3", 5),
    "H4 linear 1.5": ("H 0 0 0; H 0 0 1.5; H 0 0 3; H 0 0 4.5", 6),
    "H6 linear 1.0": ("H 0 0 0; H 0 0 1; H 0 0 2; H 0 0 3; H 0 0 4; H 0 0 5", 23),
}
