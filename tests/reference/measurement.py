"""Figures of sampling, with their sources."""

#: Shots times squared standard error of an energy whose Pauli terms are sampled one by one with the best allocation, (sum |c| sigma)^2
#: (common practice; e.g. Rubin, Babbush and McClean, New J. Phys. 20, 053020 (2018)), at the Hartree-Fock state, STO-3G, Eh^2.
#: Values recomputed independently with PySCF and openfermion. H2 at 0.7414, LiH at 1.0 angstrom.
HARTREE_FOCK_FIGURES = {"H2": 0.032866, "LiH": 9.048927}
