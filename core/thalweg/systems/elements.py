"""The elements: symbols, names, covalent radii and the masses of principal isotopes.

Radii: Cordero et al., Dalton Trans. 2008, 2832 (angstrom, Z <= 96). Masses of the most abundant (or longest-lived) isotope in
dalton, Z <= 54: atomic mass evaluation, as tabulated by IUPAC and NIST, rounded.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

_TABLE: Final = """
H Hydrogen 0.31 1.00782503 | He Helium 0.28 4.00260325 | Li Lithium 1.28 7.01600344 | Be Beryllium 0.96 9.01218307 | B Boron 0.84 11.00930536
C Carbon 0.73 12.0 | N Nitrogen 0.71 14.003074 | O Oxygen 0.66 15.99491462 | F Fluorine 0.57 18.99840316 | Ne Neon 0.58 19.99244018
Na Sodium 1.66 22.98976928 | Mg Magnesium 1.41 23.9850417 | Al Aluminium 1.21 26.98153853 | Si Silicon 1.11 27.97692653
P Phosphorus 1.07 30.973762 | S Sulfur 1.05 31.97207117 | Cl Chlorine 1.02 34.96885268 | Ar Argon 1.06 39.96238312 | K Potassium 2.03 38.963707
Ca Calcium 1.76 39.962591 | Sc Scandium 1.70 44.95591 | Ti Titanium 1.60 47.947947 | V Vanadium 1.53 50.943964 | Cr Chromium 1.39 51.940512
Mn Manganese 1.50 54.93805 | Fe Iron 1.42 55.934942 | Co Cobalt 1.38 58.9332 | Ni Nickel 1.24 57.935348 | Cu Copper 1.32 62.929601
Zn Zinc 1.22 63.929147 | Ga Gallium 1.22 68.925581 | Ge Germanium 1.20 73.921178 | As Arsenic 1.19 74.921596 | Se Selenium 1.20 79.916522
Br Bromine 1.20 78.918338 | Kr Krypton 1.16 83.911507 | Rb Rubidium 2.20 84.911789 | Sr Strontium 1.95 87.905614 | Y Yttrium 1.90 88.905848
Zr Zirconium 1.75 89.904704 | Nb Niobium 1.64 92.906378 | Mo Molybdenum 1.54 97.905408 | Tc Technetium 1.47 98.907216
Ru Ruthenium 1.46 101.90435 | Rh Rhodium 1.42 102.905504 | Pd Palladium 1.39 105.903483 | Ag Silver 1.45 106.905093 | Cd Cadmium 1.44 113.903358
In Indium 1.42 114.903878 | Sn Tin 1.39 119.902197 | Sb Antimony 1.39 120.903818 | Te Tellurium 1.38 129.906223 | I Iodine 1.39 126.904468
Xe Xenon 1.40 131.904154 | Cs Caesium 2.44 - | Ba Barium 2.15 - | La Lanthanum 2.07 - | Ce Cerium 2.04 - | Pr Praseodymium 2.03 -
Nd Neodymium 2.01 - | Pm Promethium 1.99 - | Sm Samarium 1.98 - | Eu Europium 1.98 - | Gd Gadolinium 1.96 - | Tb Terbium 1.94 -
Dy Dysprosium 1.92 - | Ho Holmium 1.92 - | Er Erbium 1.89 - | Tm Thulium 1.90 - | Yb Ytterbium 1.87 - | Lu Lutetium 1.87 - | Hf Hafnium 1.75 -
Ta Tantalum 1.70 - | W Tungsten 1.62 - | Re Rhenium 1.51 - | Os Osmium 1.44 - | Ir Iridium 1.41 - | Pt Platinum 1.36 - | Au Gold 1.36 -
Hg Mercury 1.32 - | Tl Thallium 1.45 - | Pb Lead 1.46 - | Bi Bismuth 1.48 - | Po Polonium 1.40 - | At Astatine 1.50 - | Rn Radon 1.50 -
Fr Francium 2.60 - | Ra Radium 2.21 - | Ac Actinium 2.15 - | Th Thorium 2.06 - | Pa Protactinium 2.00 - | U Uranium 1.96 - | Np Neptunium 1.90 -
Pu Plutonium 1.87 - | Am Americium 1.80 - | Cm Curium 1.69 - | Bk Berkelium - - | Cf Californium - - | Es Einsteinium - - | Fm Fermium - -
Md Mendelevium - - | No Nobelium - - | Lr Lawrencium - - | Rf Rutherfordium - - | Db Dubnium - - | Sg Seaborgium - - | Bh Bohrium - -
Hs Hassium - - | Mt Meitnerium - - | Ds Darmstadtium - - | Rg Roentgenium - - | Cn Copernicium - - | Nh Nihonium - - | Fl Flerovium - -
Mc Moscovium - - | Lv Livermorium - - | Ts Tennessine - - | Og Oganesson - -
"""


@dataclass(frozen=True)
class Element:
    """One element. `covalent_radius` in angstrom, `mass` in dalton; None where the table has no figure."""

    number: int
    symbol: str
    name: str
    covalent_radius: float | None
    mass: float | None


def _read_table() -> tuple[Element, ...]:
    elements = []
    for number, entry in enumerate(_TABLE.strip().replace("\n", " | ").split(" | "), start=1):
        symbol, name, radius, mass = entry.split()
        elements.append(Element(number, symbol, name, _figure(radius), _figure(mass)))
    return tuple(elements)


def _figure(text: str) -> float | None:
    return None if text == "-" else float(text)


ELEMENTS: Final = _read_table()
_OTHER_NAMES: Final = {"aluminum": "Al", "sulphur": "S", "cesium": "Cs", "wolfram": "W", "deuterium": "H", "tritium": "H", "d": "H", "t": "H"}
_BY_NAME: Final = {e.symbol.lower(): e for e in ELEMENTS} | {e.name.lower(): e for e in ELEMENTS}
_NOBLE: Final = (0, 2, 10, 18, 36, 54, 86, 118)


def find_element(text: str) -> Element | None:
    """The element with this symbol, English name (any case) or atomic number; None if there is none."""
    text = text.strip()
    if text.isascii() and text.isdigit():
        number = int(text) if len(text) < 4 else 0
        return ELEMENTS[number - 1] if 1 <= number <= len(ELEMENTS) else None
    name = text.lower()
    return _BY_NAME.get(_OTHER_NAMES.get(name, name).lower())


def core_orbitals(number: int) -> int:
    """Doubly occupied orbitals of the preceding noble gas: 0 for H and He, 1 for Li to Ne, 5 for Na to Ar, 9, 18, 27, 43."""
    return max(n for n in _NOBLE if n < number) // 2


def formula(symbols: tuple[str, ...]) -> str:
    """Counts in Hill order with carbon (`CH4`), else in the IUPAC sequence of binary compounds (`LiH`, `NH3`, `H2O`, `HF`)."""
    counts = {s: symbols.count(s) for s in symbols}
    ordered = sorted(counts) if "C" in counts else sorted(counts, key=_binary_rank)
    if "C" in counts:
        ordered = [s for s in ("C", "H") if s in counts] + [s for s in ordered if s not in ("C", "H")]
    return "".join(s + (str(counts[s]) if counts[s] > 1 else "") for s in ordered)


def _binary_rank(symbol: str) -> tuple[float, int]:
    """Place in the IUPAC element sequence (Red Book 2005, table VI): by group, hydrogen between nitrogen and oxygen."""
    number = _BY_NAME[symbol.lower()].number
    if number == 1:
        return 15.5, 0
    period = sum(n < number for n in _NOBLE)
    column = number - _NOBLE[period - 1]
    length = _NOBLE[period] - _NOBLE[period - 1]
    group = column if column <= 2 else column + 18 - length
    return (0 if group == 18 else float(max(group, 3) if column > 2 else group)), -period
