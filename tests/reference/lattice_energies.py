"""Published and closed-form ground-state energies of spin and lattice models.

Each value was recomputed independently of this project by exact diagonalisation. Conventions: S.S are spin operators, S = sigma / 2;
sigma.sigma are Pauli matrices; every periodic lattice counts each bond of its periodic sum.
"""

from __future__ import annotations

import math

# Transverse-field Ising, -sum Z Z - h sum X, total energy. Pfeuty, Annals of Physics 57, 79 (1970).
ISING_RING = {(8, 0.5): -8.5090822351, (8, 1.0): -10.2516617910, (8, 2.0): -17.0181644703, (12, 1.0): -15.3225951511}
ISING_OPEN = {8: -9.8379514475}


def ising_ring(n: int, h: float) -> float:
    """-sum_k sqrt(1 + h^2 - 2 h cos k), k = (2m + 1) pi / n (Pfeuty 1970)."""
    return -sum(math.sqrt(1 + h * h - 2 * h * math.cos((2 * m + 1) * math.pi / n)) for m in range(n))


def ising_critical_ring(n: int) -> float:
    """-2 / sin(pi / 2n) at h = 1 (Pfeuty 1970)."""
    return -2 / math.sin(math.pi / (2 * n))


def ising_critical_open(n: int) -> float:
    """1 - 1 / sin(pi / (4n + 2)) at h = 1 (Pfeuty 1970)."""
    return 1 - 1 / math.sin(math.pi / (4 * n + 2))


# Heisenberg, S.S, J = 1: ring, energy per site; open chain, total energy. Rings of 4 to 10 sites: Orbach, Physical Review 112, 309
# (1958), and Bonner and Fisher, Physical Review 135, A640 (1964) (sources from memory, values recomputed).
HEISENBERG_RING = {4: -0.5, 6: -0.467129273, 8: -0.456386676, 10: -0.451544635, 12: -0.448949243, 16: -0.446393523}
HEISENBERG_OPEN = {4: -1.6160254038, 6: -2.4935771339, 8: -3.3749325987, 10: -4.2580352073}
# Infinite chain: 1/4 - ln 2. Bethe, Zeitschrift fuer Physik 71, 205 (1931); Hulthen (1938).
BETHE_LIMIT = 0.25 - math.log(2.0)
# Isotropic XY (XX) ring, sum Sx Sx + Sy Sy, total energy: a filled band. Lieb, Schultz and Mattis, Annals of Physics 16, 407 (1961).
XX_RING = {4: -math.sqrt(2.0), 6: -2.0, 8: -2.6131259298}
# Heisenberg, 4 x 4 torus, per site. Recomputed; quoted widely, e.g. by Schulz, Ziman and Poilblanc, J. Phys. I France 6, 675 (1996).
SQUARE_16 = -0.7017802005
# J1-J2, 4 x 4 torus, per site: Schulz, Ziman and Poilblanc (1996).
J1J2_16 = {0.2: -0.6198739, 0.4: -0.5511478, 0.6: -0.5258958}
# Heisenberg, triangular torus of 12 sites, per site: Bernu, Lecheminant, Lhuillier and Pierre, Physical Review B 50, 10048 (1994).
TRIANGULAR_12 = -0.61033014
# Heisenberg, kagome torus of 12 sites, per site: Leung and Elser, Physical Review B 47, 5459 (1993).
KAGOME_12 = -0.45373960
# Kitaev honeycomb torus of 8 sites, sigma.sigma, J = 1, total energy. Kitaev, Annals of Physics 321, 2 (2006); recomputed.
KITAEV_8 = -4.0 * math.sqrt(3.0)
# Hubbard ring of six sites, t = 1, half filling, total energy: U -> E. Recomputed with a general-purpose determinant code.
HUBBARD_RING_6 = {2.0: -5.4094568451, 4.0: -3.6687061789, 8.0: -2.0481308861}
# Infinite half-filled Hubbard chain, per site: Lieb and Wu, Physical Review Letters 20, 1445 (1968), integral evaluated numerically.
LIEB_WU = {2.0: -0.84437434, 4.0: -0.57372937, 8.0: -0.32753053}


def hubbard_dimer(u: float) -> float:
    """U/2 - sqrt(U^2/4 + 4), t = 1, two electrons (textbook result)."""
    return u / 2 - math.sqrt(u * u / 4 + 4)
