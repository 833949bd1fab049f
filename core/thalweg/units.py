"""Physical constants (CODATA 2022, Mohr et al. 2024) and conversions. Energies are hartree, lengths bohr inside."""

from __future__ import annotations

from typing import Final

CONSTANTS_NAME: Final = "CODATA 2022"
HARTREE_IN_EV: Final = 27.211386245981
HARTREE_IN_INVERSE_CM: Final = 219474.63136314
HARTREE_IN_KCAL_PER_MOL: Final = 627.5094740629
HARTREE_IN_KJ_PER_MOL: Final = 2625.4996394799
BOHR_IN_ANGSTROM: Final = 0.529177210544
ELECTRON_MASS_IN_DALTON: Final = 5.485799090441e-4

#: Chemical accuracy, 1 kcal/mol in hartree (common practice).
CHEMICAL_ACCURACY: Final = 1.0 / HARTREE_IN_KCAL_PER_MOL

ENERGY_UNITS: Final = {
    "hartree": 1.0,
    "mEh": 1.0e3,
    "eV": HARTREE_IN_EV,
    "kcal/mol": HARTREE_IN_KCAL_PER_MOL,
    "kJ/mol": HARTREE_IN_KJ_PER_MOL,
    "cm^-1": HARTREE_IN_INVERSE_CM,
}
LENGTH_UNITS: Final = {"bohr": 1.0, "angstrom": BOHR_IN_ANGSTROM}


def constants_record() -> dict[str, float | str]:
    """The set of constants that a result was made with, as written to sessions."""
    return {
        "set": CONSTANTS_NAME,
        "hartree_in_kcal_per_mol": HARTREE_IN_KCAL_PER_MOL,
        "hartree_in_ev": HARTREE_IN_EV,
        "bohr_in_angstrom": BOHR_IN_ANGSTROM,
    }
